//! How the reference sharpens with the number of points.

use plotters::prelude::*;

use super::canvas::{Area, Drawn, FAINT, INK, LETTERS, YES, beside, decades, letters};
use super::ellipses::telling_case;
use super::{Drawing, Picture};
use crate::guidance::sharpening;
use crate::publish::prepared::Prepared;

pub(super) struct Sharpening {
    steps: Vec<(f64, f64)>,
}

pub(super) fn of<'a>(prepared: &Prepared<'a>) -> Option<Picture<'a>> {
    let study = &*prepared.explored;
    let case = telling_case(study)?;
    let steps = sharpening(study, case)?;
    let steps: Vec<(f64, f64)> = steps.into_iter().map(|(points, error)| (points as f64, error)).collect();
    if steps.iter().filter(|(_, error)| *error > 0.0 && error.is_finite()).count() < 2 {
        return None;
    }
    let suite = &study.provenance.suite.name;
    Some(Picture {
        name: format!("{suite}-reference"),
        alt: format!("Standard error of the reference of case {} of {suite} against the number of points", case.id),
        caption: format!(
            "{suite}, case {}: largest standardised standard error of the reference at every doubling, beside the slope of plain \
             Monte Carlo.",
            case.id
        ),
        size: (1000, 460),
        drawing: Drawing::Sharpening(Sharpening { steps }),
    })
}

impl Sharpening {
    pub fn draw<DB: DrawingBackend>(&self, area: &Area<DB>) -> Drawn<DB> {
        let steps: Vec<(f64, f64)> =
            self.steps.iter().copied().filter(|(_, e)| *e > 0.0 && e.is_finite()).collect();
        let (Some(&first), Some(&last)) = (steps.first(), steps.last()) else { return Ok(()) };
        let plain = [first, (last.0, first.1 * (first.0 / last.0).sqrt())];
        let Some(x) = decades(steps.iter().map(|s| s.0)) else { return Ok(()) };
        let Some(y) = decades(steps.iter().chain(&plain).map(|s| s.1)) else { return Ok(()) };
        let mut chart = ChartBuilder::on(area)
            .margin(16)
            .x_label_area_size(72)
            .y_label_area_size(106)
            .build_cartesian_2d((x.0..x.1).log_scale(), (y.0..y.1).log_scale())?;
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .bold_line_style(FAINT)
            .label_style(letters(LETTERS - 2))
            .axis_desc_style(letters(LETTERS))
            .x_desc("points [samples of h]")
            .y_desc("largest standard error [sd]")
            .x_label_formatter(&|v| format!("{v:.0e}"))
            .y_label_formatter(&|v| format!("{v:.0e}"))
            .draw()?;
        // Dashes, for a line that was not measured.
        let dashes = (0..24).step_by(2).map(|k| {
            let at = |k: f64| {
                let x = plain[0].0 * (plain[1].0 / plain[0].0).powf(k / 24.0);
                (x, first.1 * (first.0 / x).sqrt())
            };
            PathElement::new([at(f64::from(k)), at(f64::from(k + 1))], INK.stroke_width(2))
        });
        chart.draw_series(dashes)?;
        chart.draw_series([PathElement::new(steps.clone(), YES.stroke_width(3))])?;
        chart.draw_series(steps.iter().map(|&step| Circle::new(step, 6, YES.filled())))?;
        let middle = steps[steps.len() / 2];
        chart.draw_series([EmptyElement::at(middle) + beside("measured", (-110, 12))])?;
        let above = (middle.0, first.1 * (first.0 / middle.0).sqrt());
        chart.draw_series([EmptyElement::at(above) + beside("as plain Monte Carlo would fall", (14, -34))])?;
        Ok(())
    }
}
