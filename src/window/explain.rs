//! Explanations under the pointer, and the same words for screen readers: the term, what it means, its formula.

use eframe::egui::{Response, RichText, Ui};

use super::theme;
use crate::analysis::terms::{self, Term};

/// Width of an explanation [points].
const WIDTH: f32 = 340.0;

/// Explains what a response stands for by its term, with further lines where there are any.
pub(super) fn explained(ui: &Ui, response: Response, key: &str, further: impl Fn() -> String) -> Response {
    let Some(term) = terms::find(key) else { return described(ui, response, further) };
    let whole = || {
        let (words, further) = (term.words(), further());
        if further.is_empty() { words } else { format!("{words}\n{further}") }
    };
    ui.ctx().accesskit_node_builder(response.id, |node| node.set_description(whole()));
    response.on_hover_ui(|ui| {
        ui.set_max_width(WIDTH);
        term_ui(ui, term);
        let further = further();
        if !further.is_empty() {
            ui.add_space(3.0);
            ui.label(further);
        }
    })
}

/// Explains by words alone.
pub(super) fn described(ui: &Ui, response: Response, words: impl Fn() -> String) -> Response {
    ui.ctx().accesskit_node_builder(response.id, |node| node.set_description(words()));
    response.on_hover_ui(|ui| {
        ui.set_max_width(WIDTH);
        ui.label(words());
    })
}

/// No further lines.
pub(super) fn nothing() -> String {
    String::new()
}

fn term_ui(ui: &mut Ui, term: &Term) {
    ui.label(RichText::new(term.name).font(theme::strong(13.0)));
    ui.label(term.text);
    if !term.formula.is_empty() {
        ui.label(RichText::new(term.formula).font(theme::strong(12.5)));
    }
}
