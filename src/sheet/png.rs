//! A figure as PNG: its SVG drawn by resvg with the program's own fonts, so that it looks the same on every machine.

use super::svg::svg;
use crate::figure::Figure;
use resvg::{tiny_skia, usvg};
use std::fmt;
use std::sync::Arc;

/// Pixels along one side at most.
const MOST_PIXELS: f64 = 16_384.0;

/// Why a picture could not be drawn.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum PictureError {
    /// The figure has no area, or more pixels than can be held.
    Size,
    /// The picture could not be drawn or encoded; what the library says.
    Drawing(String),
}

impl fmt::Display for PictureError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            PictureError::Size => write!(f, "the picture is too small or too large to be drawn"),
            PictureError::Drawing(why) => write!(f, "the picture cannot be drawn: {why}"),
        }
    }
}

impl std::error::Error for PictureError {}

/// Draws a figure with so many pixels to its point.
///
/// # Errors
/// When its size is none a picture can have, or drawing fails.
pub fn png(figure: &Figure, pixels_per_point: f64) -> Result<Vec<u8>, PictureError> {
    let mut fonts = usvg::fontdb::Database::new();
    fonts.load_font_data(include_bytes!("../../assets/fonts/inter-regular.otf").to_vec());
    fonts.load_font_data(include_bytes!("../../assets/fonts/inter-semibold.otf").to_vec());
    let family = fonts.faces().next().and_then(|face| face.families.first()).map(|(name, _)| name.clone());
    if let Some(family) = &family {
        fonts.set_sans_serif_family(family.clone());
    }
    let options =
        usvg::Options { fontdb: Arc::new(fonts), font_family: family.unwrap_or_default(), ..usvg::Options::default() };
    let drawing = |error: &dyn fmt::Display| PictureError::Drawing(error.to_string());
    let tree = usvg::Tree::from_str(&svg(figure), &options).map_err(|error| drawing(&error))?;
    let [width, height] = figure.size.map(|length| pixels(length * pixels_per_point));
    let mut canvas = width.zip(height).and_then(|(w, h)| tiny_skia::Pixmap::new(w, h)).ok_or(PictureError::Size)?;
    #[expect(clippy::cast_possible_truncation, reason = "a scale of a few pixels to the point")]
    let scale = pixels_per_point as f32;
    resvg::render(&tree, tiny_skia::Transform::from_scale(scale, scale), &mut canvas.as_mut());
    canvas.encode_png().map_err(|error| drawing(&error))
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "checked to be a small positive number")]
fn pixels(length: f64) -> Option<u32> {
    let rounded = length.round();
    (1.0..=MOST_PIXELS).contains(&rounded).then_some(rounded as u32)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::figure::{Align, Mark, Role, Weight};

    fn picture(marks: Vec<Mark>) -> tiny_skia::Pixmap {
        let figure = Figure { size: [60.0, 30.0], marks, places: Vec::new() };
        tiny_skia::Pixmap::decode_png(&png(&figure, 2.0).expect("drawn")).expect("a PNG")
    }

    #[test]
    fn letters_are_drawn_with_our_own_fonts() {
        let text = |text: &str, weight| Mark::Text {
            at: [4.0, 4.0],
            text: text.to_owned(),
            role: Role::Ink,
            size: 14.0,
            weight,
            align: (Align::Start, Align::Start),
        };
        let dark = |pixmap: &tiny_skia::Pixmap| pixmap.pixels().iter().filter(|pixel| pixel.red() < 128).count();
        let empty = picture(Vec::new());
        assert_eq!((empty.width(), empty.height(), dark(&empty)), (120, 60, 0));
        let regular = dark(&picture(vec![text("µΩ½°", Weight::Regular)]));
        let bold = dark(&picture(vec![text("µΩ½°", Weight::Bold)]));
        assert!(regular > 50, "{regular} dark pixels");
        assert!(bold > regular, "{bold} against {regular} dark pixels");
    }

    #[test]
    fn an_impossible_size_is_refused() {
        let figure = Figure { size: [0.0, 10.0], ..Figure::default() };
        assert!(png(&figure, 1.0).is_err());
        let figure = Figure { size: [1e6, 10.0], ..Figure::default() };
        assert!(png(&figure, 1.0).is_err());
    }
}
