//! Headings and values of sweeps for people: angles in degrees, long distances in kilometres.

/// What a heading says, without its unit, and its unit.
pub(super) fn parted(heading: &str) -> (&str, &str) {
    let heading = heading.strip_suffix(crate::suite::Setting::DRAWN).unwrap_or(heading);
    match heading.split_once(" [") {
        Some((name, unit)) => (name, unit.trim_end_matches(']')),
        None => (heading, ""),
    }
}

/// The unit that people read, and by what a value in the heading's is multiplied.
pub(super) fn shown(unit: &str) -> (&str, f64) {
    match unit {
        "rad" => ("deg", 180.0 / std::f64::consts::PI),
        "rad/s" => ("deg/s", 180.0 / std::f64::consts::PI),
        other => (other, 1.0),
    }
}

/// A value with its unit.
pub(super) fn quantity(value: f64, heading: &str) -> String {
    let (unit, factor) = shown(parted(heading).1);
    let value = value * factor;
    if unit == "m" && value.abs() >= 1000.0 {
        return format!("{} km", short(value / 1000.0));
    }
    if unit.is_empty() { short(value) } else { format!("{} {unit}", short(value)) }
}

/// Three digits, without zeros at the end.
pub(super) fn short(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return format!("{value}");
    }
    let size = value.abs().log10().floor() as i32;
    if !(-4..6).contains(&size) {
        return format!("{value:.2e}");
    }
    let text = format!("{value:.*}", (2 - size).max(0) as usize);
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').into() } else { text }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantities_are_as_people_write_them() {
        assert_eq!(quantity(0.008726646259971648, "prior.across_sd [rad]"), "0.5 deg");
        assert_eq!(quantity(20_000.0, "prior.range [m], drawn"), "20 km");
        assert_eq!(quantity(300.0, "prior.range [m]"), "300 m");
        assert_eq!(quantity(0.02, "prior.along_sd"), "0.02");
        assert_eq!([short(695.33), short(0.0012345), short(1.5e-7)], ["695", "0.00123", "1.50e-7"]);
    }
}
