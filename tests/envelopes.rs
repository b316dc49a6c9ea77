//! Whether envelopes hold what they promise: the whole procedure in worlds whose breach probability is known.

use gaussworthy::trust::{Claim, Envelope, Measured, pair_envelope, single_envelope, split};
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;
use rayon::prelude::*;

const WORLDS: u64 = 2000;
/// Cases of a world, as of a suite of regimes.
const CASES: usize = 2000;

/// A world: an index uniform in [0, 1] with this probability of a breach at t, and its mean over [0, t]; another index, uniform
/// and independent of everything.
struct World {
    name: &'static str,
    breach: fn(f64) -> f64,
    risk_up_to: fn(f64) -> f64,
}

const WORLDS_TRIED: [World; 5] = [
    // The least favourable: every claim is false, by next to nothing, at every limit.
    World { name: "just beyond everywhere", breach: |_| 0.050_001, risk_up_to: |_| 0.050_001 },
    World { name: "rising", breach: |t| 0.2 * t, risk_up_to: |t| 0.1 * t },
    World {
        name: "cliff",
        breach: |t| if t < 0.4 { 0.01 } else { 0.9 },
        risk_up_to: |t| (0.01 * t.min(0.4) + 0.9 * (t - 0.4).max(0.0)) / t,
    },
    // Worst at the smallest index, where every walk begins.
    World {
        name: "worst at the start",
        breach: |t| if t < 0.1 { 0.06 } else { 0.045 },
        risk_up_to: |t| (0.06 * t.min(0.1) + 0.045 * (t - 0.1).max(0.0)) / t,
    },
    World {
        name: "a dip",
        breach: |t| if (0.2..0.4).contains(&t) { 0.0 } else { 0.08 },
        risk_up_to: |t| 0.08 * (t - (t.clamp(0.2, 0.4) - 0.2)) / t,
    },
];

/// The share of breaches inside an envelope, exactly: the blind index removes cases without regard to them.
fn true_risk(world: &World, envelope: &Envelope) -> f64 {
    let limit = envelope.terms.iter().find(|t| t.index == "seeing").map_or(1.0, |t| t.limit.min(1.0));
    (world.risk_up_to)(limit)
}

/// In how many of the worlds there is an envelope, and in how many of them it promises too much.
fn claims(world: &World, pairs: bool) -> (usize, usize) {
    let outcomes: Vec<Option<bool>> = (0..WORLDS)
        .into_par_iter()
        .map(|seed| {
            let mut rng = Pcg64::seed_from_u64(seed);
            let seeing: Vec<f64> = (0..CASES).map(|_| rng.random()).collect();
            let blind: Vec<f64> = (0..CASES).map(|_| rng.random()).collect();
            let trusted: Vec<bool> = seeing.iter().map(|&t| rng.random::<f64>() >= (world.breach)(t)).collect();
            let indices = [("blind", blind), ("seeing", seeing)];
            let indices = indices.map(|(name, values)| Measured { name: name.into(), values });
            let parts = split(seed, CASES);
            let make = if pairs { pair_envelope } else { single_envelope };
            let envelope = make(&indices, &trusted, &parts, Claim::default())?;
            Some(true_risk(world, &envelope) > Claim::default().risk)
        })
        .collect();
    (outcomes.iter().flatten().count(), outcomes.iter().flatten().filter(|f| **f).count())
}

/// The promise fails in at most 5 % of all worlds. Of 2000 that is 100, with a standard deviation of 9.7; 3.9 of them more come
/// with odds of 5e-5, so of 4e-4 over all the seven tries here if every one were least favourable, which most are not.
const MOST_FAILURES: usize = 138;

#[test]
fn the_promise_fails_in_one_world_of_twenty_at_most() {
    let singles = WORLDS_TRIED.iter().map(|world| (world, false));
    // A pair takes a hundred times as long, and these two leave it most room to err.
    for (world, pairs) in singles.chain(WORLDS_TRIED[..2].iter().map(|world| (world, true))) {
        let (made, failed) = claims(world, pairs);
        println!("{}, pairs {pairs}: {made} envelopes, {failed} promise too much, of {WORLDS} worlds", world.name);
        assert!(failed <= MOST_FAILURES, "{}: {failed} of {WORLDS} worlds", world.name);
    }
}

/// A test of nothing but the promise would be passed by a procedure that never promises. Below the cliff one case in a hundred
/// fails: seen 1953 of 2000 worlds with an envelope; 1940 leave three standard deviations of chance.
#[test]
fn envelopes_are_found_where_there_are_any() {
    let (made, _) = claims(&WORLDS_TRIED[2], false);
    assert!(made >= 1940, "{made} of {WORLDS}");
}
