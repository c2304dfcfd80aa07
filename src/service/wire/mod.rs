//! Parts of requests and answers that several operations share. What an answer gives back, a request can take.

mod conventions;
mod elements;
mod frame;
mod limits;
mod state;
mod system;
mod units;

pub use conventions::{Conventions, ConventionsEcho, scaled};
pub use elements::{About, ElementsEcho, ElementsSpec};
pub use frame::{Axes, FrameEcho, FrameSpec, Origin, XAxis};
pub use limits::{Granted, LimitsSpec};
pub use state::{Motion, Places, StateEcho, StateSpec, StatesSpec};
pub use system::{BodyEcho, SystemEcho, SystemSpec};
pub use units::{LengthUnit, TimeUnit, UnitsEcho, UnitsSpec, VelocityUnit};
