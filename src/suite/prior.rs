//! The `[prior]` section in its three forms.

use nalgebra::{DMatrix, DVector};

use super::SuiteError;
use super::node::Node;
use super::numbers::{covariance_error, matrix};
use super::planar::Planar;
use super::quantity::Wanted;
use crate::gaussian::Gaussian;
use crate::sensor::SensorSpec;

const FORMS: &str = "`mean` and `covariance`; `mean` and `sd`, perhaps `correlation`; \
    or `range`, `bearing`, `along_sd` and `across_sd`, perhaps `seen_from`, `rest_mean` and `rest_sd`";
const KEYS: [&str; 11] = [
    "mean",
    "covariance",
    "sd",
    "correlation",
    "range",
    "bearing",
    "along_sd",
    "across_sd",
    "seen_from",
    "rest_mean",
    "rest_sd",
];

/// How a prior is written.
#[derive(Debug)]
pub(super) enum Prior<'a> {
    /// `mean` and `covariance`.
    Full { mean: &'a Node, covariance: &'a Node },
    /// `mean`, `sd` and perhaps `correlation`.
    Spread { mean: &'a Node, sd: &'a Node, correlation: Option<&'a Node> },
    /// Relative to a station.
    Planar(Planar<'a>),
}

impl<'a> Prior<'a> {
    /// Tells the form by its keys.
    pub(super) fn read(section: &'a Node) -> Result<Self, SuiteError> {
        let entries = section.table(&KEYS)?;
        let has = |keys: &[&str]| entries.iter().any(|(name, _)| keys.contains(&name.as_str()));
        let full = has(&["covariance"]);
        let spread = has(&["sd", "correlation"]);
        let planar = has(&KEYS[4..]);
        let right = format!("give exactly one form: {FORMS}");
        if usize::from(full) + usize::from(spread) + usize::from(planar) > 1 || (planar && has(&["mean"])) {
            return Err(section.error(format!("mixes two forms; {right}")));
        }
        if full {
            Ok(Self::Full { mean: section.need("mean", &right)?, covariance: section.at("covariance") })
        } else if spread {
            let (mean, sd) = (section.need("mean", &right)?, section.need("sd", &right)?);
            Ok(Self::Spread { mean, sd, correlation: section.get("correlation") })
        } else if planar {
            Ok(Self::Planar(Planar::read(section)?))
        } else if has(&["mean"]) {
            Err(section.error(format!("has a mean but no spread; {right}")))
        } else {
            Err(section.error(format!("is empty; {right}")))
        }
    }

    /// How many state components it speaks of.
    pub(super) fn dimension(&self) -> Result<usize, SuiteError> {
        match self {
            Self::Full { mean, .. } | Self::Spread { mean, .. } => {
                let n = mean.list()?.len();
                if n == 0 { Err(mean.error("is empty; give at least one number")) } else { Ok(n) }
            }
            Self::Planar(planar) => planar.dimension(),
        }
    }

    /// The Gaussian; a planar position that `sensor` reads is a length.
    pub(super) fn gaussian(&self, sensor: &SensorSpec) -> Result<Gaussian, SuiteError> {
        match self {
            Self::Full { mean, covariance } => {
                let m = components(mean, sensor, Wanted::read)?;
                law(mean, m, covariance, matrix(covariance)?)
            }
            Self::Spread { mean, sd, correlation } => {
                let m = components(mean, sensor, Wanted::read)?;
                let sds = components(sd, sensor, Wanted::read_sd)?;
                let n = m.len();
                if sds.len() != n {
                    return Err(sd.error(format!("has {} entries, but `mean` has {n}", sds.len())));
                }
                let rho = match correlation {
                    Some(node) => correlations(node, n)?,
                    None => DMatrix::identity(n, n),
                };
                let p = DMatrix::from_fn(n, n, |i, j| rho[(i, j)] * sds[i] * sds[j]);
                law(mean, m, correlation.unwrap_or(sd), p)
            }
            Self::Planar(planar) => planar.gaussian(sensor),
        }
    }
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

/// The components of the planar position that a sensor reads, if it reads one.
pub(super) fn position(sensor: &SensorSpec) -> Option<[usize; 2]> {
    serde_json::from_value(sensor.parameters().get("position")?.clone()).ok()
}

fn components(
    list: &Node,
    sensor: &SensorSpec,
    read: fn(Wanted, &Node) -> Result<f64, SuiteError>,
) -> Result<Vec<f64>, SuiteError> {
    let planar = position(sensor).unwrap_or([usize::MAX; 2]);
    let wanted = |i| if planar.contains(&i) { Wanted::Length } else { Wanted::Any };
    list.list()?.iter().enumerate().map(|(i, node)| read(wanted(i), node)).collect()
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
