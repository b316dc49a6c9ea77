//! The `[prior]` section in its three forms.

use nalgebra::{DMatrix, DVector};

use super::SuiteError;
use super::frame::Frame;
use super::layout::Layout;
use super::node::Node;
use super::numbers::{covariance_error, matrix};
use super::quantity::Wanted;
use super::sensor::Described;
use super::sighting::Sighting;
use crate::gaussian::Gaussian;

const FORMS: &str = "`mean` and `covariance`; `mean` and `sd`, perhaps `correlation`; \
    or `range`, `bearing`, `along_sd` and `across_sd`, perhaps `elevation` and `up_sd`, `speed` and `course`, \
    `seen_from`, `rest_mean` and `rest_sd`";
const KEYS: [&str; 22] = [
    "mean",
    "covariance",
    "sd",
    "correlation",
    "frame_bearing",
    "frame_elevation",
    "range",
    "bearing",
    "elevation",
    "along_sd",
    "across_sd",
    "up_sd",
    "frame_covariance",
    "seen_from",
    "speed",
    "speed_sd",
    "course",
    "course_sd",
    "climb",
    "climb_sd",
    "rest_mean",
    "rest_sd",
];
/// The keys of [`KEYS`] from here on are of the third form only; the two before go with every form.
const SIGHTED: usize = 6;

/// How a prior is written.
#[derive(Debug)]
pub(super) enum Prior<'a> {
    /// `mean` and `covariance`, perhaps in a frame.
    Full { mean: &'a Node, covariance: &'a Node, frame: Option<Frame<'a>> },
    /// `mean`, `sd` and perhaps `correlation`, perhaps in a frame.
    Spread { mean: &'a Node, sd: &'a Node, correlation: Option<&'a Node>, frame: Option<Frame<'a>> },
    /// Relative to a station.
    Sighting(Sighting<'a>),
}

impl<'a> Prior<'a> {
    /// Tells the form by its keys.
    pub(super) fn read(section: &'a Node) -> Result<Self, SuiteError> {
        let entries = section.table(&KEYS)?;
        let has = |keys: &[&str]| entries.iter().any(|(name, _)| keys.contains(&name.as_str()));
        let full = has(&["covariance"]);
        let spread = has(&["sd", "correlation"]);
        let sighted = has(&KEYS[SIGHTED..]);
        let right = format!("give exactly one form: {FORMS}");
        if usize::from(full) + usize::from(spread) + usize::from(sighted) > 1 || (sighted && has(&["mean"])) {
            return Err(section.error(format!("mixes two forms; {right}")));
        }
        let need_mean = || section.need("mean", &right);
        if full {
            let (mean, covariance) = (need_mean()?, section.at("covariance"));
            Ok(Self::Full { mean, covariance, frame: Frame::read(section)? })
        } else if spread {
            let (mean, sd) = (need_mean()?, section.need("sd", &right)?);
            let correlation = section.get("correlation");
            Ok(Self::Spread { mean, sd, correlation, frame: Frame::read(section)? })
        } else if sighted {
            Ok(Self::Sighting(Sighting::read(section)?))
        } else if has(&["mean"]) {
            Err(section.error(format!("has a mean but no spread; {right}")))
        } else if entries.is_empty() {
            Err(section.error(format!("is empty; {right}")))
        } else {
            Err(section.error(format!("has neither a mean nor a range; {right}")))
        }
    }

    /// How many state components it speaks of.
    pub(super) fn dimension(&self) -> Result<usize, SuiteError> {
        match self {
            Self::Full { mean, .. } | Self::Spread { mean, .. } => {
                let n = mean.list()?.len();
                if n == 0 { Err(mean.error("is empty; give at least one number")) } else { Ok(n) }
            }
            Self::Sighting(sighting) => sighting.dimension(),
        }
    }

    /// The Gaussian; a position that `sensor` reads is a length, a velocity a speed.
    pub(super) fn gaussian(&self, sensor: &Described) -> Result<Gaussian, SuiteError> {
        let layout = Layout::of(&sensor.spec, sensor.outline.as_ref());
        match self {
            Self::Full { mean, covariance, frame } => {
                let m = components(mean, layout, Wanted::read)?;
                let given = law(mean, m, covariance, matrix(covariance)?)?;
                turned(given, *frame, layout, covariance)
            }
            Self::Spread { mean, sd, correlation, frame } => {
                let m = components(mean, layout, Wanted::read)?;
                let sds = components(sd, layout, Wanted::read_sd)?;
                let n = m.len();
                if sds.len() != n {
                    return Err(sd.error(format!("has {} entries, but `mean` has {n}", sds.len())));
                }
                let rho = match correlation {
                    Some(node) => correlations(node, n)?,
                    None => DMatrix::identity(n, n),
                };
                let p = DMatrix::from_fn(n, n, |i, j| rho[(i, j)] * sds[i] * sds[j]);
                let spread = correlation.unwrap_or(sd);
                turned(law(mean, m, spread, p)?, *frame, layout, spread)
            }
            Self::Sighting(sighting) => sighting.gaussian(layout),
        }
    }
}

/// The law whose covariance is `given` in the axes of the frame, as far as the position goes: T P T', where T turns
/// the components that the sensor reads as the position (else the first ones) and leaves the others.
fn turned(
    given: Gaussian,
    frame: Option<Frame<'_>>,
    layout: Layout<'_>,
    spread: &Node,
) -> Result<Gaussian, SuiteError> {
    let Some(frame) = frame else { return Ok(given) };
    let n = given.dimension();
    let position = match layout.position() {
        Some(named) => named,
        None => layout.unnamed_position(2 + usize::from(frame.elevation.is_some()), n, frame.bearing)?,
    };
    if position.iter().any(|&i| i >= n) || !(2..=3).contains(&position.len()) {
        return Err(frame.bearing.error(format!(
            "turns a position, components {position:?}, but the state has {n} components; leave it out"
        )));
    }
    let direction = frame.direction(position.len())?;
    let covariance = direction.of_covariance(given.covariance(), &position);
    law(frame.bearing, given.mean().iter().copied().collect(), spread, covariance)
}

/// The law; what is wrong with its covariance is said at `spread`.
pub(super) fn law(
    mean: &Node,
    m: Vec<f64>,
    spread: &Node,
    covariance: DMatrix<f64>,
) -> Result<Gaussian, SuiteError> {
    Gaussian::new(DVector::from_vec(m), covariance).map_err(|e| match e {
        crate::gaussian::GaussianError::MeanNotFinite { .. } => mean.error(e.to_string()),
        e => covariance_error(spread, &e),
    })
}

fn components<'a>(
    list: &Node,
    layout: Layout<'a>,
    read: fn(Wanted<'a>, &Node) -> Result<f64, SuiteError>,
) -> Result<Vec<f64>, SuiteError> {
    list.list()?.iter().enumerate().map(|(i, node)| read(layout.wanted(i), node)).collect()
}

/// The correlation matrix, written out or as triples `[i, j, rho]`.
///
/// Three triples on a state of three look like a matrix; a correlation matrix is the one with ones on its
/// diagonal (a set of triples that has them too pairs a component with itself, or is not symmetric, and is
/// refused, never misread).
fn correlations(node: &Node, n: usize) -> Result<DMatrix<f64>, SuiteError> {
    let rows = node.list()?;
    let written_out = rows.len() == n && rows.iter().all(|row| row.list().is_ok_and(|r| r.len() == n));
    if written_out {
        let rho = matrix(node)?;
        let off = (0..n).find(|&i| rho[(i, i)] != 1.0);
        match off {
            None => return unit_bounded(node, rho),
            Some(i) if n != 3 => {
                let entry = node.at(&format!("[{i}][{i}]"));
                return Err(entry.error(format!("is {}; a correlation matrix has 1 here", entry.describe())));
            }
            Some(_) => {}
        }
    }
    let mut rho = DMatrix::identity(n, n);
    for row in rows {
        let right = format!("give an {n} x {n} matrix, or triples [i, j, rho]");
        let [i, j, value] = row.list()? else { return Err(row.error(format!("is {}; {right}", row.describe()))) };
        let (i_at, j_at) = (i.whole(0)?, j.whole(0)?);
        for (node, at) in [(i, i_at), (j, j_at)] {
            if at >= n as u64 {
                let last = n - 1;
                return Err(node.error(format!("{at} is outside the state, whose components are 0 to {last}")));
            }
        }
        let (i, j, value) = (i_at as usize, j_at as usize, value.number()?);
        if i == j {
            return Err(row.error(format!("correlates component {i} with itself")));
        }
        if rho[(i, j)] != 0.0 {
            return Err(row.error(format!("correlates components {i} and {j} a second time")));
        }
        rho[(i, j)] = value;
        rho[(j, i)] = value;
    }
    unit_bounded(node, rho)
}

fn unit_bounded(node: &Node, rho: DMatrix<f64>) -> Result<DMatrix<f64>, SuiteError> {
    let n = rho.nrows();
    for i in 0..n {
        for j in 0..n {
            let value = rho[(i, j)];
            if value.abs() > 1.0 {
                return Err(node.error(format!("components {i} and {j}: {value} is outside -1 to 1")));
            }
            if value != rho[(j, i)] {
                let entry = node.at(&format!("[{i}][{j}]"));
                let mirror = rho[(j, i)];
                return Err(entry.error(format!("is {value}, but [{j}][{i}] is {mirror}; the matrix is symmetric")));
            }
        }
    }
    Ok(rho)
}
