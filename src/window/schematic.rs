//! A schematic in the window: a figure painted to the width of its column, each part a thing to press and to point at.
//!
//! The figures are worked out once per analysis and width. Axes of parts are put onto whole pixels, so that wires stay crisp.

use eframe::egui::{self, CursorIcon, Id, Rect, Sense, Stroke, StrokeKind, Ui, WidgetInfo, emath::GuiRounding, vec2};

use super::brush::{Brush, Scale};
use super::pointed::{Pointed, Sheet};
use super::session::Session;
use super::theme::palette;
use super::view::Desk;

use crate::figure::axis::narrow;
use crate::figure::{self, Figure, Mark, Numbers, Place};
use crate::quantity::{self, Entry};

/// Greatest size of a schematic against its own.
const LARGEST: f32 = 1.15;

/// The schematics, and what they were worked out for.
#[derive(Debug, Default)]
pub(super) struct Schematics {
    folded: bool,
    stage: Kept,
    compensator: Kept,
}

/// A figure with the generation and width it belongs to.
#[derive(Debug, Default)]
struct Kept {
    figure: Figure,
    of: Option<(u64, u32)>,
}

impl Schematics {
    /// Whether the schematics are shown.
    pub(super) fn shown(&self) -> bool {
        !self.folded
    }

    /// Shows the schematics, or folds them.
    pub(super) fn show(&mut self, shown: bool) {
        self.folded = !shown;
    }

    /// The parts of a schematic.
    pub(super) fn places(&self, sheet: Sheet) -> &[Place] {
        &self.figure(sheet).places
    }

    fn figure(&self, sheet: Sheet) -> &Figure {
        match sheet {
            Sheet::Stage => &self.stage.figure,
            Sheet::Compensator => &self.compensator.figure,
        }
    }

    fn kept(&mut self, sheet: Sheet) -> &mut Kept {
        match sheet {
            Sheet::Stage => &mut self.stage,
            Sheet::Compensator => &mut self.compensator,
        }
    }
}

impl Kept {
    /// Works the figure out anew where the session or the width moved. The last one stays where there is none.
    fn follow(&mut self, sheet: Sheet, session: &Session, width: f32) {
        let of = Some((session.generation(), width.to_bits()));
        if self.of == of {
            return;
        }
        self.of = of;
        let design = session.design();
        let condition = session.analysis().map(|analysis| {
            let condition = &analysis.condition;
            (condition.input_voltage, condition.load_current)
        });
        let numbers = Numbers { design, condition: condition.filter(|_| !session.stale()) };
        let figure = match sheet {
            Sheet::Stage => figure::stage_schematic(&numbers, f64::from(width)),
            Sheet::Compensator => {
                design.compensator().ok().map(|compensator| figure::compensator_schematic(&compensator, &numbers))
            }
        };
        if let Some(figure) = figure {
            self.figure = figure;
        }
    }
}

/// Draws a schematic over the width of its column.
pub(super) fn schematic_ui(ui: &mut Ui, sheet: Sheet, desk: &mut Desk<'_>) {
    if !desk.view.schematics.shown() {
        return;
    }
    let room = ui.available_width();
    let session = desk.session;
    let kept = desk.view.schematics.kept(sheet);
    kept.follow(sheet, session, room);
    let [width, height] = kept.figure.size.map(narrow);
    if width <= 0.0 {
        return;
    }
    let scale = (room / width).min(LARGEST);
    let (rect, _) = ui.allocate_exact_size(vec2(room, (height * scale).ceil()), Sense::hover());
    let middle = rect.min + vec2(((room - width * scale) / 2.0).max(0.0), 0.0);
    let origin = middle.round_to_pixels(ui.pixels_per_point());
    let view = Scale { origin, scale };
    let count = desk.view.schematics.places(sheet).len();
    for index in 0..count {
        part_ui(ui, sheet, index, view, desk);
    }
    paint(ui, sheet, view, desk);
}

/// One part as a thing to press.
fn part_ui(ui: &mut Ui, sheet: Sheet, index: usize, view: Scale, desk: &mut Desk<'_>) {
    let Some(place) = desk.view.schematics.places(sheet).get(index) else { return };
    let rect = Rect::from_two_pos(view.at(place.corners[0]), view.at(place.corners[1])).expand(1.5);
    let response = ui.interact(rect, Id::unique(("part", sheet, index)), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(egui::Role::Button, true, &place.name));
    let rows = || rows(place, desk);
    ui.ctx().accesskit_node_builder(response.id, |node| node.set_value(rows().join(", ")));
    let response = response.on_hover_cursor(CursorIcon::PointingHand).on_hover_ui(|ui| {
        for row in rows() {
            ui.label(row);
        }
    });
    let target = if response.clicked() { target(place, desk) } else { None };
    let painter = ui.painter();
    if response.hovered() {
        painter.rect_filled(rect, 3.0, palette(ui).accent_ground);
    }
    if response.has_focus() {
        let ring = Stroke::new(1.5, palette(ui).accent);
        painter.rect_stroke(rect, 3.0, ring, StrokeKind::Inside);
    }
    desk.view.point(Pointed::Part(sheet, index), &response);
    if let Some(path) = target {
        desk.view.go_to(&path);
    }
}

/// The entry a part leads to: the first that has a field.
fn target(place: &Place, desk: &Desk<'_>) -> Option<String> {
    let applying = desk.session.design().entries();
    place.paths.iter().find(|path| applying.iter().any(|entry| entry.path == **path)).cloned()
}

/// Names and values of the entries a part stands for, as far as they apply.
fn rows(place: &Place, desk: &Desk<'_>) -> Vec<String> {
    let design = desk.session.design();
    let applying = design.entries();
    let entries = place.paths.iter().filter_map(|path| applying.iter().find(|entry| entry.path == path));
    let row = |entry: &Entry| {
        let value = design.values.get_or_default(entry)?;
        Some(format!("{}: {}", entry.name, quantity::print(value, entry.unit)))
    };
    entries.filter_map(|entry| row(entry)).collect()
}

/// Paints all marks; those of a part that is lit stand out.
fn paint(ui: &Ui, sheet: Sheet, view: Scale, desk: &Desk<'_>) {
    let palette = palette(ui);
    let figure = desk.view.schematics.figure(sheet);
    let painter = ui.painter();
    let light = match sheet {
        Sheet::Stage => palette.plant,
        Sheet::Compensator => palette.compensator,
    };
    let plain = Brush { painter, palette, view, light: None };
    let all = |marks: &[Mark], brush: Brush<'_>, shift: Option<egui::Vec2>| {
        for mark in marks {
            brush.mark(mark, shift);
        }
    };
    let of = |range: std::ops::Range<usize>| figure.marks.get(range).unwrap_or_default();
    let mut done = 0;
    for (index, place) in figure.places.iter().enumerate() {
        all(of(done..place.marks.start), plain, None);
        let marks = of(place.marks.clone());
        let brush = Brush { light: desk.lit_place(sheet, index, place).then_some(light), ..plain };
        all(marks, brush, marks.first().map(|mark| brush.onto_pixels(mark)));
        done = place.marks.end;
    }
    all(of(done..figure.marks.len()), plain, None);
}
