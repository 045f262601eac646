//! The open file as it stands on the disk: changed or gone under the window, reloaded or kept out.

use std::path::Path;

use eframe::egui;

use super::app::App;
use super::keep::{OnDisk, look_at};
use super::safety::absolute;
use crate::design;

/// What the disk holds in the place of the open file.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum FileState {
    /// What was last read or saved, as far as is known; or there is no file.
    AsKnown,
    /// Something else: another program changed it.
    Changed {
        /// Sum over its bytes.
        sum: u64,
        /// Why no design can be read from it.
        unreadable: Option<String>,
    },
    /// It is gone, or cannot be read any more: why.
    Gone(String),
}

impl App {
    /// Takes note of what the watch saw in the place of the open file.
    pub(super) fn take_note_of(&mut self, on_disk: OnDisk) {
        let Some(path) = self.session.path().cloned() else { return };
        match on_disk {
            OnDisk::There { sum, design } if self.kept.expects(&self.session, sum, &design) => {
                self.kept.file = FileState::AsKnown;
                if self.kept.refused != Some(sum) {
                    self.session.set_adrift(false);
                }
            }
            OnDisk::There { design, .. } if design.as_ref().as_ref() == Ok(self.session.design()) => {
                self.kept.file = FileState::AsKnown;
                self.session.saved_as(path, self.session.design().clone());
            }
            OnDisk::There { sum, design } => {
                self.kept.file = FileState::Changed { sum, unreadable: design.err() };
                self.session.set_adrift(true);
            }
            OnDisk::Gone(reason) => {
                self.kept.file = FileState::Gone(reason);
                self.session.set_adrift(true);
            }
        }
    }

    /// Whether saving under a path would put an end to changes of another program that nobody has seen here.
    pub(super) fn changed_on_disk(&self, path: &Path) -> bool {
        if self.session.path().is_none_or(|own| absolute(own) != absolute(path)) {
            return false;
        }
        match look_at(path) {
            OnDisk::There { sum, design } => {
                let same = design.as_ref().as_ref() == Ok(self.session.design());
                !same && !self.kept.expects(&self.session, sum, &design)
            }
            OnDisk::Gone(_) => false,
        }
    }

    /// Takes over what the file holds now, as one step.
    pub(super) fn reload(&mut self, ctx: &egui::Context) {
        let Some(path) = self.session.path().cloned() else {
            self.tell("The design is in no file yet: there is nothing to reload.".to_owned(), true);
            return;
        };
        match design::file::load(&path) {
            Ok(design) => {
                self.session.change("Reload the file", None, |document| {
                    document.design = design.clone();
                    document.bad_texts.clear();
                });
                self.view.field = None;
                self.view.title = None;
                self.session.saved_as(path, design);
                self.in_file(ctx);
                self.tell("Reloaded from the file.".to_owned(), false);
            }
            Err(error) => {
                let reason = error.findings().first().map_or_else(|| error.to_string(), ToString::to_string);
                self.tell(format!("{reason} The design stays as it is here."), true);
            }
        }
    }

    /// Keeps the design although the file holds another: it counts as unsaved, and saving no longer asks.
    pub(super) fn keep_mine(&mut self) {
        if let FileState::Changed { sum, .. } = self.kept.file {
            self.kept.refused = Some(sum);
            self.kept.file = FileState::AsKnown;
            self.session.set_adrift(true);
        }
    }
}
