//! A figure's marks painted onto the screen: roles become the theme's colours, points become pixels.

use eframe::egui::{self, Align2, Mesh, Painter, Pos2, Shape, Stroke, pos2, vec2};

use super::theme::{self, Palette};
use crate::figure::axis::narrow;
use crate::figure::{self, Align, Mark, Weight};

/// From the figure's lengths to the screen.
#[derive(Clone, Copy, Debug)]
pub(super) struct Scale {
    /// Where the figure's origin stands.
    pub origin: Pos2,
    /// Points of the screen to a point of the figure.
    pub scale: f32,
}

impl Scale {
    /// Where a point of the figure stands.
    pub(super) fn at(self, [x, y]: figure::Point) -> Pos2 {
        self.origin + vec2(narrow(x), narrow(y)) * self.scale
    }
}

/// What marks are painted with.
#[derive(Clone, Copy)]
pub(super) struct Brush<'a> {
    /// Where to.
    pub painter: &'a Painter,
    /// Colours of the roles.
    pub palette: &'a Palette,
    /// From the figure to the screen.
    pub view: Scale,
    /// Colour of a part that is lit.
    pub light: Option<egui::Color32>,
}

impl Brush<'_> {
    /// What puts a part's first point onto the middle of a pixel; the whole part moves by it.
    pub(super) fn onto_pixels(&self, mark: &Mark) -> egui::Vec2 {
        let first = match mark {
            Mark::Line { points, .. } | Mark::Area { points, .. } => points.first().copied(),
            Mark::Circle { centre, .. } => Some(*centre),
            Mark::Text { .. } => None,
        };
        first.map(|point| self.view.at(point)).map(|at| self.snapped(at) - at).unwrap_or_default()
    }

    fn snapped(&self, at: Pos2) -> Pos2 {
        pos2(self.painter.round_to_pixel_center(at.x), self.painter.round_to_pixel_center(at.y))
    }

    /// Paints a mark, moved by `shift`; without one, each of its points goes onto pixels.
    pub(super) fn mark(&self, mark: &Mark, shift: Option<egui::Vec2>) {
        let at = |point: &figure::Point| {
            let at = self.view.at(*point);
            shift.map_or_else(|| self.snapped(at), |shift| at + shift)
        };
        let colour = |role| self.light.unwrap_or_else(|| theme::of_role(role, self.palette));
        let heavier = if self.light.is_some() { 1.35 } else { 1.0 };
        let pen = |width: f64, role| Stroke::new((narrow(width) * self.view.scale).max(1.0) * heavier, colour(role));
        match mark {
            Mark::Line { points, role, width, dash } => {
                let points: Vec<Pos2> = points.iter().map(at).collect();
                let (dashes, gaps) = theme::style_of(*dash).pattern();
                if dashes.is_empty() {
                    self.painter.add(Shape::line(points, pen(*width, *role)));
                } else {
                    let stroke = pen(*width, *role);
                    self.painter.extend(Shape::dashed_line_with_offset(&points, stroke, dashes, gaps, 0.0));
                }
            }
            Mark::Area { points, role } => {
                let points: Vec<Pos2> = points.iter().map(at).collect();
                self.painter.add(area(points, colour(*role)));
            }
            Mark::Circle { centre, radius, role, width } => {
                let radius = narrow(*radius) * self.view.scale;
                match width {
                    Some(width) => self.painter.circle_stroke(at(centre), radius, pen(*width, *role)),
                    None => self.painter.circle_filled(at(centre), radius, colour(*role)),
                };
            }
            Mark::Text { at: anchor, text, role, size, weight, align } => {
                let size = narrow(*size) * self.view.scale;
                let font = match weight {
                    Weight::Regular => egui::FontId::new(size, egui::FontFamily::Proportional),
                    Weight::Bold => theme::strong(size),
                };
                let place = self.view.at(*anchor);
                self.painter.text(place, Align2([side(align.0), side(align.1)]), text, font, colour(*role));
            }
        }
    }
}

/// A filled polygon. One of many corners is a band between two curves, which need not be convex.
fn area(points: Vec<Pos2>, colour: egui::Color32) -> Shape {
    if points.len() < 6 {
        return Shape::convex_polygon(points, colour, Stroke::NONE);
    }
    let mut mesh = Mesh::default();
    let pairs = points.iter().zip(points.iter().rev()).take(points.len() / 2);
    for (index, (upper, lower)) in (0_u32..).zip(pairs) {
        mesh.colored_vertex(*upper, colour);
        mesh.colored_vertex(*lower, colour);
        if index > 0 {
            let at = 2 * index;
            mesh.add_triangle(at - 2, at - 1, at);
            mesh.add_triangle(at - 1, at, at + 1);
        }
    }
    Shape::mesh(mesh)
}

fn side(align: Align) -> egui::Align {
    match align {
        Align::Start => egui::Align::Min,
        Align::Middle => egui::Align::Center,
        Align::End => egui::Align::Max,
    }
}
