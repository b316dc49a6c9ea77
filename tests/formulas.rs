//! Sensors written out as formulas: what they compute, how they are refused, noise inside.

mod common;

use common::random;
use gaussworthy::gaussian::{Marginal, Moments};
use gaussworthy::lanes::Level;
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::reference::{Key, Reference, Sampler, SamplerSettings, Soundness};
use gaussworthy::sensor::{BearingOnly, Derivatives, RangeBearing, Sensor, SensorSpec};
use gaussworthy::suite::{Case, Suite};
use nalgebra::DMatrix;
use rand::RngExt;
use serde_json::{Value, json};

fn sensor(described: Value, n: usize) -> Result<SensorSpec, String> {
    let Value::Object(map) = described else { panic!("a sensor is an object") };
    SensorSpec::from_json(map, n).map_err(|e| e.to_string())
}

/// One output of x, y and z.
fn formula(text: &str) -> Result<SensorSpec, String> {
    sensor(json!({"state": ["x", "y", "z"], "outputs": [{"name": "out", "formula": text}]}), 3)
}

/// The value at (x, y, z), worked point by point; checked against eight points in lanes.
fn value(text: &str, point: [f64; 3]) -> f64 {
    let spec = formula(text).unwrap_or_else(|e| panic!("{text}: {e}"));
    let sensor = spec.sensor();
    let read: Vec<f64> = sensor.reads().iter().map(|&i| point[i]).collect();
    let mut one = [0.0];
    sensor.value(&read, &mut one);
    let columns: Vec<f64> = read.iter().flat_map(|&v| [v; 8]).collect();
    for level in Level::available() {
        let mut eight = [0.0; 8];
        sensor.sample(level, 8, &columns, &mut eight);
        for lane in eight {
            let same = (lane - one[0]).abs() <= 16.0 * f64::EPSILON * one[0].abs().max(1.0);
            assert!(same || lane.is_nan() && one[0].is_nan(), "{text} in lanes: {lane} and {}", one[0]);
        }
    }
    one[0]
}

/// Against Rust's own arithmetic and mathematical library.
#[test]
#[allow(clippy::precedence)]
fn formulas_mean_what_mathematics_means() {
    let (x, y, z) = (0.7_f64, -1.3_f64, 2.5_f64);
    for (text, expected) in [
        ("1 - 2 - 3", -4.0),
        ("8 / 4 / 2", 1.0),
        ("1 + 2 * 3", 7.0),
        ("(1 + 2) * 3", 9.0),
        ("-2 ^ 2", -4.0),
        ("2 ^ 3 ^ 2", 512.0),
        ("2 ^ -1 ^ 2", 0.5),
        ("2 * -3", -6.0),
        ("1 - -1", 2.0),
        ("--x", x),
        (".5e1 + 2. + 1E-1", 7.1),
        ("x*y + z/x - y", x * y + z / x - y),
        ("x^2 + z^-3", x * x + z.powi(-3)),
        ("z^0.5", z.sqrt()),
        ("z^x", z.powf(x)),
        ("2^x", 2_f64.powf(x)),
        ("y^3", y.powi(3)),
        ("sqrt(z) + sin(x) + cos(x) + tan(x)", z.sqrt() + x.sin() + x.cos() + x.tan()),
        ("asin(x) + acos(x) + atan(z)", x.asin() + x.acos() + z.atan()),
        ("atan2(y, x) + hypot(x, y)", y.atan2(x) + x.hypot(y)),
        ("exp(x) + ln(z) + log10(z)", x.exp() + z.ln() + z.log10()),
        ("sinh(x) + cosh(x) + tanh(x) + abs(y)", x.sinh() + x.cosh() + x.tanh() + y.abs()),
        ("sinh(1e-9 * x)", (1e-9 * x).sinh()),
        ("min(x, y, z)", y),
        ("max(x, y, z)", z),
        ("max(x, ln(y))", f64::NAN),
        ("min(ln(y), x)", f64::NAN),
        // Zero has two signs, and directions from it lie half a turn apart.
        ("atan2(0, -1) + atan2(-0, -1) + 0*x", 0.0),
        ("pi + e", std::f64::consts::PI + std::f64::consts::E),
        ("if(x < y, 1, 2)", 2.0),
        ("if(x >= y and not z < 0, 1, 2)", 1.0),
        ("if(x < y or z > 2, x, y)", x),
        ("if(x == x, 1, 2) + if(x != y, 10, 20)", 11.0),
        ("if(not (x < y or z < 0) and y <= -1.3, 1, ln(-1))", 1.0),
        ("if((x) > (0), sqrt(x), sqrt(-x))", x.sqrt()),
    ] {
        let found = value(text, [x, y, z]);
        let same = (found - expected).abs() <= 8.0 * f64::EPSILON * expected.abs().max(1.0);
        assert!(same || found.is_nan() && expected.is_nan(), "{text}: {found}, expected {expected}");
    }
}

/// x^2 y + exp(x) / z where x is positive, else 3 x y; closed forms by hand.
#[test]
fn derivatives_are_exact() {
    let spec = formula("if(x > 0, x^2 * y + exp(x) / z, 3 * x * y)").unwrap();
    let at = |point: [f64; 3]| {
        let mut at = Derivatives::zeros(3, 1);
        spec.sensor().hessians(&point, &mut at);
        at
    };
    let (x, y, z) = (0.7_f64, -1.3, 2.5);
    let (found, e) = (at([x, y, z]), x.exp());
    let gradient = [2.0 * x * y + e / z, x * x, -e / (z * z)];
    let hessian =
        [[2.0 * y + e / z, 2.0 * x, -e / (z * z)], [2.0 * x, 0.0, 0.0], [-e / (z * z), 0.0, 2.0 * e / z.powi(3)]];
    for (i, (slope, bends)) in gradient.iter().zip(&hessian).enumerate() {
        assert!((found.jacobian[(0, i)] - slope).abs() < 1e-14, "slope {i}");
        for (k, bend) in bends.iter().enumerate() {
            assert!((found.hessians[0][(i, k)] - bend).abs() < 1e-14, "bend {i}, {k}");
        }
    }
    let found = at([-x, y, z]);
    assert_eq!(found.jacobian.as_slice(), [3.0 * y, -3.0 * x, 0.0]);
    assert_eq!(found.hessians[0][(0, 1)], 3.0);
}

fn run(sensor: &dyn Sensor, case: &Case, cap: u64) -> Reference {
    let marginal = Marginal::new(case.prior(), sensor.reads());
    let settings = SamplerSettings { precision: 1e-12, cap, ..SamplerSettings::default() };
    let sampler =
        Sampler::of_parts(sensor, case.prior(), &marginal, case.noise_or_zero(), Key::new(1, "same"), settings);
    sampler.unwrap().run()
}

/// A formula is the built-in sensor to the last bit, in references too.
#[test]
fn a_written_range_and_bearing_is_the_built_in_one() {
    let record = |sensor: Value| {
        Case::from_json(json!({
            "case": "ferry", "sensor": sensor,
            "prior": {"mean": [300, 120, 4], "covariance": [[900, 10, 1], [10, 400, 0], [1, 0, 2]]},
            "noise": {"covariance": [[1, 0], [0, 1e-4]]},
        }))
        .unwrap()
    };
    let case = record(json!({
        "state": ["x", "y", "speed"], "parameters": {"sx": 20, "sy": -5},
        "outputs": [
            {"name": "range", "formula": "hypot(x - sx, y - sy)", "unit": "m"},
            {"name": "bearing", "formula": "atan2(y - sy, x - sx)", "angular": true},
        ],
    }));
    let built_in = RangeBearing::new(vec![[20.0, -5.0]], [0, 1], 3).unwrap();
    assert_eq!(Sensor::outputs(case.sensor()), Sensor::outputs(&built_in));
    assert_eq!(Sensor::reads(case.sensor()), [0, 1], "what no formula needs is not read");
    let (written, own) = (run(case.sensor(), &case, 1 << 16), run(&built_in, &case, 1 << 16));
    assert_eq!(written.moments, own.moments);
    assert_eq!(written.standard_error, own.standard_error);
    // A part of the outputs reads what it needs.
    assert_eq!(Sensor::reads(&BearingOnly::new(vec![[0.0, 0.0]], [1, 0], 3).unwrap()), [1, 0]);
}

#[test]
fn a_written_case_reads_back_as_it_was() {
    let record = json!({
        "case": "echo",
        "sensor": {
            "state": ["x"], "parameters": {"gain": 2.5}, "noise": ["v"], "definitions": {"twice": "2 * x"},
            "outputs": [{"name": "level", "formula": "gain * twice * (1 + v)", "unit": "dB"}],
        },
        "prior": {"mean": [1.0], "covariance": [[0.5]]},
        "noise": {"covariance": [[0.25]], "inside": {"covariance": [[0.04]]}},
    });
    let case = Case::from_json(record.clone()).unwrap();
    assert_eq!(case.to_json(), record);
    assert_eq!(case.noise_inside(), Some(&DMatrix::from_element(1, 1, 0.04)));
}

#[test]
fn a_flaw_is_shown_where_it_is() {
    for (text, message, caret) in [
        ("x + ", "the formula ends here; a number, a name, a function or `(` is needed", 4),
        ("", "is empty; a number, a name, a function or `(` is needed", 0),
        ("x y", "stands beside what is before it; an operator or the end is needed", 2),
        ("2 (x)", "stands beside what is before it; an operator or the end is needed", 2),
        ("(x", "the formula ends here; an operator, `,` or `)` is needed", 2),
        ("x)", "`)` closes nothing; an operator or the end is needed", 1),
        ("x # y", "`#` cannot stand here; an operator or the end is needed", 2),
        ("x * * y", "`*` cannot stand here; a number, a name, a function or `(` is needed", 4),
        ("x + speed", "there is no name `speed` here; known: e, pi, x, y, z", 4),
        ("sqr(x)", "there is no function `sqr`; did you mean `sqrt`? known: ", 0),
        ("1 + x(2)", "`x` is no function; write `x * (...)` for a product", 4),
        ("1 + sin", "`sin` is a function; give its arguments in parentheses", 4),
        ("atan2(x)", "`atan2` takes 2 arguments, 1 is given", 0),
        ("sin(x, y)", "`sin` takes 1 argument, 2 are given", 0),
        ("min(x)", "`min` takes 2 arguments or more, 1 is given", 0),
        ("if(x, 1, 2)", "is a number where a condition is needed; compare it, as in x > 0", 3),
        ("if(x < y, 1)", "`if` takes a condition and two numbers, 2 are given", 0),
        ("1 + (x < y)", "is a condition where a number is needed; write if(condition, a, b)", 4),
        ("x < y < z", "`<` cannot stand here; an operator or the end is needed", 6),
        ("1e999", "is too large for a number", 0),
        ("2 * \u{fc}", "`\u{fc}` cannot stand here; a number, a name, a function or `(` is needed", 4),
    ] {
        let error = formula(text).unwrap_err();
        let start = format!("outputs[0].formula: column {}: {message}", caret + 1);
        assert!(error.starts_with(&start), "{text:?}:\n{error}\nexpected\n{start}");
        let lines: Vec<&str> = error.lines().collect();
        assert_eq!(
            lines[lines.len() - 2..],
            [format!("    {text}"), format!("    {}^", " ".repeat(caret))],
            "{error}"
        );
    }
    let error = formula("x +\n  y * w").unwrap_err();
    assert!(error.contains("line 2, column 7 of the formula: there is no name `w`"), "{error}");
    assert!(error.ends_with("\n      y * w\n          ^"), "{error}");
}

#[test]
fn what_is_around_a_formula_is_checked() {
    let outputs = json!([{"name": "out", "formula": "x"}]);
    for (described, message) in [
        (json!({"state": ["x", "y"], "outputs": outputs}), "state: names 2 components; the prior has 1"),
        (json!({"state": ["2x"], "outputs": outputs}), "state[0]: \"2x\" is no name; give a letter or `_`"),
        (
            json!({"state": ["sin"], "outputs": outputs}),
            "state[0]: `sin` means something in every formula; rename it",
        ),
        (
            json!({"state": ["x"], "parameters": {"x": 1}, "outputs": outputs}),
            "parameters.x: `x` is also the name of state[0]; rename one",
        ),
        (json!({"state": ["x"], "outputs": []}), "outputs: give at least one output"),
        (json!({"state": ["x"], "outputs": outputs, "unit": "m"}), "unit: unknown key `unit`; "),
        (json!({"state": ["x"], "outputs": [{"name": "out"}]}), "outputs[0]: `formula` is missing"),
        (
            json!({"state": ["x"], "outputs": [{"name": "out", "formula": "x", "unit": "deg", "angular": true}]}),
            "outputs[0].unit: is \"deg\", but an angular output is in \"rad\"",
        ),
        (
            json!({"state": ["x"], "definitions": {"a": "b", "b": "c + 1", "c": "a"}, "outputs": outputs}),
            "definitions.a: goes round in a circle: `a`, `b`, `c` need each other",
        ),
        (
            json!({"state": ["x"], "definitions": {"a": "q"}, "outputs": outputs}),
            "definitions.a: column 1: there is no",
        ),
    ] {
        let error = sensor(described.clone(), 1).unwrap_err();
        assert!(error.starts_with(message), "{described}:\n{error}\nexpected\n{message}");
    }
}

/// A suite says the line of the file, and the caret reaches the reader.
#[test]
fn a_flaw_in_a_suite_has_its_line() {
    let suite = |formula: &str| {
        let text = format!(
            "[sensor]\nstate = [\"x\"]\n[sensor.parameters]\nreach = \"2 km\"\n[[sensor.outputs]]\nname = \"share\"\n\
             formula = \"{formula}\"\n[prior]\nmean = [500]\nsd = [10]\n"
        );
        Suite::from_text("echo", "echo.toml", &text, None)
    };
    let mut y = [0.0];
    suite("x / reach").unwrap().cases[0].sensor().value(&[500.0], &mut y);
    assert_eq!(y, [0.25], "a parameter is in its base unit");
    let error = suite("x / raech").unwrap_err().to_string();
    assert!(
        error.starts_with("echo.toml:7: sensor.outputs[0].formula: column 5: there is no name `raech` here; did")
    );
    assert!(error.ends_with("\n    x / raech\n        ^"), "{error}");
}

/// Whatever a stranger writes is read or refused: never a panic, never a stack overflow.
#[test]
fn no_formula_harms() {
    let deep = |open: &str, close: &str, count: usize| format!("{}x{}", open.repeat(count), close.repeat(count));
    for text in [
        deep("(", ")", 20_000),
        deep("sin(", ")", 900),
        deep("if(x > 0, ", ", 1)", 300),
        deep("-", "", 4000),
        deep("not ", "", 900),
        deep("", "^x", 1500),
        deep("", "^-x", 1000),
        "x".repeat(5000),
        "\u{1F6A2}".repeat(2000),
        format!("{}1", "(".repeat(47)),
    ] {
        let _ = formula(&text);
    }
    let pieces = [
        "x", "y", "(", ")", "+", "-", "*", "/", "^", ",", "1", "2.5e3", "sin", "if", "<", ">=", "and", "not ",
        "or", "==", " ", "\n", "min", "e", ".", "\u{e9}", "1e400", "pi", "=", "atan2(",
    ];
    let mut rng = random::stream(12);
    let mut read = 0;
    for _ in 0..30_000 {
        let count = rng.random_range(1..12);
        let text: String = (0..count).map(|_| pieces[rng.random_range(0..pieces.len())]).collect();
        if let Ok(spec) = formula(&text) {
            let mut y = [0.0];
            let x = vec![0.5; spec.sensor().reads().len()];
            spec.sensor().value(&x, &mut y);
            read += 1;
        }
    }
    assert!(read > 300, "only {read} formulas were read");
}

fn case(sensor: Value, prior: Value, noise: Value) -> Case {
    Case::from_json(json!({"case": "echo", "sensor": sensor, "prior": prior, "noise": noise})).unwrap()
}

fn moments_of(method: &str, case: &Case) -> Moments {
    let (a, p) = (case.sensor().reads().len(), case.sensor().outputs().len());
    let mut moments = Moments::zeros(a, p);
    let spec = MethodSpec::parse(method).unwrap();
    let mut transform = spec.plan(a, p).unwrap();
    let (sensor, prior, noise) = (case.sensor(), case.marginal().law(), case.noise_or_zero());
    transform.apply(Problem { sensor, prior, noise: &noise }, &mut moments);
    Moments { cross_covariance: case.marginal().lift(moments.cross_covariance), ..moments }
}

/// y = x (1 + v) + w v: E y = m, Var y = P (1 + q) + q (m + w)^2, Cov(x, y) = P (products of independent Gaussians, by
/// hand). Third-degree rules know the mean and the cross-covariance of this second-degree form; five nodes know all.
#[test]
fn noise_inside_reaches_references_and_methods() {
    let (m, p, q, w) = (3.0, 0.5, 0.04, 2.0);
    let case = case(
        json!({"state": ["x", "other"], "noise": ["idle", "v"], "parameters": {"w": w},
               "outputs": [{"name": "y", "formula": "x * (1 + v) + w * v"}]}),
        json!({"mean": [m, 0], "covariance": [[p, 0.2], [0.2, 1]]}),
        json!({"inside": {"covariance": [[1, 0], [0, q]]}, "covariance": 0.01}),
    );
    let exact = p * (1.0 + q) + q * (m + w) * (m + w) + 0.01;
    assert_eq!(Sensor::reads(case.sensor()), [0, 3], "noise k is component n + k");
    let reference = Sampler::new(&case, SamplerSettings { seed: 3, ..SamplerSettings::default() }).unwrap().run();
    assert_eq!(reference.soundness, Soundness::Sound);
    for found in [&reference.moments, &moments_of("gauss-hermite:order=5", &case)] {
        assert!((found.mean[0] - m).abs() < 1e-9, "{found:?}");
        assert!((found.covariance[(0, 0)] - exact).abs() < 1e-9, "{found:?}, {exact}");
        assert_eq!(found.cross_covariance.shape(), (2, 1), "the noise is no state");
        assert!(
            (found.cross_covariance[(0, 0)] - p).abs() < 1e-9
                && (found.cross_covariance[(1, 0)] - 0.2).abs() < 1e-9
        );
    }
    let taylor = moments_of("taylor-1", &case);
    assert!((taylor.covariance[(0, 0)] - (p + q * (m + w) * (m + w) + 0.01)).abs() < 1e-12);
}

/// Noise that is added inside is noise that is added outside.
#[test]
fn added_inside_is_added_outside() {
    let prior = json!({"mean": [300, 120], "covariance": [[900, 10], [10, 400]]});
    let outputs = |v: &str, w: &str| {
        json!([{"name": "range", "formula": format!("hypot(x, y){v}")},
               {"name": "bearing", "formula": format!("atan2(y, x){w}"), "angular": true}])
    };
    let inside = case(
        json!({"state": ["x", "y"], "noise": ["v", "w"], "outputs": outputs(" + v", " + w")}),
        prior.clone(),
        json!({"inside": {"covariance": [[4, 0], [0, 1e-3]]}}),
    );
    let outside = case(
        json!({"state": ["x", "y"], "outputs": outputs("", "")}),
        prior,
        json!({"covariance": [[4, 0], [0, 1e-3]]}),
    );
    for method in ["taylor-1", "taylor-2", "gauss-hermite:order=5"] {
        let (a, b) = (moments_of(method, &inside), moments_of(method, &outside));
        let scale = b.covariance.diagonal().map(f64::sqrt);
        assert!((&a.mean - &b.mean).component_div(&scale).amax() < 1e-12, "{method}");
        assert!((&a.cross_covariance - &b.cross_covariance).amax() < 1e-10, "{method}");
        for j in 0..2 {
            for k in 0..2 {
                let apart = (a.covariance[(j, k)] - b.covariance[(j, k)]).abs();
                assert!(apart < 1e-12 * scale[j] * scale[k], "{method}: {j}, {k}");
            }
        }
    }
    let settings = SamplerSettings { precision: 1e-5, ..SamplerSettings::default() };
    let [a, b] = [&inside, &outside].map(|case| Sampler::new(case, settings).unwrap().run());
    for j in 0..2 {
        for k in 0..2 {
            let error = a.standard_error.covariance[(j, k)].hypot(b.standard_error.covariance[(j, k)]);
            let apart = (a.moments.covariance[(j, k)] - b.moments.covariance[(j, k)]).abs();
            // Odds of 1e-4 an entry at most.
            assert!(apart <= 4.5 * error, "{j}, {k}: {apart} with {error}");
        }
    }
}

#[test]
fn noise_inside_must_fit() {
    let record = |sensor: Value, noise: Value| {
        let prior = json!({"mean": [1], "covariance": [[1]]});
        let record = json!({"case": "k", "sensor": sensor, "prior": prior, "noise": noise});
        Case::from_json(record).unwrap_err().to_string()
    };
    let with = |names: Value| json!({"state": ["x"], "noise": names, "outputs": [{"name": "y", "formula": "x"}]});
    assert_eq!(
        record(with(json!(["v"])), json!(null)),
        "noise: `inside` is missing; the sensor has noise inside: v"
    );
    let stands = "noise.inside: stands here, but the sensor names no noise";
    assert_eq!(record(with(json!([])), json!({"inside": {"covariance": 1}})), stands);
    let shape = record(with(json!(["v", "w"])), json!({"inside": {"covariance": [[1]]}}));
    assert!(shape.starts_with("noise.inside.covariance: "), "{shape}");
    let bare = record(json!({"kind": "linear", "H": [[1]]}), json!({"inside": {"covariance": 1}}));
    assert_eq!(bare, stands);
}
