//! Parts of requests and answers that several operations share. What an answer gives back, a request can take.

mod conventions;
mod elements;
mod frame;
mod jacobi_form;
mod limits;
mod state;
mod system;
mod units;

pub use conventions::{Conventions, ConventionsEcho, scaled};
pub use elements::{About, ElementsEcho, ElementsSpec};
pub use frame::{Axes, FrameEcho, FrameSpec, Origin, XAxis, rotating};
pub use jacobi_form::JacobiForm;
pub use limits::{Granted, LimitsSpec};
pub use state::{Motion, Places, StateEcho, StateSpec, StatesSpec};
pub use system::{BodyEcho, SystemEcho, SystemSpec, as_system_echo};
pub use units::{LengthUnit, TimeUnit, UnitsEcho, UnitsSpec, VelocityUnit};
