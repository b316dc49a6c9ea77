//! The machine formats, written down a second time: a key that is added, renamed or left out fails the tests.

// Fields are here to be read into, whether or not a test looks at them.
#![allow(dead_code)]

use std::collections::{BTreeMap, HashMap};

use serde::Deserialize;

pub type Matrix = Vec<Vec<f64>>;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CaseRecord {
    pub case: String,
    pub sensor: Sensor,
    pub prior: Prior,
    pub noise: Option<Noise>,
}

#[derive(Debug, Deserialize)]
#[serde(tag = "kind", rename_all = "kebab-case", deny_unknown_fields)]
pub enum Sensor {
    RangeBearing {
        station: [f64; 2],
        position: [usize; 2],
    },
    BearingOnly {
        station: Option<[f64; 2]>,
        stations: Option<Vec<[f64; 2]>>,
        position: [usize; 2],
    },
    RangeOnly(Seen),
    RangeDoppler(Moving),
    BearingRate(Moving),
    RangeAzimuthElevation(Seen),
    AzimuthElevation(Seen),
    TimeDifference {
        stations: Matrix,
        position: Vec<usize>,
        wave_speed: f64,
    },
    FrequencyDifference {
        stations: Matrix,
        position: Vec<usize>,
        velocity: Vec<usize>,
        carrier: f64,
        wave_speed: f64,
    },
    ReceivedStrength {
        station: Option<Vec<f64>>,
        stations: Option<Matrix>,
        position: Vec<usize>,
        strength: f64,
        reference_distance: f64,
        exponent: f64,
    },
    Quadratic {
        #[serde(rename = "A")]
        a: Vec<Matrix>,
        b: Option<Matrix>,
        c: Option<Vec<f64>>,
    },
    Linear {
        #[serde(rename = "H")]
        h: Matrix,
        offset: Option<Vec<f64>>,
    },
    PolarToCartesian {
        range: usize,
        bearing: usize,
    },
    LineOffset {
        through: [[f64; 2]; 2],
        position: [usize; 2],
    },
    LineFeature {
        position: [usize; 2],
        line: [usize; 2],
    },
    Pinhole {
        focal_length: f64,
        centre: [f64; 2],
        position: [usize; 3],
    },
    StereoDisparity {
        focal_length: f64,
        baseline: f64,
        centre: [f64; 2],
        position: [usize; 3],
    },
    AttitudeVector {
        direction: [f64; 3],
        attitude: [usize; 3],
    },
    DipoleField {
        moment: [f64; 3],
        place: [f64; 3],
        background: [f64; 3],
        position: [usize; 3],
    },
    ExponentialDecay {
        amplitude: f64,
        scale: f64,
        offset: f64,
        component: usize,
        unit: String,
    },
    Saturating {
        limit: f64,
        gain: f64,
        offset: f64,
        component: usize,
        unit: String,
    },
    PhaseSine {
        amplitude: f64,
        frequency: f64,
        phase: f64,
        offset: f64,
        component: usize,
        unit: String,
    },
    /// Written out: it has no kind.
    #[serde(untagged)]
    Formula(Written),
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Written {
    state: Vec<String>,
    #[serde(default)]
    parameters: BTreeMap<String, f64>,
    #[serde(default)]
    noise: Vec<String>,
    #[serde(default)]
    definitions: BTreeMap<String, String>,
    outputs: Vec<WrittenOutput>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenOutput {
    name: String,
    formula: String,
    unit: Option<String>,
    #[serde(default)]
    angular: bool,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Seen {
    station: Option<Vec<f64>>,
    stations: Option<Matrix>,
    position: Vec<usize>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Moving {
    station: Option<Vec<f64>>,
    stations: Option<Matrix>,
    position: Vec<usize>,
    velocity: Vec<usize>,
}

fn count(stations: &Option<Matrix>) -> usize {
    stations.as_ref().map_or(1, Vec::len)
}

impl Sensor {
    /// Number of outputs.
    pub fn outputs(&self) -> usize {
        match self {
            Self::RangeBearing { .. } => 2,
            Self::BearingOnly { stations, .. } => stations.as_ref().map_or(1, Vec::len),
            Self::RangeOnly(seen) => count(&seen.stations),
            Self::RangeDoppler(moving) | Self::BearingRate(moving) => 2 * count(&moving.stations),
            Self::RangeAzimuthElevation(seen) => 3 * count(&seen.stations),
            Self::AzimuthElevation(seen) => 2 * count(&seen.stations),
            Self::TimeDifference { stations, .. } | Self::FrequencyDifference { stations, .. } => {
                stations.len() - 1
            }
            Self::ReceivedStrength { stations, .. } => count(stations),
            Self::Quadratic { a, .. } => a.len(),
            Self::Linear { h, .. } => h.len(),
            Self::PolarToCartesian { .. } | Self::Pinhole { .. } => 2,
            Self::StereoDisparity { .. } | Self::AttitudeVector { .. } => 3,
            Self::LineOffset { .. } | Self::LineFeature { .. } | Self::DipoleField { .. } => 1,
            Self::ExponentialDecay { .. } | Self::Saturating { .. } | Self::PhaseSine { .. } => 1,
            Self::Formula(written) => written.outputs.len(),
        }
    }

    /// Number of noise variables inside.
    pub fn noise(&self) -> usize {
        if let Self::Formula(written) = self { written.noise.len() } else { 0 }
    }

    pub fn is_linear(&self) -> bool {
        matches!(self, Self::Linear { .. } | Self::LineOffset { .. })
    }

    /// Whether control variates of degree four leave nothing of its moments to chance.
    pub fn is_polynomial(&self) -> bool {
        self.is_linear() || matches!(self, Self::Quadratic { .. })
    }
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Prior {
    pub mean: Vec<f64>,
    pub covariance: Matrix,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Noise {
    pub covariance: Matrix,
    pub inside: Option<Inside>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Inside {
    pub covariance: Matrix,
}

/// A reference; an entry that is not finite is null.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct MomentsRecord {
    pub case: String,
    pub mean: Vec<Option<f64>>,
    pub covariance: Vec<Vec<Option<f64>>>,
    pub cross_covariance: Vec<Vec<Option<f64>>>,
    pub standard_error: Entries,
    pub points: u64,
    pub replicates: u64,
    pub soundness: Soundness,
    pub stopped: Stopped,
    pub points_of: PointsOf,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Entries {
    pub mean: Vec<Option<f64>>,
    pub covariance: Vec<Vec<Option<f64>>>,
    pub cross_covariance: Vec<Vec<Option<f64>>>,
}

#[derive(Debug, Deserialize, Clone, Copy, PartialEq, Eq)]
#[serde(rename_all = "kebab-case")]
pub enum Soundness {
    Sound,
    Wide,
    Disputed,
    HeavyTailed,
    Refused,
}

#[derive(Debug, Deserialize, Clone, Copy, PartialEq, Eq)]
#[serde(rename_all = "kebab-case")]
pub enum Stopped {
    Decided,
    Cap,
    Refused,
}

#[derive(Debug, Deserialize, Clone, Copy, PartialEq, Eq)]
#[serde(rename_all = "kebab-case")]
pub enum PointsOf {
    Nets,
    Streams,
}

#[derive(Debug, Deserialize, Clone, Copy, PartialEq, Eq)]
#[serde(rename_all = "kebab-case")]
pub enum Verdict {
    Trusted,
    Rejected,
    Undecided,
    Skipped,
}

/// A row of `scores.csv`: an empty field is a value that does not exist. Behind these columns come the second opinions and what
/// the suite sweeps and draws.
#[derive(Debug, Deserialize)]
pub struct Row {
    pub case: String,
    pub family: String,
    pub method: String,
    pub inputs: u64,
    pub values: Option<u64>,
    pub jacobians: Option<u64>,
    pub hessians: Option<u64>,
    pub exact_moments: Option<u64>,
    pub verdict: Verdict,
    pub reason: String,
    pub cause: String,
    pub mean_error: Option<f64>,
    pub mean_error_standard_error: Option<f64>,
    pub covariance_error: Option<f64>,
    pub covariance_error_standard_error: Option<f64>,
    pub variance_ratio_low: Option<f64>,
    pub variance_ratio_low_standard_error: Option<f64>,
    pub variance_ratio_high: Option<f64>,
    pub variance_ratio_high_standard_error: Option<f64>,
    pub cross_covariance_error: Option<f64>,
    pub cross_covariance_error_standard_error: Option<f64>,
    pub excess: Option<f64>,
    pub excess_standard_error: Option<f64>,
    pub nees_ratio: Option<f64>,
    pub nees_ratio_standard_error: Option<f64>,
    pub worst_nees: Option<f64>,
    pub worst_nees_standard_error: Option<f64>,
    pub information_lost: Option<f64>,
    pub information_lost_standard_error: Option<f64>,
    /// A number, or `unbounded`.
    pub floor: String,
    pub floor_standard_error: Option<f64>,
    pub floor_standing: String,
    pub time_ns: Option<f64>,
    pub time_ns_lower_quartile: Option<f64>,
    pub time_ns_upper_quartile: Option<f64>,
    pub time_ratio: Option<f64>,
    pub time_ratio_lower_quartile: Option<f64>,
    pub time_ratio_upper_quartile: Option<f64>,
    pub curvature: Option<f64>,
    pub bend_over_noise: Option<f64>,
    pub information: Option<f64>,
    pub spread: Option<f64>,
}

impl Row {
    /// Every score beside its standard error.
    pub fn scores(&self) -> [(Option<f64>, Option<f64>); 9] {
        [
            (self.mean_error, self.mean_error_standard_error),
            (self.covariance_error, self.covariance_error_standard_error),
            (self.variance_ratio_low, self.variance_ratio_low_standard_error),
            (self.variance_ratio_high, self.variance_ratio_high_standard_error),
            (self.cross_covariance_error, self.cross_covariance_error_standard_error),
            (self.excess, self.excess_standard_error),
            (self.nees_ratio, self.nees_ratio_standard_error),
            (self.worst_nees, self.worst_nees_standard_error),
            (self.information_lost, self.information_lost_standard_error),
        ]
    }

    pub fn times(&self) -> [Option<f64>; 6] {
        [
            self.time_ns_lower_quartile,
            self.time_ns,
            self.time_ns_upper_quartile,
            self.time_ratio_lower_quartile,
            self.time_ratio,
            self.time_ratio_upper_quartile,
        ]
    }
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Manifest {
    pub version: String,
    pub build: Build,
    pub suite: Suite,
    pub seed: u64,
    pub settings: Settings,
    pub machine: Machine,
    /// Only of a part.
    pub shard: Option<Shard>,
    pub cases: Cases,
    pub samples: u64,
    pub times: Times,
    /// Only where methods were timed.
    pub cost: Option<Vec<Cost>>,
    /// Only where implementations outside were scored.
    pub answers: Option<Vec<Answers>>,
}

/// An implementation outside: a command, or a file of answers.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Outside {
    pub name: String,
    pub command: Option<Vec<String>>,
    pub timeout_seconds: Option<f64>,
    pub file: Option<String>,
    pub sha256: Option<String>,
}

#[derive(Debug, Deserialize, PartialEq, Eq)]
#[serde(deny_unknown_fields)]
pub struct Answers {
    pub name: String,
    pub asked: u64,
    pub valid: u64,
    pub invalid: u64,
    pub missing: u64,
    pub unknown: u64,
    pub unreadable: u64,
    pub failure: Option<String>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Build {
    pub profile: String,
    pub target: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Suite {
    pub name: String,
    pub title: String,
    pub note: String,
    pub hash: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Settings {
    pub precision: f64,
    pub cap: u64,
    pub replicates: u64,
    pub methods: Vec<String>,
    /// Only where there are any.
    pub outside: Option<Vec<Outside>>,
    pub limits: HashMap<String, f64>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Machine {
    pub threads: u64,
    pub cores: u64,
    pub architecture: String,
    pub system: String,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Shard {
    pub part: usize,
    pub of: usize,
    pub suite_cases: usize,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Cases {
    pub asked: usize,
    pub finished: usize,
    pub complete: bool,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Times {
    pub started: String,
    pub sampling_seconds: f64,
    pub timing_seconds: f64,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Cost {
    pub method: String,
    pub time_ratio: Option<Quartiles>,
    pub transforms_per_second: Option<f64>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Quartiles {
    pub lower: f64,
    pub median: f64,
    pub upper: f64,
}
