//! What the cases cost, without a clock. `effort.txt` holds the table as it is meant to be.

use std::fmt::Write;

use mechanics::interrupt::Never;
use mechanics::propagation::event::{Direction, Event, Plane, When};
use mechanics::propagation::{Arithmetic, Request, RequestParts, Sampling, solve};
use mechanics::system::Primary;
use mechanics::taylor::{ORDER, extended};

use super::cases::{HALO, HALO_PERIOD, MU, RECTILINEAR, REGULAR, REGULAR_PERIOD, case, parts};

/// A fall from 0.02 beside the smaller primary, with the angular momentum of a two-body periapsis at 1e-4.
const FALL: [f64; 6] = [1.0 - MU + 0.02, 0.0, 0.0, 0.0, 0.0579, 0.0];

/// What is not among the cases of the race: events, samples, backwards, a close fly-by, many revolutions.
fn others() -> Vec<(&'static str, RequestParts)> {
    let crossings = Event {
        when: When::Plane(Plane::across(1, 0.0)),
        direction: Direction::Either,
        only: None,
        stop_after: None,
    };
    let apses = Event { when: When::Periapsis(Primary::Smaller), ..crossings.clone() };
    vec![
        ("halo_backwards", parts(MU, HALO, -HALO_PERIOD)),
        ("halo_sampled", RequestParts { sampling: Sampling::Count(1000), ..parts(MU, HALO, HALO_PERIOD) }),
        ("nrho_events", RequestParts { events: vec![crossings, apses], ..parts(MU, RECTILINEAR, 30.0) }),
        ("fly_by_1e-4", parts(MU, FALL, 0.1)),
        ("revolutions_1000", parts(MU, REGULAR, 1000.0 * REGULAR_PERIOD)),
    ]
}

/// The table: case, order of the series, trajectories, steps of them all (each expands the series once), events found.
pub(crate) fn table() -> String {
    let mut table = String::from("# case order trajectories steps events\n");
    let raced = super::cases::NAMES.map(|name| (name, case(name).expect("a case")));
    for (name, parts) in raced.into_iter().chain(others()) {
        let order = match parts.arithmetic {
            Arithmetic::Double => ORDER,
            Arithmetic::DoubleDouble => extended::ORDER,
        };
        let all = solve(&Request::new(parts).expect("valid"), &Never).expect("not cancelled");
        let steps: u64 = all.iter().map(|trajectory| trajectory.evidence.steps).sum();
        let events: usize = all.iter().map(|trajectory| trajectory.events.len()).sum();
        writeln!(table, "{name} {order} {} {steps} {events}", all.len()).expect("a string has room");
    }
    table
}
