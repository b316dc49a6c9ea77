//! Our side of `benches/peers/compare.py`: ns a sample and time to a target error, one thread, by level.
//!
//! Prints a line of JSON a model and level, in the keys of the peers' scripts.

mod common;

use std::time::{Duration, Instant};

use clap::Parser;
use common::Model;
use gaussworthy::lanes::Level;
use gaussworthy::reference::{Sampler, SamplerSettings};
use rayon::ThreadPoolBuilder;
use serde_json::json;

/// Times the four models.
#[derive(Parser)]
struct Arguments {
    /// A, B, C or D; all unless told otherwise.
    models: Vec<String>,
    /// Binary logarithm of the samples that are timed.
    #[arg(long, default_value_t = 22)]
    log2: u32,
    /// Worst standardised standard error to reach.
    #[arg(long, default_value_t = 1e-5)]
    target: f64,
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// Times that each is done; the least counts.
    #[arg(long, default_value_t = 3)]
    repeats: usize,
    /// Only this level.
    #[arg(long)]
    level: Option<String>,
    /// What cargo says to every bench.
    #[arg(long, hide = true)]
    bench: bool,
}

/// The last doubling of a reference of `log2` samples: what one more sample costs, the pilot apart.
fn last_doubling(model: &Model, settings: SamplerSettings) -> (Duration, f64) {
    let mut sampler = model.sampler(settings);
    let mut last = Duration::ZERO;
    loop {
        let start = Instant::now();
        if !sampler.deepen() {
            return (2 * last, sampler.reference().worst_error);
        }
        last = start.elapsed();
    }
}

/// Time until the target is met, pilot, doublings and looks included, as a survey does it.
struct Reached {
    pilot: f64,
    seconds: f64,
    /// Interpolated between the last two looks, as for the peers.
    interpolated: f64,
    points: u64,
}

fn reach(model: &Model, settings: SamplerSettings) -> Option<Reached> {
    let start = Instant::now();
    let seconds = || start.elapsed().as_secs_f64();
    let mut sampler: Sampler<'_> = model.sampler(settings);
    let pilot = seconds();
    let mut before: Option<(f64, f64)> = None;
    while sampler.deepen() {
        let error = sampler.reference().worst_error;
        let now = seconds();
        if error <= settings.precision {
            let interpolated = before.map_or(now, |(then, larger): (f64, f64)| {
                then * (now / then).powf((larger / settings.precision).ln() / (larger / error).ln())
            });
            return Some(Reached { pilot, seconds: now, interpolated, points: sampler.points() });
        }
        before = Some((now, error));
    }
    None
}

fn measure(arguments: &Arguments, name: &str, level: Level) {
    let model = Model::new(name);
    let base = SamplerSettings { seed: arguments.seed, level, ..SamplerSettings::default() };
    let timed = SamplerSettings { precision: 0.0, cap: 1 << arguments.log2, ..base };
    let search = SamplerSettings { precision: arguments.target, cap: 1 << 32, ..base };
    let repeats = 0..arguments.repeats.max(1);
    let (time, worst) = repeats.clone().map(|_| last_doubling(&model, timed)).min_by_key(|t| t.0).expect("one");
    let reached = repeats.filter_map(|_| reach(&model, search)).min_by(|x, y| x.seconds.total_cmp(&y.seconds));
    println!(
        "{}",
        json!({
            "program": format!("ours, {level}"),
            "model": name,
            "ns": time.as_secs_f64() / f64::from(arguments.log2).exp2() * 1e9,
            "worst_error": worst,
            "seconds": reached.as_ref().map(|r| r.seconds),
            "seconds_interpolated": reached.as_ref().map(|r| r.interpolated),
            "pilot_seconds": reached.as_ref().map(|r| r.pilot),
            "points": reached.as_ref().map(|r| r.points),
        })
    );
}

fn main() {
    let arguments = Arguments::parse();
    let names: Vec<&str> = match arguments.models.as_slice() {
        [] => Model::NAMES.to_vec(),
        models => models.iter().map(String::as_str).collect(),
    };
    let pool = ThreadPoolBuilder::new().num_threads(1).build().expect("a pool of one thread");
    pool.install(|| {
        for name in names {
            for level in Level::available() {
                if arguments.level.as_ref().is_none_or(|only| level.to_string() == *only) {
                    measure(&arguments, name, level);
                }
            }
        }
    });
}
