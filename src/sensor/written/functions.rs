//! The functions and constants that a formula knows. A new one is one line in a table here.

use super::program::{Program, Step};

/// A function of a formula.
#[derive(Debug, Clone, Copy)]
pub(super) struct Function {
    pub name: &'static str,
    /// How many arguments it takes; `None` for two or more.
    pub arguments: Option<usize>,
    /// Appends its steps.
    pub compile: fn(&mut Program, &[usize]) -> usize,
}

/// Constants by name.
pub(super) const CONSTANTS: &[(&str, f64)] = &[("pi", std::f64::consts::PI), ("e", std::f64::consts::E)];

/// The function that chooses between two values: its first argument is a condition, which no other function takes.
pub(super) const IF: &str = "if";

macro_rules! unary {
    ($name:literal, $step:ident) => {
        Function { name: $name, arguments: Some(1), compile: |p, a| p.push(Step::$step(a[0])) }
    };
}

macro_rules! binary {
    ($name:literal, $step:ident) => {
        Function { name: $name, arguments: Some(2), compile: |p, a| p.push(Step::$step(a[0], a[1])) }
    };
}

/// Every function but `if`. Angles are radians.
pub(super) const FUNCTIONS: &[Function] = &[
    unary!("sqrt", Sqrt),
    unary!("sin", Sin),
    unary!("cos", Cos),
    unary!("tan", Tan),
    unary!("exp", Exp),
    unary!("ln", Ln),
    unary!("tanh", Tanh),
    unary!("abs", Abs),
    binary!("atan2", Atan2),
    binary!("hypot", Hypot),
    Function { name: "log10", arguments: Some(1), compile: |p, a| log10(p, a[0]) },
    Function { name: "asin", arguments: Some(1), compile: |p, a| asin(p, a[0]) },
    Function { name: "acos", arguments: Some(1), compile: |p, a| acos(p, a[0]) },
    Function { name: "atan", arguments: Some(1), compile: |p, a| atan(p, a[0]) },
    Function { name: "sinh", arguments: Some(1), compile: |p, a| sinh(p, a[0]) },
    Function { name: "cosh", arguments: Some(1), compile: |p, a| cosh(p, a[0]) },
    Function { name: "min", arguments: None, compile: |p, a| fold(p, a, |p, a, b| extreme(p, a, b, [a, b])) },
    Function { name: "max", arguments: None, compile: |p, a| fold(p, a, |p, a, b| extreme(p, a, b, [b, a])) },
];

/// ln(a) / ln(10).
fn log10(p: &mut Program, a: usize) -> usize {
    let (ln, ten) = (p.push(Step::Ln(a)), p.push(Step::Constant(std::f64::consts::LN_10)));
    p.push(Step::Divide(ln, ten))
}

/// sqrt((1 - a) (1 + a)), which keeps its digits near +-1; NaN beyond.
fn other_leg(p: &mut Program, a: usize) -> usize {
    let one = p.push(Step::Constant(1.0));
    let (less, more) = (p.push(Step::Subtract(one, a)), p.push(Step::Add(one, a)));
    let square = p.push(Step::Multiply(less, more));
    p.push(Step::Sqrt(square))
}

fn asin(p: &mut Program, a: usize) -> usize {
    let leg = other_leg(p, a);
    p.push(Step::Atan2(a, leg))
}

fn acos(p: &mut Program, a: usize) -> usize {
    let leg = other_leg(p, a);
    p.push(Step::Atan2(leg, a))
}

fn atan(p: &mut Program, a: usize) -> usize {
    let one = p.push(Step::Constant(1.0));
    p.push(Step::Atan2(a, one))
}

/// (e^a + e^-a) / 2.
fn cosh(p: &mut Program, a: usize) -> usize {
    let minus = p.push(Step::Negate(a));
    let (up, down) = (p.push(Step::Exp(a)), p.push(Step::Exp(minus)));
    let (sum, half) = (p.push(Step::Add(up, down)), p.push(Step::Constant(0.5)));
    p.push(Step::Multiply(sum, half))
}

/// tanh(a) cosh(a): the difference of two exponentials would lose its digits near zero.
fn sinh(p: &mut Program, a: usize) -> usize {
    let (ratio, cosh) = (p.push(Step::Tanh(a)), cosh(p, a));
    p.push(Step::Multiply(ratio, cosh))
}

/// The first of `order` where a < b, the second where b <= a, and NaN where either is NaN.
fn extreme(p: &mut Program, a: usize, b: usize, [where_less, else_where]: [usize; 2]) -> usize {
    let sum = p.push(Step::Add(a, b));
    let rest = p.push(Step::IfAtMost([b, a, else_where, sum]));
    p.push(Step::IfLess([a, b, where_less, rest]))
}

fn fold(p: &mut Program, all: &[usize], two: fn(&mut Program, usize, usize) -> usize) -> usize {
    all[1..].iter().fold(all[0], |so_far, &next| two(p, so_far, next))
}
