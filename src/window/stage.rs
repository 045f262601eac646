//! The column of entries: title, power stage, modulator, events, requirements.

use eframe::egui::{CollapsingHeader, FontSelection, Id, RichText, TextEdit, Ui};

use super::command::Command;
use super::form;
use super::theme::{self, palette};
use super::view::Desk;

/// Sections of the form: path prefix, heading, whether it stands open at first.
const SECTIONS: [(&str, &str, bool); 4] = [
    ("stage", "Power stage", true),
    ("control", "Control", true),
    ("requirement", "Requirements", false),
    ("event", "Steps", false),
];

/// Draws the column.
pub(super) fn stage_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    ui.spacing_mut().item_spacing.y = 2.0;
    for (section, heading, open) in SECTIONS {
        ui.add_space(6.0);
        CollapsingHeader::new(RichText::new(heading).font(theme::strong(13.5)))
            .id_salt(section)
            .default_open(open || seeks(section, desk))
            .open(seeks(section, desk).then_some(true))
            .show_unindented(ui, |ui| form::section_ui(ui, section, |_| true, desk));
    }
}

/// True when a finding leads to a field of this section.
fn seeks(section: &str, desk: &Desk<'_>) -> bool {
    desk.view.seek.as_deref().is_some_and(|path| path.starts_with(section))
}

/// Draws the field of the title.
pub(super) fn title_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let id = Id::unique("title");
    let mut text = match desk.view.title.take() {
        Some(text) => text,
        None => desk.session.design().title.clone(),
    };
    let edit = TextEdit::singleline(&mut text)
        .id(id)
        .font(FontSelection::FontId(theme::strong(13.5)))
        .hint_text(RichText::new("title").color(palette(ui).weak))
        .desired_width(f32::INFINITY);
    let response = ui.add(edit).accessible_name("Title");
    if response.has_focus() {
        desk.view.title = Some(text);
    } else if text != desk.session.design().title {
        desk.ask(Command::Title(text));
    }
}
