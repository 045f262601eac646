//! Opening the window, and saying what is missing where that fails.

use std::cell::Cell;
use std::fmt;
use std::io::Write;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::PathBuf;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use eframe::egui::{ViewportBuilder, pos2, vec2};

use super::app::App;
use super::keep::{DataFolder, load_settings};
use super::measure::Measurement;
use crate::design::Design;

/// Why the window could not be opened or went away.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum WindowError {
    /// Neither an X11 nor a Wayland display is named in the environment.
    NoDisplay,
    /// The display is named but could not be reached, or a library to reach it is missing.
    Display {
        /// What the system said.
        reason: String,
    },
    /// The display has no usable OpenGL.
    Graphics {
        /// What the system said.
        reason: String,
    },
    /// The display went away while the window was open.
    Lost {
        /// What the system said.
        reason: String,
    },
    /// The window stopped on an error of the program itself.
    Stopped {
        /// Where and why.
        reason: String,
    },
}

impl fmt::Display for WindowError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        const CLOSED: &str = "The window cannot be opened:";
        match self {
            WindowError::NoDisplay => write!(
                f,
                "{CLOSED} no display: neither DISPLAY (X11) nor WAYLAND_DISPLAY (Wayland) is set. Start it from a desktop session, \
                 or ask the same in the terminal: polewright check FILE"
            ),
            WindowError::Display { reason } => write!(
                f,
                "{CLOSED} the display cannot be used: {reason}. Check that the display named by DISPLAY or WAYLAND_DISPLAY is \
                 running, and that the libraries libX11, libXcursor, libXi, libxkbcommon and libxkbcommon-x11 (X11) or \
                 libwayland-client and libxkbcommon (Wayland) are installed"
            ),
            WindowError::Graphics { reason } => write!(
                f,
                "{CLOSED} the display has no usable OpenGL: {reason}. Install the GL driver of the graphics card, or Mesa's \
                 software driver (libGL, libEGL)"
            ),
            WindowError::Lost { reason } => write!(f, "The display went away: {reason}. {KEPT}"),
            WindowError::Stopped { reason } => write!(f, "The window stopped: {reason}. {KEPT}"),
        }
    }
}

/// What becomes of the work when the window ends by itself.
const KEPT: &str = "Unsaved work is in the journal, which the next start offers";

impl std::error::Error for WindowError {}

/// Opens the window on a design and works until it is closed, or until it is measured.
///
/// # Errors
/// When there is no display, a library is missing, or the display has no OpenGL.
pub fn run(design: Design, path: Option<PathBuf>, measurement: Option<Measurement>) -> Result<(), WindowError> {
    if !display_named() {
        return Err(WindowError::NoDisplay);
    }
    let folder = DataFolder::usual();
    let viewport = placed(folder.as_ref())
        .with_title("Polewright")
        .with_app_id("polewright")
        .with_min_inner_size(vec2(760.0, 520.0))
        .with_icon(super::icon::icon())
        .with_drag_and_drop(true);
    // The place of the window stands in the settings. The file named here is never written.
    let unused = folder.as_ref().map(|folder| folder.path().join("unused.ron"));
    let options = eframe::NativeOptions {
        viewport,
        persist_window: false,
        persistence_path: unused,
        ..eframe::NativeOptions::default()
    };
    let opened = Arc::new(AtomicBool::new(false));
    let is_open = Arc::clone(&opened);
    let open = move || {
        let create: eframe::AppCreator<'_> = Box::new(|cc| {
            is_open.store(true, Ordering::Relaxed);
            let app = match folder {
                Some(folder) => App::keeping(&cc.egui_ctx, design, path, folder),
                None => App::new(&cc.egui_ctx, design, path),
            };
            Ok(match measurement {
                Some(measurement) => Box::new(measurement.watch(app)),
                None => Box::new(app),
            })
        });
        eframe::run_native("polewright", options, create)
    };
    AT_WORK.with(|at_work| at_work.0.set(true));
    let outcome = caught(open).and_then(|outcome| outcome.map_err(|error| explain(&error)));
    AT_WORK.with(|at_work| at_work.0.set(false));
    outcome.map_err(|error| match error {
        WindowError::Display { reason } if opened.load(Ordering::Relaxed) => WindowError::Lost { reason },
        error => error,
    })
}

thread_local! {
    /// Set while the window is open.
    static AT_WORK: AtWork = const { AtWork(Cell::new(false)) };
}

/// Tells what became of the work where the X11 library ends the process by itself, as it does when its server goes away: it prints
/// a line of its own and exits, and only what belongs to the thread is still dropped then.
struct AtWork(Cell<bool>);

/// Longest that the writer of the journal takes for what was handed to it.
const LAST_WORDS: Duration = Duration::from_millis(600);

impl Drop for AtWork {
    fn drop(&mut self) {
        if self.0.get() {
            let _ = writeln!(std::io::stderr(), "The display went away. {KEPT}.");
            std::thread::sleep(LAST_WORDS);
        }
    }
}

/// A window of the size and in the place it was left in.
fn placed(folder: Option<&DataFolder>) -> ViewportBuilder {
    let usual = ViewportBuilder::default().with_inner_size(vec2(1280.0, 800.0));
    // Broken settings are told by the window.
    let settings = folder.and_then(|folder| load_settings(folder).ok());
    let Some(place) = settings.and_then(|settings| settings.look.window) else { return usual };
    let sized = usual.with_inner_size(vec2(place.size.0, place.size.1)).with_maximized(place.maximized);
    match place.position {
        Some((x, y)) => sized.with_position(pos2(x, y)),
        None => sized,
    }
}

/// On Linux and the BSDs a display is named in the environment; elsewhere the system always has one.
fn display_named() -> bool {
    let named = |name: &str| std::env::var_os(name).is_some_and(|value| !value.is_empty());
    cfg!(any(windows, target_os = "macos")) || named("DISPLAY") || named("WAYLAND_DISPLAY") || named("WAYLAND_SOCKET")
}

/// The windowing crates panic where a library is missing; the message is kept and told as an error.
fn caught<T>(open: impl FnOnce() -> T) -> Result<T, WindowError> {
    let told = Arc::new(Mutex::new(String::new()));
    let teller = Arc::clone(&told);
    let usual = std::panic::take_hook();
    std::panic::set_hook(Box::new(move |info| {
        if let Ok(mut text) = teller.lock() {
            *text = info.to_string();
        }
    }));
    let outcome = catch_unwind(AssertUnwindSafe(open));
    std::panic::set_hook(usual);
    outcome.map_err(|_told_by_the_hook| {
        let reason = told.lock().map(|text| text.replace('\n', " ")).unwrap_or_default();
        if reason.contains("could not be loaded") || reason.contains("xkbcommon") || reason.contains(".so") {
            WindowError::Display { reason }
        } else {
            WindowError::Stopped { reason }
        }
    })
}

/// The message without the place in the source that some errors begin with; it helps nobody at a desk.
fn without_place(message: &str) -> &str {
    match message.rsplit_once(".rs:") {
        Some((_, rest)) => rest.trim_start_matches(|letter: char| letter.is_ascii_digit() || ": ".contains(letter)),
        None => message,
    }
}

fn explain(error: &eframe::Error) -> WindowError {
    let reason = without_place(&error.to_string()).to_owned();
    match error {
        eframe::Error::Winit(_) | eframe::Error::WinitEventLoop(_) => WindowError::Display { reason },
        eframe::Error::Glutin(_) | eframe::Error::NoGlutinConfigs(..) | eframe::Error::OpenGL(_) => {
            WindowError::Graphics { reason }
        }
        eframe::Error::AppCreation(_) => WindowError::Stopped { reason },
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_place_in_the_source_is_left_out() {
        let message = "os error at /some/where/mod.rs:788: Failed to open connection to X server";
        assert_eq!(without_place(message), "Failed to open connection to X server");
        assert_eq!(without_place("no config"), "no config");
    }

    #[test]
    fn every_error_says_what_to_do() {
        let reason = String::from("why");
        let all = [
            WindowError::NoDisplay,
            WindowError::Display { reason: reason.clone() },
            WindowError::Graphics { reason: reason.clone() },
        ];
        assert!(all.iter().all(|error| error.to_string().contains("DISPLAY") || error.to_string().contains("Install")));
    }

    #[test]
    fn a_panic_while_opening_is_an_error() {
        let missing = caught(|| std::panic::panic_any("Library libxkbcommon-x11.so could not be loaded."));
        assert!(matches!(missing, Err::<(), _>(WindowError::Display { .. })), "{missing:?}");
    }
}
