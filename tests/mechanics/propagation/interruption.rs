//! Stopping, counted in polls and steps, never in seconds.

use mechanics::interrupt::{AfterPolls, Stop};
use mechanics::propagation::{Failure, Outcome, Request, Sampling, solve};

use super::{HALO, MU, parts, run};

#[test]
fn cancellation_ends_at_the_next_poll() {
    let request = Request::new(parts(MU, HALO, 1000.0)).expect("valid");
    assert_eq!(solve(&request, &AfterPolls::new(3, Stop::Cancelled)), Err(Failure::Cancelled));
}

#[test]
fn the_time_granted_ends_a_trajectory_with_what_there_is() {
    let mut three = parts(MU, HALO, 100.0);
    three.states = vec![three.states[0]; 3];
    let request = Request::new(three).expect("valid");
    // One poll starts the first trajectory, three more pass within it.
    let all = solve(&request, &AfterPolls::new(4, Stop::WallTime)).expect("not cancelled");
    assert_eq!(all[0].outcome, Outcome::WallTimeLimit);
    assert_eq!(all[0].evidence.steps, 64 * 4 - 1);
    assert!(all[0].last.time > 0.0 && all[0].last.time < 100.0);
    assert!(all[1..].iter().all(|t| t.outcome == Outcome::NotStarted));
    assert_eq!(all[2].last.position.x.to_bits(), HALO[0].to_bits());
}

#[test]
fn the_steps_granted_end_a_trajectory_that_can_go_on() {
    let mut request = parts(MU, HALO, 5.0);
    request.limits.steps = 10;
    let first = run(request);
    assert_eq!(first.outcome, Outcome::StepLimit);
    assert_eq!(first.evidence.steps, 10);
    let mut rest = parts(MU, HALO, 5.0 - first.last.time);
    rest.states[0] = first.last;
    let whole = run(parts(MU, HALO, 5.0));
    assert!((run(rest).last.position - whole.last.position).norm() < 1e-10);
}

#[test]
fn samples_at_every_step_stay_within_their_budget() {
    let mut request = parts(MU, HALO, 100.0);
    request.sampling = Sampling::EveryStep;
    request.limits.sample_values = 70;
    let request = Request::new(request).expect("valid");
    assert_eq!(solve(&request, &mechanics::interrupt::Never), Err(Failure::TooManySamples { limit: 70 }));
}
