//! The searchable list: every command, every entry of the design, every recent file, found by a few letters.

use eframe::egui::{Button, Key, RichText, Stroke, TextEdit, Ui, vec2};

use super::bar;
use super::command::{COMMANDS, Command, Row};
use super::dialogs;
use super::recents;
use super::theme::palette;
use super::view::Desk;
use crate::quantity::{Entry, print};

/// Draws the list; Enter in the field takes its first line.
pub(super) fn finder_ui(ui: &mut Ui, search: &mut String, desk: &mut Desk<'_>) {
    let edit = TextEdit::singleline(search).hint_text("search a command or an entry").desired_width(f32::INFINITY);
    let response = ui.add(edit).accessible_name("Search a command");
    let entered = response.lost_focus() && ui.input(|input| input.key_pressed(Key::Enter));
    if ui.memory(|memory| memory.focused().is_none()) && !entered {
        response.request_focus();
    }
    ui.add_space(6.0);
    let wanted = search.to_lowercase();
    let commands: Vec<&Row> = COMMANDS
        .iter()
        .filter(|row| row.name.to_lowercase().contains(&wanted) || row.help.to_lowercase().contains(&wanted))
        .collect();
    let entries = if wanted.is_empty() { Vec::new() } else { entries(&wanted, desk) };
    let first = commands.first().map(|row| row.command.clone());
    let first = first.or_else(|| entries.first().map(|entry| Command::GoTo(entry.path)));
    if let (true, Some(first)) = (entered, first) {
        desk.ask(Command::Dismiss);
        desk.ask(first);
    }
    dialogs::list(ui, "commands", 360.0).show(ui, |ui| {
        if commands.is_empty() && entries.is_empty() {
            ui.label(RichText::new("No command and no entry of this design is called so.").color(palette(ui).weak));
        }
        for row in commands {
            if bar::command_ui(ui, row, false) {
                desk.ask(Command::Dismiss);
                desk.ask(row.command.clone());
            }
        }
        for entry in entries {
            entry_ui(ui, entry, desk);
        }
        recents::commands_ui(ui, &wanted, desk);
    });
}

/// Entries that play a part in the design and are called so, those whose whole name it is first.
fn entries(wanted: &str, desk: &Desk<'_>) -> Vec<&'static Entry> {
    let mut found: Vec<_> = desk
        .session
        .design()
        .entries()
        .into_iter()
        .filter(|entry| entry.name.to_lowercase().contains(wanted) || entry.path.contains(wanted))
        .collect();
    found.sort_by_key(|entry| entry.name.to_lowercase() != wanted);
    found
}

fn entry_ui(ui: &mut Ui, entry: &'static Entry, desk: &mut Desk<'_>) {
    let value = desk.session.design().values.get(entry.path).map(|value| print(value, entry.unit));
    let text = RichText::new(format!("{}  {}", entry.name, value.unwrap_or_default()));
    let button = Button::new(text).stroke(Stroke::NONE).min_size(vec2(ui.available_width(), 0.0));
    let button = button.right_text(RichText::new(entry.path).color(palette(ui).weak));
    if ui.add(button).on_hover_text(format!("Go to its field. {}", entry.help)).clicked() {
        desk.ask(Command::Dismiss);
        desk.ask(Command::GoTo(entry.path));
    }
}
