//! Sensors written out as formulas in a suite: where position and velocity stand, and the units of what has no unit of its own.

use std::f64::consts::PI;

use gaussworthy::suite::{Case, Suite};

fn read(text: &str) -> Result<Case, String> {
    Suite::from_text("x", "x.toml", text, None).map(|mut s| s.cases.remove(0)).map_err(|e| e.to_string())
}

/// A few roundings of an angle or a length of a few kilometres.
#[track_caller]
fn close(found: f64, expected: f64) {
    assert!((found - expected).abs() <= 1e-12 * expected.abs().max(1.0), "{found}, expected {expected}");
}

const RANGE: &str = "\n[[sensor.outputs]]\nname = \"range\"\nformula = \"hypot(x, y)\"\nunit = \"m\"\n";
const SEEN: &str = "[prior]\nseen_from = [0, 0]\nrange = \"2 km\"\nbearing = \"90 deg\"\nalong_sd = \"30 m\"\n\
    across_sd = \"3 m\"\n";
const MOVING: &str = "speed = \"10 m/s\"\nspeed_sd = \"2 m/s\"\ncourse = \"180 deg\"\ncourse_sd = \"0.5 rad\"\n";

fn boat(sensor: &str, prior: &str) -> Result<Case, String> {
    read(&format!("[sensor]\nstate = [\"x\", \"vx\", \"y\", \"vy\"]\n{sensor}{RANGE}{prior}"))
}

#[test]
fn position_and_velocity_stand_where_the_suite_says() {
    let resting = "rest_mean = [1, 2]\nrest_sd = [3, 4]\n";
    for named in ["position = [\"x\", \"y\"]", "position = [0, 2]"] {
        let case = boat(named, &format!("{SEEN}{resting}")).unwrap();
        let (m, p) = (case.prior().mean(), case.prior().covariance());
        for (i, (mean, variance)) in [(0.0, 9.0), (1.0, 9.0), (2000.0, 900.0), (2.0, 16.0)].into_iter().enumerate()
        {
            close(m[i], mean);
            close(p[(i, i)], variance);
        }
        // What is said for the suite alone is no part of the case.
        let record = case.to_json();
        assert!(record["sensor"].get("position").is_none(), "{record}");
        assert_eq!(Case::from_json(record.clone()).unwrap().to_json(), record);
    }
    let both = "position = [\"x\", \"y\"]\nvelocity = [\"vx\", \"vy\"]";
    let case = boat(both, &format!("{SEEN}{MOVING}")).unwrap();
    let p = case.prior().covariance();
    for (i, (mean, variance)) in [(0.0, 9.0), (-10.0, 4.0), (2000.0, 900.0), (0.0, 25.0)].into_iter().enumerate() {
        assert!((case.prior().mean()[i] - mean).abs() < 1e-12, "{}", case.prior().mean());
        close(p[(i, i)], variance);
    }
    // Turned by a right angle: the position's part, and no other.
    let turned = "[prior]\nmean = [1, 2, 3, 4]\nsd = [5, 6, 7, 8]\nframe_bearing = \"90 deg\"\n";
    let case = boat("position = [\"x\", \"y\"]", turned).unwrap();
    for (i, variance) in [49.0, 36.0, 25.0, 64.0].into_iter().enumerate() {
        close(case.prior().covariance()[(i, i)], variance);
    }
    // Where the position is all there is, it is the state.
    let text = format!("[sensor]\nstate = [\"x\", \"y\"]\n{RANGE}{SEEN}");
    close(read(&text).unwrap().prior().mean()[1], 2000.0);
}

#[test]
fn formulas_whose_position_nobody_can_know_are_refused() {
    let named = "position = [\"x\", \"y\"]";
    let resting = format!("{SEEN}rest_mean = [1, 2]\nrest_sd = [3, 4]\n");
    let turned = "[prior]\nmean = [1, 2, 3, 4]\nsd = [5, 6, 7, 8]\nframe_bearing = \"90 deg\"\n";
    for (sensor, prior, said) in [
        (
            "",
            &resting[..],
            "x.toml:10: prior.range: gives a position, but nothing says which components of the state x, vx, y, vy it is; \
             give `position = [\"x\", \"y\"]` in [sensor]",
        ),
        ("", turned, "x.toml:11: prior.frame_bearing: gives a position, but nothing says which"),
        (
            named,
            &format!("{SEEN}{MOVING}"),
            "x.toml:14: prior.speed: gives a velocity, but nothing says which components of the state x, vx, y, vy it is; \
             give `velocity = [\"vx\", \"vy\"]` in [sensor]",
        ),
        (
            "position = [\"x\", \"z\"]",
            &resting,
            "x.toml:3: sensor.position[1]: the state has no component `z`; give one of x, vx, y, vy",
        ),
        (
            "position = [0, 4]",
            &resting,
            "x.toml:3: sensor.position[1]: 4 is outside the state, whose components are 0",
        ),
        ("position = [0, \"x\"]", &resting, "x.toml:3: sensor.position[1]: names the component `x` twice"),
        ("position = [0]", &resting, "x.toml:3: sensor.position: has 1 entries; give two or three components"),
        ("position = [0, 2.5]", &resting, "x.toml:3: sensor.position[1]: is 2.5; give one of x, vx, y, vy"),
    ] {
        let error = boat(sensor, prior).unwrap_err();
        assert!(error.starts_with(said), "{error}\nexpected\n{said}");
    }
}

/// An echo sounder of one component each in metres, in degrees, in a unit of its own, and without one.
fn sounder(mean: &str, noise: &str) -> Result<Case, String> {
    read(&format!(
        "[sensor]\nstate = [{{ name = \"depth\", unit = \"m\" }}, {{ name = \"tilt\", unit = \"deg\" }},\n\
         {{ name = \"glow\", unit = \"lux\" }}, \"mud\"]\n\
         noise = [{{ name = \"haze\", unit = \"m\" }}, \"gain\"]\n[[sensor.outputs]]\nname = \"echo\"\n\
         formula = \"(depth + haze) * (1 + gain)\"\nunit = \"m\"\n[[sensor.outputs]]\nname = \"lean\"\nformula = \"tilt\"\n\
         unit = \"deg\"\n[[sensor.outputs]]\nname = \"level\"\nformula = \"glow\"\nunit = \"lux\"\n[[sensor.outputs]]\n\
         name = \"rest\"\nformula = \"mud\"\n[prior]\nmean = {mean}\nsd = [1, 1, 1, 1]\n[noise]\n{noise}\n"
    ))
}

const NOISE: &str = "inside = { sd = [1, 1] }";

#[test]
fn quantities_come_in_the_unit_of_their_component() {
    let case = sounder(
        "[\"0.2 km\", \"7 deg\", \"12 lux\", 3]",
        "sd = [\"0.1 km\", \"1 deg\", \"2 lux\", 0.5]\ninside = { sd = [\"20 cm\", \"2 %\"] }",
    )
    .unwrap();
    assert_eq!(case.prior().mean().as_slice(), [200.0, 7.0, 12.0, 3.0]);
    assert_eq!(case.noise().unwrap().diagonal().as_slice(), [10000.0, 1.0, 4.0, 0.25]);
    let inside = case.noise_inside().unwrap();
    close(inside[(0, 0)], 0.04);
    close(inside[(1, 1)], 4e-4);
    // Converted into the unit that the author chose, not into the base unit.
    let case = sounder("[1, \"0.1 rad\", 1, 1]", "sd = [1, \"0.1 rad\", 1, 1]\ninside = { sd = 1 }").unwrap();
    close(case.prior().mean()[1], 18.0 / PI);
    close(case.noise().unwrap()[(1, 1)], (18.0 / PI).powi(2));
    // A record is bare numbers, and its names are names; units may stand there, and are dropped.
    let mut record = case.to_json();
    assert_eq!(record["sensor"]["state"], serde_json::json!(["depth", "tilt", "glow", "mud"]));
    assert_eq!(record["sensor"]["noise"], serde_json::json!(["haze", "gain"]));
    let plain = record.clone();
    record["sensor"]["state"][1] = serde_json::json!({"name": "tilt", "unit": "deg"});
    assert_eq!(Case::from_json(record).unwrap().to_json(), plain);
}

#[test]
fn a_quantity_that_does_not_fit_its_component_is_refused() {
    let bare = "[1, 1, 1, 1]";
    for (mean, noise, said) in [
        (
            "[\"80 deg\", 1, 1, 1]",
            NOISE,
            "prior.mean[0]: \"80 deg\" is an angle; a length is needed: m, km, cm, mm, nmi",
        ),
        ("[1, \"3 m\", 1, 1]", NOISE, "prior.mean[1]: \"3 m\" is a length; an angle is needed: deg, rad, mrad, °"),
        (
            "[1, 1, \"3 m\", 1]",
            NOISE,
            "prior.mean[2]: is \"3 m\"; give a bare number, or a text in lux, as \"2 lux\"",
        ),
        (
            "[1, 1, 1, \"80 deg\"]",
            NOISE,
            "prior.mean[3]: \"80 deg\" has a unit, but the state component `mud` has none; give a bare number, or its unit \
             in the sensor's `state`: { name = \"mud\", unit = \"rad\" }",
        ),
        (
            "[1, 1, 1, \"5 %\"]",
            NOISE,
            "prior.mean[3]: \"5 %\" has a unit, but the state component `mud` has none; give a bare number, or its unit in \
             the sensor's `state`: { name = \"mud\", unit = \"%\" }",
        ),
        (
            bare,
            "inside = { sd = [\"1 deg\", 1] }",
            "noise.inside.sd[0]: \"1 deg\" is an angle; a length is needed: m, km, cm, mm, nmi",
        ),
        (
            bare,
            "inside = { sd = [1, \"1 m\"] }",
            "noise.inside.sd[1]: \"1 m\" has a unit, but the noise variable `gain` has none; give a bare number, or its \
             unit in the sensor's `noise`: { name = \"gain\", unit = \"m\" }",
        ),
        (
            bare,
            "inside = { sd = [-1, 1] }",
            "noise.inside.sd[0]: -1 is below 0; a standard deviation is 0 or above",
        ),
        (
            bare,
            "sd = [1, \"1 m\", 1, 1]\ninside = { sd = 1 }",
            "noise.sd[1]: \"1 m\" is a length; an angle is needed: deg, rad, mrad, °; output 1 is the lean, in deg",
        ),
        (
            bare,
            "sd = [1, 1, 1, \"1 m\"]\ninside = { sd = 1 }",
            "noise.sd[3]: \"1 m\" has a unit, but the output `rest` has none; give a bare number, or the output its `unit`; \
             output 3 is the rest",
        ),
    ] {
        let error = sounder(mean, noise).unwrap_err();
        let error = error.splitn(3, ':').nth(2).unwrap().trim();
        assert_eq!(error, said);
    }
    let named = "position = [\"x\", \"y\"]";
    let text = format!("[sensor]\nstate = [{{ name = \"x\", unit = \"km\" }}, \"y\"]\n{named}{RANGE}{SEEN}");
    assert_eq!(
        read(&text).unwrap_err(),
        "x.toml:3: sensor.position[0]: `x` is in km, but a position is worked in m; give the component `unit = \"m\"`"
    );
}

#[test]
fn a_component_is_a_name_or_a_table_of_two() {
    for (component, said) in [
        (
            "{ name = \"x\", units = \"m\" }",
            "sensor.state[0].units: unknown key `units`; did you mean `unit`? allowed: name, unit",
        ),
        ("{ unit = \"m\" }", "sensor.state[0]: `name` is missing"),
        ("3", "sensor.state[0]: is the number `3`; give a name, or { name, unit }"),
        (
            "{ name = \"x\", unit = \"\\u0007\" }",
            "sensor.state[0].unit: \"\\u{7}\" is no unit; give printable characters",
        ),
    ] {
        let text = format!(
            "[sensor]\nstate = [{component}]\n[[sensor.outputs]]\nname = \"y\"\nformula = \"x\"\n[prior]\nmean = [1]\nsd = [1]\n"
        );
        let error = read(&text).unwrap_err();
        assert_eq!(error.trim_start_matches("x.toml:2: "), said);
    }
}
