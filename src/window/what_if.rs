//! The what-if: an input voltage and a load beside the nine conditions, typed in engineering notation.
//!
//! *Bad input*: text that is no usable number stays in its field, marked, with the reason under it; the condition shown stays.

use eframe::egui::{FontSelection, Key, Margin, RichText, Stroke, TextEdit, Ui};

use super::command::Command;
use super::explain;
use super::theme::{self, palette};
use super::view::Desk;
use crate::quantity::{self, Bounds, Unit};

/// What is typed for a condition beside the nine.
#[derive(Clone, Debug, Default)]
pub(super) struct WhatIf {
    input: Typed,
    load: Typed,
}

/// A text and why it cannot be used.
#[derive(Clone, Debug, Default)]
struct Typed {
    text: String,
    error: Option<String>,
}

impl Typed {
    /// The number that stands here; an empty field stands for what it offers.
    fn read(&mut self, unit: Unit, offered: f64) -> Option<f64> {
        self.error = None;
        if self.text.trim().is_empty() {
            return Some(offered);
        }
        match quantity::parse(&self.text, unit) {
            Ok(value) => match Bounds::Positive.check(value, unit) {
                Ok(()) => return Some(value),
                Err(reason) => self.error = Some(format!("It {reason}.")),
            },
            Err(error) => self.error = Some(format!("{}: {}.", error.reason, error.hint)),
        }
        None
    }
}

/// Width of a field [points].
const FIELD: f32 = 74.0;

/// Fields for input voltage and load, and the ways there and back.
pub(super) fn what_if_ui(ui: &mut Ui, salt: &str, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let offered = desk.session.analysis().map_or((1.0, 1.0), |analysis| {
        let condition = &analysis.condition;
        (condition.input_voltage, condition.load_current)
    });
    let shown = desk.session.what_if().is_some();
    let mut form = std::mem::take(&mut desk.view.what_if);
    let mut entered = false;
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 6.0;
        let (word, colour) = if shown { ("What if:", palette.accent) } else { ("What if", palette.weak) };
        let label = ui.label(RichText::new(word).font(theme::strong(13.0)).color(colour));
        explain::explained(ui, label, "what-if", explain::nothing);
        let fields = [
            (&mut form.input, "What-if input voltage", Unit::Volt, offered.0),
            (&mut form.load, "What-if load current", Unit::Ampere, offered.1),
        ];
        for (typed, name, unit, offered) in fields {
            entered |= field_ui(ui, typed, (salt, name), quantity::print(offered, unit));
        }
        entered |= ui
            .button(RichText::new("Show").color(palette.accent))
            .on_hover_text("Show this condition in full.")
            .clicked();
    });
    if entered {
        let (input, load) = (form.input.read(Unit::Volt, offered.0), form.load.read(Unit::Ampere, offered.1));
        if let (Some(input_voltage), Some(load_current)) = (input, load) {
            desk.ask(Command::WhatIf { input_voltage, load_current });
        }
    }
    for (typed, name) in [(&form.input, "Input voltage"), (&form.load, "Load")] {
        if let Some(error) = &typed.error {
            ui.label(RichText::new(format!("{name}: {error}")).font(theme::small()).color(palette.problem));
        }
    }
    desk.view.what_if = form;
    if shown {
        let (input, load) = desk.session.shown();
        let back = format!("Back to the nine: {} input, {} load", input.word(), load.word());
        let text = RichText::new(back).color(palette.accent);
        if ui.button(text).clicked() {
            desk.ask(Command::Show(input, load));
        }
    }
}

/// A field; true when Enter was pressed in it.
fn field_ui(ui: &mut Ui, typed: &mut Typed, id: (&str, &str), offered: String) -> bool {
    ui.scope(|ui| {
        if typed.error.is_some() {
            let stroke = Stroke::new(1.5, palette(ui).problem);
            ui.visuals_mut().widgets.inactive.bg_stroke = stroke;
            ui.visuals_mut().widgets.hovered.bg_stroke = stroke;
        }
        let edit = TextEdit::singleline(&mut typed.text)
            .id_salt(id)
            .font(FontSelection::FontId(theme::body()))
            .hint_text(offered)
            .margin(Margin::symmetric(4, 2))
            .desired_width(FIELD);
        let response = ui.add(edit).accessible_name(id.1);
        response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter))
    })
    .inner
}
