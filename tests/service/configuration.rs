//! Flags and variables of the real program.

use std::process::{Command, Output};

use super::support::Server;

fn run(arguments: &[&str], variables: &[(&str, &str)]) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_synodia"));
    command.args(arguments).env_clear().envs(variables.iter().copied()).output().unwrap()
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).unwrap()
}

#[test]
fn all_mistakes_come_at_once_and_name_variable_and_flag() {
    let output = run(
        &["--max-steps", "many", "--wall-time-ms", "200000"],
        &[
            ("SYNODIA_LISTEN", "nowhere"),
            ("SYNODIA_COMPUTE_TREADS", "2"),
            ("SYNODIA_LOG_FORMAT", "xml"),
            ("SYNODIA_CORS_ORIGINS", "https://good.example,example.org/path"),
        ],
    );
    assert_eq!(output.status.code(), Some(64));
    let errors = text(&output.stderr);
    for words in [
        "SYNODIA_MAX_STEPS (--max-steps) must be an integer",
        "SYNODIA_WALL_TIME_MS (--wall-time-ms) must not exceed",
        "SYNODIA_LISTEN (--listen) must be an address",
        "SYNODIA_COMPUTE_TREADS is no variable of this program; did you mean SYNODIA_COMPUTE_THREADS?",
        "SYNODIA_LOG_FORMAT (--log-format) must be auto, human or json",
        "SYNODIA_CORS_ORIGINS (--cors-origins) must list origins",
    ] {
        assert!(errors.contains(words), "{words:?} in:\n{errors}");
    }
    assert_eq!(errors.lines().count(), 6, "{errors}");
}

#[test]
fn what_an_orchestrator_sets_is_no_mistake() {
    // Kubernetes documentation, "Discovering services": a service named `synodia` puts these into every container.
    let server = Server::with(&[
        ("SYNODIA_SERVICE_HOST", "10.0.0.1"),
        ("SYNODIA_PORT", "tcp://10.0.0.1:80"),
        ("SYNODIA_PORT_80_TCP_ADDR", "10.0.0.1"),
    ]);
    assert_eq!(server.get("/livez").status, 200);
}

#[test]
fn an_unknown_flag_is_a_mistake_and_help_is_none() {
    assert_eq!(run(&["--listn", "x"], &[]).status.code(), Some(64));
    let help = run(&["--help"], &[]);
    assert_eq!(help.status.code(), Some(0));
    assert!(text(&help.stdout).contains("SYNODIA_MAX_BODY_BYTES"));
}

#[test]
fn a_flag_wins_over_its_variable() {
    let output = run(&["--compute-threads", "0"], &[("SYNODIA_COMPUTE_THREADS", "2")]);
    assert!(text(&output.stderr).contains("SYNODIA_COMPUTE_THREADS (--compute-threads) must be an integer"));
}

#[test]
fn healthcheck_tells_by_its_exit_code() {
    let server = Server::start();
    let address = server.address.to_string();
    assert_eq!(run(&["healthcheck", "--listen", &address], &[]).status.code(), Some(0));
    drop(server);
    let output = run(&["healthcheck", "--listen", &address], &[]);
    assert_eq!(output.status.code(), Some(1));
    assert!(text(&output.stderr).contains("no answer from"));
}

#[test]
fn limits_are_those_configured() {
    let server = Server::with(&[("SYNODIA_MAX_STATES", "7"), ("SYNODIA_WALL_TIME_MS", "1234")]);
    let limits = server.get("/v1/limits").json();
    assert_eq!(limits["states"], 7);
    assert_eq!(limits["wall_time_ms"], 1234);
    assert_eq!(limits["body_bytes"], 33_554_432);
}
