//! The true law of one case, the reference's Gaussian, and every method's.

use plotters::prelude::*;

use super::canvas::{Area, Drawn, FAINT, INK, LETTERS, colour, corners, letters, mark_at, tick};
use super::{Drawing, Picture};
use crate::guidance::{Law, Scene, Study, StudyCase, View};
use crate::publish::axes::shown;
use crate::publish::prepared::Prepared;

/// Methods on one picture; the best and the worst of more.
const MOST: usize = 7;

pub(super) struct Ellipses<'a> {
    prepared: &'a Prepared<'a>,
    scene: Scene,
}

/// The case whose floor is highest: there one sees what a Gaussian cannot be.
pub(super) fn telling_case(study: &Study) -> Option<&StudyCase> {
    let sound = study.cases.iter().filter(|case| case.reference.bears_verdicts());
    let rank = |case: &StudyCase| case.floor.map_or(0.0, |floor| floor.value);
    sound.max_by(|a, b| rank(a).total_cmp(&rank(b)))
}

pub(super) fn of<'a>(prepared: &'a Prepared<'a>) -> Option<Picture<'a>> {
    let study = &*prepared.explored;
    let case = telling_case(study)?;
    let mut scene = Scene::of(study, case)?;
    let order: Vec<usize> = View::own(study).ranking().iter().map(|r| r.entrant).collect();
    let ends = order.iter().take(MOST / 2).chain(order.iter().rev().take(MOST.div_ceil(2))).copied();
    let ends: Vec<usize> = ends.collect();
    scene.methods.retain(|(entrant, _)| ends.contains(entrant));
    let suite = &study.provenance.suite.name;
    Some(Picture {
        name: format!("{suite}-ellipses"),
        alt: format!(
            "Samples of the true law of case {} of {suite}, with the ellipses of the reference and of {} methods",
            case.id,
            scene.methods.len()
        ),
        caption: format!(
            "{suite}, case {}: samples of the true law (dots) and the Gaussians that stand for it, at two standard deviations; marks \
             are means. The floor here is {:.3} nats.",
            case.id,
            case.floor.map_or(f64::NAN, |floor| floor.value)
        ),
        size: (1000, 620),
        drawing: Drawing::Ellipses(Ellipses { prepared, scene }),
    })
}

impl Ellipses<'_> {
    pub fn draw<DB: DrawingBackend>(&self, area: &Area<DB>) -> Drawn<DB> {
        let scene = &self.scene;
        let (units, factors): (Vec<&str>, Vec<f64>) = scene.axes.iter().map(|(_, unit)| shown(unit)).unzip();
        let scaled = |v: &nalgebra::Vector2<f64>| (v[0] * factors[0], v[1] * factors[1]);
        let outline = |law: &Law| -> Vec<(f64, f64)> {
            law.ellipse(2.0, 96)
                .unwrap_or_default()
                .iter()
                .chain(law.ellipse(2.0, 96).unwrap_or_default().first())
                .map(&scaled)
                .collect()
        };
        let cloud: Vec<(f64, f64)> = scene.cloud.iter().map(scaled).collect();
        let reference = outline(&scene.reference);
        // The cloud and the reference are seen whole; a method may go beyond the frame.
        let range = |of: fn(&(f64, f64)) -> f64| {
            let values = || cloud.iter().chain(&reference).map(of);
            let (least, most) =
                (values().fold(f64::INFINITY, f64::min), values().fold(f64::NEG_INFINITY, f64::max));
            let room = 0.06 * (most - least);
            (least - room)..(most + room)
        };
        let (plot, side) = area.split_horizontally(690);
        let name = |k: usize| match units[k] {
            "" => scene.axes[k].0.clone(),
            unit => format!("{} [{unit}]", scene.axes[k].0),
        };
        let mut chart = ChartBuilder::on(&plot)
            .margin(16)
            .x_label_area_size(72)
            .y_label_area_size(106)
            .build_cartesian_2d(range(|p| p.0), range(|p| p.1))?;
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .bold_line_style(FAINT.mix(0.6))
            .label_style(letters(LETTERS - 2))
            .axis_desc_style(letters(LETTERS))
            .x_desc(name(0))
            .y_desc(name(1))
            .x_labels(6)
            .y_labels(6)
            .x_label_formatter(&tick)
            .y_label_formatter(&tick)
            .draw()?;
        chart.draw_series(cloud.iter().map(|&point| Circle::new(point, 2, INK.mix(0.35).filled())))?;
        chart.draw_series([PathElement::new(reference, INK.stroke_width(4))])?;
        for (entrant, law) in &scene.methods {
            let mark = &self.prepared.marks[*entrant];
            let paint = colour(mark.on_paper());
            chart.draw_series([PathElement::new(outline(law), paint.stroke_width(2))])?;
            // The mark stands on the mean, and again at places of its own on the ellipse: lines cross.
            chart.draw_series([
                EmptyElement::at(scaled(&law.mean)) + Polygon::new(corners(mark, 1.1), paint.filled())
            ])?;
            if let Some(points) = law.ellipse(2.0, 96) {
                let place = &points[(entrant * 29 + 7) % points.len()];
                chart.draw_series([
                    EmptyElement::at(scaled(place)) + Polygon::new(corners(mark, 1.0), paint.filled())
                ])?;
            }
        }
        side.draw(&PathElement::new([(2, 34), (26, 34)], INK.stroke_width(4)))?;
        side.draw(&Text::new("reference", (32, 24), letters(LETTERS - 2)))?;
        side.draw(&Circle::new((14, 63), 3, INK.mix(0.5).filled()))?;
        side.draw(&Text::new("true law", (32, 53), letters(LETTERS - 2)))?;
        for (k, (entrant, _)) in scene.methods.iter().enumerate() {
            let y = 92 + 29 * k as i32;
            let mark = &self.prepared.marks[*entrant];
            mark_at(&side, mark, (14, y), 1.2)?;
            side.draw(&Text::new(
                self.prepared.study.labels[*entrant].clone(),
                (32, y - 10),
                letters(LETTERS - 2),
            ))?;
        }
        Ok(())
    }
}
