//! Validated scalars. What a quantity is called and the range it may take are stated here once; the check,
//! its message, the published schema and the property-test generators are derived from that one line.

use thiserror::Error;

/// A scalar outside the range of its quantity.
#[derive(Clone, Copy, Debug, Error, PartialEq)]
#[error("must be a finite number {range}, got {value}")]
pub struct OutOfRange {
    /// The value that was refused.
    pub value: f64,
    /// The range it should lie in.
    pub range: Range,
}

/// A closed range, or one open at its lower end.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Range {
    /// Smallest value, itself allowed unless `above` is set.
    pub min: f64,
    /// Largest value, itself allowed.
    pub max: f64,
    /// Whether the smallest value is itself excluded.
    pub above: bool,
}

impl Range {
    /// Whether `value` is a finite number inside the range.
    #[must_use]
    pub const fn contains(&self, value: f64) -> bool {
        value.is_finite()
            && value <= self.max
            && if self.above { value > self.min } else { value >= self.min }
    }
}

impl std::fmt::Display for Range {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.above {
            write!(f, "above {} and at most {}", self.min, self.max)
        } else {
            write!(f, "from {} to {}", self.min, self.max)
        }
    }
}

/// A scalar with a name and a range.
pub trait Quantity: Copy + std::fmt::Debug + Send + Sync + 'static {
    /// What the quantity is, with its unit, for messages and the published schema.
    const WHAT: &'static str;
    /// The values it may take.
    const RANGE: Range;

    /// # Errors
    /// [`OutOfRange`] unless `value` is a finite number inside [`Self::RANGE`].
    fn new(value: f64) -> Result<Self, OutOfRange>;

    /// The value, inside [`Self::RANGE`].
    fn get(self) -> f64;
}

macro_rules! quantities {
    ($($(#[$doc:meta])* $name:ident: $what:literal, $range:expr;)*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
        pub struct $name(f64);

        impl $name {
            /// A constant of the program, checked when it is compiled.
            ///
            /// # Panics
            /// Refuses to compile in a `const` if `value` is outside the range; anything that is not a
            /// constant belongs in [`Quantity::new`].
            #[must_use]
            pub const fn constant(value: f64) -> Self {
                assert!(<Self as Quantity>::RANGE.contains(value), $what);
                Self(value)
            }
        }

        impl Quantity for $name {
            const WHAT: &'static str = $what;
            const RANGE: Range = $range;

            fn new(value: f64) -> Result<Self, OutOfRange> {
                if Self::RANGE.contains(value) { Ok(Self(value)) } else { Err(OutOfRange { value, range: Self::RANGE }) }
            }

            fn get(self) -> f64 {
                self.0
            }
        }
    )*};
}

const fn within(min: f64, max: f64) -> Range {
    Range { min, max, above: false }
}

const fn above(min: f64, max: f64) -> Range {
    Range { min, max, above: true }
}

/// Farthest coordinate, fastest velocity component: beyond it a double holds no digit of the problem.
const FAR: f64 = 1e6;
/// Latest epoch and longest duration in normalised time: more than any step limit can cross.
const LONG: f64 = 1e8;
/// Largest physical scale in km, km/s or s: far beyond any pair of bodies that orbit each other. It bounds
/// unreduced angles too.
const VAST: f64 = 1e20;
/// Largest semi-major axis and eccentricity: a nearly parabolic orbit, a fast one past a tiny body.
const FLAT: f64 = 1e30;

quantities! {
    /// μ, the smaller primary's share of the total mass.
    MassParameter: "mass parameter, the smaller primary's share of the total mass", above(0.0, 0.5);
    /// One normalised coordinate.
    Coordinate: "coordinate, in separations of the primaries", within(-FAR, FAR);
    /// One normalised velocity component.
    Speed: "velocity component, in separations times mean motion", within(-FAR, FAR);
    /// A normalised instant on the absolute clock.
    Epoch: "time, in inverse mean motions", within(-LONG, LONG);
    /// A normalised span of time; negative runs backwards.
    Duration: "duration, in inverse mean motions", within(-LONG, LONG);
    /// Relative local error of one integration step.
    Tolerance: "relative local error per step", within(1e-16, 1e-3);
    /// A normalised distance from a primary's centre.
    Distance: "distance, in separations of the primaries", above(0.0, FAR);
    /// A body's radius in separations; the two bodies of a system must not overlap in their centres.
    Radius: "radius, in separations of the primaries", above(0.0, 1.0);
    /// Gravitational parameter.
    GravitationalParameter: "gravitational parameter, km^3/s^2", above(0.0, VAST);
    /// A length in kilometres.
    Kilometres: "length, km", above(0.0, VAST);
    /// A span of time in seconds.
    Seconds: "time, s", above(0.0, VAST);
    /// A speed in kilometres per second.
    KilometresPerSecond: "speed, km/s", above(0.0, VAST);
    /// A semi-major axis in separations, negative for a hyperbola.
    SemiMajorAxis: "semi-major axis, in separations of the primaries", within(-FLAT, FLAT);
    /// A periapsis distance in separations.
    PeriapsisDistance: "periapsis distance, in separations of the primaries", above(0.0, FAR);
    /// The eccentricity of a conic.
    Eccentricity: "eccentricity", within(0.0, FLAT);
    /// An inclination in degrees.
    Inclination: "inclination, degrees", within(0.0, 180.0);
    /// An angle in degrees, not reduced to one turn.
    Angle: "angle, degrees", within(-VAST, VAST);
}
