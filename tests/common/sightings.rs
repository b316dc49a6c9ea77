//! Trials of the sensors that see a position in the plane or in space, some with its velocity: random states, and how
//! strongly the outputs can bend there.
//!
//! The bounds are Cauchy's: a function that is analytic where two coordinates move by up to rho in the complex plane,
//! and departs there from its value by at most M, has k-th derivatives of at most k! M / rho^k. With rho an eighth of
//! the range r, z'z of a position z departs from r^2 by at most 2 sqrt(2) / 8 + 2 / 64 = 0.385 of it, so that |z| <
//! 1.18 r, 1 / |z'z| < 1.63 / r^2, sqrt and ln of z'z stay analytic, and ln departs by less than 0.49.

use std::f64::consts::LN_10;

use nalgebra::DVectorView;
use rand::RngExt;
use rand_pcg::Pcg64;
use serde_json::{Value, json};

use super::random;

/// A sensor with stations, as its parameters say.
pub struct Sighting {
    described: Value,
    stations: Vec<Vec<f64>>,
    moving: bool,
}

/// What is known of an output around a point.
pub struct Reach {
    /// How far two coordinates can move with the output analytic (rho).
    pub radius: f64,
    /// How far it then departs from its value at most (M).
    pub departure: f64,
    /// How large the terms are that it is made of, for their rounding.
    pub value: f64,
}

impl Sighting {
    pub fn new(kind: &str, stations: &[&[f64]], position: &[usize], velocity: &[usize]) -> Self {
        let mut described = match (stations, kind) {
            ([one], _) => json!({"kind": kind, "station": one, "position": position}),
            _ => json!({"kind": kind, "stations": stations, "position": position}),
        };
        let more = match kind {
            "time-difference" => json!({"wave_speed": 0.7}),
            "frequency-difference" => json!({"wave_speed": 0.7, "carrier": 2.1}),
            "received-strength" => json!({"strength": 12.0, "reference_distance": 3.0, "exponent": 2.5}),
            _ => json!({}),
        };
        if !velocity.is_empty() {
            described["velocity"] = json!(velocity);
        }
        described.as_object_mut().unwrap().extend(more.as_object().unwrap().clone());
        Self { described, stations: stations.iter().map(|s| s.to_vec()).collect(), moving: !velocity.is_empty() }
    }

    /// The sensor as a case record says it.
    pub fn described(&self) -> Value {
        self.described.clone()
    }

    /// A position near or far in any direction from one of the stations, moving by a tenth of its range to ten of them.
    pub fn point(&self, rng: &mut Pcg64) -> Vec<f64> {
        let station = &self.stations[rng.random_range(0..self.stations.len())];
        let towards = |length: f64, rng: &mut Pcg64| {
            let direction = random::normal_vector(station.len(), rng).normalize();
            direction.iter().map(|u| length * u).collect::<Vec<_>>()
        };
        let range = 10f64.powf(rng.random_range(-0.5..5.0));
        let offset = towards(range, rng);
        let mut x: Vec<f64> = station.iter().zip(offset).map(|(s, o)| s + o).collect();
        if self.moving {
            let speed = range * 10f64.powf(rng.random_range(-1.0..1.0));
            x.extend(towards(speed, rng));
        }
        x
    }

    /// What is known of output `j` around `x`.
    pub fn reach(&self, x: &[f64], j: usize) -> Reach {
        let dimension = self.stations[0].len();
        let offset =
            |s: usize| x[..dimension].iter().zip(&self.stations[s]).map(|(p, o)| p - o).collect::<Vec<_>>();
        let range = |s: usize| length(&offset(s));
        // The distance to the vertical through the station.
        let ground = |s: usize| length(&offset(s)[..2]);
        let speed = length(&x[dimension..]);
        // (s, part of it): which of the station's outputs.
        let of_each = |count: usize| (j / count, j % count);
        // |z| <= 1.18 r; |(z'(v + rho))/|z|| <= 1.18 * 1.28 (|v| + r / 8).
        let distance = |s: usize| Reach { radius: range(s) / 8.0, departure: 3.0 * range(s), value: range(s) };
        let rate = |s: usize| Reach { radius: range(s) / 8.0, departure: 3.0 * (speed + range(s)), value: speed };
        // atan2 is ln((x + iy) / (x - iy)) / 2i, where both lie within rho + rho = 1/4 of their length: it departs
        // by -ln(3/4) at most. For the elevation x is a length that itself departs by 0.22 of the ground range,
        // and y by 1/8 of it: by -ln(1 - 0.35) at most.
        let angle = |radius: f64| Reach { radius, departure: 0.5, value: std::f64::consts::PI };
        let difference = |s: usize, of: &dyn Fn(usize) -> Reach, factor: f64| {
            let (here, there) = (of(s), of(0));
            Reach {
                radius: here.radius.min(there.radius),
                departure: factor * (here.departure + there.departure),
                value: factor * (here.value + there.value),
            }
        };
        match (self.described["kind"].as_str().unwrap(), dimension) {
            ("range-only", _) => distance(j),
            ("range-doppler", _) => match of_each(2) {
                (s, 0) => distance(s),
                (s, _) => rate(s),
            },
            ("range-azimuth-elevation", _) => match of_each(3) {
                (s, 0) => distance(s),
                (s, _) => angle(ground(s) / 8.0),
            },
            ("azimuth-elevation", _) => angle(ground(of_each(2).0) / 8.0),
            ("bearing-rate", _) => match of_each(2) {
                (s, 0) => angle(range(s) / 8.0),
                // 1.18 r (|v| + r / 8) * 1.63 / r^2.
                (s, _) => Reach {
                    radius: range(s) / 8.0,
                    departure: 3.0 * (speed + range(s)) / range(s),
                    value: speed / range(s),
                },
            },
            ("time-difference", _) => difference(j + 1, &distance, 1.0 / 0.7),
            ("frequency-difference", _) => difference(j + 1, &rate, 3.0),
            ("received-strength", _) => {
                // 5 exponent log10(z'z), and the strength beside it.
                let loss = 12.5 / LN_10;
                let log = (range(j) * range(j)).ln().abs();
                Reach { radius: range(j) / 8.0, departure: 0.5 * loss, value: loss * (log + 2.2) + 12.0 }
            }
            (other, _) => panic!("nothing is known of {other}"),
        }
    }
}

fn length(vector: &[f64]) -> f64 {
    DVectorView::from_slice(vector, vector.len()).norm()
}

/// Every kind, in the plane and in space, with one station and several, in states of several sizes.
pub fn sightings() -> Vec<Sighting> {
    let plane: [&[f64]; 3] = [&[3.0, -2.0], &[-40.0, 15.0], &[0.5, 800.0]];
    let space: [&[f64]; 3] = [&[3.0, -2.0, 7.0], &[-40.0, 15.0, -30.0], &[0.5, 800.0, 12.0]];
    vec![
        Sighting::new("range-only", &plane[..1], &[0, 1], &[]),
        Sighting::new("range-only", &space, &[4, 0, 2], &[]),
        Sighting::new("range-doppler", &plane[..1], &[0, 1], &[2, 3]),
        Sighting::new("range-doppler", &plane, &[0, 2], &[1, 3]),
        Sighting::new("range-doppler", &space[..2], &[0, 1, 2], &[3, 4, 5]),
        Sighting::new("bearing-rate", &plane[..1], &[0, 1], &[2, 3]),
        Sighting::new("bearing-rate", &plane, &[4, 2], &[3, 0]),
        Sighting::new("range-azimuth-elevation", &space[..1], &[0, 1, 2], &[]),
        Sighting::new("range-azimuth-elevation", &space, &[5, 1, 3], &[]),
        Sighting::new("azimuth-elevation", &space[..1], &[0, 1, 2], &[]),
        Sighting::new("azimuth-elevation", &space, &[2, 0, 1], &[]),
        Sighting::new("time-difference", &plane[..2], &[0, 1], &[]),
        Sighting::new("time-difference", &space, &[0, 1, 2], &[]),
        Sighting::new("frequency-difference", &plane, &[0, 1], &[2, 3]),
        Sighting::new("frequency-difference", &space[..2], &[3, 4, 5], &[0, 1, 2]),
        Sighting::new("received-strength", &plane, &[0, 1], &[]),
        Sighting::new("received-strength", &space[..1], &[2, 1, 0], &[]),
    ]
}
