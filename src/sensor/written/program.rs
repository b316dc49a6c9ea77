use smallvec::SmallVec;

use crate::lanes::{Lanes, Simd};
use crate::sensor::Number;

/// One step of a program; places are those of earlier steps.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Step {
    Input(usize),
    Constant(f64),
    Add(usize, usize),
    Subtract(usize, usize),
    Multiply(usize, usize),
    Divide(usize, usize),
    Negate(usize),
    Sqrt(usize),
    Sin(usize),
    Cos(usize),
    Tan(usize),
    Exp(usize),
    Ln(usize),
    Tanh(usize),
    Abs(usize),
    Atan2(usize, usize),
    Hypot(usize, usize),
    /// A whole power.
    Powi(usize, i32),
    /// A constant power that is not whole.
    Powf(usize, f64),
    /// If the first is less than the second, the third, else the fourth.
    IfLess([usize; 4]),
    IfAtMost([usize; 4]),
}

/// Formulas as a list of steps without a jump, which any [`Number`] runs: one point, eight in lanes, or dual numbers.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Program {
    steps: Vec<Step>,
    /// Places of the outputs' values (p).
    results: Vec<usize>,
}

impl Program {
    /// Appends a step, unless an equal one stands there already or its value is known now, and returns its place.
    pub fn push(&mut self, step: Step) -> usize {
        let step = self.simplified(step);
        if let Step::Add(a, _) | Step::Subtract(a, _) | Step::Multiply(a, _) | Step::Divide(a, _) = step
            && self.changes_nothing(step)
        {
            return a;
        }
        // Constants by their bits: zero has two signs.
        let same = |known: Step| match (known, step) {
            (Step::Constant(a), Step::Constant(b)) => a.to_bits() == b.to_bits(),
            _ => known == step,
        };
        if let Some(place) = self.steps.iter().position(|&known| same(known)) {
            return place;
        }
        self.steps.push(step);
        self.steps.len() - 1
    }

    /// The value at `place` if it does not depend on an input.
    pub fn constant(&self, place: usize) -> Option<f64> {
        match self.steps[place] {
            Step::Constant(value) => Some(value),
            _ => None,
        }
    }

    /// x - 0, x * 1 and x / 1 are x for every x, its sign included; x + 0 is not, for x = -0.
    fn changes_nothing(&self, step: Step) -> bool {
        let is = |place, value: f64| self.constant(place).is_some_and(|c| c.to_bits() == value.to_bits());
        match step {
            Step::Subtract(_, b) => is(b, 0.0),
            Step::Multiply(_, b) | Step::Divide(_, b) => is(b, 1.0),
            _ => false,
        }
    }

    /// The constant that the step gives, if all that it needs is constant.
    fn simplified(&self, step: Step) -> Step {
        if matches!(step, Step::Input(_) | Step::Constant(_)) || !step.needs().all(|p| self.constant(p).is_some()) {
            return step;
        }
        Step::Constant(step.value(&[], |place| self.constant(place).unwrap_or(f64::NAN)))
    }

    /// Makes the values at `results` the outputs and drops every step that none of them needs. Returns the inputs that are
    /// left, rising; the program then reads these only, in this order.
    pub fn finish(&mut self, results: &[usize]) -> Vec<usize> {
        let mut needed = vec![false; self.steps.len()];
        results.iter().for_each(|&r| needed[r] = true);
        for place in (0..self.steps.len()).rev().filter(|&p| needed[p]).collect::<Vec<_>>() {
            mark(&self.steps, place, &mut needed);
        }
        let mut inputs: Vec<usize> = self
            .steps
            .iter()
            .zip(&needed)
            .filter_map(|(step, &needed)| match step {
                Step::Input(i) if needed => Some(*i),
                _ => None,
            })
            .collect();
        inputs.sort_unstable();
        let mut moved = vec![usize::MAX; self.steps.len()];
        let mut steps = Vec::new();
        for (place, step) in self.steps.iter().enumerate().filter(|(place, _)| needed[*place]) {
            moved[place] = steps.len();
            steps.push(step.moved(&moved, &inputs));
        }
        self.results = results.iter().map(|&r| moved[r]).collect();
        self.steps = steps;
        inputs
    }

    /// [`Program::run`] at `length` points, a multiple of eight, one array a coordinate: each step for all points before the
    /// next, so that telling the steps apart costs next to nothing.
    #[inline(always)]
    pub fn run_block<S: Simd>(&self, length: usize, x: &[f64], y: &mut [f64]) {
        if length == 0 {
            return;
        }
        let mut values = vec![0.0; self.steps.len() * length];
        for (place, &step) in self.steps.iter().enumerate() {
            let (known, rest) = values.split_at_mut(place * length);
            let known = Known { steps: &self.steps, x, values: known, length };
            step.run_block::<S>(&known, &mut rest[..length]);
        }
        let known = Known { steps: &self.steps, x, values: &values, length };
        for (y, &place) in y.chunks_exact_mut(length).zip(&self.results) {
            y.copy_from_slice(known.column(place));
        }
    }

    /// Writes the outputs' values at the inputs `x` into `y`.
    #[inline(always)]
    pub fn run<T: Number>(&self, x: &[T], y: &mut [T]) {
        let mut values: SmallVec<[T; 32]> = SmallVec::with_capacity(self.steps.len());
        for step in &self.steps {
            let value = step.value(x, |place| values[place]);
            values.push(value);
        }
        for (y, &place) in y.iter_mut().zip(&self.results) {
            *y = values[place];
        }
    }
}

/// Marks what the step at `place` needs, and all that that needs; steps need earlier ones only.
fn mark(steps: &[Step], place: usize, needed: &mut [bool]) {
    let mut open = vec![place];
    while let Some(place) = open.pop() {
        for need in steps[place].needs() {
            if !needed[need] {
                needed[need] = true;
                open.push(need);
            }
        }
    }
}

/// The values of earlier steps at every point of a block; an input's stand in the block itself.
struct Known<'a> {
    steps: &'a [Step],
    x: &'a [f64],
    values: &'a [f64],
    length: usize,
}

impl Known<'_> {
    #[inline(always)]
    fn column(&self, place: usize) -> &[f64] {
        let (all, at) = match self.steps[place] {
            Step::Input(i) => (self.x, i),
            _ => (self.values, place),
        };
        &all[at * self.length..(at + 1) * self.length]
    }

    #[inline(always)]
    fn eights(&self, place: usize) -> &[[f64; 8]] {
        self.column(place).as_chunks().0
    }
}

impl Step {
    /// Writes its value at every point of a block.
    ///
    /// Loops in a macro: a closure is not compiled for the vector instructions of its caller.
    #[inline(always)]
    fn run_block<S: Simd>(self, known: &Known<'_>, out: &mut [f64]) {
        let out = out.as_chunks_mut().0;
        macro_rules! each {
            ($a:expr, |$x:ident| $value:expr) => {
                for (out, a) in out.iter_mut().zip(known.eights($a)) {
                    let $x = Lanes::<S>::from_array(a);
                    *out = ($value).to_array();
                }
            };
            ($a:expr, $b:expr, |$x:ident, $y:ident| $value:expr) => {
                for ((out, a), b) in out.iter_mut().zip(known.eights($a)).zip(known.eights($b)) {
                    let ($x, $y) = (Lanes::<S>::from_array(a), Lanes::<S>::from_array(b));
                    *out = ($value).to_array();
                }
            };
        }
        macro_rules! choose {
            ([$a:expr, $b:expr, $yes:expr, $no:expr], $choose:ident) => {
                let compared = known.eights($a).iter().zip(known.eights($b));
                let chosen = known.eights($yes).iter().zip(known.eights($no));
                for (out, ((a, b), (yes, no))) in out.iter_mut().zip(compared.zip(chosen)) {
                    let [a, b, yes, no] = [a, b, yes, no].map(Lanes::<S>::from_array);
                    *out = Number::$choose(a, b, yes, no).to_array();
                }
            };
        }
        match self {
            // Its column is the block's own.
            Self::Input(_) => {}
            Self::Constant(value) => out.fill([value; 8]),
            Self::Add(a, b) => each!(a, b, |x, y| x + y),
            Self::Subtract(a, b) => each!(a, b, |x, y| x - y),
            Self::Multiply(a, b) => each!(a, b, |x, y| x * y),
            Self::Divide(a, b) => each!(a, b, |x, y| x / y),
            Self::Negate(a) => each!(a, |x| -x),
            Self::Sqrt(a) => each!(a, |x| x.sqrt()),
            Self::Sin(a) => each!(a, |x| x.sin()),
            Self::Cos(a) => each!(a, |x| x.cos()),
            Self::Tan(a) => each!(a, |x| x.tan()),
            Self::Exp(a) => each!(a, |x| x.exp()),
            Self::Ln(a) => each!(a, |x| x.ln()),
            Self::Tanh(a) => each!(a, |x| x.tanh()),
            Self::Abs(a) => each!(a, |x| x.abs()),
            Self::Atan2(a, b) => each!(a, b, |y, x| y.atan2(x)),
            Self::Hypot(a, b) => each!(a, b, |x, y| x.hypot(y)),
            Self::Powi(a, n) => each!(a, |x| x.powi(n)),
            Self::Powf(a, n) => each!(a, |x| Number::powf(x, n)),
            Self::IfLess([a, b, yes, no]) => {
                choose!([a, b, yes, no], if_less);
            }
            Self::IfAtMost([a, b, yes, no]) => {
                choose!([a, b, yes, no], if_at_most);
            }
        }
    }

    fn needs(self) -> impl Iterator<Item = usize> {
        let places: SmallVec<[usize; 4]> = match self {
            Self::Input(_) | Self::Constant(_) => SmallVec::new(),
            Self::Add(a, b)
            | Self::Subtract(a, b)
            | Self::Multiply(a, b)
            | Self::Divide(a, b)
            | Self::Atan2(a, b)
            | Self::Hypot(a, b) => SmallVec::from_slice(&[a, b]),
            Self::Negate(a)
            | Self::Sqrt(a)
            | Self::Sin(a)
            | Self::Cos(a)
            | Self::Tan(a)
            | Self::Exp(a)
            | Self::Ln(a)
            | Self::Tanh(a)
            | Self::Abs(a)
            | Self::Powi(a, _)
            | Self::Powf(a, _) => SmallVec::from_slice(&[a]),
            Self::IfLess(all) | Self::IfAtMost(all) => SmallVec::from_slice(&all),
        };
        places.into_iter()
    }

    /// The same step where places and inputs have moved.
    fn moved(self, places: &[usize], inputs: &[usize]) -> Self {
        let at = |place: usize| places[place];
        match self {
            Self::Input(i) => Self::Input(inputs.iter().position(|&k| k == i).unwrap_or(usize::MAX)),
            Self::Constant(value) => Self::Constant(value),
            Self::Add(a, b) => Self::Add(at(a), at(b)),
            Self::Subtract(a, b) => Self::Subtract(at(a), at(b)),
            Self::Multiply(a, b) => Self::Multiply(at(a), at(b)),
            Self::Divide(a, b) => Self::Divide(at(a), at(b)),
            Self::Negate(a) => Self::Negate(at(a)),
            Self::Sqrt(a) => Self::Sqrt(at(a)),
            Self::Sin(a) => Self::Sin(at(a)),
            Self::Cos(a) => Self::Cos(at(a)),
            Self::Tan(a) => Self::Tan(at(a)),
            Self::Exp(a) => Self::Exp(at(a)),
            Self::Ln(a) => Self::Ln(at(a)),
            Self::Tanh(a) => Self::Tanh(at(a)),
            Self::Abs(a) => Self::Abs(at(a)),
            Self::Atan2(a, b) => Self::Atan2(at(a), at(b)),
            Self::Hypot(a, b) => Self::Hypot(at(a), at(b)),
            Self::Powi(a, n) => Self::Powi(at(a), n),
            Self::Powf(a, n) => Self::Powf(at(a), n),
            Self::IfLess(all) => Self::IfLess(all.map(at)),
            Self::IfAtMost(all) => Self::IfAtMost(all.map(at)),
        }
    }

    /// What it gives, `at` telling the values of earlier steps.
    #[inline(always)]
    fn value<T: Number>(self, x: &[T], at: impl Fn(usize) -> T) -> T {
        match self {
            Self::Input(i) => x[i],
            Self::Constant(value) => T::constant(value),
            Self::Add(a, b) => at(a) + at(b),
            Self::Subtract(a, b) => at(a) - at(b),
            Self::Multiply(a, b) => at(a) * at(b),
            Self::Divide(a, b) => at(a) / at(b),
            Self::Negate(a) => -at(a),
            Self::Sqrt(a) => at(a).sqrt(),
            Self::Sin(a) => at(a).sin(),
            Self::Cos(a) => at(a).cos(),
            Self::Tan(a) => at(a).tan(),
            Self::Exp(a) => at(a).exp(),
            Self::Ln(a) => at(a).ln(),
            Self::Tanh(a) => at(a).tanh(),
            Self::Abs(a) => at(a).abs(),
            Self::Atan2(a, b) => at(a).atan2(at(b)),
            Self::Hypot(a, b) => at(a).hypot(at(b)),
            Self::Powi(a, n) => at(a).powi(n),
            Self::Powf(a, n) => at(a).powf(n),
            Self::IfLess([a, b, yes, no]) => at(a).if_less(at(b), at(yes), at(no)),
            Self::IfAtMost([a, b, yes, no]) => at(a).if_at_most(at(b), at(yes), at(no)),
        }
    }
}
