//! The envelopes of the methods, from a table of scores.

use serde::{Deserialize, Serialize};

use crate::survey::{Indices, OpinionsOf, excess_over};
use crate::trust::{
    Claim, Envelope, Measured, OPINIONS, PROBES, Part, RegimeIndex, pair_envelope, single_envelope, split,
};

/// Where one method is trusted.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct MethodEnvelopes {
    /// Its label.
    pub method: String,
    /// Cases, and in how many of them the method is trusted.
    pub cases: usize,
    /// How many of them.
    pub trusted: usize,
    /// By the one cheap index, or probe, that catches most.
    pub index: Option<Envelope>,
    /// By the pair of them that catches most.
    pub pair: Option<Envelope>,
    /// By the excess over a rich rule.
    pub second_opinion: Option<Envelope>,
}

/// What envelopes are made of: every case of a survey, its indices, and how every method fared.
#[derive(Debug, Clone)]
pub struct Evidence {
    seed: u64,
    indices: Vec<Measured>,
    methods: Vec<MethodEvidence>,
}

#[derive(Debug, Clone)]
struct MethodEvidence {
    label: String,
    trusted: Vec<bool>,
    opinions: Vec<Measured>,
}

impl Evidence {
    /// No case yet, of these methods; the seed decides what a case is used for.
    pub fn new<'a>(seed: u64, labels: impl Iterator<Item = &'a str>) -> Self {
        let measured = |name: String| Measured { name, values: Vec::new() };
        let opinions = || OPINIONS.iter().map(|rule| measured(excess_over(rule))).collect();
        Self {
            seed,
            indices: RegimeIndex::ALL.iter().map(|index| measured(index.name().into())).collect(),
            methods: labels
                .map(|label| MethodEvidence { label: label.into(), trusted: Vec::new(), opinions: opinions() })
                .collect(),
        }
    }

    /// Takes up the next case: its indices, and of every method whether it is trusted and what richer rules say of it.
    pub fn add(&mut self, indices: &Indices, methods: impl Iterator<Item = (bool, OpinionsOf)>) {
        let push = |to: &mut Vec<Measured>, values: &[Option<f64>]| {
            for (measured, value) in to.iter_mut().zip(values) {
                measured.values.push(value.unwrap_or(f64::NAN));
            }
        };
        push(&mut self.indices, indices);
        for (evidence, (trusted, opinions)) in self.methods.iter_mut().zip(methods) {
            evidence.trusted.push(trusted);
            push(&mut evidence.opinions, &opinions);
        }
    }

    /// The envelopes that it bears.
    pub fn envelopes(&self, claim: Claim) -> Vec<MethodEnvelopes> {
        let cases = self.indices.first().map_or(0, |index| index.values.len());
        let parts = split(self.seed, cases);
        self.methods.iter().map(|method| self.of_method(method, &parts, claim)).collect()
    }

    fn of_method(&self, method: &MethodEvidence, parts: &[Part], claim: Claim) -> MethodEnvelopes {
        let (probes, rich) = method.opinions.split_at(PROBES);
        let cheap: Vec<Measured> = self.indices.iter().chain(probes).cloned().collect();
        let trusted = &method.trusted;
        MethodEnvelopes {
            method: method.label.clone(),
            cases: trusted.len(),
            trusted: trusted.iter().filter(|t| **t).count(),
            index: single_envelope(&cheap, trusted, parts, claim),
            pair: pair_envelope(&cheap, trusted, parts, claim),
            second_opinion: single_envelope(rich, trusted, parts, claim),
        }
    }
}
