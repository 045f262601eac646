//! Carrying out commands: what each does to the session, the view and the files.

use std::path::{Path, PathBuf};

use eframe::egui::{self, ViewportCommand};

use super::app::App;
use super::command::Command;
use super::files::{self, Answer, Ask};
use super::findings::lower_first;
use super::session::{BadText, Session};
use super::view::{Dialog, Message};
use crate::analysis::Level;
use crate::compensator::Series;
use crate::design;

/// Step of the text size, and its least and greatest.
const SIZE: (f32, f32, f32) = (0.1, 0.8, 2.0);

impl App {
    /// Carries out one command.
    pub(super) fn perform(&mut self, command: Command, ctx: &egui::Context) {
        match command {
            _ if self.view.review && command.edits() => {
                let text = "The review view is for reading. Press Esc to go back to the design.".to_owned();
                self.view.message = Some(Message { text, failed: false });
            }
            Command::OpenPath(_)
            | Command::OpenSample(_)
            | Command::CreateDesign
            | Command::Recover(_)
            | Command::Quit
                if self.session.unsaved() =>
            {
                self.view.dialog = Some(Dialog::Unsaved(Box::new(command)));
            }
            Command::Open
            | Command::NewDesign
            | Command::CreateDesign
            | Command::OpenPath(_)
            | Command::OpenSample(_)
            | Command::Save
            | Command::SaveAs
            | Command::SavePath(_)
            | Command::Browse
            | Command::Quit
            | Command::DiscardAndGoOn
            | Command::SaveAndGoOn
            | Command::Overwrite(_)
            | Command::Reload
            | Command::KeepMine
            | Command::FindUnsaved
            | Command::Recover(_)
            | Command::DiscardJournal(_)
            | Command::ForgetRecent(_)
            | Command::ForgetAllRecent
            | Command::Dismiss => self.perform_on_files(command, ctx),
            Command::Export(_) | Command::ExportPath { .. } | Command::CopyParts | Command::CopyMargins => {
                self.perform_export(command, ctx);
            }
            Command::ReturnLane(key) => self.return_lane(key),
            Command::Place(method) => self.place(method),
            edit if edit.edits() => {
                self.view.goal.said = None;
                self.perform_on_design(edit);
            }
            other => self.perform_on_view(&other, ctx),
        }
    }

    fn perform_on_files(&mut self, command: Command, ctx: &egui::Context) {
        match command {
            Command::Open => {
                self.view.message = None;
                self.view.dialog = Some(Dialog::Open { path: String::new() });
            }
            Command::NewDesign => {
                self.view.message = None;
                self.view.dialog = Some(Dialog::New);
            }
            Command::CreateDesign => {
                if let Some(design) = self.view.new_design.design() {
                    self.begin(Session::created(design), ctx);
                    self.view.review = false;
                }
            }
            Command::OpenPath(path) => self.open(&path, ctx),
            Command::OpenSample(file) => self.open_sample(file, ctx),
            Command::Save => match self.session.path().cloned() {
                Some(path) => self.save_asking(path, ctx),
                None => self.ask_where_to_save(),
            },
            Command::SaveAs => self.ask_where_to_save(),
            Command::SavePath(path) => self.save_asking(path, ctx),
            Command::Overwrite(path) => self.save_and_follow(path, ctx),
            Command::Reload => self.reload(ctx),
            Command::KeepMine => self.keep_mine(),
            Command::FindUnsaved => self.find_unsaved(ctx),
            Command::Recover(journal) => self.recover(&journal, ctx),
            Command::DiscardJournal(journal) => self.discard_journal(&journal),
            Command::ForgetRecent(path) => self.forget_recent(Some(path)),
            Command::ForgetAllRecent => self.forget_recent(None),
            Command::Browse => self.browse(ctx),
            Command::Quit => {
                self.leaving = true;
                ctx.send_viewport_cmd(ViewportCommand::Close);
            }
            Command::DiscardAndGoOn => {
                if let Some(Dialog::Unsaved(next)) = self.view.dialog.take() {
                    self.perform_on_files(*next, ctx);
                }
            }
            Command::SaveAndGoOn => self.save_and_go_on(ctx),
            _ => {
                self.after_saving = None;
                let asked = self.view.dialog.take();
                if matches!(asked, Some(Dialog::Open { .. } | Dialog::SaveAs { .. } | Dialog::Export { .. })) {
                    self.view.forget_failure();
                }
                self.put_off_recovery();
            }
        }
    }

    fn save_and_go_on(&mut self, ctx: &egui::Context) {
        let Some(Dialog::Unsaved(next)) = self.view.dialog.take() else { return };
        self.after_saving = Some(*next);
        match self.session.path().cloned() {
            Some(path) => self.save_asking(path, ctx),
            None => self.ask_where_to_save(),
        }
    }

    /// Saves, unless the file changed since it was read: then it asks first.
    fn save_asking(&mut self, path: PathBuf, ctx: &egui::Context) {
        if self.changed_on_disk(&path) {
            self.view.dialog = Some(Dialog::Overwrite { path });
        } else {
            self.save_and_follow(path, ctx);
        }
    }

    /// Saves, then goes on with what waits for it.
    fn save_and_follow(&mut self, path: PathBuf, ctx: &egui::Context) {
        if self.save(path, ctx) {
            if matches!(self.view.dialog, Some(Dialog::SaveAs { .. } | Dialog::Overwrite { .. })) {
                self.view.dialog = None;
            }
            if let Some(next) = self.after_saving.take() {
                self.perform_on_files(next, ctx);
            }
        } else if !matches!(self.view.dialog, Some(Dialog::SaveAs { .. })) {
            // The reason stands under the bar; what waited for the save does not go on.
            self.view.dialog = None;
            self.after_saving = None;
        }
    }

    fn open(&mut self, path: &Path, ctx: &egui::Context) {
        match design::file::load(path) {
            Ok(design) => {
                self.begin(Session::new(design, Some(path.to_path_buf())), ctx);
                self.view.message = None;
            }
            Err(error) => {
                // Several entries may be at fault; the first says enough to find the file and the line.
                let text = error.findings().first().map_or_else(|| error.to_string(), ToString::to_string);
                self.fail(text);
            }
        }
    }

    fn open_sample(&mut self, file: &str, ctx: &egui::Context) {
        let Some(sample) = design::sample::all().iter().find(|sample| sample.file == file) else { return };
        match sample.design() {
            Ok(design) => self.begin(Session::new(design, None), ctx),
            Err(error) => self.fail(error.to_string()),
        }
    }

    /// Goes on with another document.
    pub(super) fn begin(&mut self, session: Session, ctx: &egui::Context) {
        self.session = session;
        self.view.forget_failure();
        self.view.dialog = None;
        self.view.range_hz = None;
        self.view.field = None;
        self.view.title = None;
        self.view.typing = None;
        self.kept.new_document();
        self.in_file(ctx);
    }

    fn ask_where_to_save(&mut self) {
        let proposed = || {
            let name = PathBuf::from(files::proposed_name(&self.session.design().title));
            self.last_folder().map_or_else(|| name.clone(), |folder| folder.join(&name))
        };
        let path = self.session.path().cloned().unwrap_or_else(proposed).display().to_string();
        self.view.forget_failure();
        self.view.dialog = Some(Dialog::SaveAs { path });
    }

    /// Saves; true when it worked. Says what happened either way.
    fn save(&mut self, path: PathBuf, ctx: &egui::Context) -> bool {
        let design = self.session.design().clone();
        match design::file::save(&design, &path) {
            Ok(()) => {
                let text = format!("Saved as {}.", path.display());
                self.session.saved_as(path, design);
                self.in_file(ctx);
                self.view.message = Some(Message { text, failed: false });
                true
            }
            Err(error) => {
                self.fail(error.findings().first().map_or_else(|| error.to_string(), ToString::to_string));
                false
            }
        }
    }

    fn browse(&mut self, ctx: &egui::Context) {
        let folder = self.last_folder();
        let ask = match &self.view.dialog {
            Some(Dialog::Export { path, .. }) => Ask::Export(path.clone()),
            Some(Dialog::SaveAs { .. }) => Ask::Save(files::proposed_name(&self.session.design().title)),
            _ => Ask::Open,
        };
        match self.dialogs.ask(ask, folder, ctx) {
            Ok(()) => {
                self.view.forget_failure();
                self.view.browsing = true;
            }
            Err(error) => self.fail(format!("The file dialog could not be started: {error}. A path can be typed.")),
        }
    }

    /// Puts the answer of the system's dialog into the path that is being asked for.
    pub(super) fn take_file_answer(&mut self) {
        let Some(answer) = self.dialogs.answer() else { return };
        self.view.browsing = false;
        let Some(Dialog::Open { path } | Dialog::SaveAs { path } | Dialog::Export { path, .. }) = &mut self.view.dialog
        else {
            return;
        };
        match answer {
            Answer::Chosen(chosen) => *path = chosen.display().to_string(),
            Answer::Left => {}
            Answer::Absent => {
                self.fail("This desktop shows no file dialog. Type the path instead.".into());
            }
        }
    }

    fn fail(&mut self, text: String) {
        self.view.message = Some(Message { text, failed: true });
    }

    fn perform_on_design(&mut self, command: Command) {
        let session = &mut self.session;
        match command {
            Command::Undo => session.undo(),
            Command::Redo => session.redo(),
            Command::Enter { path, text } => enter(session, path, text),
            Command::Choose { path, key } => {
                let name = design::choice(path).map_or("choice", |choice| choice.name);
                session.change(&format!("Choose {}", lower_first(name)), None, |document| {
                    // The key comes from the table's own options.
                    let _ = document.design.set_from_text(path, key);
                });
            }
            Command::Title(title) => session.change("Enter the title", None, |document| document.design.title = title),
            Command::MoveLane { key, frequency_hz, gesture } => session.move_lane(key, frequency_hz, gesture),
            Command::MoveCrossover { frequency_hz, gesture } => session.move_crossover(frequency_hz, gesture),
            Command::Lock { path, locked } => {
                let name = if locked { "Keep a part" } else { "Let a part go" };
                session.change(name, None, |document| {
                    if locked {
                        document.design.locks.insert(path.to_owned());
                    } else {
                        document.design.locks.remove(path);
                    }
                });
            }
            Command::RoundParts => round_parts(session),
            Command::Mend(remedy) => session.change(&remedy.label, None, |document| {
                for (path, key) in &remedy.choices {
                    let _ = document.design.set_from_text(path, key);
                }
                for (path, value) in &remedy.values {
                    let _ = document.design.values.set(path, *value);
                    document.bad_texts.remove(path);
                }
            }),
            _ => {}
        }
    }

    fn perform_on_view(&mut self, command: &Command, ctx: &egui::Context) {
        let view = &mut self.view;
        match command {
            Command::Show(input, load) => self.session.show(*input, *load),
            Command::StepLevels { input, load } => self.session.step_levels(*input, *load),
            Command::WhatIf { input_voltage, load_current } => {
                self.session.show_what_if(*input_voltage, *load_current);
            }
            Command::Review => {
                view.review = !view.review;
                self.session.review(None);
                ctx.memory_mut(egui::Memory::stop_text_input);
            }
            Command::ReviewTry(number) => self.session.review(*number),
            Command::StepTry { forward } => self.session.step_try(*forward),
            Command::NextCondition => self.session.step_condition(1),
            Command::PreviousCondition => self.session.step_condition(8),
            Command::Toggle(curve) => view.toggle(*curve),
            Command::ToggleBand => view.band = !view.band,
            Command::ToggleExact => view.exact = !view.exact,
            Command::Page(page) => {
                if std::mem::take(&mut view.review) {
                    self.session.review(None);
                }
                view.page = *page;
            }
            Command::Tie(kind) => self.session.tie(*kind, !self.session.tied(*kind)),
            Command::RunTransient => view.transient.again(),
            Command::StopTransient => view.transient.stop(),
            Command::WholeRange => view.range_hz = None,
            Command::Zoom(zoom) => self.zoom(*zoom),
            Command::Pan(pan) => self.pan(*pan),
            Command::Hold => self.session.hold(),
            Command::CompareWith(number) => self.session.compare_with(*number),
            Command::DropTry(number) => self.session.drop_try(*number),
            Command::DropHeld => self.session.drop_held(),
            Command::Hint(shown) => view.hint = *shown,
            Command::Theme(theme) => {
                view.theme = *theme;
                ctx.set_theme(*theme);
            }
            Command::Larger => scale(ctx, SIZE.0),
            Command::Smaller => scale(ctx, -SIZE.0),
            Command::NormalSize => ctx.set_zoom_factor(1.0),
            Command::ToggleStage | Command::ToggleReadouts if view.one_column => {
                view.readouts_first = !view.readouts_first;
            }
            Command::ToggleStage => view.stage_column = !view.stage_column,
            Command::ToggleReadouts => view.readout_column = !view.readout_column,
            Command::ToggleSchematics => {
                let shown = view.schematics.shown();
                view.schematics.show(!shown);
            }
            Command::SweepLoad => match super::sweep::figure(&self.session) {
                Ok(figure) => view.dialog = Some(Dialog::Sweep(Box::new(figure))),
                Err(text) => view.message = Some(Message { text, failed: true }),
            },
            Command::GoTo(path) => {
                view.review = false;
                view.go_to(path);
            }
            Command::ListCommands => view.dialog = Some(Dialog::Commands { search: String::new() }),
            _ => {}
        }
    }
}

fn scale(ctx: &egui::Context, by: f32) {
    ctx.set_zoom_factor((ctx.zoom_factor() + by).clamp(SIZE.1, SIZE.2));
}

/// Takes text over for an entry: a number, or text that stays in its field with the reason.
fn enter(session: &mut Session, path: &'static str, text: String) {
    let name = design::entry(path).map_or(path, |entry| entry.name);
    session.change(&format!("Enter {}", lower_first(name)), None, |document| {
        match document.design.set_from_text(path, &text) {
            Ok(()) => {
                document.bad_texts.remove(path);
            }
            Err(finding) => {
                document.bad_texts.insert(path.to_owned(), BadText { text, finding });
            }
        }
    });
}

fn round_parts(session: &mut Session) {
    session.change("Round parts to their series", None, |document| {
        let design = &mut document.design;
        if let Ok(compensator) = design.compensator() {
            let series = |path: &str| design.choices.get(path).and_then(Series::from_key).unwrap_or(Series::Exact);
            let (resistors, capacitors) =
                (series("compensator.series.resistors"), series("compensator.series.capacitors"));
            compensator.rounded(resistors, capacitors, &design.locks).write(&mut design.values);
        }
    });
}

/// The condition `steps` further in the list of nine, from the end on from the start.
pub(super) fn condition_after(shown: (Level, Level), steps: usize) -> (Level, Level) {
    let all: Vec<_> = Level::ALL.iter().flat_map(|input| Level::ALL.iter().map(move |load| (*input, *load))).collect();
    let at = all.iter().position(|levels| *levels == shown).unwrap_or(0);
    all.get((at + steps) % all.len()).copied().unwrap_or(shown)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_nine_conditions_go_round() {
        let first = (Level::Least, Level::Least);
        assert_eq!(condition_after(first, 1), (Level::Least, Level::Nominal));
        assert_eq!(condition_after(first, 8), (Level::Greatest, Level::Greatest));
        assert_eq!(condition_after(condition_after(first, 8), 1), first);
    }
}
