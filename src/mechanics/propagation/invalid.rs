//! What can be wrong between the parts of a request.

use thiserror::Error;

use crate::system::Primary;

/// What is wrong between the parts of a request.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum Invalid {
    /// A list of durations of another length than the states.
    #[error("{durations} durations are given for {states} initial states")]
    DurationCount {
        /// Durations given.
        durations: usize,
        /// Initial states given.
        states: usize,
    },
    /// An initial state lies on a primary.
    #[error("lies on the {} primary's centre, where the equations of motion are singular", name(*.primary))]
    OnPrimary {
        /// The initial state.
        state: usize,
        /// The primary.
        primary: Primary,
    },
    /// Fewer than two samples from start to end.
    #[error("must be at least 2, for both ends are included, got {0}")]
    TooFewSamples(u64),
    /// An interval that is not a positive number.
    #[error("must be a finite number above 0, got {0}")]
    Interval(f64),
    /// An interval longer than the duration.
    #[error("{interval} is longer than the duration {duration} of trajectory {trajectory}")]
    LongInterval {
        /// The interval.
        interval: f64,
        /// The duration.
        duration: f64,
        /// The trajectory.
        trajectory: usize,
    },
    /// A sample's time that does not follow the one before.
    #[error("{time} does not follow {before} in the direction of the integration")]
    TimeOrder {
        /// Its index.
        index: usize,
        /// Its time.
        time: f64,
        /// The time before it.
        before: f64,
    },
    /// A sample's time outside a trajectory.
    #[error("{time} lies outside trajectory {trajectory}, which runs from {from} to {to}")]
    TimeOutside {
        /// Its index.
        index: usize,
        /// Its time.
        time: f64,
        /// The trajectory.
        trajectory: usize,
        /// Its start.
        from: f64,
        /// Its end.
        to: f64,
    },
    /// A manoeuvre outside a trajectory.
    #[error("{time} lies outside trajectory {trajectory}, which runs from {from} to {to}")]
    ManoeuvreOutside {
        /// Its index.
        index: usize,
        /// Its time.
        time: f64,
        /// The trajectory.
        trajectory: usize,
        /// Its start.
        from: f64,
        /// Its end.
        to: f64,
    },
    /// A manoeuvre for a trajectory that is not there.
    #[error("there is no initial state {trajectory}; {states} are given, counted from 0")]
    ManoeuvreFor {
        /// Its index.
        index: usize,
        /// The place in its list.
        place: usize,
        /// What is not there.
        trajectory: usize,
        /// Initial states given.
        states: usize,
    },
    /// A manoeuvre along the velocity before it, met backwards.
    #[error(
        "velocity_normal_binormal needs the state before the manoeuvre, but trajectory {trajectory} runs backwards"
    )]
    ManoeuvreBackwards {
        /// Its index.
        index: usize,
        /// The trajectory.
        trajectory: usize,
    },
    /// More sample numbers than granted.
    #[error("the samples would hold {asked} values; at most {limit} are allowed")]
    SampleValues {
        /// Numbers asked for.
        asked: u128,
        /// Numbers granted.
        limit: u64,
    },
    /// An audit of what is already computed in the audit's arithmetic.
    #[error(
        "computes in double_double what was computed in double; there is nothing finer to audit double_double with"
    )]
    AuditOfDoubleDouble,
    /// An audit that takes more steps than granted.
    #[error(
        "trajectory {trajectory} and its audit take the work of at least {asked} steps; at most {limit} are allowed"
    )]
    AuditSteps {
        /// The first such trajectory.
        trajectory: usize,
        /// Steps that it takes at least, those in double-double arithmetic weighted.
        asked: u64,
        /// Steps granted.
        limit: u64,
    },
}

impl Invalid {
    /// Whether it says that something lies outside the time that a trajectory runs.
    pub(super) fn is_about_span(&self) -> bool {
        matches!(
            self,
            Self::LongInterval { .. }
                | Self::TimeOutside { .. }
                | Self::ManoeuvreOutside { .. }
                | Self::ManoeuvreBackwards { .. }
                | Self::AuditSteps { .. }
        )
    }
}

fn name(primary: Primary) -> &'static str {
    match primary {
        Primary::Larger => "larger",
        Primary::Smaller => "smaller",
    }
}
