//! Units of measure by symbol.

use std::f64::consts::{PI, TAU};

use thiserror::Error;

use super::MissingScale;
use crate::system::System;

/// The size of a unit in base units (km, s, rad) as a quotient, because a quotient of exact numbers converts
/// with one rounding where a rounded factor would take two.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Ratio {
    above: f64,
    below: f64,
}

impl Ratio {
    const fn new(above: f64, below: f64) -> Self {
        Self { above, below }
    }

    fn times(self, other: Self) -> Self {
        Self::new(self.above * other.above, self.below * other.below)
    }

    pub(super) fn per(self, other: Self) -> Self {
        Self::new(self.above * other.below, self.below * other.above)
    }

    fn squared(self) -> Self {
        self.times(self)
    }

    fn apply(self, value: f64) -> f64 {
        let Self { above, below } = self;
        if above % below == 0.0 {
            value * (above / below)
        } else if below % above == 0.0 {
            value / (below / above)
        } else {
            value * above / below
        }
    }

    /// How many units of this size make `base` base units.
    pub(super) fn count_in(self, base: f64) -> f64 {
        Self::new(self.below, self.above).apply(base)
    }
}

macro_rules! symbols {
    ($($(#[$doc:meta])* $visible:vis $name:ident { $($(#[$item:meta])* $unit:ident: $symbol:literal, $size:expr;)* })*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, Eq, PartialEq)]
        $visible enum $name {
            $($(#[$item])* $unit,)*
        }

        impl $name {
            /// Every unit of this kind.
            $visible const ALL: &'static [Self] = &[$(Self::$unit),*];

            /// The symbol it is written with.
            #[must_use]
            $visible const fn symbol(self) -> &'static str {
                match self { $(Self::$unit => $symbol,)* }
            }

            /// The unit written `symbol`.
            #[must_use]
            $visible fn from_symbol(symbol: &str) -> Option<Self> {
                match symbol { $($symbol => Some(Self::$unit),)* _ => None }
            }

            pub(super) const fn size(self) -> Ratio {
                match self { $(Self::$unit => $size,)* }
            }
        }
    )*};
}

symbols! {
    /// A unit of length.
    pub LengthUnit {
        /// Metre.
        M: "m", Ratio::new(1.0, 1000.0);
        /// Kilometre.
        Km: "km", Ratio::new(1.0, 1.0);
        /// Astronomical unit, 149 597 870.7 km (IAU 2012 Resolution B2).
        Au: "au", Ratio::new(1_495_978_707.0, 10.0);
    }
    /// A unit of time.
    pub TimeUnit {
        /// Second.
        S: "s", Ratio::new(1.0, 1.0);
        /// Minute.
        Min: "min", Ratio::new(60.0, 1.0);
        /// Hour.
        H: "h", Ratio::new(3600.0, 1.0);
        /// Day of 86 400 s.
        D: "d", Ratio::new(86_400.0, 1.0);
        /// Julian year of 365.25 d.
        Yr: "yr", Ratio::new(31_557_600.0, 1.0);
    }
    /// A unit of velocity that can be chosen apart from those of length and time.
    pub VelocityUnit {
        /// Kilometre per second.
        KmPerS: "km/s", Ratio::new(1.0, 1.0);
        /// Metre per second.
        MPerS: "m/s", Ratio::new(1.0, 1000.0);
    }
    /// A unit of angle.
    AngleUnit {
        Rad: "rad", Ratio::new(1.0, 1.0);
        Deg: "deg", Ratio::new(PI, 180.0);
        Arcsec: "arcsec", Ratio::new(PI, 648_000.0);
        Rev: "rev", Ratio::new(TAU, 1.0);
    }
}

fn quotient(above: Option<Ratio>, below: Option<Ratio>) -> Option<Ratio> {
    above.zip(below).map(|(above, below)| above.per(below))
}

/// What kind of quantity a value is.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Dimension {
    /// Length.
    Length,
    /// Time.
    Time,
    /// Length per time.
    Velocity,
    /// Length per time squared.
    Acceleration,
    /// Energy per mass: velocity squared.
    Energy,
    /// Jacobi constant: velocity squared.
    JacobiConstant,
    /// Angle per time, normalised in radians per inverse mean motion.
    AngleRate,
}

/// The word for normalised units.
const NORMALIZED: &str = "normalized";

/// A unit of a certain dimension: a symbol of the trade or `normalized`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Unit {
    dimension: Dimension,
    /// None: normalised.
    size: Option<Ratio>,
}

/// A unit that is not one of the dimension.
#[derive(Clone, Debug, Error, PartialEq)]
#[error("must be one of {}, got `{symbol}`", Unit::symbols(*dimension).join(", "))]
pub struct UnknownUnit {
    /// The dimension it should have.
    pub dimension: Dimension,
    /// What was given.
    pub symbol: String,
}

/// Why a value could not be converted.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum ConvertError {
    /// The system has no scale for it.
    #[error(transparent)]
    MissingScale(#[from] MissingScale),
    /// The units are of different dimensions.
    #[error("the units are of different dimensions")]
    Incompatible,
    /// The result cannot be written as a double.
    #[error("{0:?} in the unit asked for is beyond the range of double precision")]
    Range(f64),
}

impl Unit {
    /// The unit of `dimension` written `symbol`: `normalized`, or a combination like `km`, `d`, `au/d`, `m/s^2`,
    /// `km^2/s^2`, `deg/d`.
    ///
    /// # Errors
    /// [`UnknownUnit`], which lists the symbols there are.
    pub fn parse(dimension: Dimension, symbol: &str) -> Result<Self, UnknownUnit> {
        if symbol == NORMALIZED {
            return Ok(Self { dimension, size: None });
        }
        let length = |symbol: &str| LengthUnit::from_symbol(symbol).map(LengthUnit::size);
        let time = |symbol: &str| TimeUnit::from_symbol(symbol).map(TimeUnit::size);
        let (above, below) =
            symbol.split_once('/').map_or((symbol, None), |(above, below)| (above, Some(below)));
        let size = match (dimension, below) {
            (Dimension::Length, None) => length(above),
            (Dimension::Time, None) => time(above),
            (Dimension::Velocity, Some(below)) => quotient(length(above), time(below)),
            (Dimension::Acceleration, Some(below)) => {
                quotient(length(above), below.strip_suffix("^2").and_then(time).map(Ratio::squared))
            }
            (Dimension::Energy | Dimension::JacobiConstant, Some(below)) => above
                .strip_suffix("^2")
                .zip(below.strip_suffix("^2"))
                .and_then(|(above, below)| quotient(length(above), time(below)))
                .map(Ratio::squared),
            (Dimension::AngleRate, Some(below)) => {
                quotient(AngleUnit::from_symbol(above).map(AngleUnit::size), time(below))
            }
            _ => None,
        };
        match size {
            Some(size) => Ok(Self { dimension, size: Some(size) }),
            None => Err(UnknownUnit { dimension, symbol: symbol.to_owned() }),
        }
    }

    /// Every symbol that [`Unit::parse`] knows for `dimension`.
    #[must_use]
    pub fn symbols(dimension: Dimension) -> Vec<String> {
        let lengths = || LengthUnit::ALL.iter().map(|unit| unit.symbol());
        let times = || TimeUnit::ALL.iter().map(|unit| unit.symbol());
        let angles = || AngleUnit::ALL.iter().map(|unit| unit.symbol());
        let pairs = |above: Vec<&'static str>, power_above: &str, power_below: &str| {
            above
                .into_iter()
                .flat_map(|above| times().map(move |below| (above, below)))
                .map(|(above, below)| format!("{above}{power_above}/{below}{power_below}"))
                .collect::<Vec<_>>()
        };
        let mut symbols = vec![NORMALIZED.to_owned()];
        symbols.extend(match dimension {
            Dimension::Length => lengths().map(str::to_owned).collect(),
            Dimension::Time => times().map(str::to_owned).collect(),
            Dimension::Velocity => pairs(lengths().collect(), "", ""),
            Dimension::Acceleration => pairs(lengths().collect(), "", "^2"),
            Dimension::Energy | Dimension::JacobiConstant => pairs(lengths().collect(), "^2", "^2"),
            Dimension::AngleRate => pairs(angles().collect(), "", ""),
        });
        symbols
    }

    /// Whether it is the normalised one, whose size depends on the system.
    #[must_use]
    pub fn is_normalized(&self) -> bool {
        self.size.is_none()
    }

    fn resolve(&self, system: &System) -> Result<Ratio, MissingScale> {
        match self.size {
            Some(size) => Ok(size),
            None => normalised(self.dimension, system).ok_or_else(|| MissingScale::of(system)),
        }
    }
}

/// The normalised unit of `dimension`.
fn normalised(dimension: Dimension, system: &System) -> Option<Ratio> {
    let whole = |value| Ratio::new(value, 1.0);
    let (length, time, velocity) =
        (system.length_km().map(whole), system.time_s().map(whole), system.velocity_km_s().map(whole));
    match dimension {
        Dimension::Length => length,
        Dimension::Time => time,
        Dimension::Velocity => velocity,
        Dimension::Acceleration => velocity.zip(time).map(|(velocity, time)| velocity.per(time)),
        Dimension::Energy | Dimension::JacobiConstant => velocity.map(Ratio::squared),
        Dimension::AngleRate => time.map(|time| whole(1.0).per(time)),
    }
}

/// `value` from one unit to another of the same dimension. A unit to itself keeps the bits; physical units need
/// no scale of the system.
///
/// # Errors
/// [`ConvertError`]: a missing scale, different dimensions, or a result that overflows or vanishes.
pub fn convert(value: f64, from: Unit, to: Unit, system: &System) -> Result<f64, ConvertError> {
    if from.dimension != to.dimension {
        return Err(ConvertError::Incompatible);
    }
    if from == to {
        return Ok(value);
    }
    let result = from.resolve(system)?.per(to.resolve(system)?).apply(value);
    if result.is_finite() && (result != 0.0 || value == 0.0) {
        Ok(result)
    } else {
        Err(ConvertError::Range(value))
    }
}
