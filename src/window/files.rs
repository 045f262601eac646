//! Design files: loading, saving, and the system's file dialog, which runs on a thread of its own because it can hang.

use std::path::PathBuf;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::{Duration, Instant};

use eframe::egui;

/// What the system's dialog is asked for.
#[derive(Clone, Debug)]
pub(super) enum Ask {
    /// A file to open.
    Open,
    /// A path to save under; the name it proposes.
    Save(String),
    /// A path for a picture or for curves; the name it proposes.
    Export(String),
}

/// What became of the system's dialog.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Answer {
    /// This was chosen.
    Chosen(PathBuf),
    /// Nothing: it was left.
    Left,
    /// Nothing, sooner than anyone can look at a dialog: there is none, or it failed. The library tells both alike.
    Absent,
}

/// Time in which nobody has looked at a dialog and left it.
const AT_ONCE: Duration = Duration::from_millis(700);

/// Answers of the system's file dialog.
#[derive(Debug)]
pub(super) struct FileDialogs {
    sender: Sender<Answer>,
    receiver: Receiver<Answer>,
}

impl Default for FileDialogs {
    fn default() -> Self {
        let (sender, receiver) = channel();
        FileDialogs { sender, receiver }
    }
}

impl FileDialogs {
    /// Opens the system's dialog; its answer comes with [`FileDialogs::answer`]. Says so when no thread could be started.
    pub(super) fn ask(&self, ask: Ask, folder: Option<PathBuf>, ctx: &egui::Context) -> Result<(), std::io::Error> {
        let (sender, ctx) = (self.sender.clone(), ctx.clone());
        let run = move || {
            let asked = Instant::now();
            let mut dialog = rfd::FileDialog::new();
            if !matches!(ask, Ask::Export(_)) {
                dialog = dialog.add_filter("design file", &["ron"]);
            }
            if let Some(folder) = folder {
                dialog = dialog.set_directory(folder);
            }
            let path = match ask {
                Ask::Open => dialog.pick_file(),
                Ask::Save(name) | Ask::Export(name) => dialog.set_file_name(name).save_file(),
            };
            let answer = match path {
                Some(path) => Answer::Chosen(path),
                None if asked.elapsed() < AT_ONCE => Answer::Absent,
                None => Answer::Left,
            };
            // The window may be gone by now; then nobody waits.
            if sender.send(answer).is_ok() {
                ctx.request_repaint();
            }
        };
        std::thread::Builder::new().name("file dialog".to_owned()).spawn(run).map(|_| ())
    }

    /// What became of a dialog that was asked for.
    pub(super) fn answer(&self) -> Option<Answer> {
        self.receiver.try_recv().ok()
    }
}

/// The name a design is proposed to be saved under.
pub(super) fn proposed_name(title: &str) -> String {
    let kept: String = title.chars().map(|letter| if letter.is_alphanumeric() { letter } else { ' ' }).collect();
    let words: Vec<String> = kept.split_whitespace().map(str::to_lowercase).collect();
    if words.is_empty() { "design.ron".to_owned() } else { format!("{}.ron", words.join("-")) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_title_makes_a_file_name() {
        assert_eq!(proposed_name("Gimbal rail, 24 V"), "gimbal-rail-24-v.ron");
        assert_eq!(proposed_name(" / "), "design.ron");
    }
}
