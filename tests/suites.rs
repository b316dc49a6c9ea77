//! Suites as their users meet them: what is bundled, what is refused and in which words.

use std::collections::HashSet;
use std::f64::consts::PI;
use std::io::Write;
use std::path::Path;

use gaussworthy::suite::{Case, Suite};
use rand::{RngExt, SeedableRng};

fn read(text: &str) -> Result<Suite, String> {
    Suite::from_text("x", "x.toml", text, None).map_err(|e| e.to_string())
}

/// A sound suite with one piece of its text replaced.
fn with(from: &str, to: &str) -> String {
    const SOUND: &str = r#"title = "sound"
[sensor]
kind = "range-bearing"
station = [0, 0]
[prior]
mean = [3000, 400]
covariance = [[900, 0], [0, 400]]
[noise]
sd = ["10 m", "0.3 deg"]
"#;
    assert!(from.is_empty() || SOUND.contains(from), "{from} is not in the text");
    if from.is_empty() { format!("{SOUND}{to}") } else { SOUND.replacen(from, to, 1) }
}

#[test]
fn a_sound_suite_is_read() {
    assert_eq!(read(&with("", "")).unwrap().cases.len(), 1);
}

#[test]
fn every_mistake_gets_its_line_and_what_would_be_right() {
    let flat = "range = \"2 km\"\nbearing = \"30 deg\"\nalong_sd = \"20 m\"\nacross_sd = \"3 deg\"";
    let planar = |from: &str, to: &str| {
        let prior = if from.is_empty() { format!("{flat}\n{to}") } else { flat.replacen(from, to, 1) };
        with("mean = [3000, 400]\ncovariance = [[900, 0], [0, 400]]", &prior)
    };
    let spread = |sd: &str| with("covariance = [[900, 0], [0, 400]]", sd);
    const FORMS: &str = "give exactly one form: `mean` and `covariance`; `mean` and `sd`, perhaps `correlation`; \
        or `range`, `bearing`, `along_sd` and `across_sd`, perhaps `seen_from`, `rest_mean` and `rest_sd`";
    let forms = |start: &str| format!("{start}; {FORMS}");
    let table: Vec<(String, String)> = [
        // The file as a whole.
        ("".into(), "x.toml:1: is empty; a suite needs [sensor] and [prior], and perhaps [noise] and [[family]]".into()),
        ("# only a comment\n".into(), "x.toml:1: is empty; a suite needs [sensor] and [prior], and perhaps [noise] and [[family]]".into()),
        ("title = \"x\"\n[sensor\n".into(), "x.toml:2: is not TOML: unclosed table, expected `]`".into()),
        ("title = \"x\"\n".into(), "x.toml:1: [sensor] is missing; say what measures, as [sensor] with `kind = \"range-bearing\"`".into()),
        (with("", "[prior]\n"), "x.toml:10: is not TOML: duplicate key".into()),
        // Unknown keys, with the nearest known one.
        (with("[noise]", "[nosie]"), "x.toml:8: nosie: unknown key `nosie`; did you mean `noise`? allowed: title, note, seed, precision, cap, draws, limits, method, family, sensor, prior, noise".into()),
        (with("covariance", "covarience"), "x.toml:7: prior.covarience: unknown key `covarience`; did you mean `covariance`? allowed: mean, covariance, sd, correlation, range, bearing, along_sd, across_sd, seen_from, rest_mean, rest_sd".into()),
        (with("station =", "statoin ="), "x.toml:4: sensor.statoin: unknown key `statoin`; did you mean `station`? allowed: station, stations, position".into()),
        (with("sd =", "std ="), "x.toml:9: noise.std: unknown key `std`; did you mean `sd`? allowed: sd, covariance".into()),
        (with("", "[[family]]\nname = \"a\"\nnotes = 1\n"), "x.toml:12: family[0].notes: unknown key `notes`; did you mean `noise`? allowed: name, draws, sensor, prior, noise".into()),
        // Sensors.
        (with("range-bearing", "range-baering"), "x.toml:3: sensor.kind: there is no sensor `range-baering`; did you mean `range-bearing`? give one of KINDS".into()),
        (with("kind = \"range-bearing\"", "kind = 5"), "x.toml:3: sensor.kind: is 5; give one of KINDS".into()),
        (with("kind = \"range-bearing\"", ""), "x.toml:2: sensor: `kind` is missing; give one of KINDS".into()),
        (with("station = [0, 0]", ""), "x.toml:2: sensor: `station` is missing; give `station` [x, y] or `stations` [[x, y], ...]".into()),
        (with("station = [0, 0]", "station = [0]"), "x.toml:4: sensor.station: has length 1; give a list of length 2".into()),
        (with("station = [0, 0]", "station = [0, \"3 deg\"]"), "x.toml:4: sensor.station[1]: \"3 deg\" is an angle; a length is needed: m, km, cm, mm".into()),
        (with("station = [0, 0]", "station = [0, 0]\nposition = [0, 2]"), "x.toml:5: sensor.position[1]: 2 is outside the state, which has 2 components counted from 0".into()),
        (with("station = [0, 0]", "station = [0, inf]"), "x.toml:4: sensor.station[1]: is inf; give a finite number".into()),
        // Priors.
        (with("mean = [3000, 400]\ncovariance = [[900, 0], [0, 400]]", ""), format!("x.toml:5: prior: {}", forms("is empty"))),
        (spread(""), format!("x.toml:5: prior: {}", forms("has a mean but no spread"))),
        (with("mean = [3000, 400]", "mean = [3000, 400]\nrange = 5"), format!("x.toml:5: prior: {}", forms("mixes two forms"))),
        (with("[[900, 0], [0, 400]]", "[[900, 0, 0], [0, 400, 0], [0, 0, 1]]"), "x.toml:7: prior.covariance: the covariance is 3 x 3, but 2 x 2 is needed".into()),
        (with("[[900, 0], [0, 400]]", "[[900, 0],\n[0]]"), "x.toml:8: prior.covariance[1]: has 1 numbers, but the first row has 2".into()),
        (with("[[900, 0], [0, 400]]", "[\n[900, 30],\n[20, 400]]"), "x.toml:8: prior.covariance[0][1]: covariance[0][1] is 30, but covariance[1][0] is 20; a covariance is symmetric".into()),
        (with("[[900, 0], [0, 400]]", "[[900, 900], [900, 400]]"), "x.toml:7: prior.covariance: the covariance is indefinite: its correlation matrix has the eigenvalue -5.000e-1; none may be negative".into()),
        (with("[[900, 0], [0, 400]]", "[[900, 0],\n[0, -400]]"), "x.toml:8: prior.covariance[1][1]: covariance[1][1] is -400; a variance cannot be negative".into()),
        (with("[[900, 0], [0, 400]]", "[[900, 0], [0, nan]]"), "x.toml:7: prior.covariance[1][1]: is nan; give a finite number".into()),
        (with("mean = [3000, 400]", "mean = []"), "x.toml:6: prior.mean: is empty; give at least one number".into()),
        (with("mean = [3000, 400]", "mean = 3000"), "x.toml:6: prior.mean: is 3000; give a list [..]".into()),
        (with("mean = [3000, 400]", "mean = [3000, \"4 deg\"]"), "x.toml:6: prior.mean[1]: \"4 deg\" is an angle; a length is needed: m, km, cm, mm".into()),
        (spread("sd = [30, -20]"), "x.toml:7: prior.sd[1]: -20 is below 0; a standard deviation is 0 or above".into()),
        (spread("sd = [30]"), "x.toml:7: prior.sd: has 1 entries, but `mean` has 2".into()),
        (spread("sd = [30, 20]\ncorrelation = [[0, 1, 1.5]]"), "x.toml:8: prior.correlation: components 0 and 1: 1.5 is outside -1 to 1".into()),
        (spread("sd = [30, 20]\ncorrelation = [[0, 2, 0.5]]"), "x.toml:8: prior.correlation[0][1]: 2 is outside the state, whose components are 0 to 1".into()),
        (spread("sd = [30, 20]\ncorrelation = [[1, 0.5], [0.4, 1]]"), "x.toml:8: prior.correlation[0][1]: is 0.5, but [1][0] is 0.4; the matrix is symmetric".into()),
        (spread("sd = [30, 20]\ncorrelation = [[1, 0.5], [0.5, 2]]"), "x.toml:8: prior.correlation[1][1]: is 2; a correlation matrix has 1 here".into()),
        (planar("bearing = \"30 deg\"", "bearing = 30"), "x.toml:7: prior.bearing: 30 has no unit; an angle needs one: \"30 deg\" or \"30 rad\"".into()),
        (planar("range = \"2 km\"", "range = \"3 deg\""), "x.toml:6: prior.range: \"3 deg\" is an angle; a length is needed: m, km, cm, mm".into()),
        (planar("range = \"2 km\"", "range = \"2 furlong\""), "x.toml:6: prior.range: there is no unit `furlong` (\"2 furlong\"); give a length in m, km, cm, mm; an angle in deg, rad, mrad; a share in %".into()),
        (planar("range = \"2 km\"", "range = \"far\""), "x.toml:6: prior.range: \"far\" is not a quantity; give a number and a unit: a length in m, km, cm, mm; an angle in deg, rad, mrad; a share in %".into()),
        (planar("range = \"2 km\"", "range = 0"), "x.toml:6: prior.range: 0 is not above 0, as a range is".into()),
        (planar("along_sd = \"20 m\"", "along_sd = \"2 deg\""), "x.toml:8: prior.along_sd: \"2 deg\" is an angle; along the line of sight give a length or a share".into()),
        (planar("across_sd = \"3 deg\"", "across_sd = \"-3 deg\""), "x.toml:9: prior.across_sd: \"-3 deg\" is below 0; a standard deviation is 0 or above".into()),
        (planar("along_sd = \"20 m\"\n", ""), "x.toml:5: prior: `along_sd` is missing; give a length, as \"25 m\", or a share of the range, as \"10 %\"".into()),
        (planar("", "rest_mean = [1, 2]"), "x.toml:5: prior: `rest_sd` is missing; `rest_mean` stands without it".into()),
        (planar("", "rest_mean = [1, 2]\nrest_sd = [1]"), "x.toml:11: prior.rest_sd: has 1 entries, but `rest_mean` has 2".into()),
        (planar("", "").replace("kind = \"range-bearing\"\nstation = [0, 0]", "kind = \"linear\"\nH = [[1, 0]]"), "x.toml:5: prior: the sensor `linear` has no station to see range and bearing from; give `seen_from = [x, y]`, or the prior by `mean` and `sd`".into()),
        // Noise.
        (with("\"0.3 deg\"", "0.3"), "x.toml:9: noise.sd[1]: 0.3 has no unit; an angle needs one: \"0.3 deg\" or \"0.3 rad\"; output 1 is the bearing".into()),
        (with("\"0.3 deg\"", "\"0.3 m\""), "x.toml:9: noise.sd[1]: \"0.3 m\" is a length; an angle is needed: deg, rad, mrad; output 1 is the bearing".into()),
        (with("sd = [\"10 m\", \"0.3 deg\"]", "sd = \"10 m\""), "x.toml:9: noise.sd: \"10 m\" is a length; an angle is needed: deg, rad, mrad; output 1 is the bearing".into()),
        (with("[\"10 m\", \"0.3 deg\"]", "[\"10 m\"]"), "x.toml:9: noise.sd: has 1 entries; the sensor has 2 outputs: range, bearing".into()),
        (with("\"10 m\"", "\"-10 m\""), "x.toml:9: noise.sd[0]: \"-10 m\" is below 0; a standard deviation is 0 or above; output 0 is the range".into()),
        (with("sd = [\"10 m\", \"0.3 deg\"]", "covariance = [[1, 2], [2, 1]]"), "x.toml:9: noise.covariance: the covariance is indefinite: its correlation matrix has the eigenvalue -1.000e0; none may be negative".into()),
        (with("sd = [\"10 m\", \"0.3 deg\"]", ""), "x.toml:8: noise: says nothing; give `sd` or `covariance`, or leave the noise out".into()),
        (with("sd = [\"10 m\", \"0.3 deg\"]", "sd = [1]\ncovariance = 1"), "x.toml:10: noise.covariance: stands beside `sd`; give one of the two".into()),
        // Sweeps and draws.
        (with("3000", "{ from = 1, to = 2, steps = 0 }"), "x.toml:6: prior.mean[0].steps: the sweep is empty; give at least 2 steps".into()),
        (with("3000", "{ list = [] }"), "x.toml:6: prior.mean[0].list: the sweep is empty; give at least one value".into()),
        (with("3000", "{ from = \"2 km\", to = \"1 km\", steps = 3 }"), "x.toml:6: prior.mean[0].from: \"2 km\" is above `to` = \"1 km\"; exchange the two".into()),
        (planar("\"30 deg\"", "{ from = \"170 deg\", to = \"-170 deg\", steps = 3 }"), "x.toml:7: prior.bearing.from: \"170 deg\" is above `to` = \"-170 deg\"; exchange the two, or go on past the cut, as from \"170 deg\" to \"190 deg\"".into()),
        (planar("\"30 deg\"", "{ from = 0, to = 3, steps = 3 }"), "x.toml:7: prior.bearing: 0 has no unit; an angle needs one: \"0 deg\" or \"0 rad\"".into()),
        (with("3000", "{ from = -1, to = 2, steps = 3, scale = \"log\" }"), "x.toml:6: prior.mean[0].from: -1 cannot stand on a log scale; give a bound above 0".into()),
        (with("3000", "{ from = 1, to = 2, steps = 3, scale = \"lin\" }"), "x.toml:6: prior.mean[0].scale: \"lin\" is no scale; give \"linear\" or \"log\"".into()),
        (with("3000", "{ form = 1, to = 2, steps = 3 }"), "x.toml:6: prior.mean[0].form: unknown key `form`; did you mean `from`? allowed: from, to, steps, scale, list, draw".into()),
        (with("3000", "{ from = 1, to = nan, steps = 3 }"), "x.toml:6: prior.mean[0].to: is nan; give a finite number".into()),
        (with("3000", "{ from = 1, to = 2, steps = 2_000_000 }"), "x.toml:6: prior.mean[0]: the grid has 2000000 cases, 2000000 along this key; at most 1000000 are allowed".into()),
        (with("[3000, 400]", "[{ from = 1, to = 2, steps = 900 }, { from = 1, to = 2, steps = 1200 }]"), "x.toml:6: prior.mean[1]: the grid has 1080000 cases, 1200 along this key; at most 1000000 are allowed".into()),
        (with("3000", "{ draw = \"uniform\", from = 1, to = 2 }"), "x.toml:6: prior.mean[0]: is drawn, but `draws` is missing; say how many cases each grid point gets".into()),
        (with("title = \"sound\"", "draws = 2_000_000").replace("3000", "{ draw = \"uniform\", from = 1, to = 2 }"), "x.toml:1: draws: the grid has 2000000 cases, 2000000 drawn at every point; at most 1000000 are allowed".into()),
        (with("title = \"sound\"", "draws = 5"), "x.toml:1: draws: nothing is drawn in this suite; leave it out, or draw a value".into()),
        (spread("sd = [30, { list = [10, 20, -1] }]"), "x.toml:7: prior.sd[1].list[2]: -1 is below 0; a standard deviation is 0 or above (case x-002)".into()),
        // Families.
        (with("", "[[family]]\nname = \"a\"\n[[family]]\nname = \"a\"\n"), "x.toml:13: family[1].name: the family \"a\" stands on line 11 already; rename one".into()),
        (with("", "[[family]]\n"), "x.toml:10: family[0]: `name` is missing; give each family a name of its own".into()),
        (with("", "[[family]]\nname = \"a,b\"\n"), "x.toml:11: family[0].name: the name holds `,`; use printable characters, no comma and no quotes".into()),
        (with("", "[family]\nname = \"a\"\n"), "x.toml:10: family: is no list of tables; write [[family]]".into()),
        (with("", "[[family]]\nname = \"a\"\n[family.noise]\nsd = [1, \"1 deg\"]\n"), "x.toml:8: noise: no family uses it, for each has its own; delete it".into()),
        (with("", "[[family]]\nname = \"a\"\ndraws = 3\n"), "x.toml:12: family[0].draws: nothing is drawn in this family; leave it out, or draw a value".into()),
        // Settings.
        (with("title = \"sound\"", "seed = -1"), "x.toml:1: seed: is -1; give a whole number, 0 or above".into()),
        (with("title = \"sound\"", "precision = 0"), "x.toml:1: precision: is 0; give a standard error above 0 and below 1, as 1e-3".into()),
        (with("title = \"sound\"", "cap = 1.5"), "x.toml:1: cap: is 1.5; give a whole number, 1 or above".into()),
        (with("title = \"sound\"", "title = \"\"\"two\nlines\"\"\""), "x.toml:1: title: has several lines; give one".into()),
        (with("", "[limits]\nmean_eror = 1\n"), "x.toml:11: limits.mean_eror: unknown key `mean_eror`; did you mean `mean_error`? allowed: mean_error, variance_ratio_low, variance_ratio_high, cross_covariance_error, nees_ratio_low, nees_ratio_high, excess, floor, confidence".into()),
        (with("", "[limits]\nmean_error = -1\n"), "x.toml:11: limits.mean_error: is -1; a limit is a number above 0".into()),
        (with("", "[limits]\nfloor = \"much\"\n"), "x.toml:11: limits.floor: is the text \"much\"; give a number".into()),
        (with("", "[method]\nid = \"taylor-1\"\n"), "x.toml:10: method: is a table; give a list [..], as [[method]]".into()),
        (with("", "[[method]]\nid = \"taylor-1\"\n[[method]]\nid = \"taylor-1\"\n"), "x.toml:12: method[1]: `taylor-1` stands on line 10 already; delete one".into()),
    ]
    .into();
    let kinds = gaussworthy::sensor::KINDS.iter().map(|k| k.name).collect::<Vec<_>>().join(", ");
    let wrong: Vec<_> = table
        .into_iter()
        .filter_map(|(text, expected)| {
            let expected = expected.replace("KINDS", &kinds);
            let said = read(&text).err().unwrap_or_else(|| "was read without complaint".into());
            (said != expected).then(|| format!("expected {expected}\n    said {said}\n"))
        })
        .collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn an_unknown_method_is_named_with_its_line() {
    let said = read(&with("", "[[method]]\nid = \"tailor-1\"\n")).unwrap_err();
    assert!(said.starts_with("x.toml:11: method[0].id: ") && said.contains("tailor-1"), "{said}");
    let said = read(&with("", "[[method]]\nid = \"gauss-hermite\"\nordre = 5\n")).unwrap_err();
    assert!(said.starts_with("x.toml:12: method[0].ordre: ") && said.contains("ordre"), "{said}");
}

#[test]
fn settings_are_read() {
    let text = with("", "[limits]\nexcess = 0.2\n[[method]]\nid = \"taylor-1\"\n[[method]]\nid = \"cubature-3\"\n");
    let suite = read(&format!("note = \"n\"\nseed = 9\nprecision = 5e-4\ncap = 1_000_000\n{text}")).unwrap();
    assert_eq!((&*suite.name, &*suite.title, &*suite.note), ("x", "sound", "n"));
    assert_eq!((suite.seed, suite.precision, suite.cap), (Some(9), Some(5e-4), Some(1_000_000)));
    assert_eq!((suite.limits.excess, suite.limits.mean_error), (0.2, 0.1));
    let labels: Vec<_> = suite.methods.as_deref().unwrap().iter().map(|m| m.label().to_string()).collect();
    assert_eq!(labels, ["taylor-1", "cubature-3"]);
    let overridden = Suite::from_text("x", "x.toml", &format!("seed = 9\n{text}"), Some(4)).unwrap();
    assert_eq!(overridden.seed, Some(4));
    assert!(read(&with("", "")).unwrap().methods.is_none());
}

fn same_bits(a: &Case, b: &Case) -> bool {
    let bits = |case: &Case| {
        let numbers = case.prior().mean().iter().chain(case.prior().covariance().iter());
        numbers.chain(case.noise_or_zero().iter()).map(|v| v.to_bits()).collect::<Vec<_>>()
    };
    a.id() == b.id() && bits(a) == bits(b) && a.to_json() == b.to_json()
}

#[test]
fn bundled_suites_are_sound_and_large_enough() {
    for bundled in Suite::bundled() {
        let suite = Suite::load(bundled.name, None).unwrap_or_else(|e| panic!("{e}"));
        assert_eq!(suite.title, bundled.summary);
        let range = if bundled.name == "smoke" { 24..=40 } else { 24..=100 };
        assert!(range.contains(&suite.cases.len()), "{} has {} cases", suite.name, suite.cases.len());
        let names: HashSet<_> = suite.cases.iter().map(Case::id).collect();
        assert_eq!(names.len(), suite.cases.len());
        for case in &suite.cases {
            let line = case.to_json().to_string();
            let back = Case::from_json(serde_json::from_str(&line).unwrap()).unwrap();
            assert!(same_bits(case, &back), "{line}");
        }
    }
    let kinds: HashSet<_> = Suite::load("smoke", None).unwrap().cases.iter().map(|c| c.spec().kind()).collect();
    assert_eq!(kinds.len(), gaussworthy::sensor::KINDS.len(), "smoke has every sensor");
}

#[test]
fn ships_in_the_west_lie_on_the_cut() {
    let suite = Suite::load("listening-buoys", None).unwrap();
    let west: Vec<_> = suite.cases.iter().filter(|c| c.id().starts_with("west-")).collect();
    assert_eq!(west.len(), 15);
    let mut bearings = Vec::new();
    for case in west {
        let mut bearing = [0.0];
        case.sensor().value(&[case.prior().mean()[0], case.prior().mean()[1]], &mut bearing);
        assert!(bearing[0].abs() > PI - 9_f64.to_radians(), "{} looks to {}", case.id(), bearing[0]);
        bearings.push(bearing[0]);
    }
    assert!(bearings.iter().any(|&b| b > 0.0) && bearings.iter().any(|&b| b < 0.0), "both sides: {bearings:?}");
}

#[test]
fn draws_follow_the_seed() {
    let drawn = |seed| {
        let suite = Suite::load("harbour-radar", seed).unwrap();
        suite.cases.into_iter().filter(|c| c.id().starts_with("any-")).collect::<Vec<_>>()
    };
    let (own, again, other) = (drawn(None), drawn(None), drawn(Some(21)));
    assert_eq!((own.len(), other.len()), (24, 24));
    assert!(own.iter().zip(&again).all(|(a, b)| same_bits(a, b)));
    assert!(own.iter().zip(&other).all(|(a, b)| a.prior() != b.prior()));
    assert!(own.windows(2).all(|pair| pair[0].prior() != pair[1].prior()));
}

#[test]
fn a_family_keeps_its_cases_when_others_change() {
    let family = |name: &str| {
        format!(
            "[[family]]\nname = \"{name}\"\ndraws = 3\n[family.prior]\nmean = [1, 2]\n\
             sd = [1, {{ draw = \"uniform\", from = 1, to = 9 }}]\n"
        )
    };
    let head = "[sensor]\nkind = \"linear\"\nH = [[1, 1]]\n";
    let alone = read(&format!("{head}{}", family("b"))).unwrap().cases;
    let beside = read(&format!("{head}{}{}", family("a"), family("b"))).unwrap().cases;
    assert_eq!((alone.len(), beside.len()), (3, 6));
    assert!(alone.iter().zip(&beside[3..]).all(|(a, b)| same_bits(a, b)));
    assert!(beside[..3].iter().zip(&beside[3..]).all(|(a, b)| a.prior() != b.prior()));
}

/// Relative rounding of a handful of operations.
const ROUNDING: f64 = 1e-13;

#[track_caller]
fn close(found: f64, expected: f64) {
    assert!((found - expected).abs() <= ROUNDING * expected.abs().max(1.0), "{found} is not {expected}");
}

#[test]
fn the_three_forms_of_a_prior_say_the_same() {
    // By hand: 5 m away in the direction (3, 4) / 5, seen from (10, 20); 2 m along, 10 % of 5 m across:
    // mean (13, 24), covariance (9 * 4 + 16 * 0.25) / 25 = 1.6, 12 * 3.75 / 25 = 1.8, (16 * 4 + 9 * 0.25) / 25 = 2.65.
    let bearing = (4.0_f64 / 3.0).atan().to_string();
    let sensor = "[sensor]\nkind = \"range-bearing\"\nstation = [10, 20]\nposition = [2, 0]\n";
    let planar = format!(
        "{sensor}[prior]\nrange = \"500 cm\"\nbearing = \"{bearing} rad\"\nalong_sd = 2\nacross_sd = \"10 %\"\n\
         rest_mean = [7, 8]\nrest_sd = [0.5, 3]\n"
    );
    let full = format!(
        "{sensor}[prior]\nmean = [24, 7, 13, 8]\n\
         covariance = [[2.65, 0, 1.8, 0], [0, 0.25, 0, 0], [1.8, 0, 1.6, 0], [0, 0, 0, 9]]\n"
    );
    let rho = 1.8 / (2.65_f64 * 1.6).sqrt();
    let (a, b) = (2.65_f64.sqrt(), 1.6_f64.sqrt());
    let start = format!("{sensor}[prior]\nmean = [24, 7, \"13 m\", 8]\nsd = [{a}, 0.5, {b}, 3]\n");
    let triples = format!("{start}correlation = [[2, 0, {rho}]]\n");
    let matrix = format!("{start}correlation = [[1, 0, {rho}, 0], [0, 1, 0, 0], [{rho}, 0, 1, 0], [0, 0, 0, 1]]\n");
    let expected = read(&full).unwrap().cases.remove(0);
    for text in [planar, triples, matrix] {
        let case = read(&text).unwrap_or_else(|e| panic!("{e}")).cases.remove(0);
        for (found, expected) in case.prior().mean().iter().zip(expected.prior().mean()) {
            close(*found, *expected);
        }
        for (found, expected) in case.prior().covariance().iter().zip(expected.prior().covariance()) {
            close(*found, *expected);
        }
    }
}

#[test]
fn three_triples_on_a_state_of_three_are_no_matrix() {
    let text = "[sensor]\nkind = \"linear\"\nH = [[1, 1, 1]]\n[prior]\nmean = [0, 0, 0]\nsd = [1, 2, 3]\n";
    let covariance = |correlation: &str| {
        let suite = read(&format!("{text}correlation = {correlation}\n")).unwrap_or_else(|e| panic!("{e}"));
        suite.cases[0].prior().covariance().clone()
    };
    let triples = covariance("[[0, 1, 0.5], [0, 2, 0.25], [1, 2, -0.25]]");
    assert_eq!(triples, covariance("[[1, 0.5, 0.25], [0.5, 1, -0.25], [0.25, -0.25, 1]]"));
    assert_eq!((triples[(0, 1)], triples[(0, 2)], triples[(1, 2)]), (1.0, 0.75, -1.5));
}

#[test]
fn spreads_and_noise_take_their_units() {
    let text = "[sensor]\nkind = \"bearing-only\"\nstations = [[\"1 km\", 0], [0, 0]]\n[prior]\nrange = \"2 km\"\n\
        bearing = \"90 deg\"\nalong_sd = \"10 %\"\nacross_sd = \"3 deg\"\n[noise]\nsd = \"8 mrad\"\n";
    let case = read(text).unwrap().cases.remove(0);
    let (mean, p) = (case.prior().mean(), case.prior().covariance());
    close(mean[0], 1000.0);
    close(mean[1], 2000.0);
    close(p[(0, 0)], (2000.0 * 3.0 * PI / 180.0_f64).powi(2));
    close(p[(1, 1)], 200.0 * 200.0);
    let r = case.noise().unwrap();
    assert_eq!((r[(0, 1)], r.nrows()), (0.0, 2));
    close(r[(1, 1)], 64e-6);
    let moved = read(&text.replace("range =", "seen_from = [0, \"1 km\"]\nrange =")).unwrap().cases.remove(0);
    close(moved.prior().mean()[1], 3000.0);
    let bare = read(&text.replace("sd = \"8 mrad\"", "covariance = 0.25")).unwrap().cases.remove(0);
    assert_eq!(bare.noise().unwrap().diagonal().as_slice(), [0.25, 0.25]);
    let none = read(&text.replace("[noise]\nsd = \"8 mrad\"\n", "")).unwrap().cases.remove(0);
    assert!(none.noise().is_none());
}

fn file(folder: &Path, name: &str, bytes: &[u8]) -> std::path::PathBuf {
    let path = folder.join(name);
    std::fs::File::create(&path).unwrap().write_all(bytes).unwrap();
    path
}

#[test]
fn files_that_are_no_suite_are_refused() {
    let folder = tempfile::tempdir().unwrap();
    let said = |path: &Path| {
        let error = Suite::load(path.to_str().unwrap(), None).unwrap_err().to_string();
        error.replace(&folder.path().display().to_string(), "DIR")
    };
    assert!(said(&folder.path().join("none.toml")).starts_with("DIR/none.toml: cannot be read: "));
    std::fs::create_dir(folder.path().join("folder.toml")).unwrap();
    assert_eq!(said(&folder.path().join("folder.toml")), "DIR/folder.toml: is a folder; give a file");
    let broken = file(folder.path(), "broken.toml", b"title = \"x\"\n# \xff\n");
    assert_eq!(said(&broken), "DIR/broken.toml:2: is not UTF-8 text");
    let comma = file(folder.path(), "a,b.toml", b"");
    assert!(said(&comma).starts_with("DIR/a,b.toml: the name holds `,`"));
    // A sparse file: 100 MB that nobody should read.
    let huge = file(folder.path(), "huge.toml", b"");
    std::fs::File::options().write(true).open(&huge).unwrap().set_len(100_000_000).unwrap();
    assert_eq!(said(&huge), "DIR/huge.toml: has 100000000 bytes; a suite has at most 8 MiB (8388608 bytes)");
    assert_eq!(
        Suite::load("harbor-radar", None).unwrap_err().to_string(),
        "harbor-radar: there is no bundled suite of this name; did you mean `harbour-radar`? give one of \
         harbour-radar, listening-buoys, power-meter, pilot-boats, mast-cameras, wave-timing, smoke, or the path of a file that ends in .toml (case records go to --cases)"
    );
}

/// Text mangled at random: pieces cut, doubled, or replaced by words that mean something elsewhere.
fn mangled(text: &str, stream: &mut rand_pcg::Pcg64) -> String {
    const WORDS: [&str; 16] = [
        "-1",
        "0",
        "1e308",
        "nan",
        "\"3 deg\"",
        "\"1e308 km\"",
        "[]",
        "{}",
        "[[]]",
        "{ list = [1] }",
        "true",
        "\"\"",
        "\u{e9}",
        "\n",
        "steps",
        "{ draw = \"uniform\", from = 0, to = 1 }",
    ];
    let mut pieces: Vec<&str> = text.split_inclusive([' ', ',', '\n', '[', ']', '{', '}', ':']).collect();
    for _ in 0..stream.random_range(1..4) {
        let at = stream.random_range(0..pieces.len());
        match stream.random_range(0..4) {
            0 => drop(pieces.remove(at)),
            1 => pieces.insert(at, pieces[stream.random_range(0..pieces.len())]),
            _ => pieces[at] = WORDS[stream.random_range(0..WORDS.len())],
        }
    }
    pieces.concat()
}

#[test]
fn mangled_text_is_read_or_refused_in_one_line() {
    const TEXT: &str = r#"seed = 2
draws = 2
precision = 1e-3
[limits]
floor = 0.1
[sensor]
kind = "bearing-only"
stations = [[0, 0], ["1 km", 5]]
position = [0, 1]
[noise]
covariance = [[1, 0.5], [0.5, 1]]
[[family]]
name = "a"
[family.prior]
range = { from = "1 km", to = "2 km", steps = 2, scale = "log" }
bearing = { draw = "uniform", from = "0 deg", to = "90 deg" }
along_sd = "5 %"
across_sd = { list = ["1 deg", 20] }
seen_from = [0, "1 m"]
rest_mean = [1]
rest_sd = [2]
[[family]]
name = "b"
[family.sensor]
kind = "quadratic"
A = [[[1, 0, 0], [0, 1, 0], [0, 0, 2]]]
[family.prior]
mean = [1, 2, 3]
sd = [1, 2, 3]
correlation = [[0, 1, 0.5], [0, 2, 0.1], [1, 2, 0.2]]
[family.noise]
sd = 0.5
"#;
    assert_eq!(read(TEXT).unwrap().cases.len(), 9);
    let mut stream = rand_pcg::Pcg64::seed_from_u64(11);
    let mut refused = 0;
    for _ in 0..4000 {
        let text = mangled(TEXT, &mut stream);
        if let Err(said) = read(&text) {
            refused += 1;
            assert!(said.starts_with("x.toml:") && !said.contains('\n') && said.len() < 1000, "{said}");
        }
    }
    assert!((1000..4000).contains(&refused), "{refused} of 4000 were refused: the test tries nothing");
    let record = read(TEXT).unwrap().cases[0].to_json().to_string();
    let folder = tempfile::tempdir().unwrap();
    for _ in 0..1000 {
        let text = mangled(&record, &mut stream);
        let path = file(folder.path(), "r.jsonl", text.as_bytes());
        if let Err(error) = Suite::from_case_records(&path) {
            let said = error.to_string();
            assert!(said.contains("r.jsonl:") && !said.contains('\n') && said.len() < 1000, "{said}");
        }
    }
}
