//! The window's icon: a pole's cross beside a zero's ring on the frequency axis, worked out pixel by pixel.

use eframe::egui::{Color32, IconData};

use super::theme;

/// Pixels along a side.
const SIDE: u16 = 64;
/// Half of the line width [pixels].
const HALF_LINE: f32 = 3.2;

/// The icon.
pub(super) fn icon() -> IconData {
    let (ground, zero, pole, axis) = theme::icon_colours();
    let mut rgba = Vec::with_capacity(4 * usize::from(SIDE) * usize::from(SIDE));
    for row in 0..SIDE {
        for column in 0..SIDE {
            let (x, y) = (f32::from(column) + 0.5, f32::from(row) + 0.5);
            let mut colour = Color32::TRANSPARENT;
            for (distance, ink) in [(plate(x, y), ground), (rail(x, y), axis), (ring(x, y), zero), (cross(x, y), pole)]
            {
                colour = blend(colour, ink, (0.5 - distance).clamp(0.0, 1.0));
            }
            rgba.extend(colour.to_srgba_unmultiplied());
        }
    }
    IconData { rgba, width: u32::from(SIDE), height: u32::from(SIDE) }
}

fn blend(under: Color32, over: Color32, share: f32) -> Color32 {
    under.lerp_to_gamma(over, share)
}

/// Distance from a plate with round corners [pixels], negative inside; so are those below.
fn plate(x: f32, y: f32) -> f32 {
    let (dx, dy) = ((x - 32.0).abs() - 18.0, (y - 32.0).abs() - 18.0);
    dx.max(0.0).hypot(dy.max(0.0)) - 13.0
}

fn rail(x: f32, y: f32) -> f32 {
    ((x - 32.0).abs() - 25.0).max((y - 32.0).abs() - 1.5)
}

fn ring(x: f32, y: f32) -> f32 {
    ((x - 21.0).hypot(y - 32.0) - 8.5).abs() - HALF_LINE
}

fn cross(x: f32, y: f32) -> f32 {
    let (x, y) = ((x - 44.0).abs(), (y - 32.0).abs());
    let along = x.midpoint(y).min(8.5);
    (x - along).hypot(y - along) - HALF_LINE
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_icon_has_all_its_pixels() {
        let icon = icon();
        assert_eq!(icon.rgba.len(), 64 * 64 * 4);
        assert_eq!(icon.rgba[3], 0, "the corner is clear");
    }
}
