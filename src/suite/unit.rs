//! What quantities measure, and in which units. A new dimension or unit is one line in the tables here.

use std::f64::consts::PI;

/// What a quantity measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Dimension {
    /// In metres.
    Length,
    /// In radians.
    Angle,
    /// In seconds.
    Time,
    /// In metres a second.
    Speed,
    /// In radians a second.
    AngularRate,
    /// In hertz.
    Frequency,
    /// A share of something else, 1 for the whole.
    Share,
}

/// Unit, what it measures, and its size in the base unit of that; the base unit has the size 1.
pub(super) const UNITS: &[(&str, Dimension, f64)] = &[
    ("m", Dimension::Length, 1.0),
    ("km", Dimension::Length, 1e3),
    ("cm", Dimension::Length, 1e-2),
    ("mm", Dimension::Length, 1e-3),
    ("deg", Dimension::Angle, PI / 180.0),
    ("rad", Dimension::Angle, 1.0),
    ("mrad", Dimension::Angle, 1e-3),
    ("s", Dimension::Time, 1.0),
    ("ms", Dimension::Time, 1e-3),
    ("us", Dimension::Time, 1e-6),
    ("ns", Dimension::Time, 1e-9),
    ("min", Dimension::Time, 60.0),
    ("h", Dimension::Time, 3600.0),
    ("m/s", Dimension::Speed, 1.0),
    ("km/h", Dimension::Speed, 1.0 / 3.6),
    // The international knot: a nautical mile of 1852 m an hour.
    ("kn", Dimension::Speed, 1852.0 / 3600.0),
    ("deg/s", Dimension::AngularRate, PI / 180.0),
    ("rad/s", Dimension::AngularRate, 1.0),
    ("Hz", Dimension::Frequency, 1.0),
    ("kHz", Dimension::Frequency, 1e3),
    ("MHz", Dimension::Frequency, 1e6),
    ("GHz", Dimension::Frequency, 1e9),
    ("%", Dimension::Share, 1e-2),
];

impl Dimension {
    /// Every one, in the order of [`UNITS`].
    pub(super) const ALL: [Self; 7] =
        [Self::Length, Self::Angle, Self::Time, Self::Speed, Self::AngularRate, Self::Frequency, Self::Share];

    /// The unit in which its numbers are kept; a share has none.
    pub(super) fn base_unit(self) -> Option<&'static str> {
        UNITS.iter().find(|u| u.1 == self && u.2 == 1.0).map(|u| u.0)
    }

    /// The dimension that `unit` is the base unit of.
    pub(super) fn of_base(unit: &str) -> Option<Self> {
        UNITS.iter().find(|u| u.0 == unit && u.2 == 1.0).map(|u| u.1)
    }

    /// Its name with an article.
    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Length => "a length",
            Self::Angle => "an angle",
            Self::Time => "a time",
            Self::Speed => "a speed",
            Self::AngularRate => "an angular rate",
            Self::Frequency => "a frequency",
            Self::Share => "a share",
        }
    }

    /// Whether its numbers need a unit: degrees and radians are mistaken too easily.
    pub(super) fn needs_unit(self) -> bool {
        matches!(self, Self::Angle | Self::AngularRate)
    }

    fn symbols(self) -> impl Iterator<Item = &'static str> {
        UNITS.iter().filter(move |u| u.1 == self).map(|u| u.0)
    }

    /// The units that measure it.
    pub(super) fn units(self) -> String {
        self.symbols().collect::<Vec<_>>().join(", ")
    }

    /// `given` in its first two units, for a number that stands without one.
    pub(super) fn examples(self, given: &str) -> String {
        self.symbols().take(2).map(|unit| format!("\"{given} {unit}\"")).collect::<Vec<_>>().join(" or ")
    }

    /// A value in base units, written with a unit.
    pub(super) fn write(self, value: f64) -> String {
        match self.base_unit() {
            Some(unit) => format!("\"{value} {unit}\""),
            None => format!("\"{} %\"", 100.0 * value),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_dimension_but_a_share_has_one_base_unit() {
        for dimension in Dimension::ALL {
            let bases = UNITS.iter().filter(|u| u.1 == dimension && u.2 == 1.0).count();
            assert_eq!(bases, usize::from(dimension != Dimension::Share), "{dimension:?}");
        }
        assert!(UNITS.iter().all(|u| Dimension::ALL.contains(&u.1)));
        assert_eq!(Dimension::of_base("rad/s"), Some(Dimension::AngularRate));
        assert_eq!((Dimension::of_base("km"), Dimension::of_base("dB")), (None, None));
    }

    #[test]
    fn no_unit_stands_twice() {
        for (i, unit) in UNITS.iter().enumerate() {
            assert!(UNITS[..i].iter().all(|other| other.0 != unit.0), "{}", unit.0);
        }
    }
}
