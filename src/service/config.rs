//! Configuration by flags and `SYNODIA_*` variables; a flag wins over its variable. All mistakes are found at
//! once and name both.

use std::collections::BTreeMap;
use std::ffi::OsString;
use std::fmt::Display;
use std::net::SocketAddr;
use std::ops::RangeInclusive;
use std::str::FromStr;
use std::time::Duration;

use clap::{Arg, ArgMatches, Command};
use http::HeaderValue;

/// Time for a computation that asks for none.
const WALL_TIME_MS: u64 = 30_000;
/// Prefix of every variable.
const PREFIX: &str = "SYNODIA_";
/// What an orchestrator sets by itself for a service of this name; no mistakes of the operator.
const FOREIGN: [&str; 2] = ["SYNODIA_SERVICE_", "SYNODIA_PORT"];

/// Everything that can be configured.
#[derive(Clone, Debug)]
pub struct Config {
    /// `--listen`, `SYNODIA_LISTEN`: address of the HTTP listener, 127.0.0.1:8080.
    pub listen: SocketAddr,
    /// How much one request may ask.
    pub limits: Limits,
    /// The compute threads.
    pub compute: Compute,
    /// Patience with clients and with the own end.
    pub times: Times,
    /// What is logged and how.
    pub log: Log,
    /// `--cors-origins`, `SYNODIA_CORS_ORIGINS`: origins, separated by commas, whose pages may call; none.
    pub cors_origins: Vec<HeaderValue>,
}

/// How much one request may ask.
#[derive(Clone, Copy, Debug)]
pub struct Limits {
    /// `--max-body-bytes`, `SYNODIA_MAX_BODY_BYTES`: size of a body, 32 MiB.
    pub body_bytes: usize,
    /// `--max-states`, `SYNODIA_MAX_STATES`: states in a request, 100,000.
    pub states: u64,
    /// `--max-steps`, `SYNODIA_MAX_STEPS`: integration steps per trajectory, 1,000,000.
    pub steps: u64,
    /// `--max-events`, `SYNODIA_MAX_EVENTS`: events per trajectory, 100,000.
    pub events: u64,
    /// `--max-sample-values`, `SYNODIA_MAX_SAMPLE_VALUES`: numbers in a buffered answer, 20,000,000.
    pub sample_values: u64,
    /// `--wall-time-ms`, `SYNODIA_WALL_TIME_MS`: time for a computation that asks for none, 30 s or the most if that is
    /// less.
    pub wall_time: Duration,
    /// `--max-wall-time-ms`, `SYNODIA_MAX_WALL_TIME_MS`: most time a request may ask for, 120 s.
    pub max_wall_time: Duration,
}

/// The compute threads.
#[derive(Clone, Copy, Debug)]
pub struct Compute {
    /// `--compute-threads`, `SYNODIA_COMPUTE_THREADS`: as many as there are cores. One fewer keeps a core free
    /// for answers that need no computing, where the machine is busy with other work as well.
    pub threads: usize,
    /// `--compute-queue`, `SYNODIA_COMPUTE_QUEUE`: computations that may wait for a thread, 64.
    pub queue: usize,
}

/// Patience with clients and with the own end.
#[derive(Clone, Copy, Debug)]
pub struct Times {
    /// `--request-timeout-ms`, `SYNODIA_REQUEST_TIMEOUT_MS`: time for a request's head and again for its body
    /// to arrive, 10 s.
    pub request: Duration,
    /// `--send-timeout-ms`, `SYNODIA_SEND_TIMEOUT_MS`: time for a client to take the next part of an answer, 30 s.
    pub send: Duration,
    /// `--drain-ms`, `SYNODIA_DRAIN_MS`: time for requests in flight to end after a stop signal, 10 s.
    pub drain: Duration,
}

/// What is logged and how.
#[derive(Clone, Debug)]
pub struct Log {
    /// `--log`, `SYNODIA_LOG`: a level, or directives like `synodia=debug,hyper=warn`; `info`.
    pub filter: String,
    /// `--log-format`, `SYNODIA_LOG_FORMAT`: `human`, `json`, or `auto`: human on a terminal, JSON otherwise.
    pub format: LogFormat,
}

/// How log lines look.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum LogFormat {
    /// Human on a terminal, JSON otherwise.
    Auto,
    /// For people.
    Human,
    /// One JSON object a line.
    Json,
}

struct Setting {
    flag: &'static str,
    value: &'static str,
    help: &'static str,
}

const fn setting(flag: &'static str, value: &'static str, help: &'static str) -> Setting {
    Setting { flag, value, help }
}

const SETTINGS: [Setting; 16] = [
    setting("listen", "ADDRESS", "Address of the HTTP listener [127.0.0.1:8080]"),
    setting("compute-threads", "N", "Threads that compute [as many as cores]"),
    setting("compute-queue", "N", "Computations that may wait for a thread [64]"),
    setting(
        "request-timeout-ms",
        "MS",
        "Time for a request's head, and again for its body, to arrive [10000]",
    ),
    setting("send-timeout-ms", "MS", "Time for a client to take the next part of an answer [30000]"),
    setting("drain-ms", "MS", "Time for requests in flight to end after a stop signal [10000]"),
    setting("max-body-bytes", "N", "Size of a request's body [33554432]"),
    setting("max-states", "N", "States in a request [100000]"),
    setting("max-steps", "N", "Integration steps per trajectory [1000000]"),
    setting("max-events", "N", "Events per trajectory [100000]"),
    setting("max-sample-values", "N", "Numbers in a buffered answer [20000000]"),
    setting("wall-time-ms", "MS", "Time for a computation that asks for none [30000]"),
    setting("max-wall-time-ms", "MS", "Most time that a request may ask for [120000]"),
    setting("log", "FILTER", "A level, or directives like synodia=debug,hyper=warn [info]"),
    setting("log-format", "FORMAT", "auto, human or json [auto: human on a terminal]"),
    setting("cors-origins", "ORIGINS", "Origins, separated by commas, whose pages may call [none]"),
];

fn variable(flag: &str) -> String {
    format!("{PREFIX}{}", flag.to_uppercase().replace('-', "_"))
}

/// What the program is asked to do.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Task {
    /// Serve HTTP.
    Serve,
    /// Print the `OpenAPI` document.
    OpenApi,
    /// Ask a server on this machine whether it is ready.
    Healthcheck,
    /// Show the service at work.
    Demo,
}

/// Why there is no configuration.
#[derive(Debug)]
pub enum Refusal {
    /// Help or version was asked for, or the command line cannot be read.
    Usage(clap::Error),
    /// All mistakes in flags and variables, each naming its place.
    Mistakes(Vec<String>),
}

/// Reads the command line and the environment.
///
/// # Errors
/// [`Refusal`] with every mistake there is.
pub fn read(
    arguments: impl IntoIterator<Item = OsString>,
    environment: impl IntoIterator<Item = (OsString, OsString)>,
) -> Result<(Task, Config), Refusal> {
    let matches = command().try_get_matches_from(arguments).map_err(Refusal::Usage)?;
    let task = match matches.subcommand_name() {
        Some("openapi") => Task::OpenApi,
        Some("healthcheck") => Task::Healthcheck,
        Some("demo") => Task::Demo,
        _ => Task::Serve,
    };
    let flags = matches.subcommand().map_or(&matches, |(_, inner)| inner);
    let mut source = Source::new(flags, environment);
    let config = source.config();
    if source.mistakes.is_empty() { Ok((task, config)) } else { Err(Refusal::Mistakes(source.mistakes)) }
}

fn command() -> Command {
    let settings = SETTINGS.iter().map(|setting| {
        let help = format!("{} ({})", setting.help, variable(setting.flag));
        Arg::new(setting.flag).long(setting.flag).value_name(setting.value).help(help).global(true)
    });
    Command::new("synodia")
        .about("HTTP service for circular restricted three-body computations")
        .version(env!("CARGO_PKG_VERSION"))
        .args(settings)
        .subcommand(Command::new("serve").about("Serve HTTP (the default)"))
        .subcommand(Command::new("openapi").about("Print the OpenAPI document"))
        .subcommand(
            Command::new("healthcheck").about("Ask the server at the listen address whether it is ready"),
        )
        .subcommand(Command::new("demo").about("Show the service at work on an invented mission"))
}

/// Flags and variables, and what is wrong with them so far.
struct Source<'a> {
    flags: &'a ArgMatches,
    variables: BTreeMap<String, String>,
    mistakes: Vec<String>,
}

impl<'a> Source<'a> {
    fn new(flags: &'a ArgMatches, environment: impl IntoIterator<Item = (OsString, OsString)>) -> Self {
        let mut mistakes = Vec::new();
        let mut variables = BTreeMap::new();
        let known: Vec<String> = SETTINGS.iter().map(|setting| variable(setting.flag)).collect();
        for (name, value) in environment {
            let Some(name) = name.to_str().filter(|name| name.starts_with(PREFIX)) else { continue };
            if known.iter().any(|known| known == name) {
                match value.into_string() {
                    Ok(value) => drop(variables.insert(name.to_owned(), value)),
                    Err(_) => mistakes.push(format!("{name} is not UTF-8")),
                }
            } else if !FOREIGN.iter().any(|foreign| name.starts_with(foreign)) {
                let nearest = known.iter().min_by_key(|known| strsim::levenshtein(known, name));
                let hint = nearest.map(|nearest| format!("; did you mean {nearest}?")).unwrap_or_default();
                mistakes.push(format!("{name} is no variable of this program{hint}"));
            }
        }
        Self { flags, variables, mistakes }
    }

    fn text(&self, flag: &str) -> Option<String> {
        let given = self.flags.get_one::<String>(flag).cloned();
        given.or_else(|| self.variables.get(&variable(flag)).cloned())
    }

    fn refuse(&mut self, flag: &str, what: impl Display) {
        self.mistakes.push(format!("{} (--{flag}) {what}", variable(flag)));
    }

    fn parsed<T: FromStr>(&mut self, flag: &str, default: T, wanted: &str) -> T {
        let Some(text) = self.text(flag) else { return default };
        text.trim().parse().unwrap_or_else(|_| {
            self.refuse(flag, format_args!("must be {wanted}, got {text:?}"));
            default
        })
    }

    fn count(&mut self, flag: &str, default: u64, range: RangeInclusive<u64>) -> u64 {
        let wanted = format!("an integer from {} to {}", range.start(), range.end());
        let count = self.parsed(flag, default, &wanted);
        if !range.contains(&count) {
            self.refuse(flag, format_args!("must be {wanted}, got {count}"));
        }
        count
    }

    fn size(&mut self, flag: &str, default: usize, range: RangeInclusive<u64>) -> usize {
        usize::try_from(self.count(flag, default as u64, range)).unwrap_or(default)
    }

    fn milliseconds(&mut self, flag: &str, default: u64, range: RangeInclusive<u64>) -> Duration {
        Duration::from_millis(self.count(flag, default, range))
    }

    fn config(&mut self) -> Config {
        let cores = std::thread::available_parallelism().map_or(1, usize::from);
        Config {
            listen: self.parsed("listen", SocketAddr::from(([127, 0, 0, 1], 8080)), "an address with a port"),
            limits: self.limits(),
            compute: Compute {
                threads: self.size("compute-threads", cores, 1..=MANY_THREADS),
                queue: self.size("compute-queue", 64, 0..=MANY),
            },
            times: Times {
                request: self.milliseconds("request-timeout-ms", 10_000, 1..=DAY_MS),
                send: self.milliseconds("send-timeout-ms", 30_000, 1..=DAY_MS),
                drain: self.milliseconds("drain-ms", 10_000, 0..=DAY_MS),
            },
            log: self.log(),
            cors_origins: self.origins(),
        }
    }

    fn limits(&mut self) -> Limits {
        let max_wall_time = self.milliseconds("max-wall-time-ms", 120_000, 1..=DAY_MS);
        let usual = u64::try_from(max_wall_time.as_millis()).unwrap_or(WALL_TIME_MS).min(WALL_TIME_MS);
        let limits = Limits {
            body_bytes: self.size("max-body-bytes", 32 << 20, 1..=MANY),
            states: self.count("max-states", 100_000, 1..=MANY),
            steps: self.count("max-steps", 1_000_000, 1..=MANY),
            events: self.count("max-events", 100_000, 1..=MANY),
            sample_values: self.count("max-sample-values", 20_000_000, 1..=MANY),
            wall_time: self.milliseconds("wall-time-ms", usual, 1..=DAY_MS),
            max_wall_time,
        };
        if limits.wall_time > limits.max_wall_time {
            self.refuse("wall-time-ms", "must not exceed SYNODIA_MAX_WALL_TIME_MS (--max-wall-time-ms)");
        }
        limits
    }

    fn log(&mut self) -> Log {
        let filter = self.text("log").unwrap_or_else(|| "info".to_owned());
        if let Err(error) = tracing_subscriber::EnvFilter::builder().parse(&filter) {
            self.refuse("log", format_args!("must be a level or directives: {error}"));
        }
        let format = match self.text("log-format").as_deref() {
            None | Some("auto") => LogFormat::Auto,
            Some("human") => LogFormat::Human,
            Some("json") => LogFormat::Json,
            Some(other) => {
                self.refuse("log-format", format_args!("must be auto, human or json, got {other:?}"));
                LogFormat::Auto
            }
        };
        Log { filter, format }
    }

    fn origins(&mut self) -> Vec<HeaderValue> {
        let text = self.text("cors-origins").unwrap_or_default();
        let mut origins = Vec::new();
        for origin in text.split(',').map(str::trim).filter(|origin| !origin.is_empty()) {
            let uri = origin.parse::<http::Uri>().ok().filter(|uri| {
                uri.scheme().is_some() && uri.path() == "/" && uri.query().is_none() && !origin.ends_with('/')
            });
            match (uri, HeaderValue::from_str(origin)) {
                (Some(_), Ok(value)) => origins.push(value),
                _ => self.refuse(
                    "cors-origins",
                    format_args!("must list origins like https://example.org, got {origin:?}"),
                ),
            }
        }
        origins
    }
}

/// Upper end of counts: beyond it a limit is none.
const MANY: u64 = 1 << 40;
/// More threads than any machine has cores.
const MANY_THREADS: u64 = 4096;
/// Upper end of times: one day.
const DAY_MS: u64 = 86_400_000;
