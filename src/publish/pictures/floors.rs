//! The floor over a suite: what no method can mend.

use plotters::prelude::*;

use super::canvas::{Area, Drawn, FAINT, INK, LETTERS, WARN, YES, beside, decades, letters};
use super::{Drawing, Picture};
use crate::guidance::View;
use crate::publish::prepared::Prepared;
use crate::trust::Standing;

pub(super) struct Floors {
    /// Value, margin, whether it is above the limit; rising.
    floors: Vec<(f64, f64, Standing)>,
    limit: f64,
}

const LEAST: f64 = 1e-7;

pub(super) fn of<'a>(prepared: &Prepared<'a>) -> Option<Picture<'a>> {
    let study = &*prepared.explored;
    let view = View::own(study);
    let mut floors: Vec<(f64, f64, Standing)> = (0..study.cases.len())
        .filter_map(|k| {
            let floor = study.cases[k].floor?;
            let margin = study.judge.quantile() * floor.standard_error;
            Some((floor.value.max(LEAST), margin, view.floor(k)))
        })
        .collect();
    if floors.len() < 2 {
        return None;
    }
    floors.sort_by(|a, b| a.0.total_cmp(&b.0));
    let suite = &study.provenance.suite.name;
    let above = floors.iter().filter(|f| f.2 == Standing::Broken).count();
    Some(Picture {
        name: format!("{suite}-floor"),
        alt: format!("Floors of {} cases of {suite} in rising order; {above} are above the limit", floors.len()),
        caption: format!(
            "{suite}: how far the true law is from any Gaussian, case by case in rising order, with confidence bounds; {above} of \
             {} are above the limit (crosses). Floors below 1e-7 are drawn there.",
            floors.len()
        ),
        size: (1000, 460),
        drawing: Drawing::Floors(Floors { floors, limit: study.provenance.settings.limits.floor }),
    })
}

impl Floors {
    pub fn draw<DB: DrawingBackend>(&self, area: &Area<DB>) -> Drawn<DB> {
        let Some(y) = decades(self.floors.iter().map(|f| f.0).chain([self.limit])) else { return Ok(()) };
        let count = self.floors.len() as f64;
        let mut chart = ChartBuilder::on(area)
            .margin(16)
            .x_label_area_size(72)
            .y_label_area_size(106)
            .build_cartesian_2d(0.0..count + 1.0, (y.0..y.1).log_scale())?;
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .bold_line_style(FAINT)
            .label_style(letters(LETTERS - 2))
            .axis_desc_style(letters(LETTERS))
            .x_desc("cases, by rising floor")
            .y_desc("floor [nats]")
            .x_label_formatter(&|v| format!("{v:.0}"))
            .y_label_formatter(&|v| format!("{v:.0e}"))
            .draw()?;
        chart
            .draw_series([PathElement::new([(0.0, self.limit), (count + 1.0, self.limit)], INK.stroke_width(2))])?;
        chart.draw_series([EmptyElement::at((0.0, self.limit)) + beside("limit", (6, -26))])?;
        for (k, &(value, margin, standing)) in self.floors.iter().enumerate() {
            let x = k as f64 + 1.0;
            let ends = [(x, (value - margin).max(y.0)), (x, (value + margin).min(y.1))];
            chart.draw_series([PathElement::new(ends, INK.stroke_width(1))])?;
            if standing == Standing::Broken {
                chart.draw_series([Cross::new((x, value), 4, WARN.stroke_width(2))])?;
            } else {
                chart.draw_series([Circle::new((x, value), 3, YES.filled())])?;
            }
        }
        Ok(())
    }
}
