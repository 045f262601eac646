//! What the window looked like when it was closed, kept for the next start.
//!
//! *Format*: RON in the data folder, meant to be read by people; fields are only ever added, an absent one has its default, an
//! unknown one is left aside. *Bad input*: a file that cannot be read is told and replaced; a number out of range is not used.

use std::io;
use std::path::{Path, PathBuf};

use eframe::egui::{self, ThemePreference};
use serde::{Deserialize, Serialize};

use super::folder::DataFolder;
use super::path_text;
use crate::design::file::replace;
use crate::window::view::{ClosedLoop, Event, View};

/// Size of the text, least and greatest.
pub(in crate::window) const TEXT_SIZES: (f32, f32) = (0.8, 2.0);
/// Sizes and places of a window that can be meant [points].
const LARGEST: f32 = 16384.0;

/// Where the window stood, apart from scaling by the text size.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
pub(in crate::window) struct WindowPlace {
    /// Width and height inside its frame [points].
    pub size: (f32, f32),
    /// Upper left corner of its frame, where the system tells [points].
    #[serde(default)]
    pub position: Option<(f32, f32)>,
    /// It filled the screen.
    #[serde(default)]
    pub maximized: bool,
}

/// Colours of the window.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub(in crate::window) enum Colours {
    /// Light colours.
    Light,
    /// Dark colours.
    Dark,
    /// As the desktop has them.
    #[default]
    System,
}

/// The words for the event of the time plot.
#[derive(Serialize, Deserialize)]
#[serde(remote = "Event", rename_all = "snake_case")]
enum EventWord {
    Load,
    Line,
    Reference,
}

/// The words for the closed-loop response that is shown.
#[derive(Serialize, Deserialize)]
#[serde(remote = "ClosedLoop", rename_all = "snake_case")]
enum ClosedLoopWord {
    Impedance,
    Line,
    Reference,
    Input,
}

/// What is seen and how.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub(in crate::window) struct Look {
    pub window: Option<WindowPlace>,
    /// Size of text and drawing, 1 is normal.
    pub text_size: f32,
    pub colours: Colours,
    pub plant: bool,
    pub compensator: bool,
    pub loop_gain: bool,
    pub band: bool,
    pub exact: bool,
    pub stage_column: bool,
    pub readout_column: bool,
    /// Which column has the room for one.
    pub readouts_first: bool,
    #[serde(with = "EventWord")]
    pub event: Event,
    #[serde(with = "ClosedLoopWord")]
    pub closed_loop: ClosedLoop,
    /// The hint for who is new here was closed.
    pub hint_closed: bool,
}

impl Default for Look {
    fn default() -> Self {
        // Nobody has closed the hint who never saw it.
        let mut look = Look::of(&View::default(), 1.0, None);
        look.hint_closed = false;
        look
    }
}

impl Look {
    /// The look of a view at a text size.
    fn of(view: &View, text_size: f32, window: Option<WindowPlace>) -> Self {
        Look {
            window,
            text_size,
            colours: match view.theme {
                ThemePreference::Light => Colours::Light,
                ThemePreference::Dark => Colours::Dark,
                ThemePreference::System => Colours::System,
            },
            plant: view.plant,
            compensator: view.compensator,
            loop_gain: view.loop_gain,
            band: view.band,
            exact: view.exact,
            stage_column: view.stage_column,
            readout_column: view.readout_column,
            readouts_first: view.readouts_first,
            event: view.event,
            closed_loop: view.closed_loop,
            hint_closed: !view.hint,
        }
    }

    /// The look of the window now; where it stands stays as it was while the system does not tell.
    pub(in crate::window) fn now(view: &View, ctx: &egui::Context, before: &Look) -> Self {
        let zoom = ctx.zoom_factor();
        let window = ctx.input(|input| place(input.viewport(), zoom, before.window));
        Look::of(view, zoom, window.or(before.window))
    }

    /// Gives a new window this look.
    pub(in crate::window) fn apply(&self, view: &mut View, ctx: &egui::Context) {
        view.theme = match self.colours {
            Colours::Light => ThemePreference::Light,
            Colours::Dark => ThemePreference::Dark,
            Colours::System => ThemePreference::System,
        };
        ctx.set_theme(view.theme);
        ctx.set_zoom_factor(self.text_size);
        view.plant = self.plant;
        view.compensator = self.compensator;
        view.loop_gain = self.loop_gain;
        view.band = self.band;
        view.exact = self.exact;
        view.stage_column = self.stage_column;
        view.readout_column = self.readout_column;
        view.readouts_first = self.readouts_first;
        view.event = self.event;
        view.closed_loop = self.closed_loop;
        view.hint = !self.hint_closed;
    }

    /// Without numbers that cannot be meant.
    fn usable(mut self) -> Self {
        let (least, greatest) = TEXT_SIZES;
        if !(least..=greatest).contains(&self.text_size) {
            self.text_size = 1.0;
        }
        let size = |length: f32| (1.0..=LARGEST).contains(&length);
        self.window = self.window.filter(|window| size(window.size.0) && size(window.size.1));
        if let Some(window) = &mut self.window {
            window.position = window.position.filter(|(x, y)| x.abs() <= LARGEST && y.abs() <= LARGEST);
        }
        self
    }
}

/// Where a window stands, in points at normal text size. One that fills the screen keeps the size it will return to.
fn place(viewport: &egui::ViewportInfo, zoom: f32, before: Option<WindowPlace>) -> Option<WindowPlace> {
    let maximized = viewport.maximized.unwrap_or(false) || viewport.fullscreen.unwrap_or(false);
    if maximized && let Some(before) = before {
        return Some(WindowPlace { maximized, ..before });
    }
    if viewport.minimized.unwrap_or(false) {
        return None;
    }
    let size = viewport.inner_rect?.size() * zoom;
    let position = viewport.outer_rect.map(|rect| (rect.min * zoom).round()).map(|min| (min.x, min.y));
    let size = (size.x.round(), size.y.round());
    (size.0 >= 1.0 && size.1 >= 1.0).then_some(WindowPlace { size, position, maximized })
}

/// All that is kept about the window.
#[derive(Clone, Debug, Default, PartialEq)]
pub(in crate::window) struct Settings {
    /// What is seen and how.
    pub look: Look,
    /// The folder files were last opened from or saved in.
    pub folder: Option<PathBuf>,
}

#[derive(Default, Serialize, Deserialize)]
#[serde(default)]
struct Kept {
    look: Look,
    folder: Option<String>,
}

/// Reads the settings in a data folder; the defaults when there are none yet.
///
/// # Errors
/// Why the file cannot be read, as a sentence.
pub(in crate::window) fn load(folder: &DataFolder) -> Result<Settings, String> {
    load_file(&folder.settings())
}

fn load_file(file: &Path) -> Result<Settings, String> {
    let told = |reason: String| format!("The settings in {} could not be read: {reason}.", file.display());
    let text = match std::fs::read_to_string(file) {
        Ok(text) => text,
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(Settings::default()),
        Err(error) => return Err(told(error.to_string())),
    };
    let kept: Kept = ron::from_str(&text).map_err(|error| told(format!("line {}", error.span.start.line)))?;
    Ok(Settings { look: kept.look.usable(), folder: kept.folder.as_deref().map(path_text::from_text) })
}

/// Writes the settings.
pub(super) fn save(file: &Path, settings: &Settings) -> io::Result<()> {
    let kept = Kept { look: settings.look, folder: settings.folder.as_deref().map(path_text::to_text) };
    let pretty = ron::ser::PrettyConfig::new().new_line("\n");
    let mut text = ron::ser::to_string_pretty(&kept, pretty).map_err(io::Error::other)?;
    text.push('\n');
    replace(file, text.as_bytes())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn settings_come_back() {
        let folder = tempfile::tempdir().expect("a folder");
        let file = folder.path().join("settings.ron");
        assert_eq!(load_file(&file), Ok(Settings::default()));
        let window = WindowPlace { size: (1000.0, 700.0), position: Some((-20.0, 40.0)), maximized: false };
        let look = Look {
            window: Some(window),
            text_size: 1.3,
            colours: Colours::Dark,
            plant: false,
            event: Event::Reference,
            closed_loop: ClosedLoop::Line,
            ..Look::default()
        };
        let settings = Settings { look, folder: Some(PathBuf::from("/designs")) };
        save(&file, &settings).expect("saved");
        assert_eq!(load_file(&file), Ok(settings));
    }

    #[test]
    fn an_absent_field_has_its_default_and_an_unknown_one_is_left_aside() {
        let folder = tempfile::tempdir().expect("a folder");
        let file = folder.path().join("settings.ron");
        std::fs::write(&file, "(look: (band: false, of_a_later_release: 3))").expect("written");
        let expected = Settings { look: Look { band: false, ..Look::default() }, folder: None };
        assert_eq!(load_file(&file), Ok(expected));
    }

    #[test]
    fn broken_settings_are_told_and_wild_numbers_not_used() {
        let folder = tempfile::tempdir().expect("a folder");
        let file = folder.path().join("settings.ron");
        for broken in ["(look: (text_si", "\u{0}", "nothing", "(look: (event: sideways))"] {
            std::fs::write(&file, broken).expect("written");
            let told = load_file(&file).expect_err("told");
            assert!(told.contains("settings.ron") && told.ends_with('.'), "{told}");
        }
        for wild in ["text_size: NaN", "text_size: 400.0", "window: Some((size: (0.0, inf)))"] {
            std::fs::write(&file, format!("(look: ({wild}))")).expect("written");
            assert_eq!(load_file(&file), Ok(Settings::default()), "{wild}");
        }
    }
}
