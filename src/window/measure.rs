//! What a start of the window costs: time to the first curves, frames painted at rest, memory. Asked for on the command line.
//!
//! *Method.* The clock runs from the program's first line. A frame is painted when the next turn of the program begins, so the
//! start ends there, buffers swapped. After a second for the desktop to place the window, frames are counted while nobody touches
//! it; then the window closes by itself. Memory is read from `/proc/self/status`; where there is none, nothing is said about it.

use std::fmt;
use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

use eframe::egui::{self, ViewportCommand};

use super::app::App;

/// Time the desktop has to place and paint the window before rest begins.
const SETTLE: Duration = Duration::from_secs(1);

/// A measurement under way, shared by the window and whoever reports it.
#[derive(Clone, Debug)]
pub struct Measurement {
    started: Instant,
    rest: Duration,
    found: Arc<Mutex<Found>>,
}

/// What was found so far.
#[derive(Clone, Copy, Debug, Default)]
struct Found {
    /// Window and graphics were ready [since the start].
    ready: Option<Duration>,
    /// Work of the first frame with curves: analysis, and laying out.
    logic: Duration,
    ui: Duration,
    /// That frame was on the screen [since the start].
    painted: Option<Duration>,
    /// Frames painted at rest.
    frames: u32,
    /// Rest was long enough.
    rested: bool,
    /// Resident, of that private to the program, and the greatest so far [bytes].
    memory: Option<Memory>,
}

/// Memory of the process [bytes].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
struct Memory {
    resident: u64,
    private: u64,
    greatest: u64,
}

impl Measurement {
    /// A measurement of a program that started at `started`, resting for so long.
    pub fn new(started: Instant, rest: Duration) -> Self {
        Measurement { started, rest, found: Arc::default() }
    }

    fn note(&self, change: impl FnOnce(&mut Found)) {
        change(&mut self.found.lock().unwrap_or_else(PoisonError::into_inner));
    }

    fn found(&self) -> Found {
        *self.found.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Takes note that window and graphics are ready, and wraps the application.
    pub(super) fn watch(self, app: App) -> Watched {
        self.note(|found| found.ready = Some(self.started.elapsed()));
        Watched { app, measurement: self, drawn: false, rest_from: None }
    }
}

/// The report: one line for each number.
impl fmt::Display for Measurement {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let found = self.found();
        let ms = |duration: Duration| duration.as_secs_f64() * 1e3;
        if let (Some(ready), Some(painted)) = (found.ready, found.painted) {
            let rest = painted.saturating_sub(ready + found.logic + found.ui);
            writeln!(f, "first frame with curves after {:.0} ms", ms(painted))?;
            writeln!(f, "  window and graphics ready {:.1} ms", ms(ready))?;
            writeln!(f, "  analysis {:.1} ms", ms(found.logic))?;
            writeln!(f, "  layout {:.1} ms", ms(found.ui))?;
            writeln!(f, "  painting and the rest {:.1} ms", ms(rest))?;
        }
        if found.rested {
            writeln!(f, "frames in {} s at rest: {}", self.rest.as_secs_f64(), found.frames)?;
        }
        if let Some(memory) = found.memory {
            let mb = |bytes: u64| bytes as f64 / 1e6;
            writeln!(
                f,
                "resident memory {:.0} MB, of it {:.0} MB the program's own and the rest mapped files; at most {:.0} MB",
                mb(memory.resident),
                mb(memory.private),
                mb(memory.greatest)
            )?;
        }
        Ok(())
    }
}

/// The application with a watch beside it.
#[derive(Debug)]
pub(super) struct Watched {
    app: App,
    measurement: Measurement,
    drawn: bool,
    rest_from: Option<Instant>,
}

impl Watched {
    /// The frame before this turn is on the screen.
    fn begin(&mut self, ctx: &egui::Context) {
        if self.drawn && self.rest_from.is_none() {
            self.measurement.note(|found| found.painted = Some(self.measurement.started.elapsed()));
            self.rest_from = Some(Instant::now() + SETTLE);
        }
        let Some(from) = self.rest_from else { return };
        let until = from + self.measurement.rest;
        let now = Instant::now();
        if now >= until {
            self.measurement.note(|found| {
                found.rested = true;
                found.memory = memory();
            });
            self.app.leave(ctx);
        } else {
            ctx.request_repaint_after(until - now);
            if now >= from {
                self.measurement.note(|found| found.frames += 1);
            }
        }
    }
}

impl eframe::App for Watched {
    fn logic(&mut self, ctx: &egui::Context, frame: &mut eframe::Frame) {
        self.begin(ctx);
        let from = Instant::now();
        self.app.logic(ctx, frame);
        if !self.drawn {
            self.measurement.note(|found| found.logic = from.elapsed());
        }
    }

    fn ui(&mut self, ui: &mut egui::Ui, frame: &mut eframe::Frame) {
        let from = Instant::now();
        self.app.ui(ui, frame);
        if !self.drawn && self.app.session().analysis().is_some() {
            self.measurement.note(|found| found.ui = from.elapsed());
            self.drawn = true;
            ui.ctx().request_repaint();
        }
    }

    fn on_exit(&mut self, gl: Option<&eframe::glow::Context>) {
        self.app.on_exit(gl);
    }

    fn persist_egui_memory(&self) -> bool {
        self.app.persist_egui_memory()
    }

    fn clear_color(&self, visuals: &egui::Visuals) -> [f32; 4] {
        self.app.clear_color(visuals)
    }
}

impl App {
    /// Closes without a question: a measurement changes nothing.
    fn leave(&mut self, ctx: &egui::Context) {
        self.leaving = true;
        ctx.send_viewport_cmd(ViewportCommand::Close);
    }
}

/// Memory of this process, where the system tells.
fn memory() -> Option<Memory> {
    read(&std::fs::read_to_string("/proc/self/status").ok()?)
}

/// Reads the kernel's status of a process: lines such as `VmRSS:   1234 kB`, in units of 1024 bytes.
fn read(status: &str) -> Option<Memory> {
    let bytes = |name: &str| {
        let line = status.lines().find_map(|line| line.strip_prefix(name)?.strip_prefix(':'))?;
        line.trim().strip_suffix("kB")?.trim().parse::<u64>().ok().map(|kilobytes| kilobytes * 1024)
    };
    Some(Memory { resident: bytes("VmRSS")?, private: bytes("RssAnon")?, greatest: bytes("VmHWM")? })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_kernels_status_is_read() {
        let status = "Name:\tpolewright\nVmHWM:\t  180000 kB\nVmRSS:\t  170000 kB\nRssAnon:\t   90000 kB\n";
        let memory = read(status).unwrap();
        assert_eq!(memory, Memory { resident: 170_000 * 1024, private: 90_000 * 1024, greatest: 180_000 * 1024 });
        assert_eq!(read("Name:\tpolewright\n"), None);
    }

    #[test]
    fn the_report_says_only_what_was_found() {
        let measurement = Measurement::new(Instant::now(), Duration::from_secs(10));
        assert_eq!(measurement.to_string(), "");
        measurement.note(|found| {
            found.ready = Some(Duration::from_millis(200));
            found.painted = Some(Duration::from_millis(260));
            (found.rested, found.frames) = (true, 2);
        });
        let text = measurement.to_string();
        assert!(text.starts_with("first frame with curves after 260 ms\n"), "{text}");
        assert!(text.ends_with("frames in 10 s at rest: 2\n"), "{text}");
    }
}
