//! What is asked and told about work left behind and about a file that changed under the window.

use std::path::{Path, PathBuf};
use std::time::SystemTime;

use eframe::egui::{self, RichText, Ui};

use super::bar;
use super::command::Command;
use super::dialogs::{buttons, list, primary, title};
use super::keep::{Content, Left, OnDisk};
use super::on_disk::FileState;
use super::theme::{self, palette};
use super::view::Desk;
use crate::design::Difference;

/// Differences told one by one.
const MOST_TOLD: usize = 12;

/// Draws the offer of work left behind.
pub(super) fn recovery_ui(ui: &mut Ui, discarding: &mut Option<PathBuf>, desk: &mut Desk<'_>) {
    title(ui, "Unsaved work was left behind");
    let text = "A window ended before this was saved. Recovering opens it as unsaved work; no file is changed by that.";
    ui.label(RichText::new(text).color(palette(ui).weak));
    ui.add_space(8.0);
    list(ui, "left behind", 420.0).show(ui, |ui| {
        for (index, left) in desk.kept.left.iter().enumerate() {
            if index > 0 {
                ui.separator();
            }
            ui.push_id(&left.file, |ui| left_ui(ui, left, discarding, desk.send));
            ui.add_space(6.0);
        }
    });
    ui.add_space(4.0);
    if ui
        .button("Not now")
        .on_hover_text("Keep it; the Design menu offers it again, and so does the next start.")
        .clicked()
    {
        desk.ask(Command::Dismiss);
    }
}

fn left_ui(ui: &mut Ui, left: &Left, discarding: &mut Option<PathBuf>, send: &mut Vec<Command>) {
    match &left.content {
        Ok(content) => content_ui(ui, content),
        Err(error) => {
            ui.label(RichText::new("A journal that cannot be used").font(theme::strong(13.5)));
            let text = format!("{}: {error}. It stays there until you discard it.", left.file.display());
            ui.label(RichText::new(text).color(palette(ui).problem));
        }
    }
    ui.add_space(4.0);
    let name = left.content.as_ref().map_or_else(|_| left.file.display().to_string(), name_of);
    buttons(ui, |ui| {
        if left.content.is_ok() && ui.add(primary(ui, "Recover")).clicked() {
            send.push(Command::Recover(left.file.clone()));
        }
        if discarding.as_ref() == Some(&left.file) {
            let text = RichText::new("Discard for good").color(palette(ui).problem);
            if ui.button(text).on_hover_text(format!("Remove the unsaved work on {name}.")).clicked() {
                send.push(Command::DiscardJournal(left.file.clone()));
            }
            if ui.button("Keep it").clicked() {
                *discarding = None;
            }
        } else if ui.button("Discard").on_hover_text(format!("Give up the unsaved work on {name}.")).clicked() {
            *discarding = Some(left.file.clone());
        }
    });
}

fn name_of(content: &Content) -> String {
    let title = &content.snapshot.design.title;
    if title.is_empty() { "Untitled".to_owned() } else { title.clone() }
}

fn content_ui(ui: &mut Ui, content: &Content) {
    ui.label(RichText::new(name_of(content)).font(theme::strong(13.5)));
    let age = SystemTime::now().duration_since(content.written).map_or(0, |age| age.as_secs());
    let file = match &content.snapshot.path {
        Some(path) => path.display().to_string(),
        None => "never saved to a file".to_owned(),
    };
    ui.label(RichText::new(format!("Last changed {}; {file}", ago(age))).font(theme::small()).color(palette(ui).weak));
    for line in lines(content) {
        ui.label(RichText::new(line).font(theme::small()));
    }
}

/// What is special about the work: how it differs from its file, and what cannot be compared.
fn lines(content: &Content) -> Vec<String> {
    let mut lines = Vec::new();
    match (&content.on_disk, &content.differences) {
        (_, Some(differences)) if differences.is_empty() => lines.push("The numbers are those of its file.".to_owned()),
        (_, Some(differences)) => {
            lines.extend(differences.iter().take(MOST_TOLD).map(told));
            if differences.len() > MOST_TOLD {
                lines.push(format!("and {} more differences from its file", differences.len() - MOST_TOLD));
            }
        }
        (Some(OnDisk::Gone(reason)), _) => lines.push(format!("Its file cannot be compared: {reason}.")),
        (Some(OnDisk::There { .. }), _) => lines.push("Its file cannot be read as a design now.".to_owned()),
        (None, _) => {}
    }
    for (path, text) in &content.snapshot.bad_texts {
        let name = crate::design::entry(path).map_or(path.as_str(), |entry| entry.name);
        lines.push(format!("{name}: the text “{text}”, which is no number"));
    }
    lines
}

fn told(difference: &Difference) -> String {
    let shown = |text: &str| if text.is_empty() { "nothing".to_owned() } else { text.to_owned() };
    format!("{}: {}; in its file {}", difference.name, shown(&difference.after), shown(&difference.before))
}

/// An age in words [s].
fn ago(seconds: u64) -> String {
    let counted = |count: u64, unit: &str| format!("{count} {unit}{} ago", if count == 1 { "" } else { "s" });
    match seconds {
        0..60 => "less than a minute ago".to_owned(),
        60..3600 => counted(seconds / 60, "minute"),
        3600..86400 => counted(seconds / 3600, "hour"),
        _ => counted(seconds / 86400, "day"),
    }
}

/// Draws the question whether to save over a file that changed.
pub(super) fn overwrite_ui(ui: &mut Ui, path: &Path, desk: &mut Desk<'_>) {
    title(ui, "The file was changed by another program");
    let text = format!("{} no longer holds what was read from it. Saving now would end those changes.", path.display());
    ui.label(text);
    ui.add_space(8.0);
    buttons(ui, |ui| {
        if ui.button("Save over it").clicked() {
            desk.ask(Command::Overwrite(path.to_path_buf()));
        }
        if ui.add(primary(ui, "Save as…")).clicked() {
            desk.ask(Command::SaveAs);
        }
        if ui.button("Cancel").clicked() {
            desk.ask(Command::Dismiss);
        }
    });
}

/// What is to be told about the open file, if anything.
pub(super) fn notice(desk: &Desk<'_>) -> Option<String> {
    let name = desk.session.path()?.file_name()?.to_string_lossy();
    match &desk.kept.file {
        FileState::AsKnown => None,
        FileState::Changed { unreadable: None, .. } => Some(format!("{name} was changed by another program.")),
        FileState::Changed { unreadable: Some(reason), .. } => {
            Some(format!("{name} was changed by another program and cannot be read now: {reason}"))
        }
        FileState::Gone(reason) => {
            Some(format!("{name} cannot be found in its place any more: {reason}. The work is kept here."))
        }
    }
}

/// Draws the line about the open file.
pub(super) fn notice_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let Some(text) = notice(desk) else { return };
    let state = desk.kept.file.clone();
    bar::line_ui(ui, &text, palette(ui).problem, |ui| match state {
        FileState::Changed { unreadable, .. } => {
            if ui
                .button("Keep mine")
                .on_hover_text("Go on with the design as it is here; saving replaces the file.")
                .clicked()
            {
                desk.ask(Command::KeepMine);
            }
            let reload = ui.add_enabled(unreadable.is_none(), egui::Button::new("Reload"));
            if reload.on_hover_text("Take over what the file holds now; can be undone.").clicked() {
                desk.ask(Command::Reload);
            }
        }
        FileState::Gone(_) => {
            if ui.button("Save as…").clicked() {
                desk.ask(Command::SaveAs);
            }
            if ui.button("Save again").on_hover_text("Write the file anew in its place.").clicked() {
                desk.ask(Command::Save);
            }
        }
        FileState::AsKnown => {}
    });
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_age_is_told_in_words() {
        assert_eq!(ago(5), "less than a minute ago");
        assert_eq!(ago(60), "1 minute ago");
        assert_eq!(ago(7250), "2 hours ago");
        assert_eq!(ago(200_000), "2 days ago");
    }
}
