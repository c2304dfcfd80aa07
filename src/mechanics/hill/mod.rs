//! Regions of motion and the passages between them.
//!
//! At a Jacobi constant C the third body stays where 2Ω ≥ C. The parts of that region surround the larger
//! primary, the smaller one, or both from outside, and open into each other at L1, L2 and L3 as C falls below the
//! constants of these points (Hill 1878, American Journal of Mathematics 1:5; Szebehely 1967, *Theory of
//! Orbits*, 4.5-4.7).

mod ascent;

use nalgebra::Vector3;

use crate::equilibria::{Equilibria, Point};
use crate::potential::{JacobiConstant, Place};
use ascent::Basins;

/// Where steepest ascent of the effective potential ends.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Region {
    /// In the larger primary.
    AroundLarger,
    /// In the smaller primary.
    AroundSmaller,
    /// At infinity.
    Outside,
}

impl Region {
    /// All three.
    pub const ALL: [Self; 3] = [Self::AroundLarger, Self::AroundSmaller, Self::Outside];

    /// The region of a barycentric rotating position (x, y, z).
    ///
    /// Ω rises along the ascent, so the region is the connected component of {2Ω ≥ C} wherever the passages are
    /// closed at C. That case is decided exactly, by these facts about spheres about the primaries, with γ₁ and
    /// γ₂ the distances of L1 and L2 from the smaller primary and δ = 1 − r₁ of L3. They follow from
    /// 2Ω + μ(1 − μ) = (1 − μ)g(r₁) + μg(r₂) − z², where g(r) = r² + 2/r has its only minimum at r = 1.
    ///
    /// - Ascent never leaves r₂ ≤ γ₁ nor r₁ ≤ 1 − γ₁: on each sphere the outward derivative of Ω is largest at
    ///   the point of contact, L1, where it is 0.
    /// - On the surface of {r₁ < 1 − δ} ∪ {r₂ < γ₂} Ω is at most that of L2. A position with a larger one
    ///   is outside if and only if it lies out of that union.
    /// - Ascent never leaves ϱ₁ ≥ 1 + γ₂ nor {ϱ₁ ≥ 1, ϱ₂ ≥ 1}, ϱ being distances from the primaries' vertical
    ///   axes: ϱ₁ grows in the first, both grow in the second.
    ///
    /// Elsewhere the ascent is followed until one of the first and last facts applies, in capped work. A position
    /// on a border between basins, to rounding, ends on a saddle: it counts to the smaller primary, or if it lies
    /// beyond the larger to that.
    #[must_use]
    pub fn of(equilibria: &Equilibria, position: &Vector3<f64>) -> Self {
        let (l1_to_larger, gamma_1) = equilibria.get(Point::L1).exact_distances();
        let (_, gamma_2) = equilibria.get(Point::L2).exact_distances();
        let (l3_to_larger, _) = equilibria.get(Point::L3).exact_distances();
        let place = Place::of(equilibria.mass_parameter(), position);

        if place.smaller <= gamma_1 {
            return Self::AroundSmaller;
        }
        if place.larger <= l1_to_larger {
            return Self::AroundLarger;
        }
        let at_rest = JacobiConstant::of_place(equilibria.mass_parameter(), &place);
        let enclosed = at_rest > equilibria.get(Point::L2).jacobi_constant();
        if enclosed && place.larger >= l3_to_larger && place.smaller >= gamma_2 {
            return Self::Outside;
        }
        Basins::of(equilibria).ascend(position, enclosed)
    }
}

/// An opening between regions.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Passage {
    /// At L1, between the regions around the two primaries.
    L1,
    /// At L2, between the region around the smaller primary and the outside.
    L2,
    /// At L3, between the region around the larger primary and the outside.
    L3,
    /// At L4 and L5: nothing is forbidden in the plane any more.
    Triangular,
}

impl Passage {
    /// All four, in the order in which they open.
    pub const ALL: [Self; 4] = [Self::L1, Self::L2, Self::L3, Self::Triangular];

    /// `"L1"`, `"L2"`, `"L3"` or `"L4_L5"`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::L1 => "L1",
            Self::L2 => "L2",
            Self::L3 => "L3",
            Self::Triangular => "L4_L5",
        }
    }

    /// The equilibrium that it opens at (of the two triangular ones, L4).
    #[must_use]
    pub fn point(self) -> Point {
        match self {
            Self::L1 => Point::L1,
            Self::L2 => Point::L2,
            Self::L3 => Point::L3,
            Self::Triangular => Point::L4,
        }
    }

    /// The two regions that it joins; L4 and L5 join none that the others have not.
    fn joins(self) -> Option<[Region; 2]> {
        match self {
            Self::L1 => Some([Region::AroundLarger, Region::AroundSmaller]),
            Self::L2 => Some([Region::AroundSmaller, Region::Outside]),
            Self::L3 => Some([Region::AroundLarger, Region::Outside]),
            Self::Triangular => None,
        }
    }
}

/// The passages that are open at one Jacobi constant.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct OpenPassages {
    open: [bool; 4],
}

impl OpenPassages {
    /// Those whose own Jacobi constant lies above `jacobi_constant`.
    #[must_use]
    pub fn at(equilibria: &Equilibria, jacobi_constant: &JacobiConstant) -> Self {
        let opens = |passage: Passage| equilibria.get(passage.point()).jacobi_constant() > *jacobi_constant;
        Self { open: Passage::ALL.map(opens) }
    }

    /// The open ones, in the order in which they open.
    pub fn iter(&self) -> impl Iterator<Item = Passage> + use<> {
        Passage::ALL.into_iter().zip(self.open).filter_map(|(passage, open)| open.then_some(passage))
    }

    /// The regions joined to `region`, itself included, through open passages.
    pub fn reachable_from(&self, region: Region) -> impl Iterator<Item = Region> + use<> {
        let mut reached = Region::ALL.map(|other| other == region);
        // Among three regions the second round settles all.
        for [a, b] in self.iter().chain(self.iter()).filter_map(Passage::joins) {
            let either = reached[a as usize] || reached[b as usize];
            reached[a as usize] = either;
            reached[b as usize] = either;
        }
        Region::ALL.into_iter().zip(reached).filter_map(|(other, reached)| reached.then_some(other))
    }
}
