//! The first coefficients, which begin the recurrences.
//!
//! Every sum begins with +0 and takes its products away, and what it is multiplied with is positive: so it is never −0,
//! and adding a product that is 0 changes no bit. The kernel that packs a trajectory's components relies on that. (A product
//! below 1e-323 rounds to 0 of its own sign; coefficients so small belong to no place within the bounds of a state.)

use super::Primaries;
use super::lanes::twice_integrated;
use super::tables::CORIOLIS;
use crate::arithmetic::Real;

/// What every order needs again, formed once.
pub(super) struct Leading<R> {
    /// 1 over the half squares of order 0.
    pub inverse: [R; 2],
    /// −3/2 of the forces over the half squares of order 0: a force's share in its newest half square.
    pub slope: [R; 2],
    /// The farther one's share in the newest d.
    pub far_slope: R,
    /// The half squares of order 1 over those of order 0.
    pub bend: [R; 2],
    /// The forces of order 1 over the half squares of order 0.
    pub tilt: [R; 2],
    /// The total force of order 0 less the centrifugal one.
    pub pull: [R; 3],
}

/// Orders 0 and 1 of everything, and the position up to order 3.
pub(super) struct Opening<R> {
    pub leading: Leading<R>,
    pub position: [[R; 3]; 4],
    pub half_square: [[R; 2]; 2],
    pub force: [[R; 2]; 2],
    pub total: [R; 2],
    pub side: R,
    pub jacobi: R,
}

impl<R: Real> Opening<R> {
    /// Of the solutions through (x, y, z, vx, vy, vz), whose x is so far from the larger and the smaller primary.
    #[inline(always)]
    pub(super) fn new(primaries: &Primaries, state: &[R; 6], [to_larger, to_smaller]: [R; 2]) -> Self {
        let [x, y, z, vx, vy, vz] = *state;
        let constant = R::from_f64;
        let (zero, one, two, half) = (constant(0.0), constant(1.0), constant(2.0), constant(0.5));
        let off_axis = z.mul_add(z, y * y);
        let square_larger = to_larger.mul_add(to_larger, off_axis);
        let square_smaller = to_smaller.mul_add(to_smaller, off_axis);
        let pick = |smaller: R, larger: R| square_smaller.select_less(square_larger, smaller, larger);

        let share_smaller = constant(primaries.mass_parameter());
        let share_larger = constant(primaries.smaller_x().value);
        let square = [pick(square_smaller, square_larger), pick(square_larger, square_smaller)];
        let share = [pick(share_smaller, share_larger), pick(share_larger, share_smaller)];
        let side = pick(one, constant(-1.0));
        let d = pick(to_smaller, to_larger);
        let half_square = [square[0] * half, square[1] * half];
        let force = [0, 1].map(|i| share[i] / (square[i] * square[i].sqrt()));
        let total = force[0] + force[1];
        let inverse = [one / half_square[0], one / half_square[1]];
        let steepened = constant(-1.5);
        let slope = [(force[0] * steepened) * inverse[0], (force[1] * steepened) * inverse[1]];
        let far_slope = slope[1] * side;
        let centripetal = total - one;

        let speed_square = vz.mul_add(vz, vy.mul_add(vy, vx * vx));
        let potential = force[0].mul_add(square[0], force[1] * square[1]);
        let jacobi = two.mul_add(potential, y.mul_add(y, x * x)) - speed_square;

        let near = vz.mul_add(z, vy.mul_add(y, vx.mul_add(d, zero)));
        let half_square_1 = [near, side.mul_add(vx, near)];
        let force_1 = [near.mul_add(slope[0], zero), near.mul_add(slope[1], far_slope.mul_add(vx, zero))];
        let total_1 = force_1[0] + force_1[1];

        let twice = constant(CORIOLIS[0]);
        // x from the barycentre; in all later orders it is that of d.
        let second = [
            d.neg_mul_add(total, vy.mul_add(twice, side.neg_mul_add(force[1], x))),
            y.neg_mul_add(centripetal, vx.neg_mul_add(twice, zero)),
            z.neg_mul_add(total, zero),
        ];
        let second =
            [twice_integrated(0, second[0]), twice_integrated(0, second[1]), twice_integrated(0, second[2])];
        let turn = constant(CORIOLIS[1]);
        let third = [
            d.neg_mul_add(total_1, side.neg_mul_add(force_1[1], vx.neg_mul_add(centripetal, zero))),
            y.neg_mul_add(total_1, vy.neg_mul_add(centripetal, zero)),
            z.neg_mul_add(total_1, vz.neg_mul_add(total, zero)),
        ];
        let third = [
            twice_integrated(1, second[1].mul_add(turn, third[0])),
            twice_integrated(1, second[0].neg_mul_add(turn, third[1])),
            twice_integrated(1, third[2]),
        ];

        let bend = [half_square_1[0] * inverse[0], half_square_1[1] * inverse[1]];
        let tilt = [force_1[0] * inverse[0], force_1[1] * inverse[1]];
        Self {
            leading: Leading {
                inverse,
                slope,
                far_slope,
                bend,
                tilt,
                pull: [centripetal, centripetal, total],
            },
            position: [[d, y, z], [vx, vy, vz], second, third],
            half_square: [half_square, half_square_1],
            force: [force, force_1],
            total: [total, total_1],
            side,
            jacobi,
        }
    }
}
