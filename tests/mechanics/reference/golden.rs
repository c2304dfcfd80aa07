//! Bits of final states, matrices and events, the same on every machine and however they are computed. `golden.txt`
//! holds the table as it is meant to be.

use std::fmt::Write;

use mechanics::interrupt::Never;
use mechanics::propagation::event::{Direction, Event, Plane, When};
use mechanics::propagation::{MatrixOutput, Request, RequestParts, Trajectory, solve};
use mechanics::state::State;
use mechanics::system::Primary;
use mechanics::taylor::Path;

use super::cases::{case, parts};

/// FNV-1a, 64 bit (Fowler, Noll & Vo).
pub(crate) fn hashed(values: impl IntoIterator<Item = f64>) -> u64 {
    values
        .into_iter()
        .flat_map(|value| value.to_bits().to_le_bytes())
        .fold(0xcbf2_9ce4_8422_2325, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3))
}

/// One in so many members of the ensemble is in the table.
const STRIDE: usize = 157;

/// The ensemble's members of the table, with their matrices and events.
pub(crate) fn request() -> RequestParts {
    let ensemble = case("ensemble_10k").expect("a case");
    let event = |when| Event { when, direction: Direction::Either, only: None, stop_after: None };
    RequestParts {
        states: ensemble.states.iter().copied().step_by(STRIDE).collect(),
        matrix: MatrixOutput::Final,
        events: vec![event(When::Plane(Plane::across(1, 0.0))), event(When::Periapsis(Primary::Smaller))],
        ..ensemble
    }
}

/// The bits of a state at the end, and those of the matrix and of the events in one number each.
pub(crate) fn line(trajectory: &Trajectory) -> String {
    let mut line = bits(&trajectory.last);
    let matrix = trajectory.matrix.iter().flat_map(|matrix| matrix.iter().copied());
    let events = trajectory.events.iter().flat_map(|event| {
        std::iter::once(event.state.time).chain(event.state.components().iter().copied().collect::<Vec<_>>())
    });
    write!(line, " {:016x} {:016x}", hashed(matrix), hashed(events)).expect("a string has room");
    line
}

/// The bits of a state's components.
pub(crate) fn bits(state: &State) -> String {
    let words: Vec<_> = state.components().iter().map(|c| format!("{:016x}", c.to_bits())).collect();
    words.join(" ")
}

/// Final states and matrices of two hundred trajectories over all mass parameters, close approaches included.
fn sweep(path: Path) -> u64 {
    let mut all = Vec::new();
    for i in 0..200 {
        let i = f64::from(i);
        let mu = libm::exp2(-1.0 - 0.1 * i);
        let state = [0.3 + 0.003 * i, 0.01 * i - 1.0, 0.002 * i - 0.2, 0.1, 1.2 - 0.01 * i, 0.05];
        let request = RequestParts { matrix: MatrixOutput::Final, ..parts(mu, state, 3.0) };
        for trajectory in solved(path, request) {
            all.extend(trajectory.last.components().iter());
            all.extend(trajectory.matrix.expect("asked for").iter());
        }
    }
    hashed(all)
}

/// All trajectories of a request.
pub(crate) fn solved(path: Path, parts: RequestParts) -> Vec<Trajectory> {
    solve(&Request::new(parts).expect("valid").on(path), &Never).expect("not cancelled")
}

/// The table: a hash of a sweep of mass parameters, then members of the ensemble.
pub(crate) fn table(path: Path) -> String {
    let mut table =
        String::from("# sweep, or x y z vx vy vz of a member at its end, matrix and events (hashed)\n");
    writeln!(table, "{:016x}", sweep(path)).expect("a string has room");
    for trajectory in solved(path, request()) {
        writeln!(table, "{}", line(&trajectory)).expect("a string has room");
    }
    table
}
