/// A suite that comes with the program.
#[derive(Debug, Clone, Copy)]
pub struct Bundled {
    /// What the command line calls it.
    pub name: &'static str,
    /// One line: its title.
    pub summary: &'static str,
    /// Its TOML, as it stands in `suites/`.
    pub text: &'static str,
}

impl Bundled {
    const fn regimes(name: &'static str, summary: &'static str, text: &'static str) -> Self {
        Self { name, summary, text }
    }
}

/// The suites that are surveyed when none is named: those that show what the program is for.
pub const DEMONSTRATION: [&str; 3] = ["harbour-radar", "listening-buoys", "power-meter"];

/// Every bundled suite, in the order in which they are surveyed. A new one is one line here.
pub(super) const ALL: &[Bundled] = &[
    Bundled {
        name: "harbour-radar",
        summary: "Harbour radar of Brackmoor Sound: range and bearing, near to far, round to very flat priors",
        text: include_str!("../../suites/harbour-radar.toml"),
    },
    Bundled {
        name: "listening-buoys",
        summary: "Listening buoys of Brackmoor Sound: bearings from one buoy and from two, also across the cut",
        text: include_str!("../../suites/listening-buoys.toml"),
    },
    Bundled {
        name: "power-meter",
        summary: "Power meters of Brackmoor Sound: quadratic readings in 1, 2 and 6 dimensions",
        text: include_str!("../../suites/power-meter.toml"),
    },
    Bundled {
        name: "pilot-boats",
        summary: "Pilot boats of Brackmoor Sound: range rates, bearing rates and ranges alone, with velocity states",
        text: include_str!("../../suites/pilot-boats.toml"),
    },
    Bundled {
        name: "mast-cameras",
        summary: "Mast cameras of Brackmoor Sound: azimuth and elevation of a drone, with range and from two masts",
        text: include_str!("../../suites/mast-cameras.toml"),
    },
    Bundled {
        name: "wave-timing",
        summary: "Distress transmitter in Brackmoor Sound: differences of time and frequency, and received strength",
        text: include_str!("../../suites/wave-timing.toml"),
    },
    Bundled {
        name: "leading-lights",
        summary: "Leading lights of Brackmoor Sound: offsets from lines known and mapped, directions through attitude errors",
        text: include_str!("../../suites/leading-lights.toml"),
    },
    Bundled {
        name: "tide-gauges",
        summary: "Tide gauges of Brackmoor Sound: light by depth, tide by the hour, meters at their limits, plots by range and bearing",
        text: include_str!("../../suites/tide-gauges.toml"),
    },
    Bundled {
        name: "quay-cameras",
        summary: "Quay cameras of Brackmoor Sound: image points and disparities, from far off to the lens itself",
        text: include_str!("../../suites/quay-cameras.toml"),
    },
    Bundled {
        name: "hull-watch",
        summary: "Hull watch of Brackmoor Sound: field strength of steel hulls, from far off to alongside",
        text: include_str!("../../suites/hull-watch.toml"),
    },
    Bundled {
        name: "buoy-controllers",
        summary: "Buoy controllers of Brackmoor Sound: the same methods in double and in single precision",
        text: include_str!("../../suites/buoy-controllers.toml"),
    },
    Bundled {
        name: "smoke",
        summary: "A few cases of every sensor, measured in seconds",
        text: include_str!("../../suites/smoke.toml"),
    },
];

/// The suites of regimes: one sensor each, thousands of drawn cases, from which envelopes are made. A new one is one line here.
pub(super) const REGIMES: &[Bundled] = &[
    Bundled::regimes(
        "regimes-range-bearing",
        "Radars of Brackmoor Sound: range and bearing, over the regimes that the trade meets",
        include_str!("../../suites/regimes/range-bearing.toml"),
    ),
    Bundled::regimes(
        "regimes-bearing-only",
        "Listening buoys of Brackmoor Sound: one bearing, over the regimes that the trade meets",
        include_str!("../../suites/regimes/bearing-only.toml"),
    ),
    Bundled::regimes(
        "regimes-crossed-bearings",
        "Pairs of listening buoys of Brackmoor Sound: crossed bearings, over the regimes that the trade meets",
        include_str!("../../suites/regimes/crossed-bearings.toml"),
    ),
    Bundled::regimes(
        "regimes-range-only",
        "Transponders of Brackmoor Sound: range alone, over the regimes that the trade meets",
        include_str!("../../suites/regimes/range-only.toml"),
    ),
    Bundled::regimes(
        "regimes-range-doppler",
        "Doppler radars of Brackmoor Sound: range and range rate of a moving target, over the regimes that the trade meets",
        include_str!("../../suites/regimes/range-doppler.toml"),
    ),
    Bundled::regimes(
        "regimes-bearing-rate",
        "Tracking cameras of Brackmoor Sound: bearing and bearing rate of a moving target, over the regimes that the trade meets",
        include_str!("../../suites/regimes/bearing-rate.toml"),
    ),
    Bundled::regimes(
        "regimes-range-azimuth-elevation",
        "Mast radars of Brackmoor Sound: range, azimuth and elevation of a drone, over the regimes that the trade meets",
        include_str!("../../suites/regimes/range-azimuth-elevation.toml"),
    ),
    Bundled::regimes(
        "regimes-azimuth-elevation",
        "Mast cameras of Brackmoor Sound: azimuth and elevation of a drone, over the regimes that the trade meets",
        include_str!("../../suites/regimes/azimuth-elevation.toml"),
    ),
    Bundled::regimes(
        "regimes-time-difference",
        "Shore receivers of Brackmoor Sound: differences of arrival times, over the regimes that the trade meets",
        include_str!("../../suites/regimes/time-difference.toml"),
    ),
    Bundled::regimes(
        "regimes-frequency-difference",
        "Shore receivers of Brackmoor Sound: differences of Doppler shifts, over the regimes that the trade meets",
        include_str!("../../suites/regimes/frequency-difference.toml"),
    ),
    Bundled::regimes(
        "regimes-received-strength",
        "Beacon receivers of Brackmoor Sound: received strength, over the regimes that the trade meets",
        include_str!("../../suites/regimes/received-strength.toml"),
    ),
    Bundled::regimes(
        "regimes-polar-plots",
        "Plots of the radars of Brackmoor Sound: position from range and bearing, over the regimes that the trade meets",
        include_str!("../../suites/regimes/polar-plots.toml"),
    ),
    Bundled::regimes(
        "regimes-line-feature",
        "Quay walls of Brackmoor Sound: distance from a wall that is itself only estimated, over the regimes that the trade meets",
        include_str!("../../suites/regimes/line-feature.toml"),
    ),
    Bundled::regimes(
        "regimes-pinhole",
        "Quay cameras of Brackmoor Sound: the image point of a target, over the regimes that the trade meets",
        include_str!("../../suites/regimes/pinhole.toml"),
    ),
    Bundled::regimes(
        "regimes-stereo-disparity",
        "Quay camera pairs of Brackmoor Sound: image point and disparity, over the regimes that the trade meets",
        include_str!("../../suites/regimes/stereo-disparity.toml"),
    ),
    Bundled::regimes(
        "regimes-attitude-vector",
        "Sun sensors of Brackmoor Sound: a known direction through an attitude error, over the regimes that the trade meets",
        include_str!("../../suites/regimes/attitude-vector.toml"),
    ),
    Bundled::regimes(
        "regimes-dipole-field",
        "Hull watch of Brackmoor Sound: field strength beside a steel hull, over the regimes that the trade meets",
        include_str!("../../suites/regimes/dipole-field.toml"),
    ),
    Bundled::regimes(
        "regimes-exponential-decay",
        "Light gauges of Brackmoor Sound: light over depth, over the regimes that the trade meets",
        include_str!("../../suites/regimes/exponential-decay.toml"),
    ),
    Bundled::regimes(
        "regimes-saturating",
        "Current meters of Brackmoor Sound: readings near the limit, over the regimes that the trade meets",
        include_str!("../../suites/regimes/saturating.toml"),
    ),
    Bundled::regimes(
        "regimes-phase-sine",
        "Tide gauges of Brackmoor Sound: level over an hour that is badly known, over the regimes that the trade meets",
        include_str!("../../suites/regimes/phase-sine.toml"),
    ),
    Bundled::regimes(
        "regimes-quadratic",
        "Power meters of Brackmoor Sound: power of two currents, over the regimes that the trade meets",
        include_str!("../../suites/regimes/quadratic.toml"),
    ),
];
