use rand::seq::SliceRandom;
use rand_pcg::Pcg64;

/// What a case is used for when an envelope is made.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Part {
    /// Chooses the index and the limits to try.
    Selection,
    /// Decides which of them holds.
    Calibration,
    /// Untouched until the claim stands, then counted.
    HeldOut,
}

impl Part {
    /// Its name in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Selection => "selection",
            Self::Calibration => "calibration",
            Self::HeldOut => "held-out",
        }
    }
}

/// The parts of `cases` cases, a third each, shuffled by the seed: they depend on nothing else.
pub fn split(seed: u64, cases: usize) -> Vec<Part> {
    let parts = [Part::Selection, Part::Calibration, Part::HeldOut];
    let mut all: Vec<Part> = (0..cases).map(|i| parts[i % 3]).collect();
    // A stream of its own: the draws of the cases come from others.
    all.shuffle(&mut Pcg64::new(seed.into(), u128::from_le_bytes(*b"gaussworthy part")));
    all
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_third_each_by_the_seed_alone() {
        let all = split(7, 2000);
        for (part, count) in [(Part::Selection, 667), (Part::Calibration, 667), (Part::HeldOut, 666)] {
            assert_eq!(all.iter().filter(|p| **p == part).count(), count);
        }
        assert_eq!(all, split(7, 2000));
        assert_ne!(all, split(8, 2000));
        // Neighbours in a suite are alike: they must not go to the parts in turn. 667 of 2000 stay by chance, sd 21;
        // odds of 1e-6 beyond 5 sd.
        let kept = all.iter().zip([Part::Selection, Part::Calibration, Part::HeldOut].iter().cycle());
        let kept = kept.filter(|(a, b)| a == b).count() as f64;
        assert!((kept - 666.7).abs() < 5.0 * 21.1, "{kept}");
    }
}
