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
    let space = |from: &str, to: &str| planar("", &"elevation = \"8 deg\"\nup_sd = \"5 m\"".replacen(from, to, 1));
    // Away from the planar sensor, to one that reads the three components.
    let unbound = |text: String| {
        text.replace(
            "kind = \"range-bearing\"\nstation = [0, 0]\n[prior]",
            "kind = \"linear\"\nH = [[1, 1, 1]]\n[prior]\nseen_from = [0, 0, 0]",
        )
    };
    let framed = |covariance: &str| {
        planar("along_sd = \"20 m\"\nacross_sd = \"3 deg\"", &format!("frame_covariance = {covariance}"))
    };
    let moving = |from: &str, to: &str| {
        let velocity = "speed = \"8 kn\"\ncourse = \"200 deg\"\nspeed_sd = \"10 %\"\ncourse_sd = \"5 deg\"";
        planar("", &if from.is_empty() { format!("{velocity}\n{to}") } else { velocity.replacen(from, to, 1) })
    };
    let spread = |sd: &str| with("covariance = [[900, 0], [0, 400]]", sd);
    const FORMS: &str = "give exactly one form: `mean` and `covariance`; `mean` and `sd`, perhaps `correlation`; \
        or `range`, `bearing`, `along_sd` and `across_sd`, perhaps `elevation` and `up_sd`, `speed` and `course`, \
        `seen_from`, `rest_mean` and `rest_sd`";
    const UNITS: &str = "a length in m, km, cm, mm, nmi; an angle in deg, rad, mrad, °; a time in s, ms, us, ns, min, h; \
        a speed in m/s, km/h, kn; an angular rate in deg/s, rad/s; a frequency in Hz, kHz, MHz, GHz; a share in %";
    let forms = |start: &str| format!("{start}; {FORMS}");
    let table: Vec<(String, String)> = [
        // The file as a whole.
        ("".into(), "x.toml:1: is empty; a suite needs [sensor] and [prior], and perhaps [noise] and [[family]]".into()),
        ("# only a comment\n".into(), "x.toml:1: is empty; a suite needs [sensor] and [prior], and perhaps [noise] and [[family]]".into()),
        ("title = \"x\"\n[sensor\n".into(), "x.toml:2: is not TOML: unclosed table, expected `]`".into()),
        ("title = \"x\"\n".into(), "x.toml:1: [sensor] is missing; say what measures, as [sensor] with `kind = \"range-bearing\"`".into()),
        (with("", "[prior]\n"), "x.toml:10: is not TOML: duplicate key `prior`; delete one".into()),
        // Unknown keys, with the nearest known one.
        (with("[noise]", "[nosie]"), "x.toml:8: nosie: unknown key `nosie`; did you mean `noise`? allowed: title, note, seed, precision, cap, draws, limits, envelope, method, family, sensor, prior, noise".into()),
        (with("covariance", "covarience"), "x.toml:7: prior.covarience: unknown key `covarience`; did you mean `covariance`? allowed: mean, covariance, sd, correlation, frame_bearing, frame_elevation, range, bearing, elevation, along_sd, across_sd, up_sd, frame_covariance, seen_from, speed, speed_sd, course, course_sd, climb, climb_sd, rest_mean, rest_sd".into()),
        (with("station =", "statoin ="), "x.toml:4: sensor.statoin: unknown key `statoin`; did you mean `station`? allowed: station, stations, position".into()),
        (with("sd =", "std ="), "x.toml:9: noise.std: unknown key `std`; did you mean `sd`? allowed: sd, covariance, inside".into()),
        (with("", "[[family]]\nname = \"a\"\nnotes = 1\n"), "x.toml:12: family[0].notes: unknown key `notes`; did you mean `noise`? allowed: name, draws, sensor, prior, noise".into()),
        // Sensors.
        (with("range-bearing", "range-baering"), "x.toml:3: sensor.kind: there is no sensor `range-baering`; did you mean `range-bearing`? give one of KINDS".into()),
        (with("kind = \"range-bearing\"", "kind = 5"), "x.toml:3: sensor.kind: is 5; give one of KINDS".into()),
        (with("kind = \"range-bearing\"", ""), "x.toml:2: sensor: `kind` is missing; give one of KINDS".into()),
        (with("station = [0, 0]", ""), "x.toml:2: sensor: `station` is missing; give `station` [x, y] or `stations` [[x, y], ...]".into()),
        (with("station = [0, 0]", "station = [0]"), "x.toml:4: sensor.station: has length 1; give a list of length 2".into()),
        (with("station = [0, 0]", "station = [0, \"3 deg\"]"), "x.toml:4: sensor.station[1]: \"3 deg\" is an angle; a length is needed: m, km, cm, mm, nmi".into()),
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
        (with("mean = [3000, 400]", "mean = [3000, \"4 deg\"]"), "x.toml:6: prior.mean[1]: \"4 deg\" is an angle; a length is needed: m, km, cm, mm, nmi".into()),
        (spread("sd = [30, -20]"), "x.toml:7: prior.sd[1]: -20 is below 0; a standard deviation is 0 or above".into()),
        (spread("sd = [30]"), "x.toml:7: prior.sd: has 1 entries, but `mean` has 2".into()),
        (spread("sd = [30, 20]\ncorrelation = [[0, 1, 1.5]]"), "x.toml:8: prior.correlation: components 0 and 1: 1.5 is outside -1 to 1".into()),
        (spread("sd = [30, 20]\ncorrelation = [[0, 2, 0.5]]"), "x.toml:8: prior.correlation[0][1]: 2 is outside the state, whose components are 0 to 1".into()),
        (spread("sd = [30, 20]\ncorrelation = [[1, 0.5], [0.4, 1]]"), "x.toml:8: prior.correlation[0][1]: is 0.5, but [1][0] is 0.4; the matrix is symmetric".into()),
        (spread("sd = [30, 20]\ncorrelation = [[1, 0.5], [0.5, 2]]"), "x.toml:8: prior.correlation[1][1]: is 2; a correlation matrix has 1 here".into()),
        (planar("bearing = \"30 deg\"", "bearing = 30"), "x.toml:7: prior.bearing: 30 has no unit; an angle needs one: \"30 deg\" or \"30 rad\"".into()),
        (planar("range = \"2 km\"", "range = \"3 deg\""), "x.toml:6: prior.range: \"3 deg\" is an angle; a length is needed: m, km, cm, mm, nmi".into()),
        (planar("range = \"2 km\"", "range = \"2 furlong\""), format!("x.toml:6: prior.range: there is no unit `furlong` (\"2 furlong\"); give {UNITS} (what is measured in another unit is a bare number in it)")),
        (planar("range = \"2 km\"", "range = \"far\""), format!("x.toml:6: prior.range: \"far\" is not a quantity; give a number and a unit: {UNITS}")),
        (planar("range = \"2 km\"", "range = 0"), "x.toml:6: prior.range: 0 is not above 0, as a range is".into()),
        (planar("along_sd = \"20 m\"", "along_sd = \"2 deg\""), "x.toml:8: prior.along_sd: \"2 deg\" is an angle; along the line of sight give a length or a share".into()),
        (planar("across_sd = \"3 deg\"", "across_sd = \"-3 deg\""), "x.toml:9: prior.across_sd: \"-3 deg\" is below 0; a standard deviation is 0 or above".into()),
        (planar("along_sd = \"20 m\"\n", ""), "x.toml:5: prior: `along_sd` is missing; give a length, as \"25 m\", or a share of the range, as \"10 %\"".into()),
        (planar("", "rest_mean = [1, 2]"), "x.toml:5: prior: `rest_sd` is missing; `rest_mean` stands without it".into()),
        (planar("", "rest_mean = [1, 2]\nrest_sd = [1]"), "x.toml:11: prior.rest_sd: has 1 entries, but `rest_mean` has 2".into()),
        (planar("", "").replace("kind = \"range-bearing\"\nstation = [0, 0]", "kind = \"linear\"\nH = [[1, 0]]"), "x.toml:5: prior: the sensor `linear` has no station to see range and bearing from; give `seen_from = [x, y]`, or the prior by `mean` and `sd`".into()),
        (planar("range = \"2 km\"", "range = \"2 min\""), "x.toml:6: prior.range: \"2 min\" is a time; a length is needed: m, km, cm, mm, nmi".into()),
        (planar("bearing = \"30 deg\"", "bearing = \"3 deg/s\""), "x.toml:7: prior.bearing: \"3 deg/s\" is an angular rate; an angle is needed: deg, rad, mrad, °".into()),
        (planar("across_sd = \"3 deg\"", "across_sd = \"3 kn\""), "x.toml:9: prior.across_sd: \"3 kn\" is a speed; across the line of sight give a length, an angle or a share".into()),
        (planar("", "rest_mean = [\"3 %\"]\nrest_sd = [1]"), "x.toml:10: prior.rest_mean[0]: \"3 %\" is a share; a number is needed, or a quantity such as \"3 m\" or \"3 deg\"".into()),
        // Priors in space.
        (space("", ""), "x.toml:10: prior.elevation: the sensor `range-bearing` reads a position in the plane, components [0, 1]; leave `elevation` out".into()),
        (space("up_sd = \"5 m\"", ""), "x.toml:5: prior: `up_sd` is missing; `elevation` stands without it: give a length, an angle, as \"3 deg\", or a share of the range".into()),
        (space("elevation = \"8 deg\"", ""), "x.toml:11: prior.up_sd: stands without `elevation`; a position in the plane has no spread upwards".into()),
        (unbound(space("\"8 deg\"", "\"100 deg\"")), "x.toml:11: prior.elevation: \"100 deg\" is beyond the vertical; give -90 deg to 90 deg".into()),
        (unbound(space("\"8 deg\"", "8")), "x.toml:11: prior.elevation: 8 has no unit; an angle needs one: \"8 deg\" or \"8 rad\"".into()),
        (unbound(space("\"5 m\"", "\"-5 m\"")), "x.toml:12: prior.up_sd: \"-5 m\" is below 0; a standard deviation is 0 or above".into()),
        (space("", "").replace("kind = \"range-bearing\"\nstation = [0, 0]", "kind = \"linear\"\nH = [[1, 0, 0]]"), "x.toml:5: prior: the sensor `linear` has no station to see range and bearing from; give `seen_from = [x, y, z]`, or the prior by `mean` and `sd`".into()),
        (unbound(space("\"5 m\"", "\"5 m\"\nseen_from = [0, 0]")).replacen("seen_from = [0, 0, 0]\n", "", 1), "x.toml:12: prior.seen_from: give one point [x, y, z]".into()),
        // Frames.
        (planar("", "frame_bearing = \"3 deg\""), "x.toml:10: prior.frame_bearing: turns a `frame_covariance`, or the spread about a `mean`; `along_sd` and `across_sd` go with the line of sight".into()),
        (planar("", "frame_covariance = [[4, 1], [1, 9]]"), "x.toml:10: prior.frame_covariance: stands beside `along_sd`; give one of the two".into()),
        (framed("[[4, 1], [1, 9]]\nframe_elevation = \"3 deg\""), "x.toml:9: prior.frame_elevation: stands without `frame_bearing`; give both".into()),
        (framed("[[4, 1], [1, 9]]\nframe_bearing = \"9 deg\"\nframe_elevation = \"3 deg\""), "x.toml:10: prior.frame_elevation: lifts the axes of a position in the plane; leave it out".into()),
        (framed("[[4, 1], [1, 9]]\nframe_bearing = 20"), "x.toml:9: prior.frame_bearing: 20 has no unit; an angle needs one: \"20 deg\" or \"20 rad\"".into()),
        (framed("[[4, 7],\n[7, 9]]"), "x.toml:8: prior.frame_covariance: the covariance is indefinite: its correlation matrix has the eigenvalue -1.667e-1; none may be negative".into()),
        (framed("[[4, 0],\n[0, -9]]"), "x.toml:9: prior.frame_covariance[1][1]: covariance[1][1] is -9; a variance cannot be negative".into()),
        (framed("[[4]]"), "x.toml:8: prior.frame_covariance: the covariance is 1 x 1, but 2 x 2 is needed".into()),
        (with("mean = [3000, 400]\ncovariance = [[900, 0], [0, 400]]", "frame_bearing = \"9 deg\""), format!("x.toml:5: prior: {}", forms("has neither a mean nor a range"))),
        (with("", "").replace("kind = \"range-bearing\"\nstation = [0, 0]", "kind = \"linear\"\nH = [[1]]").replace("mean = [3000, 400]\ncovariance = [[900, 0], [0, 400]]", "mean = [1]\nsd = [1]\nframe_bearing = \"9 deg\""), "x.toml:8: prior.frame_bearing: turns a position, components [0, 1], but the state has 1 components; leave it out".into()),
        // Velocities.
        (moving("speed = \"8 kn\"\n", ""), "x.toml:5: prior: `speed` is missing; give a speed, as \"8 kn\"".into()),
        (moving("course = \"200 deg\"\n", ""), "x.toml:5: prior: `course` is missing; give an angle, counter-clockwise from the x axis, as \"30 deg\"".into()),
        (moving("speed_sd = \"10 %\"\n", ""), "x.toml:5: prior: `speed_sd` is missing; give a speed, as \"0.5 m/s\", or a share of `speed`, as \"10 %\"".into()),
        (moving("course_sd = \"5 deg\"", ""), "x.toml:5: prior: `course_sd` is missing; give an angle, as \"5 deg\"".into()),
        (moving("\"8 kn\"", "\"8 km\""), "x.toml:10: prior.speed: \"8 km\" is a length; a speed is needed: m/s, km/h, kn".into()),
        (moving("\"8 kn\"", "\"8 knots\""), format!("x.toml:10: prior.speed: there is no unit `knots` (\"8 knots\"); did you mean `kn`? give {UNITS} (what is measured in another unit is a bare number in it)")),
        (moving("\"8 kn\"", "0"), "x.toml:10: prior.speed: 0 is not above 0, and without way there is no course; give the velocity by `rest_mean` and `rest_sd`".into()),
        (moving("\"200 deg\"", "200"), "x.toml:11: prior.course: 200 has no unit; an angle needs one: \"200 deg\" or \"200 rad\"".into()),
        (moving("\"10 %\"", "\"-1 m/s\""), "x.toml:12: prior.speed_sd: \"-1 m/s\" is below 0; a standard deviation is 0 or above".into()),
        (moving("\"10 %\"", "\"5 deg\""), "x.toml:12: prior.speed_sd: \"5 deg\" is an angle; a speed is needed: m/s, km/h, kn".into()),
        (moving("course_sd = \"5 deg\"", "course_sd = \"0.5 m/s\""), "x.toml:13: prior.course_sd: \"0.5 m/s\" is a speed; an angle is needed: deg, rad, mrad, °".into()),
        (moving("", "climb = 1\nclimb_sd = 1"), "x.toml:14: prior.climb: stands without `elevation`; a position in the plane has no climb".into()),
        (moving("", "climb = 1"), "x.toml:5: prior: `climb_sd` is missing; give a speed, as \"0.5 m/s\"".into()),
        // Noise.
        (with("\"0.3 deg\"", "0.3"), "x.toml:9: noise.sd[1]: 0.3 has no unit; an angle needs one: \"0.3 deg\" or \"0.3 rad\"; output 1 is the bearing".into()),
        (with("\"0.3 deg\"", "\"0.3 m\""), "x.toml:9: noise.sd[1]: \"0.3 m\" is a length; an angle is needed: deg, rad, mrad, °; output 1 is the bearing".into()),
        (with("sd = [\"10 m\", \"0.3 deg\"]", "sd = \"10 m\""), "x.toml:9: noise.sd: \"10 m\" is a length; an angle is needed: deg, rad, mrad, °; output 1 is the bearing".into()),
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
        (with("", "[limits]\nnees_ratio_high = 0.5\n"), "x.toml:10: limits: `nees_ratio_low` is 0.9, not below `nees_ratio_high`, which is 0.5".into()),
        (with("", "[limits]\nvariance_ratio_low = 2\n"), "x.toml:11: limits.variance_ratio_low: is 2, not below `variance_ratio_high`, which is 1.25".into()),
        (with("", "[limits]\nfloor = \"much\"\n"), "x.toml:11: limits.floor: is the text \"much\"; give a number".into()),
        (with("", "[method]\nid = \"taylor-1\"\n"), "x.toml:10: method: is a table; give a list [..], as [[method]], or method = \"every\"".into()),
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
        let range = if bundled.name == "smoke" { 30..=80 } else { 24..=100 };
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

/// The case of a suite that has one.
#[track_caller]
fn only(text: &str) -> Case {
    let mut cases = read(text).unwrap_or_else(|e| panic!("{e}")).cases;
    assert_eq!(cases.len(), 1);
    cases.remove(0)
}

#[track_caller]
fn all_close<'a>(found: impl IntoIterator<Item = &'a f64>, expected: impl IntoIterator<Item = f64>) {
    let found: Vec<_> = found.into_iter().copied().collect();
    let expected: Vec<_> = expected.into_iter().collect();
    assert_eq!(found.len(), expected.len());
    for (found, expected) in found.into_iter().zip(expected) {
        close(found, expected);
    }
}

/// A sensor without a station, on a state of `n`.
fn gauge(n: usize) -> String {
    format!("[sensor]\nkind = \"linear\"\nH = [{:?}]\n[prior]\n", vec![1; n])
}

/// The bearing whose cosine is 3/5 and the elevation whose sine is 5/13: right triangles in whole numbers.
fn whole_triangles() -> (String, String) {
    ((4.0_f64 / 3.0).atan().to_string(), (5.0_f64 / 12.0).atan().to_string())
}

#[test]
fn a_place_in_space_is_worked_by_hand() {
    // 65 m away along u = (36, 48, 25) / 65; across lies a = (-4, 3, 0) / 5, up w = (-3, -4, 12) / 13. All three are
    // unit vectors at right angles, so P = 2^2 u u' + 3^2 a a' + 1 w w'.
    let (bearing, elevation) = whole_triangles();
    let text = |spread: &str| {
        format!(
            "{}range = 65\nbearing = \"{bearing} rad\"\nelevation = \"{elevation} rad\"\nseen_from = [10, 20, 30]\n\
             {spread}\nrest_mean = [7]\nrest_sd = [5]\n",
            gauge(4)
        )
    };
    let (u, a, w) = ([36.0, 48.0, 25.0], [-4.0, 3.0, 0.0], [-3.0, -4.0, 12.0]);
    let p = |i: usize, j: usize| {
        if i == 3 || j == 3 {
            return if i == j { 25.0 } else { 0.0 };
        }
        4.0 * u[i] * u[j] / 4225.0 + 9.0 * a[i] * a[j] / 25.0 + w[i] * w[j] / 169.0
    };
    // The angles are seen from 65 m: 3 m across and 1 m up.
    let in_angles = format!("along_sd = 2\nacross_sd = \"{} rad\"\nup_sd = \"{} %\"", 3.0 / 65.0, 100.0 / 65.0);
    for spread in [
        "along_sd = \"200 cm\"\nacross_sd = 3\nup_sd = \"1 m\"",
        &in_angles,
        "frame_covariance = [[4, 0, 0], [0, 9, 0], [0, 0, 1]]",
    ] {
        let case = only(&text(spread));
        all_close(case.prior().mean(), [46.0, 68.0, 55.0, 7.0]);
        all_close(case.prior().covariance(), (0..16).map(|k| p(k / 4, k % 4)));
    }
    // A covariance between along and up adds 0.5 (u w' + w u').
    let case = only(&text("frame_covariance = [[4, 0, 0.5], [0, 9, 0], [0.5, 0, 1]]"));
    let cross = |i: usize, j: usize| {
        if i == 3 || j == 3 { 0.0 } else { 0.5 * (u[i] * w[j] + w[i] * u[j]) / 845.0 }
    };
    all_close(case.prior().covariance(), (0..16).map(|k| p(k / 4, k % 4) + cross(k / 4, k % 4)));
}

#[test]
fn a_place_at_elevation_zero_is_the_place_in_the_plane() {
    let seen = "range = \"3 km\"\nbearing = \"250 deg\"\nalong_sd = \"40 m\"\nacross_sd = \"2 deg\"\n";
    let flat = only(&format!("{}seen_from = [5, 6]\n{seen}", gauge(2)));
    let space = only(&format!("{}seen_from = [5, 6, 7]\n{seen}elevation = \"0 deg\"\nup_sd = 9\n", gauge(3)));
    let (flat, space) = (flat.prior(), space.prior());
    assert_eq!(space.mean().rows(0, 2), flat.mean().rows(0, 2));
    assert_eq!(space.covariance().view((0, 0), (2, 2)), flat.covariance().view((0, 0), (2, 2)));
    assert_eq!((space.mean()[2], space.covariance()[(2, 2)], space.covariance()[(0, 2)]), (7.0, 81.0, 0.0));
    // Straight up, along is z and up points back against the bearing.
    let up = only(&format!("{}seen_from = [5, 6, 7]\n{seen}elevation = \"90 deg\"\nup_sd = 9\n", gauge(3)));
    close(up.prior().mean()[2], 3007.0);
    close(up.prior().covariance()[(2, 2)], 1600.0);
}

#[test]
fn frames_turn_the_spread_of_the_position_only() {
    // T = [[3, -4], [4, 3]] / 5 and K = [[4, 1], [1, 9]]: T K T' by hand = [[156, -67], [-67, 169]] / 25.
    let (bearing, _) = whole_triangles();
    let expected = [156.0 / 25.0, -67.0 / 25.0, -67.0 / 25.0, 169.0 / 25.0];
    let frame = format!("frame_bearing = \"{bearing} rad\"\n");
    let k = "[[4, 1], [1, 9]]";
    let seen = "range = 100\nbearing = \"77 deg\"\nseen_from = [0, 0]\n";
    let along = format!("range = 100\nbearing = \"{bearing} rad\"\nseen_from = [0, 0]\n");
    for prior in [
        format!("{seen}frame_covariance = {k}\n{frame}"),
        format!("{along}frame_covariance = {k}\n"),
        format!("mean = [1, 2]\ncovariance = {k}\n{frame}"),
        format!("mean = [1, 2]\nsd = [2, 3]\ncorrelation = [[0, 1, {}]]\n{frame}", 1.0 / 6.0),
    ] {
        all_close(only(&format!("{}{prior}", gauge(2))).prior().covariance(), expected);
    }
    // Within a larger state the rows of the position are turned, T (2, 3)' = (-6, 17) / 5, the others left.
    let text = format!(
        "[sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\nposition = [2, 0]\n[prior]\nmean = [\"1 km\", 2, 3]\n\
         covariance = [[9, 3, 1], [3, 16, 2], [1, 2, 4]]\n{frame}"
    );
    let turned = only(&text);
    all_close(turned.prior().mean(), [1000.0, 2.0, 3.0]);
    let (x, y, cross) = (156.0 / 25.0, 169.0 / 25.0, -67.0 / 25.0);
    all_close(
        turned.prior().covariance(),
        [y, 17.0 / 5.0, cross, 17.0 / 5.0, 16.0, -6.0 / 5.0, cross, -6.0 / 5.0, x],
    );
    // In space: lifted by a right angle, what was along x lies along z, what was up lies against x.
    let lifted = only(&format!(
        "{}mean = [0, 0, 0]\nsd = [1, 2, 3]\nframe_bearing = \"0 deg\"\nframe_elevation = \"90 deg\"\n",
        gauge(3)
    ));
    all_close(lifted.prior().covariance(), [9.0, 0.0, 0.0, 0.0, 4.0, 0.0, 0.0, 0.0, 1.0]);
}

#[test]
fn speed_and_course_are_worked_by_hand() {
    // 5 m/s along (3, 4) / 5 with 10 % = 0.5 m/s along and 5 * 0.2 = 1 m/s across: mean (3, 4), covariance
    // xx = (9 * 0.25 + 16) / 25 = 0.73, yy = (16 * 0.25 + 9) / 25 = 0.52, xy = 12 * (0.25 - 1) / 25 = -0.36.
    let (course, _) = whole_triangles();
    let velocity =
        format!("speed = \"18 km/h\"\ncourse = \"{course} rad\"\nspeed_sd = \"10 %\"\ncourse_sd = \"0.2 rad\"\n");
    let seen = "range = 100\nbearing = \"90 deg\"\nalong_sd = 2\nacross_sd = 3\nrest_mean = [6]\nrest_sd = [8]\n";
    // Components: position, velocity, rest. The velocity takes the first that are not of the position.
    for (position, order) in [("[0, 1]", [0, 1, 2, 3, 4]), ("[0, 2]", [0, 2, 1, 3, 4]), ("[4, 1]", [4, 1, 0, 2, 3])]
    {
        let sensor =
            format!("[sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\nposition = {position}\n[prior]\n");
        let case = only(&format!("{sensor}{seen}{velocity}"));
        let (mean, p) = (case.prior().mean(), case.prior().covariance());
        all_close(&order.map(|i| mean[i]), [0.0, 100.0, 3.0, 4.0, 6.0]);
        let [x, y, vx, vy, rest] = order;
        all_close(&[p[(x, x)], p[(y, y)], p[(rest, rest)]], [9.0, 4.0, 64.0]);
        all_close(
            &[p[(vx, vx)], p[(vy, vy)], p[(vx, vy)], p[(x, vx)], p[(rest, vy)]],
            [0.73, 0.52, -0.36, 0.0, 0.0],
        );
    }
    let climbing = only(&format!(
        "{}seen_from = [0, 0, 0]\nelevation = \"0 deg\"\nup_sd = 1\n{velocity}climb = \"-3.6 km/h\"\nclimb_sd = 0.25\n{seen}",
        gauge(7)
    ));
    let (mean, p) = (climbing.prior().mean(), climbing.prior().covariance());
    all_close(mean, [0.0, 100.0, 0.0, 3.0, 4.0, -1.0, 6.0]);
    all_close(&[p[(3, 3)], p[(4, 4)], p[(3, 4)], p[(5, 5)], p[(3, 5)]], [0.73, 0.52, -0.36, 0.0625, 0.0]);
}

#[test]
fn course_is_of_first_order() {
    // Speed N(v, a^2) and course N(c, s^2), independent, have along and across c the exact variances
    // (v^2 + a^2) (1 + exp(-2 s^2)) / 2 - v^2 exp(-s^2) and (v^2 + a^2) (1 - exp(-2 s^2)) / 2, from the characteristic
    // function of the normal law, E cos k(theta - c) = exp(-k^2 s^2 / 2). First order leaves out shares of the order
    // of s^2 and (a / v)^2, and along also v^2 s^4 / 2.
    let (v, a, s) = (8.0_f64, 0.2_f64, 0.03_f64);
    let case = only(&format!(
        "{}seen_from = [0, 0]\nrange = 1\nbearing = \"0 deg\"\nalong_sd = 1\nacross_sd = 1\n\
         speed = {v}\nspeed_sd = {a}\ncourse = \"0 deg\"\ncourse_sd = \"{s} rad\"\n",
        gauge(4)
    ));
    let p = case.prior().covariance();
    let square = v * v + a * a;
    let along = square * (1.0 + (-2.0 * s * s).exp()) / 2.0 - v * v * (-s * s).exp();
    let across = square * (1.0 - (-2.0 * s * s).exp()) / 2.0;
    let order = s * s + (a / v).powi(2);
    assert!((p[(2, 2)] / along - 1.0).abs() < 2.0 * order + v * v * s.powi(4) / (a * a), "{p} {along}");
    assert!((p[(3, 3)] / across - 1.0).abs() < 2.0 * order, "{p} {across}");
}

#[test]
fn new_keys_are_swept_and_drawn() {
    let text = format!(
        "draws = 3\n{}seen_from = [0, 0, 0]\nrange = \"1 km\"\nbearing = \"0 deg\"\n\
         elevation = {{ from = \"0 deg\", to = \"60 deg\", steps = 3 }}\n\
         frame_covariance = [[{{ list = [1, 4] }}, 0, 0], [0, 9, 0], [0, 0, 16]]\n\
         frame_bearing = {{ list = [\"0 deg\", \"90 deg\"] }}\n\
         speed = {{ draw = \"log-uniform\", from = \"1 kn\", to = \"30 kn\" }}\n\
         course = {{ draw = \"uniform\", from = \"0 deg\", to = \"360 deg\" }}\n\
         speed_sd = {{ list = [\"5 %\"] }}\ncourse_sd = \"5 deg\"\n",
        gauge(5)
    );
    let cases = read(&text).unwrap_or_else(|e| panic!("{e}")).cases;
    assert_eq!(cases.len(), 3 * 2 * 2 * 3);
    // Elevation runs slowest, the draws fastest.
    for (i, case) in cases.iter().enumerate() {
        let (mean, p) = (case.prior().mean(), case.prior().covariance());
        close(mean[2], 1000.0 * (30.0 * (i / 12) as f64 * PI / 180.0).sin());
        let along = [1.0, 4.0][i / 6 % 2];
        let (x, y) = if i / 3 % 2 == 0 { (along, 9.0) } else { (9.0, along) };
        all_close(&[p[(0, 0)], p[(1, 1)], p[(2, 2)]], [x, y, 16.0]);
        let speed = mean[3].hypot(mean[4]);
        assert!((1852.0 / 3600.0 - 1e-9..=30.0 * 1852.0 / 3600.0 + 1e-9).contains(&speed), "{speed}");
        // The trace of a turned covariance is that of the variances.
        close(p[(3, 3)] + p[(4, 4)], speed * speed * (0.05_f64.powi(2) + (5.0 * PI / 180.0).powi(2)));
    }
    assert!(cases.windows(2).all(|pair| pair[0].prior().mean()[3] != pair[1].prior().mean()[3]));
}

fn file(folder: &Path, name: &str, bytes: &[u8]) -> std::path::PathBuf {
    let path = folder.join(name);
    std::fs::File::create(&path).unwrap().write_all(bytes).unwrap();
    path
}

/// What a suite of regimes is for: thousands of cases, all drawn, each with the seed's own draw, and envelopes asked for.
#[test]
fn suites_of_regimes_draw_thousands_of_cases() {
    for bundled in Suite::regimes() {
        let suite = Suite::load(bundled.name, None).unwrap_or_else(|e| panic!("{e}"));
        assert_eq!(suite.title, bundled.summary);
        assert!(suite.cases.len() >= 2000 && suite.envelope.is_some(), "{}", bundled.name);
        assert!(suite.methods.as_ref().is_some_and(|methods| methods.len() > 20), "{}", bundled.name);
        assert!(suite.note.starts_with("Invented numbers"), "{}", bundled.name);
        for case in &suite.cases {
            assert!(case.settings().len() >= 3 && case.settings().iter().all(|s| !s.swept), "{}", case.id());
        }
    }
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
    let names = Suite::bundled().iter().map(|suite| suite.name).collect::<Vec<_>>().join(", ");
    let sensors = Suite::regimes().iter().map(|suite| suite.name.strip_prefix("regimes-").unwrap());
    let sensors = sensors.collect::<Vec<_>>().join(", ");
    assert_eq!(
        Suite::load("harbor-radar", None).unwrap_err().to_string(),
        format!(
            "harbor-radar: there is no bundled suite of this name; did you mean `harbour-radar`? give one of \
             {names}, a suite of regimes, regimes- and one of {sensors}, or the path of a file that ends in .toml (case records \
             go to --cases)"
        )
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
[[family]]
name = "c"
[family.sensor]
kind = "linear"
H = [[1, 0, 1, 0, 1, 0]]
[family.prior]
seen_from = [0, 0, "1 m"]
range = "1 km"
bearing = "20 deg"
elevation = "5 deg"
frame_covariance = [[4, 1, 0], [1, 9, 0], [0, 0, 1]]
frame_bearing = "70 deg"
frame_elevation = "-3 deg"
speed = "8 kn"
speed_sd = "10 %"
course = { list = ["20 deg", "1 rad"] }
course_sd = "5 deg"
climb = -1
climb_sd = 0.5
[family.noise]
sd = "1 m"
[[family]]
name = "d"
[family.sensor]
kind = "linear"
H = [[1, 0, 1]]
[family.prior]
mean = [1, 2, 3]
sd = [1, 2, 3]
frame_bearing = "20 deg"
[family.noise]
sd = 2
"#;
    assert_eq!(read(TEXT).unwrap().cases.len(), 12);
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
