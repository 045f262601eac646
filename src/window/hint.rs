//! The hint for who is new here: three short sentences under the bar, once, and again when asked for.

use eframe::egui::{Align, Frame, Label, Layout, Margin, Panel, RichText, Ui, vec2};

use super::command::Command;
use super::theme::{self, palette};
use super::view::Desk;

/// What someone needs to know to begin.
const SENTENCES: [&str; 3] = [
    "Enter the power stage at the left: curves, margins and steps follow at once, at nine conditions.",
    "Drag a handle under the curves: it stands under the place it bends, and its parts follow.",
    "Hold keeps a try to compare with, F5 opens the page for a review, Ctrl+K lists all commands.",
];
/// Width of the button with its surroundings [points].
const BUTTON: f32 = 84.0;

/// Draws the hint.
pub(super) fn hint_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let frame = Frame::new().fill(palette.accent_ground).inner_margin(Margin::symmetric(14, 7));
    Panel::top("hint").resizable(false).frame(frame).show(ui, |ui| {
        ui.horizontal_top(|ui| {
            let width = (ui.available_width() - BUTTON).max(120.0);
            ui.allocate_ui_with_layout(vec2(width, 0.0), Layout::top_down(Align::Min), |ui| {
                ui.set_width(width);
                ui.spacing_mut().item_spacing.y = 2.0;
                for sentence in SENTENCES {
                    ui.add(Label::new(RichText::new(sentence).font(theme::body()).color(palette.ink)).wrap());
                }
            });
            ui.with_layout(Layout::right_to_left(Align::Min), |ui| {
                let text = RichText::new("Got it").color(palette.accent);
                if ui.button(text).on_hover_text("The View menu shows the hint again.").clicked() {
                    desk.ask(Command::Hint(false));
                }
            });
        });
    });
}
