use std::hint::black_box;
use std::time::{Duration, Instant};

use nalgebra::DMatrix;
use serde::Serialize;

use crate::gaussian::Moments;
use crate::method::{MethodSpec, Problem, Transform};
use crate::suite::{Case, Suite};

/// Rounds of a measurement: methods in turn, round by round, so that what slows the machine slows all alike.
const ROUNDS: usize = 11;
/// A batch of transforms lasts at least this long, well above the clock's step.
const BATCH: Duration = Duration::from_micros(10);
/// One transform for so many of a batch is run before it.
const WARM_UP_SHARE: u32 = 8;
/// A transform that takes this long warms itself: what cold caches add is lost in it.
const WARMS_ITSELF: Duration = Duration::from_micros(100);
/// Cases timed in a suite, evenly chosen where there are more.
const TIMED_CASES: usize = 240;
/// How long the transforms of one method run on all threads.
const THROUGHPUT_TIME: Duration = Duration::from_millis(40);
/// Every ratio is to this method in the same round.
const BASELINE: &str = "taylor-1";

/// Median and quartiles of repeated measurements.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Quartiles {
    /// First quartile.
    pub lower: f64,
    /// Median.
    pub median: f64,
    /// Third quartile.
    pub upper: f64,
}

impl Quartiles {
    /// Of a list of measurements, in its unit; `None` of none.
    ///
    /// Linear between order statistics: Q(s) = x_(k) + f (x_(k+1) - x_(k)) with k + f = 1 + s (n - 1), x_(1) the least.
    ///
    /// Source: R. J. Hyndman, Y. Fan, "Sample quantiles in statistical packages", The American Statistician 50 (1996)
    /// 361-365, definition 7.
    pub fn of(mut values: Vec<f64>) -> Option<Self> {
        values.sort_by(f64::total_cmp);
        let last = values.len().checked_sub(1)?;
        let at = |share: f64| {
            let place = share * last as f64;
            let (low, high) = (values[place.floor() as usize], values[place.ceil() as usize]);
            low + (high - low) * place.fract()
        };
        Some(Self { lower: at(0.25), median: at(0.5), upper: at(0.75) })
    }
}

/// What one transform costs.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cost {
    /// Time of one transform on one thread \[ns\].
    pub nanoseconds: Quartiles,
    /// The same as a ratio to first-order Taylor in the same round.
    pub ratio: Quartiles,
}

/// What the methods of a suite cost.
#[derive(Debug, Clone, PartialEq)]
pub struct Timing {
    /// By case (index in the suite) and method (in the plan's order); `None` where the method refuses.
    pub cases: Vec<(usize, Vec<Option<Cost>>)>,
    /// By method: quartiles over the timed cases of their median ratio to first-order Taylor.
    pub ratio: Vec<Option<Quartiles>>,
    /// By method: transforms a second on all threads.
    pub throughput: Vec<Option<f64>>,
}

/// Times the methods on a suite's cases; nothing else of ours should run meanwhile.
pub fn time_methods(suite: &Suite, methods: &[MethodSpec]) -> Timing {
    let step = suite.cases.len().div_ceil(TIMED_CASES).max(1);
    let chosen: Vec<usize> = (0..suite.cases.len()).step_by(step).collect();
    let cases: Vec<(usize, Vec<Option<Cost>>)> =
        chosen.iter().map(|&i| (i, time_case(&suite.cases[i], methods))).collect();
    let ratio = (0..methods.len())
        .map(|m| Quartiles::of(cases.iter().filter_map(|(_, costs)| costs[m].map(|c| c.ratio.median)).collect()))
        .collect();
    let throughput = methods
        .iter()
        .map(|method| throughput(&chosen.iter().map(|&i| &suite.cases[i]).collect::<Vec<_>>(), method))
        .collect();
    Timing { cases, ratio, throughput }
}

/// One case with the transform of one method, ready to run again and again.
struct Bench<'a> {
    case: &'a Case,
    noise: DMatrix<f64>,
    planned: Box<dyn Transform>,
    moments: Moments,
    whole: DMatrix<f64>,
}

impl<'a> Bench<'a> {
    fn new(case: &'a Case, method: &MethodSpec) -> Option<Self> {
        let (a, p) = (case.marginal().law().dimension(), case.sensor().outputs().len());
        method.method().serves(case.sensor()).ok()?;
        Some(Self {
            case,
            noise: case.noise_or_zero(),
            planned: method.plan(a, p).ok()?,
            moments: Moments::zeros(a, p),
            whole: DMatrix::zeros(case.prior().dimension(), p),
        })
    }

    fn once(&mut self) {
        let marginal = self.case.marginal();
        let problem = Problem { sensor: self.case.sensor(), prior: marginal.law(), noise: &self.noise };
        self.planned.apply(black_box(problem), &mut self.moments);
        marginal.lift_into(&self.moments.cross_covariance, &mut self.whole);
        black_box((&self.moments, &self.whole));
    }

    /// Time of one transform \[ns\], over a batch of `batch`.
    fn time(&mut self, batch: u32) -> f64 {
        let clock = Instant::now();
        for _ in 0..batch {
            self.once();
        }
        clock.elapsed().as_secs_f64() * 1e9 / f64::from(batch)
    }

    /// As [`Bench::time`], after transforms that are not timed: what ran before has left caches and branch predictors to
    /// itself, and with a rule of many nodes before it a first-order Taylor transform alone took eighteen times its time.
    fn warmed(&mut self, pace: Pace) -> f64 {
        for _ in 0..pace.warm_up {
            self.once();
        }
        self.time(pace.batch)
    }

    /// How to time it, found by trying; the better of two tries, for the first is a cold one.
    fn pace(&mut self) -> Pace {
        Pace::of(|batch| self.time(batch).min(self.time(batch)))
    }
}

/// How many transforms are run before a batch, and in it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Pace {
    warm_up: u32,
    batch: u32,
}

impl Pace {
    /// For transforms of which each takes `time` \[ns\] in a batch of so many: the batch is long enough for the clock. One
    /// that is long warms itself.
    fn of(mut time: impl FnMut(u32) -> f64) -> Self {
        let nanoseconds = |duration: Duration| duration.as_secs_f64() * 1e9;
        let mut batch = 1;
        let each = loop {
            let each = time(batch);
            if each * f64::from(batch) >= nanoseconds(BATCH) || batch >= 1 << 20 {
                break each;
            }
            batch *= 2;
        };
        let warm_up = if each >= nanoseconds(WARMS_ITSELF) { 0 } else { batch.div_ceil(WARM_UP_SHARE) };
        Self { warm_up, batch }
    }
}

fn time_case(case: &Case, methods: &[MethodSpec]) -> Vec<Option<Cost>> {
    let Ok(baseline) = MethodSpec::parse(BASELINE) else { return vec![None; methods.len()] };
    // The baseline once: where it is among the methods, what is measured of it is the unit, too.
    let mut timed = methods.to_vec();
    let unit = timed.iter().position(|m| m.label() == baseline.label()).unwrap_or_else(|| {
        timed.push(baseline);
        methods.len()
    });
    let mut benches: Vec<Option<(Bench<'_>, Pace)>> = timed
        .iter()
        .map(|method| {
            let mut bench = Bench::new(case, method)?;
            let pace = bench.pace();
            Some((bench, pace))
        })
        .collect();
    let mut costs = in_turn(benches.len(), unit, |m| {
        let (bench, pace) = benches[m].as_mut()?;
        Some(bench.warmed(*pace))
    });
    costs.truncate(methods.len());
    costs
}

/// Costs by `time` \[ns\] of each of `count`, asked in turn, round by round, as a ratio to that of `unit` in the same round;
/// `None` where either has no time.
fn in_turn(count: usize, unit: usize, mut time: impl FnMut(usize) -> Option<f64>) -> Vec<Option<Cost>> {
    let mut times = vec![Vec::with_capacity(ROUNDS); count];
    let mut ratios = times.clone();
    for _ in 0..ROUNDS {
        let round: Vec<Option<f64>> = (0..count).map(&mut time).collect();
        for (m, time) in round.iter().enumerate() {
            if let (Some(time), Some(unit)) = (time, round[unit]) {
                times[m].push(*time);
                ratios[m].push(time / unit);
            }
        }
    }
    times
        .into_iter()
        .zip(ratios)
        .map(|(times, ratios)| Some(Cost { nanoseconds: Quartiles::of(times)?, ratio: Quartiles::of(ratios)? }))
        .collect()
}

fn throughput(cases: &[&Case], method: &MethodSpec) -> Option<f64> {
    let rates: Vec<f64> = rayon::broadcast(|_| {
        let mut benches: Vec<Bench<'_>> = cases.iter().filter_map(|case| Bench::new(case, method)).collect();
        if benches.is_empty() {
            return 0.0;
        }
        let clock = Instant::now();
        let mut done = 0u64;
        while clock.elapsed() < THROUGHPUT_TIME {
            for bench in &mut benches {
                bench.once();
            }
            done += benches.len() as u64;
        }
        done as f64 / clock.elapsed().as_secs_f64()
    });
    let total: f64 = rates.iter().sum();
    (total > 0.0).then_some(total)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Definition 7 as Hyndman and Fan (1996) write it: with m = 1 - s, j = floor(n s + m) and g = n s + m - j,
    /// Q(s) = (1 - g) x_(j) + g x_(j+1).
    fn definition_7(sorted: &[f64], share: f64) -> f64 {
        let place = sorted.len() as f64 * share + 1.0 - share;
        let (j, g) = (place.floor(), place.fract());
        let order = |k: f64| sorted[(k as usize - 1).min(sorted.len() - 1)];
        (1.0 - g) * order(j) + g * order(j + 1.0)
    }

    #[test]
    fn quartiles_are_those_of_definition_7() {
        // Two roundings of values up to 200.
        const ROUNDING: f64 = 1e-13;
        for n in 1..=12_u32 {
            let sorted: Vec<f64> = (1..=n).map(|k| f64::from(k * k)).collect();
            let found = Quartiles::of(sorted.iter().rev().copied().collect()).unwrap();
            for (value, share) in [(found.lower, 0.25), (found.median, 0.5), (found.upper, 0.75)] {
                let expected = definition_7(&sorted, share);
                assert!((value - expected).abs() <= ROUNDING, "{n} values, {share}: {value}, not {expected}");
            }
        }
    }

    #[test]
    fn quartiles_are_those_of_a_worked_example() {
        // Of 1 to 10, by hand from definition 7: 1 + 9/4, 1 + 9/2, 1 + 27/4.
        let found = Quartiles::of((1..=10).rev().map(f64::from).collect());
        assert_eq!(found, Some(Quartiles { lower: 3.25, median: 5.5, upper: 7.75 }));
        assert_eq!(Quartiles::of(Vec::new()), None);
    }

    /// A machine on which method `m` takes `times[m]` in a batch, all of them longer from round to round.
    fn slowing(times: &[Option<f64>]) -> impl FnMut(usize) -> Option<f64> + '_ {
        let mut asked = 0;
        move |m| {
            let round = asked / times.len();
            asked += 1;
            times[m].map(|time| time * (1.0 + round as f64))
        }
    }

    #[test]
    fn a_ratio_is_to_the_unit_of_its_round_in_any_order() {
        let orders = [[0, 1, 2, 3], [3, 2, 1, 0], [2, 0, 3, 1]];
        for order in orders {
            let times = order.map(|method| [Some(8.0), Some(32.0), Some(8e6), None][method]);
            let unit = order.iter().position(|&method| method == 0).unwrap();
            let costs = in_turn(4, unit, slowing(&times));
            let alike = |v| Quartiles { lower: v, median: v, upper: v };
            for (method, ratio) in [Some(1.0), Some(4.0), Some(1e6), None].into_iter().enumerate() {
                let place = order.iter().position(|&m| m == method).unwrap();
                assert_eq!(costs[place].map(|cost| cost.ratio), ratio.map(alike), "{order:?}: method {method}");
            }
            // Rounds 1 to 11 times 8 ns: the sixth.
            assert_eq!(costs[unit].unwrap().nanoseconds.median, 48.0);
        }
        assert_eq!(in_turn(2, 1, |m| (m == 0).then_some(1.0)), [None, None], "no unit, no ratio");
    }

    #[test]
    fn first_order_taylor_is_its_own_unit_wherever_it_stands() {
        let text = "[sensor]\nkind = \"range-only\"\nstation = [0, 0]\n[prior]\nmean = [3, 4]\nsd = [1, 1]\n";
        let suite = Suite::from_text("near", "near.toml", text, None).unwrap();
        for labels in [&["taylor-1", "gauss-hermite:order=15"][..], &["gauss-hermite:order=15", "taylor-1"]] {
            let methods: Vec<_> = labels.iter().map(|label| MethodSpec::parse(label).unwrap()).collect();
            let timing = time_methods(&suite, &methods);
            let at = labels.iter().position(|&label| label == BASELINE).unwrap();
            let one = Quartiles { lower: 1.0, median: 1.0, upper: 1.0 };
            assert_eq!(timing.cases[0].1[at].unwrap().ratio, one, "the same measurement, not one like it");
            assert_eq!(timing.ratio[at], Some(one));
        }
        let without = time_methods(&suite, &[MethodSpec::parse("unscented").unwrap()]);
        assert!(without.cases[0].1.len() == 1 && without.ratio[0].is_some());
    }

    #[test]
    fn what_is_short_is_warmed_and_repeated() {
        let pace = |each: f64| Pace::of(move |_| each);
        assert_eq!(pace(100.0), Pace { warm_up: 16, batch: 128 });
        assert_eq!(pace(9e3), Pace { warm_up: 1, batch: 2 });
        assert_eq!(pace(5e4), Pace { warm_up: 1, batch: 1 });
        assert_eq!(pace(3e6), Pace { warm_up: 0, batch: 1 });
        assert_eq!(Pace::of(|_| 0.0), Pace { warm_up: 1 << 17, batch: 1 << 20 }, "a clock that stands still");
    }
}
