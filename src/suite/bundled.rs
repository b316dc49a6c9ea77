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
