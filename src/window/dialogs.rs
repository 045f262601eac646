//! Questions and lists over the window: open, save as, unsaved changes, all commands.

use eframe::egui::{Button, Frame, Id, Key, Modal, RichText, ScrollArea, TextEdit, Ui};

use super::command::Command;
use super::export;
use super::theme::{self, palette};
use super::view::{Desk, Dialog};
use super::{bar, finder, new_design, recents, recovery, sweep};

/// Width of a dialog [points].
const DIALOG: f32 = 520.0;

/// Draws the dialog that is open, if any.
pub(super) fn dialog_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let Some(mut dialog) = desk.view.dialog.clone() else { return };
    let frame = Frame::popup(ui.style()).inner_margin(18);
    let response = Modal::new(Id::unique("dialog")).frame(frame).show(ui.ctx(), |ui| {
        if dialog == Dialog::New {
            new_design::new_design_ui(ui, desk);
            return;
        }
        if let Dialog::Sweep(drawn) = &dialog {
            sweep::sweep_ui(ui, drawn, desk);
            return;
        }
        ui.set_width(DIALOG.min(ui.ctx().content_rect().width() - 60.0));
        match &mut dialog {
            Dialog::New | Dialog::Sweep(_) => {}
            Dialog::Open { path } => open_ui(ui, path, desk),
            Dialog::SaveAs { path } => save_as_ui(ui, path, desk),
            Dialog::Export { what, path } => export::export_ui(ui, *what, path, desk),
            Dialog::Unsaved(next) => unsaved_ui(ui, next, desk),
            Dialog::Overwrite { path } => recovery::overwrite_ui(ui, path, desk),
            Dialog::Recovery { discarding } => recovery::recovery_ui(ui, discarding, desk),
            Dialog::Commands { search } => finder::finder_ui(ui, search, desk),
        }
    });
    if response.should_close() {
        desk.ask(Command::Dismiss);
    }
    desk.view.dialog = Some(dialog);
}

/// Why the last try failed, where it is looked for.
pub(super) fn failure_ui(ui: &mut Ui, desk: &Desk<'_>) {
    if let Some(message) = desk.view.message.as_ref().filter(|message| message.failed) {
        ui.label(RichText::new(&message.text).color(palette(ui).problem));
    }
}

pub(super) fn title(ui: &mut Ui, text: &str) {
    ui.label(RichText::new(text).font(theme::strong(16.0)));
    ui.add_space(6.0);
}

/// A field for a path with a button for the system's dialog; true when Enter was pressed in it.
pub(super) fn path_ui(ui: &mut Ui, path: &mut String, desk: &mut Desk<'_>) -> bool {
    let mut entered = false;
    let (name, hint) = match desk.view.dialog {
        Some(Dialog::Export { .. }) => ("Path of the file", "path of a file"),
        _ => ("Path of the design file", "path of a design file"),
    };
    ui.horizontal(|ui| {
        let edit = TextEdit::singleline(path).hint_text(hint).desired_width(400.0);
        let response = ui.add(edit).accessible_name(name);
        entered = response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter));
        let nothing_focused = ui.memory(|memory| memory.focused().is_none());
        if nothing_focused && !entered {
            response.request_focus();
        }
        let browse = ui.add_enabled(!desk.view.browsing, Button::new("Browse…"));
        if browse.on_hover_text("Ask the system's file dialog. A typed path always works.").clicked() {
            desk.ask(Command::Browse);
        }
    });
    if desk.view.browsing {
        let text = "Waiting for the system's file dialog. If none appears, type the path here.";
        ui.label(RichText::new(text).font(theme::small()).color(palette(ui).weak));
    }
    entered
}

fn open_ui(ui: &mut Ui, path: &mut String, desk: &mut Desk<'_>) {
    title(ui, "Open a design");
    let entered = path_ui(ui, path, desk);
    failure_ui(ui, desk);
    ui.add_space(4.0);
    buttons(ui, |ui| {
        let open = ui.add_enabled(!path.is_empty(), primary(ui, "Open")).clicked();
        if open || (entered && !path.is_empty()) {
            desk.ask(Command::OpenPath(path.clone().into()));
        }
        if ui.button("Cancel").clicked() {
            desk.ask(Command::Dismiss);
        }
    });
    if !desk.kept.recent.is_empty() {
        ui.add_space(10.0);
        ui.label(RichText::new("Recent files").font(theme::strong(13.5)));
        list(ui, "recent", 170.0).show(ui, |ui| recents::recents_ui(ui, desk));
    }
    ui.add_space(10.0);
    ui.label(RichText::new("Or a sample").font(theme::strong(13.5)));
    list(ui, "samples", 260.0).show(ui, |ui| {
        bar::samples_ui(ui, desk);
    });
}

fn save_as_ui(ui: &mut Ui, path: &mut String, desk: &mut Desk<'_>) {
    title(ui, "Save the design as");
    let entered = path_ui(ui, path, desk);
    failure_ui(ui, desk);
    let target = with_ending(path);
    if !path.is_empty() && target.exists() {
        ui.label(RichText::new("This file exists and will be replaced.").color(palette(ui).problem));
    }
    ui.add_space(4.0);
    buttons(ui, |ui| {
        let save = ui.add_enabled(!path.is_empty(), primary(ui, "Save")).clicked();
        if save || (entered && !path.is_empty()) {
            desk.ask(Command::SavePath(target));
        }
        if ui.button("Cancel").clicked() {
            desk.ask(Command::Dismiss);
        }
    });
}

/// The path with the ending of design files when it has none.
fn with_ending(path: &str) -> std::path::PathBuf {
    let mut path = std::path::PathBuf::from(path);
    if path.extension().is_none() {
        path.set_extension("ron");
    }
    path
}

fn unsaved_ui(ui: &mut Ui, next: &Command, desk: &mut Desk<'_>) {
    title(ui, "There are unsaved changes");
    let text = match next {
        Command::Quit => "Closing now would lose them.",
        _ => "Opening another design would lose them.",
    };
    ui.label(text);
    if desk.session.bad_texts().next().is_some() {
        ui.label("Text that is not a number stands in a field; it is not part of the file.");
    }
    ui.add_space(8.0);
    buttons(ui, |ui| {
        if ui.add(primary(ui, "Save")).clicked() {
            desk.ask(Command::SaveAndGoOn);
        }
        if ui.button("Discard changes").clicked() {
            desk.ask(Command::DiscardAndGoOn);
        }
        if ui.button("Cancel").clicked() {
            desk.ask(Command::Dismiss);
        }
    });
}

pub(super) fn buttons(ui: &mut Ui, content: impl FnOnce(&mut Ui)) {
    ui.horizontal(content);
}

/// A list that scrolls: as high as wished where the window has the room. Without a least height it would take what the dialog
/// happened to leave when it was first drawn.
pub(super) fn list(ui: &Ui, name: &str, wish: f32) -> ScrollArea {
    let height = wish.min(ui.ctx().content_rect().height() * LIST_SHARE);
    ScrollArea::vertical().id_salt(name).max_height(height).min_scrolled_height(height)
}

/// Most of the window's height that one list takes.
const LIST_SHARE: f32 = 0.4;

/// The button that is meant.
pub(super) fn primary(ui: &Ui, text: &str) -> Button<'static> {
    let palette = palette(ui);
    Button::new(RichText::new(text).color(palette.panel).strong()).fill(palette.accent)
}
