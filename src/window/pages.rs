//! What the middle column shows: the loop with its lanes, the waveforms of a steady period, or what follows an event.

use eframe::egui::{self, Rect, Ui};

use super::command::Command;
use super::steps::tab_ui;
use super::theme;
use super::view::Desk;

/// A page of the middle column.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Page {
    /// Bode plots with lanes, steps and closed-loop responses.
    #[default]
    Loop,
    /// One steady period of the switched loop, and what its parts bear.
    Waveforms,
    /// The switched loop cycle by cycle after an event.
    Transient,
}

/// The pages with their names and the terms that explain them.
const NAMES: [(Page, &str, &str); 3] = [
    (Page::Loop, "Loop", "page-loop"),
    (Page::Waveforms, "Waveforms", "page-waveforms"),
    (Page::Transient, "Transient", "page-transient"),
];

/// Draws a page that wants so much height; it scrolls where there is less.
pub(super) fn page_ui(ui: &mut Ui, rect: Rect, least: f32, draw: impl FnOnce(&mut Ui, Rect)) {
    if rect.height() >= least {
        draw(ui, rect);
        return;
    }
    let mut inner = ui.new_child(egui::UiBuilder::new().max_rect(rect));
    egui::ScrollArea::vertical().id_salt("page").auto_shrink(false).show(&mut inner, |ui| {
        let (_, whole) = ui.allocate_space(egui::vec2(rect.width(), least));
        draw(ui, whole);
    });
}

/// Height of the row of pages [points].
pub(super) const HEIGHT: f32 = 24.0;

/// Draws the row that chooses the page; gives back what is free at its right end.
pub(super) fn pages_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) -> Rect {
    let inner = rect.with_min_x(rect.left() + theme::GUTTER + 2.0).with_max_x(rect.right() - theme::RIGHT_GUTTER - 4.0);
    let mut row =
        ui.new_child(egui::UiBuilder::new().max_rect(inner).layout(egui::Layout::left_to_right(egui::Align::Center)));
    row.spacing_mut().item_spacing.x = 14.0;
    for (page, name, term) in NAMES {
        if tab_ui(&mut row, (name, name), term, desk.view.page == page) && desk.view.page != page {
            desk.ask(Command::Page(page));
        }
    }
    inner.with_min_x(row.min_rect().right() + 14.0)
}
