//! The files worked on last, to be opened again: in the menu, in the open dialog and in the list of commands.

use eframe::egui::{self, Button, RichText, Ui};

use super::command::Command;
use super::theme::{self, palette};
use super::view::Desk;

/// Draws the list; true when a file was chosen. A missing file is marked and can be taken off the list.
pub(super) fn recents_ui(ui: &mut Ui, desk: &mut Desk<'_>) -> bool {
    desk.kept.recent_shown(ui.ctx());
    ui.set_max_width(430.0);
    if desk.kept.recent.is_empty() {
        ui.label(RichText::new("No file was opened or saved yet.").color(palette(ui).weak));
    }
    let mut chosen = false;
    for recent in &desk.kept.recent {
        let name = recent.path.file_name().unwrap_or(recent.path.as_os_str()).to_string_lossy().into_owned();
        let folder = recent.path.parent().map(|folder| folder.display().to_string()).unwrap_or_default();
        let missing = recent.there == Some(false);
        let colour = if missing { palette(ui).weak } else { palette(ui).accent };
        ui.horizontal(|ui| {
            let button = Button::new(RichText::new(&name).color(colour)).frame(false);
            if ui.add(button).on_hover_text(recent.path.display().to_string()).clicked() {
                desk.send.push(Command::OpenPath(recent.path.clone()));
                chosen = true;
            }
            if missing {
                ui.label(RichText::new("not there").font(theme::small()).color(palette(ui).problem));
                let remove =
                    Button::new(RichText::new("Remove").font(theme::small()).color(palette(ui).accent)).small();
                if ui.add(remove).accessible_name(format!("Remove {name} from the recent files")).clicked() {
                    desk.send.push(Command::ForgetRecent(recent.path.clone()));
                }
            }
        });
        let text = RichText::new(folder).font(theme::small()).color(palette(ui).weak);
        ui.add(egui::Label::new(text).truncate());
        ui.add_space(3.0);
    }
    chosen
}

/// The recent files as rows of the list of commands, those whose path holds the wanted words.
pub(super) fn commands_ui(ui: &mut Ui, wanted: &str, desk: &mut Desk<'_>) {
    desk.kept.recent_shown(ui.ctx());
    for recent in &desk.kept.recent {
        let path = recent.path.display().to_string();
        if !format!("open {}", path.to_lowercase()).contains(wanted) {
            continue;
        }
        let name = recent.path.file_name().unwrap_or(recent.path.as_os_str()).to_string_lossy();
        let missing = if recent.there == Some(false) { " (not there)" } else { "" };
        let button = Button::new(format!("Open {name}{missing}"))
            .stroke(egui::Stroke::NONE)
            .min_size(egui::vec2(ui.available_width(), 0.0));
        if ui.add(button).on_hover_text(path).clicked() {
            desk.send.push(Command::Dismiss);
            desk.send.push(Command::OpenPath(recent.path.clone()));
        }
    }
}
