//! Which part of a whole that is shared among several runs.

use std::fmt;
use std::str::FromStr;

/// One part of a survey that is shared among several runs: part K of N does the cases (or replicates) K, K + N, K + 2N,
/// .., counted from 1, so that dear regions of a sweep are spread over all parts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Shard {
    part: usize,
    of: usize,
}

/// What is no part.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("`{0}` is no part of a survey; give K/N with K from 1 to N, such as 3/8")]
pub struct ShardError(String);

impl Shard {
    /// The whole in one part.
    pub const WHOLE: Self = Self { part: 1, of: 1 };

    /// Part `part`, from 1, of `of`; `None` where there is no such part.
    pub fn new(part: usize, of: usize) -> Option<Self> {
        (1..=of).contains(&part).then_some(Self { part, of })
    }

    /// Which part, from 1.
    pub fn part(self) -> usize {
        self.part
    }

    /// How many parts there are.
    pub fn of(self) -> usize {
        self.of
    }

    /// Whether the item at `index`, from 0, belongs to it.
    pub fn holds(self, index: usize) -> bool {
        index % self.of == self.part - 1
    }

    /// How many of `items` items belong to it.
    pub fn share(self, items: usize) -> usize {
        (items + self.of - self.part) / self.of
    }
}

impl FromStr for Shard {
    type Err = ShardError;

    fn from_str(text: &str) -> Result<Self, ShardError> {
        let number = |digits: &str| digits.parse().ok();
        let parts = text.split_once('/').and_then(|(k, n)| Some((number(k)?, number(n)?)));
        parts.and_then(|(part, of)| Self::new(part, of)).ok_or_else(|| ShardError(text.into()))
    }
}

impl fmt::Display for Shard {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/{}", self.part, self.of)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_case_is_in_one_part() {
        for cases in [0, 1, 7, 12] {
            for of in 1..=9 {
                let shards: Vec<_> = (1..=of).map(|part| Shard::new(part, of).unwrap()).collect();
                assert!((0..cases).all(|i| shards.iter().filter(|s| s.holds(i)).count() == 1));
                for shard in shards {
                    assert_eq!(
                        shard.share(cases),
                        (0..cases).filter(|&i| shard.holds(i)).count(),
                        "{shard} {cases}"
                    );
                }
            }
        }
    }

    #[test]
    fn only_parts_are_read() {
        assert_eq!("3/8".parse(), Ok(Shard { part: 3, of: 8 }));
        for text in ["0/3", "4/3", "1/0", "0/0", "3", "a/b", "1/2/3", "", "-1/2", "1 / 2"] {
            assert!(text.parse::<Shard>().is_err(), "{text}");
        }
    }
}
