//! Numbers beside marks of a plot, placed so that none covers another, a mark, or the edge of its plot.

use eframe::egui::{Align2, Color32, Painter, Pos2, Rect, pos2, vec2};

use super::theme;

/// Distance of a number from the line it belongs to [points].
const BESIDE: f32 = 9.0;
/// Distance of a number from the level it stands at [points].
const APART: f32 = 11.0;

/// What is already taken of a plot: marks and the numbers placed so far.
#[derive(Debug, Default)]
pub(super) struct Labels {
    taken: Vec<Rect>,
}

impl Labels {
    /// Keeps numbers off a vertical mark.
    pub(super) fn keep_off(&mut self, x: f32, from: f32, to: f32) {
        self.taken.push(Rect::from_two_pos(pos2(x, from), pos2(x, to)).expand(2.5));
    }

    /// Writes a number at the first of the places that is free. Where none is, it is left out whole: half a number misleads.
    pub(super) fn write(
        &mut self,
        painter: &Painter,
        bounds: Rect,
        places: &[(Pos2, Align2)],
        text: &str,
        colours: (Color32, Color32),
    ) {
        let (ink, ground) = colours;
        let galley = painter.layout_no_wrap(text.to_owned(), theme::strong(12.5), ink);
        let rects = places.iter().map(|(at, align)| align.anchor_size(*at, galley.size()).expand2(vec2(3.0, 1.0)));
        let Some(rect) = self.first_free(bounds, rects) else { return };
        self.taken.push(rect);
        painter.rect_filled(rect, 3.0, ground.gamma_multiply(0.82));
        painter.galley(rect.min + vec2(3.0, 1.0), galley, ink);
    }

    fn first_free(&self, bounds: Rect, mut rects: impl Iterator<Item = Rect>) -> Option<Rect> {
        rects.find(|rect| bounds.contains_rect(*rect) && !self.taken.iter().any(|taken| taken.intersects(*rect)))
    }
}

/// Places beside a vertical mark: right and left of it at each height, the first heights first.
pub(super) fn beside(x: f32, heights: &[f32]) -> Vec<(Pos2, Align2)> {
    let sides = |y: &f32| [(pos2(x + BESIDE, *y), Align2::LEFT_CENTER), (pos2(x - BESIDE, *y), Align2::RIGHT_CENTER)];
    heights.iter().flat_map(sides).collect()
}

/// Heights above and below a level, the nearest first; `up` says which side is tried first.
pub(super) fn around(level: f32, up: bool) -> Vec<f32> {
    let way = if up { -1.0 } else { 1.0 };
    [way, -way, 2.6 * way, -2.6 * way].iter().map(|steps| level + steps * APART).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_number_gives_way_to_what_stands_there() {
        let bounds = Rect::from_min_max(pos2(0.0, 0.0), pos2(200.0, 100.0));
        let size = vec2(50.0, 14.0);
        let mut labels = Labels::default();
        let places = beside(100.0, &around(50.0, true));
        let rects = || places.iter().map(|(at, align)| align.anchor_size(*at, size));
        labels.keep_off(100.0, 0.0, 100.0);
        let mut found: Vec<Rect> = Vec::new();
        while let Some(rect) = labels.first_free(bounds, rects()) {
            assert!(bounds.contains_rect(rect));
            assert!(found.iter().all(|other| !other.intersects(rect)));
            found.push(rect);
            labels.taken.push(rect);
        }
        assert_eq!(found.len(), 8, "right and left at four heights");
        assert!(found[0].left() > 100.0 && found[0].bottom() < 50.0, "right above comes first");
        // Near the right edge only the left side is within the plot.
        let near = beside(180.0, &[50.0]);
        let rects = near.iter().map(|(at, align)| align.anchor_size(*at, size));
        assert!(Labels::default().first_free(bounds, rects).is_some_and(|rect| rect.right() < 180.0));
    }
}
