//! What all pictures share: paper, ink, letters, marks, legends, logarithmic axes.

use std::sync::Once;

use plotters::coord::Shift;
use plotters::prelude::*;
use plotters::style::{RGBColor, TextStyle, register_font as register};

use super::super::marks::Mark;

pub(super) type Area<DB> = DrawingArea<DB, Shift>;
pub(super) type Drawn<DB> = Result<(), DrawingAreaErrorKind<<DB as DrawingBackend>::ErrorType>>;

/// Letters that are read at half the size.
pub(super) const LETTERS: u32 = 26;
pub(super) const INK: RGBColor = RGBColor(27, 35, 43);
pub(super) const FAINT: RGBColor = RGBColor(205, 202, 194);
pub(super) const YES: RGBColor = RGBColor(13, 110, 98);
pub(super) const WARN: RGBColor = RGBColor(122, 61, 0);

/// DejaVu Sans, cut down to the characters that are needed; its licence stands beside it.
static FONT: &[u8] = include_bytes!("../../../assets/DejaVuSans-subset.ttf");

/// Makes the letters known, once.
pub(super) fn register_font() -> Result<(), &'static str> {
    static ONCE: Once = Once::new();
    let mut done = Ok(());
    ONCE.call_once(|| {
        done = register("sans-serif", FontStyle::Normal, FONT).map_err(|_| "the built-in font cannot be read");
    });
    done
}

pub(super) fn letters(size: u32) -> TextStyle<'static> {
    ("sans-serif", size).into_font().color(&INK)
}

pub(super) fn colour(hex: &str) -> RGBColor {
    let channel = |k: usize| u8::from_str_radix(hex.get(k..k + 2).unwrap_or("00"), 16).unwrap_or(0);
    RGBColor(channel(1), channel(3), channel(5))
}

/// The corners of a mark in pixels about its middle.
pub(super) fn corners(mark: &Mark, scale: f64) -> Vec<(i32, i32)> {
    let pixel = |v: f64| (v * scale).round() as i32;
    mark.outline().iter().map(|&(x, y)| (pixel(x), pixel(y))).collect()
}

/// A mark at a pixel.
pub(super) fn mark_at<DB: DrawingBackend>(area: &Area<DB>, mark: &Mark, at: (i32, i32), scale: f64) -> Drawn<DB> {
    let outline = corners(mark, scale).into_iter().map(|(x, y)| (x + at.0, y + at.1)).collect::<Vec<_>>();
    area.draw(&Polygon::new(outline, colour(mark.on_paper()).filled()))
}

/// Marks with their names, one below the other.
pub(super) fn legend<DB: DrawingBackend>(area: &Area<DB>, entries: &[(&Mark, String)], top: i32) -> Drawn<DB> {
    for (k, (mark, text)) in entries.iter().enumerate() {
        let y = top + k as i32 * 29;
        mark_at(area, mark, (14, y + 10), 1.2)?;
        area.draw(&Text::new(text.clone(), (32, y), letters(LETTERS - 2)))?;
    }
    Ok(())
}

/// The least and greatest of positive numbers, widened to whole powers of ten.
pub(super) fn decades(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    let (mut least, mut greatest) = (f64::INFINITY, 0.0_f64);
    for value in values.filter(|v| *v > 0.0 && v.is_finite()) {
        (least, greatest) = (least.min(value), greatest.max(value));
    }
    let power = |v: f64| 10f64.powf(v);
    (greatest > 0.0).then(|| {
        let (low, high) = (least.log10().floor(), greatest.log10().ceil());
        (power(low), power(if high > low { high } else { low + 1.0 }))
    })
}

/// A number on an axis.
pub(super) fn tick(value: &f64) -> String {
    if *value == 0.0 {
        return "0".into();
    }
    if (1e-3..1e5).contains(&value.abs()) {
        let text = format!("{value:.4}");
        return text.trim_end_matches('0').trim_end_matches('.').into();
    }
    format!("{value:.0e}")
}

/// Words so many pixels away from a place of a chart.
pub(super) fn beside(words: &'static str, away: (i32, i32)) -> Text<'static, (i32, i32), &'static str> {
    Text::new(words, away, letters(LETTERS - 3))
}
