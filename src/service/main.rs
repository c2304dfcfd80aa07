//! The `synodia` program.

mod demo;
mod healthcheck;

use std::fmt::Display;
use std::io::Write;
use std::process::ExitCode;

use synodia::config::{self, Config, Refusal, Task};
use synodia::{api, server, telemetry};

/// Mistakes in flags or variables (`EX_USAGE` of sysexits).
const EX_USAGE: u8 = 64;

fn main() -> ExitCode {
    let (task, config) = match config::read(std::env::args_os(), std::env::vars_os()) {
        Ok(read) => read,
        Err(refusal) => return refuse(&refusal),
    };
    match task {
        Task::Serve => serve(config),
        Task::OpenApi => match std::io::stdout().write_all(api::document().as_bytes()) {
            Ok(()) => ExitCode::SUCCESS,
            Err(error) => fail(&error),
        },
        Task::Healthcheck => healthcheck::run(config.listen),
        Task::Demo => on_runtime(demo::run(config)),
    }
}

fn serve(config: Config) -> ExitCode {
    let logs = match telemetry::start(&config.log) {
        Ok(logs) => logs,
        Err(error) => return fail(&error),
    };
    let served = on_runtime(async {
        let listener = tokio::net::TcpListener::bind(config.listen).await.map_err(|error| {
            std::io::Error::new(error.kind(), format!("cannot listen on {}: {error}", config.listen))
        })?;
        let address = listener.local_addr()?;
        let (app, router) = api::start(config)?;
        tracing::info!(
            %address,
            version = env!("CARGO_PKG_VERSION"),
            arithmetic = api::arithmetic(),
            threads = app.config.compute.threads,
            "serving"
        );
        server::serve(listener, app, router).await
    });
    drop(logs);
    served
}

/// Runs the program's asynchronous part, and leaves what still computes afterwards to the end of the process.
fn on_runtime<E: Display>(part: impl Future<Output = Result<(), E>>) -> ExitCode {
    let runtime = match tokio::runtime::Builder::new_multi_thread().enable_all().build() {
        Ok(runtime) => runtime,
        Err(error) => return fail(&error),
    };
    let ended = runtime.block_on(part);
    runtime.shutdown_background();
    match ended {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => fail(&error),
    }
}

fn fail(error: &dyn Display) -> ExitCode {
    let _ = writeln!(std::io::stderr(), "synodia: {error}");
    ExitCode::FAILURE
}

fn refuse(refusal: &Refusal) -> ExitCode {
    match refusal {
        Refusal::Usage(error) => {
            let _ = error.print();
            if error.use_stderr() { ExitCode::from(EX_USAGE) } else { ExitCode::SUCCESS }
        }
        Refusal::Mistakes(mistakes) => {
            for mistake in mistakes {
                let _ = writeln!(std::io::stderr(), "synodia: {mistake}");
            }
            ExitCode::from(EX_USAGE)
        }
    }
}
