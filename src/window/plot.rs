//! A plot's ground, grid and curves, painted straight onto the screen from two axes.

use eframe::egui::{Align2, Color32, FontId, Mesh, Painter, Pos2, Rect, Shape, Stroke, StrokeKind, pos2, vec2};

use super::axis::{Axis, DecadeLine, decade_lines};
use super::theme::{self, LineStyle, Palette};
use super::thin::thin;

/// A rectangle of the screen with an axis along each side.
#[derive(Clone, Copy, Debug)]
pub(super) struct Plot {
    /// Where it is drawn.
    pub rect: Rect,
    /// Along the lower edge.
    pub x: Axis,
    /// Along the left edge.
    pub y: Axis,
}

/// How a curve is drawn.
#[derive(Clone, Copy, Debug)]
pub(super) struct Pen {
    /// Colour.
    pub colour: Color32,
    /// Width [points].
    pub width: f32,
    /// How it is broken up.
    pub style: LineStyle,
}

impl Plot {
    /// Where a pair of values stands.
    pub(super) fn at(&self, x: f64, y: f64) -> Pos2 {
        pos2(self.x.at(x), self.y.at(y))
    }

    /// The frame around the plot.
    pub(super) fn frame(&self, painter: &Painter, palette: &Palette) {
        painter.rect_stroke(self.rect, 0.0, Stroke::new(1.0, palette.grid_strong), StrokeKind::Middle);
    }

    /// Lines of a decade grid along x.
    pub(super) fn decades(&self, painter: &Painter, palette: &Palette) {
        let (from, to) = self.x.range();
        for DecadeLine { value, digit } in decade_lines(from, to) {
            let colour = if digit == 1 { palette.grid_strong } else { palette.grid };
            let x = painter.round_to_pixel_center(self.x.at(value));
            painter.vline(x, self.rect.y_range(), Stroke::new(1.0, colour));
        }
    }

    /// A horizontal line of the grid.
    pub(super) fn level(&self, painter: &Painter, value: f64, colour: Color32) {
        let y = painter.round_to_pixel_center(self.y.at(value));
        painter.hline(self.rect.x_range(), y, Stroke::new(1.0, colour));
    }

    /// A label in the left gutter at a value of y.
    pub(super) fn level_label(&self, painter: &Painter, value: f64, text: &str, colour: Color32) {
        let y = self.y.at(value);
        painter.text(pos2(self.rect.left() - 7.0, y), Align2::RIGHT_CENTER, text, theme::small(), colour);
    }

    /// A curve through points whose x are in the axis' own measure. Values that are not finite break it.
    pub(super) fn curve(&self, painter: &Painter, inner_x: &[f64], y: &[f64], pen: Pen) {
        let painter = painter.with_clip_rect(self.rect.expand(0.5));
        let column = 1.0 / painter.pixels_per_point();
        let mut run: Vec<Pos2> = Vec::with_capacity(inner_x.len().min(4096));
        for (x, y) in inner_x.iter().zip(y) {
            if y.is_finite() {
                run.push(pos2(self.x.at_inner(*x), self.y.at(*y)));
            } else {
                stroke(&painter, thin(std::mem::take(&mut run), column), pen);
            }
        }
        stroke(&painter, thin(run, column), pen);
    }

    /// The area between two curves whose x are in the axis' own measure.
    pub(super) fn band(&self, painter: &Painter, inner_x: &[f64], y: &[(f64, f64)], colour: Color32) {
        let painter = painter.with_clip_rect(self.rect);
        let mut mesh = Mesh::default();
        mesh.reserve_vertices(2 * inner_x.len());
        for (index, (x, (low, high))) in (0_u32..).zip(inner_x.iter().zip(y)) {
            let x = self.x.at_inner(*x);
            mesh.colored_vertex(pos2(x, self.y.at(*low)), colour);
            mesh.colored_vertex(pos2(x, self.y.at(*high)), colour);
            if index > 0 {
                let at = 2 * index;
                mesh.add_triangle(at - 2, at - 1, at);
                mesh.add_triangle(at - 1, at, at + 1);
            }
        }
        painter.add(Shape::mesh(mesh));
    }
}

/// Strokes a line in its style.
pub(super) fn stroke(painter: &Painter, points: Vec<Pos2>, pen: Pen) {
    if points.len() < 2 {
        return;
    }
    let (dashes, gaps) = pen.style.pattern();
    let line = Stroke::new(pen.width, pen.colour);
    if dashes.is_empty() {
        painter.line(points, line);
    } else {
        painter.extend(Shape::dashed_line_with_offset(&points, line, dashes, gaps, 0.0));
    }
}

/// Text on a ground of its own, so that it can be read over curves. Gives back the ground.
pub(super) fn tag(
    painter: &Painter,
    at: Pos2,
    align: Align2,
    text: &str,
    font: FontId,
    colours: (Color32, Color32),
) -> Rect {
    let (ink, ground) = colours;
    let galley = painter.layout_no_wrap(text.to_owned(), font, ink);
    let rect = align.anchor_size(at, galley.size());
    let bounds = painter.clip_rect();
    let mut shift = vec2(0.0, 0.0);
    shift.x += (bounds.left() + 2.0 - rect.left()).max(0.0);
    shift.x -= (rect.right() - bounds.right() + 2.0).max(0.0);
    let rect = rect.translate(shift);
    painter.rect_filled(rect.expand2(vec2(3.0, 1.0)), 3.0, ground);
    painter.galley(rect.min, galley, ink);
    rect
}

/// A short piece of a line in a role's style, for legends.
pub(super) fn sample(painter: &Painter, from: Pos2, length: f32, pen: Pen) {
    stroke(painter, vec![from, from + vec2(length, 0.0)], pen);
}
