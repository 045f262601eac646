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

/// Places right and left of a vertical mark at each height, the first heights first.
pub(super) fn beside(x: f32, heights: &[f32]) -> Vec<(Pos2, Align2)> {
    heights.iter().flat_map(|y| [right_of(x, *y), left_of(x, *y)]).collect()
}

/// Places about the point where a mark meets a level. Curves fall there as a rule, so above it the right is clear of them
/// and below it the left; `up` says which of the two comes first.
pub(super) fn around(at: Pos2, up: bool) -> Vec<(Pos2, Align2)> {
    let row = |y: f32| {
        let (above, below) = (at.y - y * APART, at.y + y * APART);
        let (clear, other) = (right_of(at.x, above), left_of(at.x, below));
        let (first, second) = if up { (clear, other) } else { (other, clear) };
        [first, second, left_of(at.x, above), right_of(at.x, below)]
    };
    [1.0, 2.6].into_iter().flat_map(row).collect()
}

fn right_of(x: f32, y: f32) -> (Pos2, Align2) {
    (pos2(x + BESIDE, y), Align2::LEFT_CENTER)
}

fn left_of(x: f32, y: f32) -> (Pos2, Align2) {
    (pos2(x - BESIDE, y), Align2::RIGHT_CENTER)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_number_gives_way_to_what_stands_there() {
        let bounds = Rect::from_min_max(pos2(0.0, 0.0), pos2(200.0, 100.0));
        let size = vec2(50.0, 14.0);
        let mut labels = Labels::default();
        let places = around(pos2(100.0, 50.0), true);
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
