//! The marks in the gutter that tie the two zeros, or the two poles: tied, they move together and keep their ratio.

use eframe::egui::{Rect, Role, Sense, Stroke, Ui, WidgetInfo, pos2};

use super::command::Command;
use super::theme::palette;
use super::view::Desk;
use crate::compensator::LaneKind;

/// Draws the mark of a kind between the middles of its first and last lane, at the left of their names.
pub(super) fn tie_ui(ui: &mut Ui, kind: LaneKind, left: f32, rows: (f32, f32), desk: &mut Desk<'_>) {
    let (name, word) = match kind {
        LaneKind::Zero => ("Tie the zeros", "zeros"),
        LaneKind::Pole => ("Tie the poles", "poles"),
        LaneKind::Gain => return,
    };
    let palette = palette(ui);
    let (top, bottom) = rows;
    let tied = desk.session.tied(kind);
    let rect = Rect::from_min_max(pos2(left, top - 7.0), pos2(left + 14.0, bottom + 7.0));
    let response = ui.interact(rect, ui.scope_id().with(("tie", word)), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, tied, name));
    let lit = response.hovered() || response.has_focus();
    let colour = if tied || lit { palette.accent } else { palette.weak.gamma_multiply(0.8) };
    let stroke = Stroke::new(if tied { 2.0 } else { 1.4 }, colour);
    let painter = ui.painter();
    let (x, end, middle) = (left + 5.0, left + 10.0, f32::midpoint(top, bottom));
    painter.hline(x..=end, top, stroke);
    painter.hline(x..=end, bottom, stroke);
    if tied {
        painter.vline(x, top..=bottom, stroke);
        painter.circle_filled(pos2(x, middle), 2.6, colour);
    } else {
        painter.vline(x, top..=middle - 3.5, stroke);
        painter.vline(x, middle + 3.5..=bottom, stroke);
    }
    super::legend::focus_ring(ui, &response);
    let help = if tied {
        format!("The two {word} move together and keep their ratio. Press to move each by itself.")
    } else {
        format!(
            "Press to tie the two {word}: they then move together and keep their ratio. Drag one onto the other first to make a \
             double."
        )
    };
    if response.on_hover_text(help).clicked() {
        desk.ask(Command::Tie(kind));
    }
}
