//! Stopping, counted in polls and steps, never in seconds.

use mechanics::interrupt::{AfterPolls, Stop};
use mechanics::propagation::{Failure, MatrixOutput, Outcome, Request, Sampling, solve};

use super::{HALO, MU, parts, run};

#[test]
fn cancellation_ends_at_the_next_poll() {
    let request = Request::new(parts(MU, HALO, 1000.0)).expect("valid");
    assert_eq!(solve(&request, &AfterPolls::new(3, Stop::Cancelled)), Err(Failure::Cancelled));
}

#[test]
fn the_time_granted_ends_a_trajectory_with_what_there_is() {
    // Matrices of samples are computed one trajectory after the other.
    let mut two = parts(MU, HALO, 100.0);
    two.states = vec![two.states[0]; 2];
    two.matrix = MatrixOutput::Samples;
    two.sampling = Sampling::Count(2);
    let request = Request::new(two).expect("valid");
    // One poll starts the first trajectory, three more pass within it.
    let all = solve(&request, &AfterPolls::new(4, Stop::WallTime)).expect("not cancelled");
    assert_eq!(all[0].outcome, Outcome::WallTimeLimit);
    assert_eq!(all[0].evidence.steps, 64 * 4);
    assert!(all[0].last.time > 0.0 && all[0].last.time < 100.0);
    assert_eq!(all[1].outcome, Outcome::NotStarted);
    assert_eq!(all[1].last.position.x.to_bits(), HALO[0].to_bits());
}

#[test]
fn the_time_granted_ends_trajectories_side_by_side() {
    let mut many = parts(MU, HALO, 1000.0);
    many.states = vec![many.states[0]; 20];
    // Each step is looked at for samples.
    let mut watched = many.clone();
    watched.sampling = Sampling::Count(10);
    for parts in [many, watched] {
        let request = Request::new(parts).expect("valid");
        let lanes = request.lanes();
        // Each start polls once, then all of them together after 64 steps of each.
        let polls = u64::try_from(lanes).expect("few") + 3;
        let all = solve(&request, &AfterPolls::new(polls, Stop::WallTime)).expect("not cancelled");
        for (index, trajectory) in all.iter().enumerate() {
            assert_eq!(trajectory.index, index);
            if index < lanes {
                assert_eq!((trajectory.outcome, trajectory.evidence.steps), (Outcome::WallTimeLimit, 64 * 4));
                assert_eq!(trajectory.last, all[0].last);
            } else {
                assert_eq!((trajectory.outcome, trajectory.evidence.steps), (Outcome::NotStarted, 0));
            }
        }
        let cancelled = solve(&request, &AfterPolls::new(polls, Stop::Cancelled));
        assert_eq!(cancelled, Err(Failure::Cancelled), "nobody waits for it");
    }
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
