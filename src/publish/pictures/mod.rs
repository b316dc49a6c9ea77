//! Pictures of a study, one file each, as SVG and as PNG: the same marks as in the page, every axis with its unit.

mod canvas;
mod ellipses;
mod floors;
mod indices;
mod pareto;
mod sharpening;
mod trust_maps;

use plotters::prelude::*;

use super::prepared::Prepared;
use canvas::Drawn;

/// A picture that can be drawn on anything.
pub(super) struct Picture<'a> {
    /// Its file's name without ending.
    pub name: String,
    /// What it shows, for those who do not see it.
    pub alt: String,
    /// What it says.
    pub caption: String,
    /// Width and height in pixels.
    pub size: (u32, u32),
    drawing: Drawing<'a>,
}

enum Drawing<'a> {
    TrustMaps(trust_maps::TrustMaps<'a>),
    Indices(indices::Indices<'a>),
    Pareto(pareto::Pareto<'a>),
    Ellipses(ellipses::Ellipses<'a>),
    Sharpening(sharpening::Sharpening),
    Floors(floors::Floors),
}

/// Why a picture could not be drawn.
pub(super) type Failure = Box<dyn std::error::Error + Send + Sync>;

impl<'a> Picture<'a> {
    /// The pictures of a study.
    pub fn all(prepared: &'a Prepared<'a>) -> Vec<Self> {
        let mut pictures: Vec<Self> = trust_maps::all(prepared);
        pictures.extend(indices::of(prepared));
        pictures.extend(pareto::of(prepared));
        pictures.extend(ellipses::of(prepared));
        pictures.extend(sharpening::of(prepared));
        pictures.extend(floors::of(prepared));
        pictures
    }

    /// As SVG.
    pub fn svg(&self) -> Result<String, Failure> {
        canvas::register_font()?;
        let mut text = String::new();
        {
            let area = SVGBackend::with_string(&mut text, self.size).into_drawing_area();
            self.draw(&area).map_err(|e| e.to_string())?;
            area.present().map_err(|e| e.to_string())?;
        }
        Ok(text)
    }

    /// As PNG.
    pub fn png(&self) -> Result<Vec<u8>, Failure> {
        canvas::register_font()?;
        let (width, height) = self.size;
        let mut pixels = vec![0; 3 * (width * height) as usize];
        {
            let area = BitMapBackend::with_buffer(&mut pixels, self.size).into_drawing_area();
            self.draw(&area).map_err(|e| e.to_string())?;
            area.present().map_err(|e| e.to_string())?;
        }
        let mut bytes = Vec::new();
        let mut encoder = png::Encoder::new(&mut bytes, width, height);
        encoder.set_color(png::ColorType::Rgb);
        encoder.set_compression(png::Compression::High);
        encoder.write_header()?.write_image_data(&pixels)?;
        Ok(bytes)
    }

    fn draw<DB: DrawingBackend>(&self, area: &canvas::Area<DB>) -> Drawn<DB> {
        area.fill(&WHITE)?;
        match &self.drawing {
            Drawing::TrustMaps(drawing) => drawing.draw(area),
            Drawing::Indices(drawing) => drawing.draw(area),
            Drawing::Pareto(drawing) => drawing.draw(area),
            Drawing::Ellipses(drawing) => drawing.draw(area),
            Drawing::Sharpening(drawing) => drawing.draw(area),
            Drawing::Floors(drawing) => drawing.draw(area),
        }
    }
}
