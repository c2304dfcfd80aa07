//! Runs the reference cases: the race's own side, and the printer of the committed tables.
//!
//! ```text
//! cases paths                   the kernels that this machine can run, the one it chooses first
//! cases names                   the cases
//! cases request NAME            a case as the body of POST /v1/trajectories
//! cases solve NAME [PATH]       final states, matrices and steps of a case
//! cases time NAME SECONDS [PATH]  processor time of a case, measured over at least so long
//! cases effort | golden         the tables of tests/mechanics/reference
//! ```
#![expect(
    clippy::disallowed_methods,
    clippy::disallowed_macros,
    clippy::print_stdout,
    reason = "a program, not a computation: it reads its arguments and a clock, and prints"
)]

#[path = "../mechanics/reference/cases.rs"]
mod cases;
#[path = "../mechanics/reference/effort.rs"]
mod effort;
#[path = "../mechanics/reference/golden.rs"]
mod golden;

use std::hint::black_box;
use std::process::ExitCode;

use mechanics::interrupt::Never;
use mechanics::propagation::{Durations, MatrixOutput, Request, Trajectory, solve};
use mechanics::quantity::Quantity;
use mechanics::taylor::Path;
use rustix::time::{ClockId, clock_gettime};
use serde_json::{Value, json};

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let answer = match arguments[..] {
        ["paths"] => Some(json!(paths()).to_string()),
        ["names"] => Some(json!(cases::NAMES).to_string()),
        ["request", name] => request(name).map(|request| body(&request).to_string()),
        ["solve", name] => request(name).map(|request| solution(&request).to_string()),
        ["solve", name, path] => request_on(name, path).map(|request| solution(&request).to_string()),
        ["time", name, seconds] => request(name).and_then(|request| timed(&request, seconds)),
        ["time", name, seconds, path] => request_on(name, path).and_then(|request| timed(&request, seconds)),
        ["effort"] => Some(effort::table().trim_end().to_owned()),
        ["golden"] => Some(golden::table(Path::fastest()).trim_end().to_owned()),
        _ => None,
    };
    let Some(answer) = answer else {
        println!("see the head of tests/bench/cases.rs for what can be asked");
        return ExitCode::FAILURE;
    };
    println!("{answer}");
    ExitCode::SUCCESS
}

/// The kernels that can run here, the one that is chosen first.
fn paths() -> Vec<&'static str> {
    Path::available().into_iter().rev().map(Path::name).collect()
}

fn request(name: &str) -> Option<Request> {
    cases::case(name).map(|parts| Request::new(parts).expect("valid"))
}

/// A case on one of the [`paths`].
fn request_on(name: &str, path: &str) -> Option<Request> {
    let path = Path::available().into_iter().find(|available| available.name() == path)?;
    Some(request(name)?.on(path))
}

fn solved(request: &Request) -> Vec<Trajectory> {
    solve(black_box(request), &Never).expect("not cancelled")
}

fn body(request: &Request) -> Value {
    let parts = request.parts();
    let states: Vec<_> = parts
        .states
        .iter()
        .map(|state| json!({ "position": state.position.as_slice(), "velocity": state.velocity.as_slice() }))
        .collect();
    let Durations::All(duration) = parts.durations else { unreachable!("the cases have one duration each") };
    let matrix = if parts.matrix == MatrixOutput::None { "none" } else { "final" };
    json!({
        "system": { "mass_parameter": parts.mass_parameter.get() },
        "initial_states": states,
        "duration": duration.get(),
        "tolerance": parts.tolerance.get(),
        "state_transition_matrix": matrix,
    })
}

fn solution(request: &Request) -> Value {
    let all = solved(request);
    let states: Vec<[f64; 6]> = all.iter().map(|t| t.last.components().into()).collect();
    let matrices: Vec<_> =
        all.iter().filter_map(|t| t.matrix).map(|m| m.transpose().as_slice().to_vec()).collect();
    let steps: u64 = all.iter().map(|trajectory| trajectory.evidence.steps).sum();
    json!({ "states": states, "matrices": matrices, "steps": steps })
}

/// Processor time of this process, s.
#[expect(clippy::cast_precision_loss, reason = "a double counts nanoseconds for a hundred days")]
fn processor_time() -> f64 {
    let now = clock_gettime(ClockId::ProcessCPUTime);
    now.tv_sec as f64 + 1e-9 * now.tv_nsec as f64
}

/// Processor time of one solution, from so many that they last at least `seconds`.
fn timed(request: &Request, seconds: &str) -> Option<String> {
    let seconds: f64 = seconds.parse().ok()?;
    let run = |times: u32| {
        let begun = processor_time();
        for _ in 0..times {
            black_box(solved(request));
        }
        processor_time() - begun
    };
    // To warm up.
    run(1);
    let mut times = 1;
    let mut taken = run(times);
    // Grown until it lasts, at most to a number that no case needs.
    while taken < seconds && times < 1 << 30 {
        times *= 2;
        taken = run(times);
    }
    let solution = taken / f64::from(times);
    let trajectories = request.count();
    Some(json!({ "seconds": solution, "solutions": times, "trajectories": trajectories }).to_string())
}
