//! Regions of motion and passages.

use mechanics::equilibria::{Equilibria, Point};
use mechanics::hill::{OpenPassages, Passage, Region};
use mechanics::potential::{JacobiConstant, JacobiForm, gradient};
use nalgebra::Vector3;
use proptest::prelude::*;

use crate::reference::{REGIONS, mass_parameter, number, rows};

fn equilibria(mu: f64) -> Equilibria {
    Equilibria::of(mass_parameter(mu))
}

/// Cells of a square or cubic lattice, joined through common faces where 2Ω ≥ C.
struct Flood {
    centre: Vector3<f64>,
    spacing: f64,
    /// Cells from the centre to each edge, along x, y and z.
    reach: [i32; 3],
    label: Vec<Option<usize>>,
}

impl Flood {
    /// Labels each allowed cell with the lowest number of its component.
    fn new(all: &Equilibria, c: &JacobiConstant, centre: Vector3<f64>, width: f64, reach: [i32; 3]) -> Self {
        let spacing = width / f64::from(reach[0]);
        let mut flood = Self { centre, spacing, reach, label: Vec::new() };
        let cells: Vec<_> = flood.cells().collect();
        let mu = all.mass_parameter();
        let allowed: Vec<bool> = cells
            .iter()
            // The centre of a primary is allowed at every constant.
            .map(|&cell| JacobiConstant::at_rest(mu, &flood.position(cell)).map_or(true, |rest| rest >= *c))
            .collect();
        flood.label = vec![None; cells.len()];
        for start in 0..cells.len() {
            let mut stack = vec![start];
            while let Some(index) = stack.pop() {
                if !allowed[index] || flood.label[index].is_some() {
                    continue;
                }
                flood.label[index] = Some(start);
                for axis in 0..3 {
                    for side in [-1, 1] {
                        let mut neighbour = cells[index];
                        neighbour[axis] += side;
                        stack.extend(flood.index(neighbour));
                    }
                }
            }
        }
        flood
    }

    fn cells(&self) -> impl Iterator<Item = [i32; 3]> + use<> {
        let [a, b, c] = self.reach;
        (-a..=a).flat_map(move |i| (-b..=b).flat_map(move |j| (-c..=c).map(move |k| [i, j, k])))
    }

    fn index(&self, cell: [i32; 3]) -> Option<usize> {
        let mut index = 0;
        for (i, reach) in cell.into_iter().zip(self.reach) {
            index = index * usize::try_from(2 * reach + 1).ok()? + usize::try_from(i + reach).ok()?;
            if i > reach {
                return None;
            }
        }
        Some(index)
    }

    fn position(&self, cell: [i32; 3]) -> Vector3<f64> {
        self.centre + Vector3::from(cell.map(f64::from)) * self.spacing
    }

    /// Allowed positions with the component's label.
    fn allowed(&self) -> impl Iterator<Item = (Vector3<f64>, usize)> {
        self.cells().zip(&self.label).filter_map(|(cell, label)| Some((self.position(cell), (*label)?)))
    }

    /// The label of the component of the cell nearest to a position, if it is allowed.
    fn at(&self, position: Vector3<f64>) -> Option<usize> {
        let cell = (position - self.centre) / self.spacing;
        #[expect(clippy::cast_possible_truncation, reason = "cells are few")]
        let cell = [cell.x, cell.y, cell.z].map(|x| x.round() as i32);
        self.label[self.index(cell)?]
    }
}

/// Asserts that each region of a lattice is one component and the other way round, as far as `kind` tells them
/// apart; `seeds` are positions of known kind.
fn assert_components_are_regions<K: PartialEq + std::fmt::Debug>(
    all: &Equilibria,
    flood: &Flood,
    seeds: &[(Vector3<f64>, K)],
    kind: impl Fn(Region) -> K,
) {
    let known: Vec<_> = seeds.iter().map(|(r, k)| (flood.at(*r).expect("seeds are allowed"), k)).collect();
    let mut counted = 0;
    for (position, label) in flood.allowed() {
        let Some((_, want)) = known.iter().find(|(known, _)| *known == label) else { continue };
        let found = kind(Region::of(all, &position));
        assert_eq!(found, **want, "{position:?} at {:?}", all.mass_parameter());
        counted += 1;
    }
    assert!(counted > 200, "the lattice is too coarse to prove anything");
}

/// Whole plane and space, above the constant of L1 and between those of L1 and L2.
#[test]
fn closed_passages_make_regions_of_components() {
    for mu in [1e-3, 0.012_150_585_6, 0.1, 0.3, 0.5] {
        let all = equilibria(mu);
        let (c1, c2) = (all.get(Point::L1).jacobi_constant(), all.get(Point::L2).jacobi_constant());
        let far = Vector3::new(0.0, 1.95, 0.0);
        let (larger, smaller) = (Vector3::new(-mu, 0.0, 0.0), Vector3::new(1.0 - mu, 0.0, 0.0));
        for reach in [[200, 200, 0], [32, 32, 16]] {
            // Far enough above for the gap to be wider than a cell of the plane's lattice.
            let closed = c1.plus(if reach[2] == 0 { 0.01 } else { 0.15 });
            // Narrower cells are needed to see the smallest of the inner regions in space.
            if reach[2] == 0 || mu >= 0.1 {
                let flood = Flood::new(&all, &closed, Vector3::zeros(), 2.0, reach);
                let seeds = [
                    (larger, Region::AroundLarger),
                    (smaller, Region::AroundSmaller),
                    (far, Region::Outside),
                ];
                assert_components_are_regions(&all, &flood, &seeds, |region| region);
            }
            let gap = c1.above(&c2);
            if reach[2] == 0 && gap > 1e-3 {
                let between = c2.plus(0.7 * gap);
                let flood = Flood::new(&all, &between, Vector3::zeros(), 2.0, reach);
                let seeds = [(larger, false), (far, true)];
                assert_components_are_regions(&all, &flood, &seeds, |region| region == Region::Outside);
            }
        }
    }
}

/// Windows about the necks of L1 and L2 just above their constants, both sides of each, down to tiny μ.
#[test]
fn both_sides_of_a_closed_neck_are_told_apart() {
    for mu in [1e-15, 1e-9, 3e-6, 0.012_150_585_6, 0.3, 0.5] {
        let all = equilibria(mu);
        for (point, left, right) in [
            (Point::L1, Region::AroundLarger, Region::AroundSmaller),
            (Point::L2, Region::AroundSmaller, Region::Outside),
        ] {
            // About the point the constant rises as 9 times the square of the distance along x, or so: the gap is
            // then a dozen cells wide.
            let neck = all.get(point);
            let width = 0.1 * neck.distance_to_smaller();
            let closed = neck.jacobi_constant().plus(0.09 * width * width);
            let flood = Flood::new(&all, &closed, neck.position(), width, [100, 100, 0]);
            let side = |sign: f64| neck.position() + Vector3::new(sign * width, 0.0, 0.0);
            // At L2 the inner side is joined to the larger primary's region too.
            let inner =
                |region| if point == Point::L2 && region == Region::AroundLarger { left } else { region };
            assert_components_are_regions(&all, &flood, &[(side(-1.0), left), (side(1.0), right)], inner);
        }
    }
}

/// Integrated by a general-purpose library; see `reference/make.py`.
#[test]
fn ascent_ends_where_an_integrator_says() {
    for row in rows(REGIONS) {
        let want = match row[4] {
            "larger" => Region::AroundLarger,
            "smaller" => Region::AroundSmaller,
            _ => Region::Outside,
        };
        let position = Vector3::new(number(row[1]), number(row[2]), number(row[3]));
        assert_eq!(Region::of(&equilibria(number(row[0])), &position), want, "{row:?}");
    }
}

#[test]
fn extreme_positions_have_a_region() {
    for mu in [5e-324, 1e-100, 1e-16, 0.012_150_585_6, 0.5] {
        let all = equilibria(mu);
        for x in [-1e6, -1.0, -mu, 0.0, 1.0 - mu, 1e6] {
            for z in [0.0, 1e-300, 1e-3, 1.0, 1e6] {
                let _ = Region::of(&all, &Vector3::new(x, 0.0, z));
            }
        }
        assert_eq!(Region::of(&all, &Vector3::new(-mu, 0.0, 0.0)), Region::AroundLarger);
        assert_eq!(Region::of(&all, &Vector3::new(1e6, 0.0, 0.0)), Region::Outside);
        for equilibrium in all.iter() {
            let _ = Region::of(&all, &equilibrium.position());
        }
    }
    // On the border by symmetry, and of equal masses: as documented.
    assert_eq!(Region::of(&equilibria(0.5), &Vector3::new(0.0, 0.3, 0.0)), Region::AroundSmaller);
}

/// Which passages open in which order, Szebehely 1967, *Theory of Orbits*, 4.6 (from memory).
#[test]
fn passages_open_in_order() {
    let all = equilibria(0.012_150_585_6);
    let at =
        |c: f64| OpenPassages::at(&all, &JacobiConstant::new(all.mass_parameter(), c, JacobiForm::Plain));
    // C1 to C4 are 3.18834, 3.17216, 3.01215, 2.98800 here (worked out at 40 digits).
    for (c, names) in [
        (3.2, vec![]),
        (3.18, vec!["L1"]),
        (3.1, vec!["L1", "L2"]),
        (3.0, vec!["L1", "L2", "L3"]),
        (2.98, vec!["L1", "L2", "L3", "L4_L5"]),
    ] {
        assert_eq!(at(c).iter().map(Passage::name).collect::<Vec<_>>(), names);
    }
    let reachable = |c, region| at(c).reachable_from(region).collect::<Vec<_>>();
    assert_eq!(reachable(3.2, Region::AroundSmaller), [Region::AroundSmaller]);
    assert_eq!(reachable(3.18, Region::AroundSmaller), [Region::AroundLarger, Region::AroundSmaller]);
    assert_eq!(reachable(3.18, Region::Outside), [Region::Outside]);
    for region in Region::ALL {
        assert_eq!(reachable(3.1, region), Region::ALL);
    }
}

/// An open passage is one whose constant lies above, by however little.
#[test]
fn passages_tell_the_smallest_offsets() {
    let all = equilibria(1e-9);
    for point in [Point::L1, Point::L2, Point::L3] {
        let c = all.get(point).jacobi_constant();
        let open =
            |offset| OpenPassages::at(&all, &c.plus(offset)).iter().any(|passage| passage.point() == point);
        assert!(open(-1e-25) && !open(0.0) && !open(1e-25));
    }
}

proptest! {
    /// The surfaces that [`Region::of`] relies on, sampled.
    #[test]
    fn bounding_surfaces_hold(exponent in -9.0..0.0_f64, u in -1.0..1.0_f64, turn in 0.0..6.3_f64, z in -2.0..2.0_f64) {
        let mu = 0.5 * 10.0_f64.powf(exponent);
        let all = equilibria(mu);
        let [l1, l2, l3] = [Point::L1, Point::L2, Point::L3].map(|point| *all.get(point));
        let (larger, smaller) = (Vector3::new(-mu, 0.0, 0.0), Vector3::new(1.0 - mu, 0.0, 0.0));
        let s = (1.0 - u * u).sqrt();
        let direction = Vector3::new(u, s * turn.cos(), s * turn.sin());
        let rounding = 1e-14;

        for (centre, radius) in [(larger, l1.distance_to_larger()), (smaller, l1.distance_to_smaller())] {
            let outward = gradient(all.mass_parameter(), &(centre + radius * direction)).dot(&direction);
            prop_assert!(outward <= rounding, "{outward:e}");
        }

        let on_larger = larger + l3.distance_to_larger() * direction;
        let on_smaller = smaller + l2.distance_to_smaller() * direction;
        let at_rest = |r: &Vector3<f64>| JacobiConstant::at_rest(all.mass_parameter(), r).expect("off the primaries");
        if (on_larger - smaller).norm() >= l2.distance_to_smaller() {
            prop_assert!(at_rest(&on_larger).above(&l2.jacobi_constant()) <= rounding);
        }
        if (on_smaller - larger).norm() >= l3.distance_to_larger() {
            prop_assert!(at_rest(&on_smaller).above(&l2.jacobi_constant()) <= rounding);
        }

        let horizontal = Vector3::new(turn.cos(), turn.sin(), 0.0);
        let on_cylinder = larger + l2.distance_to_larger() * horizontal + Vector3::z() * z;
        prop_assert!(gradient(all.mass_parameter(), &on_cylinder).dot(&horizontal) >= -rounding);

        // Outside both unit cylinders, out to twice their radius.
        let outside = larger + (1.5 + 0.5 * u) * horizontal + Vector3::z() * z;
        let across = |centre: Vector3<f64>| (outside - centre).component_mul(&Vector3::new(1.0, 1.0, 0.0));
        if across(smaller).norm() >= 1.0 {
            let uphill = gradient(all.mass_parameter(), &outside);
            for centre in [larger, smaller] {
                prop_assert!(uphill.dot(&across(centre)) >= -rounding);
            }
        }
    }

    /// Mirror images in both planes of symmetry, and for equal masses in the third.
    #[test]
    fn regions_are_symmetric(mu in 1e-6..0.5_f64, x in -1.5..1.5_f64, y in -1.5..1.5_f64, z in -1.0..1.0_f64) {
        let all = equilibria(mu);
        let region = Region::of(&all, &Vector3::new(x, y, z));
        prop_assert_eq!(region, Region::of(&all, &Vector3::new(x, -y, z)));
        prop_assert_eq!(region, Region::of(&all, &Vector3::new(x, y, -z)));
    }
}
