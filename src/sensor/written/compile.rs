use std::collections::{BTreeSet, HashMap};

use pest::Parser;
use pest::error::{ErrorVariant, InputLocation};
use pest::iterators::{Pair, Pairs};

use super::functions::{CONSTANTS, FUNCTIONS, IF};
use super::program::{Program, Step};
use crate::wording::{EXCERPT, is_line_breaking, proposal};

#[derive(pest_derive::Parser)]
#[grammar = "sensor/written/grammar.pest"]
struct Grammar;

/// Longest formula, in bytes: a longer one wants definitions.
const LONGEST: usize = 4096;
/// Most characters of a formula that are shown of a line.
const WIDEST: usize = 80;
/// Deepest nesting of parentheses.
const DEEPEST: usize = 48;
/// Largest size of a whole exponent that is worked by multiplication.
const LARGEST_POWER: f64 = 64.0;

/// What is wrong with a formula, and where in it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Flaw {
    /// Byte at which it shows.
    at: usize,
    message: String,
}

impl Flaw {
    /// The message, and below it the line of the formula with a caret under the place.
    pub fn shown_in(&self, formula: &str) -> String {
        let before = &formula[..self.at];
        let start = before.rfind('\n').map_or(0, |newline| newline + 1);
        let line = formula[start..].lines().next().unwrap_or("");
        let column = before[start..].chars().count();
        let place = match before.matches('\n').count() {
            0 => format!("column {}", column + 1),
            lines => format!("line {}, column {} of the formula", lines + 1, column + 1),
        };
        let line: Vec<char> = line.chars().map(|c| if is_line_breaking(c) { ' ' } else { c }).collect();
        let (line, column) = around(&line, column);
        let blank = " ".repeat(column);
        format!("{place}: {}{EXCERPT}{line}{EXCERPT}{blank}^", self.message)
    }
}

/// The part of a line around a column of it that fits a terminal, and where the column is there.
fn around(line: &[char], column: usize) -> (String, usize) {
    if line.len() <= WIDEST {
        return (line.iter().collect(), column);
    }
    let start = column.saturating_sub(WIDEST / 2).min(line.len() - WIDEST);
    let end = start + WIDEST;
    // Two dots stand for what is not shown.
    let (before, after) = (if start > 0 { ".. " } else { "" }, if end < line.len() { " .." } else { "" });
    let part: String = line[start..end].iter().collect();
    (format!("{before}{part}{after}"), before.len() + column - start)
}

/// Every name in a formula, functions and constants included.
pub(super) fn names_in(text: &str) -> Result<BTreeSet<String>, Flaw> {
    let parsed = parse(text)?;
    let names = parsed.flatten().filter(|pair| pair.as_rule() == Rule::name);
    Ok(names.map(|pair| pair.as_str().to_owned()).collect())
}

fn parse(text: &str) -> Result<Pairs<'_, Rule>, Flaw> {
    check_size(text)?;
    Grammar::parse(Rule::formula, text).map_err(|e| flaw_of(text, &e))
}

/// The expression of a parsed formula, which holds it and the end.
fn expression(mut parsed: Pairs<'_, Rule>) -> Result<Pair<'_, Rule>, Flaw> {
    let expression = parsed.next().and_then(|formula| formula.into_inner().next());
    expression.ok_or_else(|| Flaw { at: 0, message: "is empty".into() })
}

/// What a name or a part of a formula stands for.
#[derive(Debug, Clone)]
enum Value {
    /// Place in the program.
    Number(usize),
    Condition(Condition),
}

#[derive(Debug, Clone)]
enum Condition {
    Less(usize, usize),
    AtMost(usize, usize),
    Not(Box<Condition>),
    And(Box<Condition>, Box<Condition>),
    Or(Box<Condition>, Box<Condition>),
}

/// Compiles formulas into one program; names are added as they become known.
#[derive(Debug, Default)]
pub(super) struct Compiler {
    pub program: Program,
    names: HashMap<String, Value>,
}

impl Compiler {
    /// Makes `name` stand for the value at `place`.
    pub fn define(&mut self, name: &str, place: usize) {
        self.names.insert(name.into(), Value::Number(place));
    }

    /// Makes `name` stand for a formula, or for a condition.
    pub fn definition(&mut self, name: &str, text: &str) -> Result<(), Flaw> {
        let value = self.value(expression(parse(text)?)?)?;
        self.names.insert(name.into(), value);
        Ok(())
    }

    /// Compiles a formula and returns the place of its value.
    pub fn formula(&mut self, text: &str) -> Result<usize, Flaw> {
        self.number(expression(parse(text)?)?)
    }

    fn number(&mut self, pair: Pair<'_, Rule>) -> Result<usize, Flaw> {
        let at = pair.as_span().start();
        match self.value(pair)? {
            Value::Number(place) => Ok(place),
            Value::Condition(_) => Err(Flaw {
                at,
                message: format!("is a condition where a number is needed; write {IF}(condition, a, b)"),
            }),
        }
    }

    fn condition(&mut self, pair: Pair<'_, Rule>) -> Result<Condition, Flaw> {
        let at = pair.as_span().start();
        match self.value(pair)? {
            Value::Condition(condition) => Ok(condition),
            Value::Number(_) => {
                Err(Flaw { at, message: "is a number where a condition is needed; compare it, as in x > 0".into() })
            }
        }
    }

    fn value(&mut self, pair: Pair<'_, Rule>) -> Result<Value, Flaw> {
        let at = pair.as_span().start();
        let rule = pair.as_rule();
        match rule {
            Rule::number => {
                let value = pair.as_str().parse::<f64>().ok().filter(|v| v.is_finite());
                let value = value.ok_or_else(|| Flaw { at, message: "is too large for a number".into() })?;
                Ok(Value::Number(self.program.push(Step::Constant(value))))
            }
            Rule::name => self.name(pair.as_str(), at),
            Rule::call => self.call(pair).map(Value::Number),
            Rule::power => self.power(pair),
            Rule::negation | Rule::signed | Rule::exponent => self.prefixed(pair),
            _ => self.chain(pair),
        }
    }

    fn name(&mut self, name: &str, at: usize) -> Result<Value, Flaw> {
        if let Some(value) = self.names.get(name) {
            return Ok(value.clone());
        }
        if let Some((_, value)) = CONSTANTS.iter().find(|(constant, _)| *constant == name) {
            return Ok(Value::Number(self.program.push(Step::Constant(*value))));
        }
        if name == IF || FUNCTIONS.iter().any(|f| f.name == name) {
            return Err(Flaw { at, message: format!("`{name}` is a function; give its arguments in parentheses") });
        }
        let mut known: Vec<&str> = self.names.keys().map(String::as_str).collect();
        known.extend(CONSTANTS.iter().map(|(name, _)| *name));
        known.sort_unstable();
        let near = proposal(name, known.iter().copied());
        let message = format!("there is no name `{name}` here; {near}known: {}", known.join(", "));
        Err(Flaw { at, message })
    }

    fn call(&mut self, pair: Pair<'_, Rule>) -> Result<usize, Flaw> {
        let at = pair.as_span().start();
        let mut parts = pair.into_inner();
        let name = parts.next().map_or("", |name| name.as_str());
        let arguments: Vec<Pair<'_, Rule>> = parts.collect();
        let wrong = |needed: &str| {
            let given = arguments.len();
            Err(Flaw { at, message: format!("`{name}` takes {needed}, {given} {} given", are(given)) })
        };
        if name == IF {
            let [condition, yes, no] = arguments.as_slice() else {
                return wrong("a condition and two numbers");
            };
            let condition = self.condition(condition.clone())?;
            let (yes, no) = (self.number(yes.clone())?, self.number(no.clone())?);
            return Ok(self.choose(&condition, yes, no));
        }
        let Some(function) = FUNCTIONS.iter().find(|f| f.name == name) else {
            let known = || FUNCTIONS.iter().map(|f| f.name).chain([IF]);
            let near = proposal(name, known());
            let all: Vec<&str> = known().collect();
            let message = if self.names.contains_key(name) {
                format!("`{name}` is no function; write `{name} * (...)` for a product")
            } else {
                format!("there is no function `{name}`; {near}known: {}", all.join(", "))
            };
            return Err(Flaw { at, message });
        };
        match function.arguments {
            Some(1) if arguments.len() != 1 => return wrong("1 argument"),
            Some(n) if arguments.len() != n => return wrong(&format!("{n} arguments")),
            None if arguments.len() < 2 => return wrong("2 arguments or more"),
            _ => {}
        }
        let places = arguments.into_iter().map(|a| self.number(a)).collect::<Result<Vec<_>, _>>()?;
        Ok((function.compile)(&mut self.program, &places))
    }

    /// Signs, or `not`, before something.
    fn prefixed(&mut self, pair: Pair<'_, Rule>) -> Result<Value, Flaw> {
        let (mut minus, mut not, mut prefixes) = (false, false, 0);
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::sign => minus ^= part.as_str() == "-",
                Rule::not => not = !not,
                _ if prefixes == 0 => return self.value(part),
                _ if part.as_rule() == Rule::comparison => {
                    let condition = self.condition(part)?;
                    return Ok(Value::Condition(if not { Condition::Not(condition.into()) } else { condition }));
                }
                _ => {
                    let place = self.number(part)?;
                    return Ok(Value::Number(if minus { self.program.push(Step::Negate(place)) } else { place }));
                }
            }
            prefixes += 1;
        }
        Ok(Value::Number(self.program.push(Step::Constant(f64::NAN))))
    }

    /// A power binds tighter than a sign before it and groups from the right: -2^-3^2 is -(2^(-(3^2))).
    fn power(&mut self, pair: Pair<'_, Rule>) -> Result<Value, Flaw> {
        let mut parts: Vec<Pair<'_, Rule>> = pair.into_inner().collect();
        if parts.len() == 1 {
            return self.value(parts.remove(0));
        }
        let first = self.number(parts.remove(0))?;
        // The sign of an exponent stands before all of the power that follows it.
        let mut bases = vec![(false, first)];
        for exponent in parts {
            let mut minus = false;
            for part in exponent.into_inner() {
                if part.as_rule() == Rule::sign {
                    minus ^= part.as_str() == "-";
                } else {
                    bases.push((minus, self.number(part)?));
                }
            }
        }
        let signed = |p: &mut Program, (minus, place)| if minus { p.push(Step::Negate(place)) } else { place };
        let mut power = bases.pop().map_or(first, |last| signed(&mut self.program, last));
        while let Some((minus, base)) = bases.pop() {
            let raised = self.raise(base, power);
            power = signed(&mut self.program, (minus, raised));
        }
        Ok(Value::Number(power))
    }

    fn raise(&mut self, base: usize, exponent: usize) -> usize {
        let p = &mut self.program;
        match p.constant(exponent) {
            Some(n) if n == n.trunc() && n.abs() <= LARGEST_POWER => p.push(Step::Powi(base, n as i32)),
            Some(n) => p.push(Step::Powf(base, n)),
            None => {
                let ln = p.push(Step::Ln(base));
                let product = p.push(Step::Multiply(exponent, ln));
                p.push(Step::Exp(product))
            }
        }
    }

    /// Operands with operators of one level between them, worked from the left.
    fn chain(&mut self, pair: Pair<'_, Rule>) -> Result<Value, Flaw> {
        let rule = pair.as_rule();
        let mut parts: Vec<Pair<'_, Rule>> = pair.into_inner().collect();
        if parts.len() == 1 {
            return self.value(parts.remove(0));
        }
        let mut parts = parts.into_iter();
        let Some(first) = parts.next() else {
            return Err(Flaw { at: 0, message: "is empty".into() });
        };
        if matches!(rule, Rule::expression | Rule::conjunction) {
            let mut so_far = self.condition(first)?;
            while let (Some(_), Some(next)) = (parts.next(), parts.next()) {
                let (left, right) = (Box::new(so_far), Box::new(self.condition(next)?));
                so_far =
                    if rule == Rule::expression { Condition::Or(left, right) } else { Condition::And(left, right) };
            }
            return Ok(Value::Condition(so_far));
        }
        let mut so_far = self.number(first)?;
        while let (Some(operator), Some(next)) = (parts.next(), parts.next()) {
            let next = self.number(next)?;
            if rule == Rule::comparison {
                return Ok(Value::Condition(Condition::of(operator.as_str(), so_far, next)));
            }
            so_far = self.program.push(match operator.as_str() {
                "+" => Step::Add(so_far, next),
                "-" => Step::Subtract(so_far, next),
                "*" => Step::Multiply(so_far, next),
                _ => Step::Divide(so_far, next),
            });
        }
        Ok(Value::Number(so_far))
    }

    /// `yes` where the condition holds, else `no`; both are worked, and only the values decide.
    fn choose(&mut self, condition: &Condition, yes: usize, no: usize) -> usize {
        match condition {
            Condition::Less(a, b) => self.program.push(Step::IfLess([*a, *b, yes, no])),
            Condition::AtMost(a, b) => self.program.push(Step::IfAtMost([*a, *b, yes, no])),
            Condition::Not(not) => self.choose(not, no, yes),
            Condition::And(left, right) => {
                let both = self.choose(right, yes, no);
                self.choose(left, both, no)
            }
            Condition::Or(left, right) => {
                let either = self.choose(right, yes, no);
                self.choose(left, yes, either)
            }
        }
    }
}

impl Condition {
    fn of(comparator: &str, a: usize, b: usize) -> Self {
        let equal = || Self::And(Self::AtMost(a, b).into(), Self::AtMost(b, a).into());
        match comparator {
            "<" => Self::Less(a, b),
            ">" => Self::Less(b, a),
            "<=" => Self::AtMost(a, b),
            ">=" => Self::AtMost(b, a),
            "==" => equal(),
            _ => Self::Not(equal().into()),
        }
    }
}

fn are(count: usize) -> &'static str {
    if count == 1 { "is" } else { "are" }
}

/// Bounds what a formula may cost before it is read: the reader goes into parentheses by calling itself.
fn check_size(text: &str) -> Result<(), Flaw> {
    if text.len() > LONGEST {
        let at = (0..=LONGEST).rev().find(|&at| text.is_char_boundary(at)).unwrap_or(0);
        return Err(Flaw {
            at,
            message: format!("is longer than {LONGEST} characters; break it up by definitions"),
        });
    }
    let mut depth = 0_usize;
    for (at, c) in text.char_indices() {
        match c {
            '(' => depth += 1,
            ')' => depth = depth.saturating_sub(1),
            _ => {}
        }
        if depth > DEEPEST {
            return Err(Flaw {
                at,
                message: format!("more than {DEEPEST} parentheses stand open; use definitions"),
            });
        }
    }
    Ok(())
}

/// What was expected where the grammar could not go on, in the reader's words.
fn flaw_of(text: &str, e: &pest::error::Error<Rule>) -> Flaw {
    let at = match e.location {
        InputLocation::Pos(at) | InputLocation::Span((at, _)) => at,
    };
    let rest = text[at..].trim_start();
    let is_operator = |rule: &Rule| {
        matches!(rule, Rule::add_sign | Rule::multiply_sign | Rule::comparator | Rule::and | Rule::or | Rule::EOI)
    };
    let wants_operand = matches!(&e.variant, ErrorVariant::ParsingError { positives, .. }
        if !positives.iter().all(is_operator));
    let open = text[..at].matches('(').count() > text[..at].matches(')').count();
    let start = text.len() - rest.len();
    if let Some(message) = foreign(&text[..start], rest, wants_operand) {
        return Flaw { at: start, message };
    }
    let found = match rest.chars().next() {
        None if text.trim().is_empty() => "is empty".to_owned(),
        None => "the formula ends here".to_owned(),
        Some(')') if !open => "`)` closes nothing".to_owned(),
        Some(c) if !wants_operand && (c.is_alphanumeric() || "_.(".contains(c)) => {
            "stands beside what is before it".into()
        }
        Some(c) => format!("`{c}` cannot stand here"),
    };
    let wanted = match (wants_operand, open) {
        (true, _) => "a number, a name, a function or `(` is needed",
        (false, true) => "an operator, `,` or `)` is needed",
        (false, false) => "an operator or the end is needed",
    };
    Flaw { at: start, message: format!("{found}; {wanted}") }
}

/// What to say of the spelling of another language at the beginning of `rest`, if it is one; `before` is what could be read.
fn foreign(before: &str, rest: &str, wants_operand: bool) -> Option<String> {
    let comparator = rest.starts_with(['<', '>']) || rest.starts_with("==") || rest.starts_with("!=");
    let word = rest.starts_with(|c: char| c.is_alphabetic() || c == '_');
    let number = before.trim_end().rsplit(|c: char| !(c.is_alphanumeric() || "_.".contains(c))).next();
    let number = number.filter(|token| token.starts_with(|c: char| c.is_ascii_digit() || c == '.'));
    Some(match rest {
        _ if rest.starts_with('*') && before.ends_with('*') => "a power is written with `^`, as in x^2".into(),
        _ if rest.starts_with('&') => "a condition is joined by `and`, as in x > 0 and y > 0".into(),
        _ if rest.starts_with('|') => "a condition is joined by `or`, as in x > 0 or y > 0".into(),
        _ if rest.starts_with('!') && !comparator => "a condition is turned round by `not`, as in not x > 0".into(),
        _ if rest.starts_with('=') && !comparator => "two numbers are compared by `==`".into(),
        _ if comparator && !wants_operand => "comparisons do not chain; join two, as in 0 < x and x < 3".into(),
        _ if word && !wants_operand => {
            let number = number?;
            format!(
                "a number in a formula has no unit; make the quantity a parameter, as in parameters = {{ limit = \"{number} m\" }}, \
                 or write a product with `*`"
            )
        }
        _ => return None,
    })
}
