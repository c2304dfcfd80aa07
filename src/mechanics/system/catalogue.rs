//! Known pairs of primaries, each constant beside its published source.
//!
//! The separation is the published mean semi-major axis and the unit of time follows from Kepler's third law, so
//! that the circular problem is consistent in itself; the published period stands beside it to show how far the
//! idealisation is off. A planet seen from the Sun has the gravitational parameter of its whole system of
//! satellites, because that is what pulls; seen from one of its satellites it stands alone. `sun-earth` takes the
//! Earth alone, `sun-earth-and-moon` the two as one body.

#![expect(clippy::unreadable_literal, reason = "published digits stay as they were printed")]

use std::borrow::Cow;

use super::{Body, System, kepler_time};
use crate::quantity::{Kilometres, KilometresPerSecond, MassParameter, Radius, Seconds};

/// The astronomical unit, km: IAU 2012 Resolution B2.
pub const ASTRONOMICAL_UNIT_KM: f64 = 149_597_870.7;

/// Days in a Julian century.
const CENTURY_D: f64 = 36_525.0;
/// Degrees in a revolution.
const REVOLUTION_DEG: f64 = 360.0;

/// A published constant and where it was published.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Constant {
    /// Its value.
    pub value: f64,
    /// Where it was published, or from which published constants it is made.
    pub source: &'static str,
}

/// Where constants were published.
struct Source(&'static str);

impl Source {
    const fn gives(&self, value: f64) -> Constant {
        Constant { value, source: self.0 }
    }
}

const DE440: Source = Source(
    "GM of the body alone: Park, Folkner, Williams & Boggs 2021, The JPL Planetary and Lunar Ephemerides DE440 and \
     DE441, AJ 161:105, and the GM kernel that goes with it",
);
const DE440_SYSTEM: Source = Source(
    "GM of the planet with its satellites: Park, Folkner, Williams & Boggs 2021, The JPL Planetary and Lunar \
     Ephemerides DE440 and DE441, AJ 161:105, and the GM kernel that goes with it",
);
const DE440_PAIR: Source = Source(
    "sum of the GM of Earth and Moon: Park, Folkner, Williams & Boggs 2021, The JPL Planetary and Lunar \
     Ephemerides DE440 and DE441, AJ 161:105, and the GM kernel that goes with it",
);
// Pluto and Charon come from one kernel, so that the pair is consistent.
const GM_KERNEL_2025: Source = Source("GM of the body alone: JPL GM kernel of 2025");
const IAU_WGCCRE: Source = Source(
    "mean radius: Archinal et al. 2018, Report of the IAU Working Group on Cartographic Coordinates and Rotational \
     Elements: 2015, CeMDA 130:22",
);
const IAU_WGCCRE_RECALLED: Source = Source(
    "mean radius, quoted from memory: Archinal et al. 2018, Report of the IAU Working Group on Cartographic \
     Coordinates and Rotational Elements: 2015, CeMDA 130:22",
);
const IAU_2015_SUN: Source = Source("nominal radius: IAU 2015 Resolution B3");
const EARTH_IN_PAIR: Source = Source(
    "the Earth's mean radius stands for the pair: Archinal et al. 2018, Report of the IAU Working Group on \
     Cartographic Coordinates and Rotational Elements: 2015, CeMDA 130:22",
);
const STANDISH: Source = Source(
    "semi-major axis at J2000 times the astronomical unit of IAU 2012 Resolution B2: Standish, Keplerian elements \
     for approximate positions of the major planets, Table 1 (1800-2050)",
);
const STANDISH_RATE: Source = Source(
    "period of the mean longitude's rate: Standish, Keplerian elements for approximate positions of the major \
     planets, Table 1 (1800-2050)",
);
const ALMANAC: Source =
    Source("planetary satellite mean orbital parameters, as tabulated in the Astronomical Almanac");
const ALMANAC_RECALLED: Source = Source(
    "planetary satellite mean orbital parameters, as tabulated in the Astronomical Almanac, quoted from memory",
);

/// A body with its constants.
struct Named {
    name: &'static str,
    /// km³/s².
    gm: Constant,
    /// km.
    radius: Constant,
}

impl Named {
    fn body(&self) -> Body {
        Body {
            name: Some(Cow::Borrowed(self.name)),
            gm_km3_s2: Some(self.gm.value),
            radius_km: Some(self.radius.value),
        }
    }
}

/// A pair of primaries in the catalogue.
pub struct Entry {
    id: &'static str,
    mass_parameter: MassParameter,
    larger: &'static Named,
    smaller: &'static Named,
    separation: Constant,
    length: Kilometres,
    period: Constant,
}

impl Entry {
    /// A planet about the Sun: semi-major axis in au, rate of the mean longitude in degrees per Julian century.
    const fn planet(id: &'static str, planet: &'static Named, semi_major_axis: f64, rate: f64) -> Self {
        let separation = STANDISH.gives(semi_major_axis * ASTRONOMICAL_UNIT_KM);
        let period = STANDISH_RATE.gives(REVOLUTION_DEG * CENTURY_D / rate);
        Self::satellite(id, &SUN, planet, separation, period)
    }

    /// A body about another: separation in km, period in days.
    const fn satellite(
        id: &'static str,
        larger: &'static Named,
        smaller: &'static Named,
        separation: Constant,
        period: Constant,
    ) -> Self {
        Self {
            id,
            mass_parameter: MassParameter::constant(smaller.gm.value / (larger.gm.value + smaller.gm.value)),
            larger,
            smaller,
            separation,
            length: Kilometres::constant(separation.value),
            period,
        }
    }

    /// Its identifier.
    #[must_use]
    pub fn id(&self) -> &'static str {
        self.id
    }

    /// The pair as a system.
    #[must_use]
    pub fn system(&self) -> System {
        let separation = self.separation.value;
        let time = kepler_time(separation, self.larger.gm.value + self.smaller.gm.value);
        System {
            id: Some(self.id),
            mass_parameter: self.mass_parameter,
            larger: self.larger.body(),
            smaller: self.smaller.body(),
            radius_larger: Some(Radius::constant(self.larger.radius.value / separation)),
            radius_smaller: Some(Radius::constant(self.smaller.radius.value / separation)),
            length: Some(self.length),
            time: Some(Seconds::constant(time)),
            velocity: Some(KilometresPerSecond::constant(separation / time)),
        }
    }

    /// Sidereal period as published, in days; Kepler's third law gives a slightly different one.
    #[must_use]
    pub fn published_period_d(&self) -> f64 {
        self.period.value
    }

    /// Every constant of the entry with its source, under the name of the quantity and its unit.
    #[must_use]
    pub fn sources(&self) -> [(&'static str, Constant); 6] {
        [
            ("larger.gm_km3_s2", self.larger.gm),
            ("larger.radius_km", self.larger.radius),
            ("smaller.gm_km3_s2", self.smaller.gm),
            ("smaller.radius_km", self.smaller.radius),
            ("separation_km", self.separation),
            ("published_period_d", self.period),
        ]
    }
}

/// All entries, from the Sun outwards.
#[must_use]
pub fn entries() -> &'static [Entry] {
    &ENTRIES
}

/// The entry with the identifier `id`.
#[must_use]
pub fn find(id: &str) -> Option<&'static Entry> {
    ENTRIES.iter().find(|entry| entry.id == id)
}

const SUN: Named =
    Named { name: "Sun", gm: DE440.gives(132712440041.27942), radius: IAU_2015_SUN.gives(695700.0) };
const MERCURY: Named =
    Named { name: "Mercury", gm: DE440.gives(22031.868551400003), radius: IAU_WGCCRE.gives(2439.4) };
const VENUS: Named = Named { name: "Venus", gm: DE440.gives(324858.592), radius: IAU_WGCCRE.gives(6051.8) };
const EARTH: Named =
    Named { name: "Earth", gm: DE440.gives(398600.43550702266), radius: IAU_WGCCRE.gives(6371.0084) };
const MOON: Named =
    Named { name: "Moon", gm: DE440.gives(4902.80011845755), radius: IAU_WGCCRE.gives(1737.4) };
const PHOBOS: Named =
    Named { name: "Phobos", gm: DE440.gives(0.0007087546066894452), radius: IAU_WGCCRE.gives(11.08) };
const IO: Named = Named { name: "Io", gm: DE440.gives(5959.915466180539), radius: IAU_WGCCRE.gives(1821.49) };
const EUROPA: Named =
    Named { name: "Europa", gm: DE440.gives(3202.712099607295), radius: IAU_WGCCRE.gives(1560.8) };
const GANYMEDE: Named =
    Named { name: "Ganymede", gm: DE440.gives(9887.832752719638), radius: IAU_WGCCRE.gives(2631.2) };
const CALLISTO: Named =
    Named { name: "Callisto", gm: DE440.gives(7179.283402579837), radius: IAU_WGCCRE.gives(2410.3) };
const ENCELADUS: Named =
    Named { name: "Enceladus", gm: DE440.gives(7.210366688598896), radius: IAU_WGCCRE.gives(252.1) };
const RHEA: Named =
    Named { name: "Rhea", gm: DE440.gives(153.9417519146563), radius: IAU_WGCCRE.gives(763.5) };
const TITAN: Named =
    Named { name: "Titan", gm: DE440.gives(8978.137095521046), radius: IAU_WGCCRE.gives(2574.76) };
const TITANIA: Named =
    Named { name: "Titania", gm: DE440.gives(226.9437003741248), radius: IAU_WGCCRE.gives(788.9) };
const OBERON: Named =
    Named { name: "Oberon", gm: DE440.gives(205.3234302535623), radius: IAU_WGCCRE.gives(761.4) };
const TRITON: Named =
    Named { name: "Triton", gm: DE440.gives(1428.495462910464), radius: IAU_WGCCRE_RECALLED.gives(1352.6) };
const MARS: Named =
    Named { name: "Mars", gm: DE440.gives(42828.37362069909), radius: IAU_WGCCRE.gives(3389.5) };
const JUPITER: Named =
    Named { name: "Jupiter", gm: DE440.gives(126686531.9003704), radius: IAU_WGCCRE.gives(69911.0) };
const SATURN: Named =
    Named { name: "Saturn", gm: DE440.gives(37931206.23436167), radius: IAU_WGCCRE.gives(58232.0) };
const URANUS: Named =
    Named { name: "Uranus", gm: DE440.gives(5793951.256527211), radius: IAU_WGCCRE.gives(25362.0) };
const NEPTUNE: Named =
    Named { name: "Neptune", gm: DE440.gives(6835103.145462294), radius: IAU_WGCCRE.gives(24622.0) };
const PLUTO: Named =
    Named { name: "Pluto", gm: GM_KERNEL_2025.gives(869.3261226311508), radius: IAU_WGCCRE.gives(1188.3) };
const CHARON: Named =
    Named { name: "Charon", gm: GM_KERNEL_2025.gives(106.1011388236118), radius: IAU_WGCCRE.gives(606.0) };
/// The planet with its satellites, as the Sun feels it.
const MARS_SYSTEM: Named = Named { gm: DE440_SYSTEM.gives(42828.3758157561), ..MARS };
/// The planet with its satellites, as the Sun feels it.
const JUPITER_SYSTEM: Named = Named { gm: DE440_SYSTEM.gives(126712764.1), ..JUPITER };
/// The planet with its satellites, as the Sun feels it.
const SATURN_SYSTEM: Named = Named { gm: DE440_SYSTEM.gives(37940584.8418), ..SATURN };
/// The planet with its satellites, as the Sun feels it.
const URANUS_SYSTEM: Named = Named { gm: DE440_SYSTEM.gives(5794556.4), ..URANUS };
/// The planet with its satellites, as the Sun feels it.
const NEPTUNE_SYSTEM: Named = Named { gm: DE440_SYSTEM.gives(6836527.100580399), ..NEPTUNE };
/// The two as one body at their barycentre.
const EARTH_AND_MOON: Named = Named {
    name: "Earth and Moon",
    gm: DE440_PAIR.gives(EARTH.gm.value + MOON.gm.value),
    radius: EARTH_IN_PAIR.gives(EARTH.radius.value),
};

static ENTRIES: [Entry; 22] = [
    Entry::planet("sun-mercury", &MERCURY, 0.38709927, 149472.67411175),
    Entry::planet("sun-venus", &VENUS, 0.72333566, 58517.81538729),
    Entry::planet("sun-earth", &EARTH, 1.00000261, 35999.37244981),
    Entry::planet("sun-earth-and-moon", &EARTH_AND_MOON, 1.00000261, 35999.37244981),
    Entry::planet("sun-mars", &MARS_SYSTEM, 1.52371034, 19140.30268499),
    Entry::planet("sun-jupiter", &JUPITER_SYSTEM, 5.202887, 3034.74612775),
    Entry::planet("sun-saturn", &SATURN_SYSTEM, 9.53667594, 1222.49362201),
    Entry::planet("sun-uranus", &URANUS_SYSTEM, 19.18916464, 428.48202785),
    Entry::planet("sun-neptune", &NEPTUNE_SYSTEM, 30.06992276, 218.45945325),
    Entry::satellite("earth-moon", &EARTH, &MOON, ALMANAC.gives(384400.0), ALMANAC.gives(27.321661)),
    Entry::satellite(
        "mars-phobos",
        &MARS,
        &PHOBOS,
        ALMANAC.gives(9376.0),
        ALMANAC_RECALLED.gives(0.31891023),
    ),
    Entry::satellite("jupiter-io", &JUPITER, &IO, ALMANAC.gives(421800.0), ALMANAC.gives(1.769137786)),
    Entry::satellite(
        "jupiter-europa",
        &JUPITER,
        &EUROPA,
        ALMANAC.gives(671100.0),
        ALMANAC.gives(3.551181041),
    ),
    Entry::satellite(
        "jupiter-ganymede",
        &JUPITER,
        &GANYMEDE,
        ALMANAC.gives(1070400.0),
        ALMANAC.gives(7.15455296),
    ),
    Entry::satellite(
        "jupiter-callisto",
        &JUPITER,
        &CALLISTO,
        ALMANAC.gives(1882700.0),
        ALMANAC.gives(16.6890184),
    ),
    Entry::satellite(
        "saturn-enceladus",
        &SATURN,
        &ENCELADUS,
        ALMANAC_RECALLED.gives(238040.0),
        ALMANAC_RECALLED.gives(1.370218),
    ),
    Entry::satellite(
        "saturn-rhea",
        &SATURN,
        &RHEA,
        ALMANAC_RECALLED.gives(527070.0),
        ALMANAC_RECALLED.gives(4.518212),
    ),
    Entry::satellite(
        "saturn-titan",
        &SATURN,
        &TITAN,
        ALMANAC_RECALLED.gives(1221870.0),
        ALMANAC.gives(15.945421),
    ),
    Entry::satellite(
        "uranus-titania",
        &URANUS,
        &TITANIA,
        ALMANAC_RECALLED.gives(436300.0),
        ALMANAC_RECALLED.gives(8.706234),
    ),
    Entry::satellite(
        "uranus-oberon",
        &URANUS,
        &OBERON,
        ALMANAC_RECALLED.gives(583500.0),
        ALMANAC_RECALLED.gives(13.463234),
    ),
    Entry::satellite(
        "neptune-triton",
        &NEPTUNE,
        &TRITON,
        ALMANAC_RECALLED.gives(354759.0),
        ALMANAC.gives(5.876854),
    ),
    Entry::satellite(
        "pluto-charon",
        &PLUTO,
        &CHARON,
        ALMANAC_RECALLED.gives(19591.0),
        ALMANAC.gives(6.3872304),
    ),
];
