//! The load sweep over the window: crossover, margin and duty ratio over the load, and where conduction changes.

use eframe::egui::{self, RichText, Role, Sense, Ui, WidgetInfo, vec2};

use super::brush::{Brush, Scale};
use super::command::{Command, Exported};
use super::dialogs;
use super::export;
use super::session::Session;
use super::theme::palette;
use super::view::Desk;
use crate::analysis::{SWEEP_POINTS, load_sweep};
use crate::figure::axis::narrow;
use crate::figure::{self, Figure};

/// Size of the figure [points].
pub(super) const SIZE: [f64; 2] = [860.0, 540.0];
/// Room around the figure in the window [points].
const AROUND: (f32, f32) = (80.0, 150.0);

/// Works the sweep out as a figure.
///
/// # Errors
/// Why there is none, in words.
pub(super) fn figure(session: &Session) -> Result<Figure, String> {
    let design = export::checked(session)?;
    let sweep = load_sweep(&design, SWEEP_POINTS).map_err(|finding| finding.to_string())?;
    figure::sweep(&design.title, &sweep, SIZE).ok_or_else(|| "No load has a result.".to_owned())
}

/// Draws the figure as large as the window lets it be.
pub(super) fn sweep_ui(ui: &mut Ui, drawn: &Figure, desk: &mut Desk<'_>) {
    let [width, height] = drawn.size.map(narrow);
    let room = ui.ctx().content_rect().size() - vec2(AROUND.0, AROUND.1);
    let scale = (room.x / width).min(room.y / height).min(1.25);
    let (rect, response) = ui.allocate_exact_size(vec2(width, height) * scale, Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Image, true, "Load sweep"));
    let view = Scale { origin: rect.min, scale };
    let brush = Brush { painter: ui.painter(), palette: palette(ui), view, light: None };
    for mark in &drawn.marks {
        brush.mark(mark, Some(egui::Vec2::ZERO));
    }
    ui.add_space(4.0);
    dialogs::buttons(ui, |ui| {
        if ui.add(dialogs::primary(ui, "Close")).clicked() {
            desk.ask(Command::Dismiss);
        }
        if ui.button("Save as picture\u{2026}").clicked() {
            desk.ask(Command::Dismiss);
            desk.ask(Command::Export(Exported::Sweep));
        }
        let words = "Averaged models at every load; the same numbers: polewright check FILE --load-sweep";
        ui.label(RichText::new(words).color(palette(ui).weak));
    });
}
