//! Values drawn at random: `{ draw = "uniform", from, to }`, each case from its own stream.

use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;
use sha2::{Digest, Sha256};

use super::SuiteError;
use super::node::{Item, Node, Place};
use super::sweep::Bounds;
use crate::wording::proposal;

/// A value drawn between two bounds, uniformly or with a uniform logarithm.
#[derive(Debug, Clone)]
pub(super) struct Draw {
    bounds: Bounds,
    place: Place,
}

impl Draw {
    pub(super) fn read(table: &Node) -> Result<Self, SuiteError> {
        table.table(&["draw", "from", "to"])?;
        let law = table.at("draw");
        let log = match law.text()? {
            "uniform" => false,
            "log-uniform" => true,
            other => {
                let near = proposal(other, ["uniform", "log-uniform"]);
                return Err(law.error(format!("\"{other}\" is no law; {near}give \"uniform\" or \"log-uniform\"")));
            }
        };
        Ok(Self { bounds: Bounds::read(table, log)?, place: table.place.clone() })
    }

    /// The next value from the stream.
    pub(super) fn value(&self, stream: &mut Pcg64) -> Node {
        let item: Item = self.bounds.at(stream.random::<f64>());
        Node { place: self.place.clone(), item }
    }
}

/// The random stream of one case: it depends on the seed, the family's name and the case's index alone, so
/// a case keeps its draw whatever else the suite gains or loses.
pub(super) fn stream(seed: u64, family: &str, index: u64) -> Pcg64 {
    let hash = Sha256::new()
        .chain_update(b"gaussworthy draw\0")
        .chain_update(seed.to_le_bytes())
        .chain_update(index.to_le_bytes())
        .chain_update(family.as_bytes())
        .finalize();
    Pcg64::from_seed(hash.into())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::suite::quantity::Quantity;

    fn drawn(text: &str, count: usize, seed: u64) -> Vec<f64> {
        let root = Node::parse(text).unwrap();
        let draw = Draw::read(root.get("x").unwrap()).unwrap();
        let mut stream = stream(seed, "family", 0);
        (0..count).map(|_| Quantity::of(&draw.value(&mut stream)).unwrap().value).collect()
    }

    /// Kolmogorov-Smirnov distance of values in [0, 1] from the uniform law.
    fn distance(mut values: Vec<f64>) -> f64 {
        values.sort_by(f64::total_cmp);
        let n = values.len() as f64;
        values
            .iter()
            .enumerate()
            .fold(0.0, |d: f64, (i, v)| d.max((v - i as f64 / n).abs()).max((v - (i + 1) as f64 / n).abs()))
    }

    #[test]
    fn both_laws_are_what_they_say() {
        // Asymptotic law of sqrt(n) D: P(> 2.7) = 2 exp(-2 * 2.7^2) = 1e-6 false alarms (Kolmogorov 1933).
        let limit = 2.7 / 10_000_f64.sqrt();
        let uniform = drawn("x = { draw = \"uniform\", from = -2, to = 6 }", 10_000, 5);
        let d = distance(uniform.iter().map(|v| (v + 2.0) / 8.0).collect());
        assert!(d < limit, "uniform: {d} >= {limit}");
        let log = drawn("x = { draw = \"log-uniform\", from = 0.01, to = 100 }", 10_000, 5);
        let d = distance(log.iter().map(|v| (v.log10() + 2.0) / 4.0).collect());
        assert!(d < limit, "log-uniform: {d} >= {limit}");
    }

    #[test]
    fn streams_depend_on_seed_family_and_index() {
        let first = |seed, family, index| stream(seed, family, index).random::<u64>();
        let base = first(1, "a", 0);
        assert_eq!(first(1, "a", 0), base);
        for other in [first(2, "a", 0), first(1, "b", 0), first(1, "a", 1), first(1, "a0", 0)] {
            assert_ne!(other, base);
        }
    }

    #[test]
    fn draws_that_cannot_be_meant_are_refused() {
        for (text, expected) in [
            (
                "x = { draw = \"unifrom\", from = 1, to = 2 }",
                ":1: x.draw: \"unifrom\" is no law; did you mean `uniform`? give \"uniform\" or \"log-uniform\"",
            ),
            ("x = { draw = \"uniform\", from = 1 }", ":1: x: `to` is missing; give `from` and `to`"),
            (
                "x = { draw = \"log-uniform\", from = -1, to = 2 }",
                ":1: x.from: -1 cannot stand on a log scale; give a bound above 0",
            ),
            (
                "x = { draw = \"uniform\", from = 1, to = 2, steps = 4 }",
                ":1: x.steps: unknown key `steps`; allowed: draw, from, to",
            ),
        ] {
            let root = Node::parse(text).unwrap();
            assert_eq!(Draw::read(root.get("x").unwrap()).unwrap_err().to_string(), expected);
        }
    }
}
