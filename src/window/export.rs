//! What leaves the window: pictures and curves into files, tables onto the clipboard; always of the condition shown.

use std::ffi::OsStr;
use std::path::{Path, PathBuf};

use eframe::egui::{self, RichText, Ui};

use super::app::App;
use super::command::{Command, Exported};
use super::dialogs;
use super::files;
use super::session::Session;
use super::theme::palette;
use super::time_export;
use super::view::{Desk, Dialog, Message, View};
use crate::design::{self, CheckedDesign};
use crate::figure::{self, Figure};
use crate::sheet;

/// Size of an exported plot [points], and pixels to the point of its PNG.
const PLOT: ([f64; 2], f64) = ([900.0, 620.0], 2.0);
/// Size of an exported time or closed-loop plot [points].
const SMALL_PLOT: [f64; 2] = [760.0, 460.0];

impl Exported {
    /// What it is called in the proposed file name, with its ending.
    fn ending(self) -> &'static str {
        match self {
            Exported::Bode => "bode.png",
            Exported::Step => "step.png",
            Exported::Response => "response.png",
            Exported::Sweep => "load-sweep.png",
            Exported::Curves => "curves.csv",
            Exported::StepCurve => "step.csv",
            Exported::Waves => "waveforms.png",
            Exported::WaveCurves => "waveforms.csv",
            Exported::Transient => "transient.png",
            Exported::TransientCurves => "transient.csv",
        }
    }

    /// What is asked for, for people.
    fn heading(self) -> &'static str {
        match self {
            Exported::Bode => "Save the Bode plot as a picture",
            Exported::Step => "Save the time plot as a picture",
            Exported::Response => "Save the closed-loop plot as a picture",
            Exported::Sweep => "Save the load sweep as a picture",
            Exported::Curves => "Save the frequency curves as CSV",
            Exported::StepCurve => "Save the time curve as CSV",
            Exported::Waves => "Save the waveforms as a picture",
            Exported::WaveCurves => "Save the waveforms as CSV",
            Exported::Transient => "Save the transient as a picture",
            Exported::TransientCurves => "Save the transient as CSV",
        }
    }

    fn is_picture(self) -> bool {
        !matches!(self, Exported::Curves | Exported::StepCurve | Exported::WaveCurves | Exported::TransientCurves)
    }
}

impl App {
    /// Carries out one of the commands that put something out.
    pub(super) fn perform_export(&mut self, command: Command, ctx: &egui::Context) {
        let done = match command {
            Command::Export(what) => {
                let name = files::proposed_name(&self.session.design().title);
                let path = format!("{}-{}", name.trim_end_matches(".ron"), what.ending());
                self.view.message = None;
                self.view.dialog = Some(Dialog::Export { what, path });
                return;
            }
            Command::ExportPath { what, path } => {
                let done = export(&self.session, &self.view, what, &path);
                if done.is_ok() {
                    self.view.dialog = None;
                }
                done.map(|()| format!("Saved as {}.", path.display()))
            }
            Command::CopyParts => checked(&self.session).map(|checked| {
                ctx.copy_text(sheet::parts_list(self.session.design(), &checked));
                let digital = checked.compensator.digital().is_some();
                let what = if digital { "Parts and coefficients are" } else { "The parts list is" };
                format!("{what} on the clipboard.")
            }),
            Command::CopyMargins => usable(&self.session).map(|analysis| {
                ctx.copy_text(sheet::margin_table(self.session.design(), analysis));
                "The margin table is on the clipboard.".to_owned()
            }),
            _ => return,
        };
        let failed = done.is_err();
        self.view.message = Some(Message { text: done.unwrap_or_else(|why| why), failed });
    }
}

/// The present results; none while an entry cannot be used, for what is put out must not be out of date.
pub(super) fn usable(session: &Session) -> Result<&crate::analysis::Analysis, String> {
    let stale = "An entry cannot be used, so the results are out of date. Mend it first.";
    session.analysis().filter(|_| !session.stale()).ok_or_else(|| stale.to_owned())
}

/// The checked design, or its first problem in words.
pub(super) fn checked(session: &Session) -> Result<CheckedDesign, String> {
    let first = |problems: Vec<crate::finding::Finding>| problems.first().map_or_else(String::new, ToString::to_string);
    session.design().check().map_err(first)
}

fn export(session: &Session, view: &View, what: Exported, path: &Path) -> Result<(), String> {
    let bytes = if what.is_picture() { picture(session, view, what, path)? } else { curves(session, view, what)? };
    design::file::replace(path, &bytes).map_err(|error| format!("{} cannot be written: {error}.", path.display()))
}

fn picture(session: &Session, view: &View, what: Exported, path: &Path) -> Result<Vec<u8>, String> {
    let figure = draw(session, view, what)?;
    let ending = path.extension().and_then(OsStr::to_str).map(str::to_ascii_lowercase);
    match ending.as_deref() {
        Some("svg") => Ok(sheet::svg(&figure).into_bytes()),
        Some("png") => sheet::png(&figure, PLOT.1).map_err(|error| error.to_string()),
        _ => Err("The name of a picture ends in .png or .svg.".to_owned()),
    }
}

fn draw(session: &Session, view: &View, what: Exported) -> Result<Figure, String> {
    if what == Exported::Sweep {
        return super::sweep::figure(session);
    }
    if let Some(chart) = time_export::chart(session, view, what) {
        return chart.map(|chart| chart.figure(PLOT.0, true).0);
    }
    let analysis = usable(session)?;
    let title = &session.design().title;
    let held = session.held().map(|held| (held.name.as_str(), &held.analysis));
    let exact = session.referee().filter(|_| view.exact).and_then(|exact| exact.as_ref().ok());
    let drawn = match what {
        Exported::Step => figure::step(title, analysis, held, view.event, SMALL_PLOT),
        Exported::Response => figure::response(title, analysis, (held, exact), view.closed_loop, SMALL_PLOT),
        _ => {
            let shown = figure::Shown {
                plant: view.plant,
                compensator: view.compensator,
                loop_gain: view.loop_gain,
                band: view.band,
            };
            figure::bode(title, analysis, (held, exact), shown, PLOT.0)
        }
    };
    drawn.ok_or_else(|| "There is no such result at this condition.".to_owned())
}

fn curves(session: &Session, view: &View, what: Exported) -> Result<Vec<u8>, String> {
    if let Some(written) = time_export::numbers(session, view, what) {
        return written;
    }
    let analysis = usable(session)?;
    let none = || "There is no such result at this condition.".to_owned();
    let mut bytes = Vec::new();
    let written = if what == Exported::StepCurve {
        sheet::write_step(view.event.of(analysis).ok_or_else(none)?, &mut bytes)
    } else {
        let detail = analysis.shown.as_ref().map_err(ToString::to_string)?;
        sheet::write_curves(&detail.curves, &mut bytes)
    };
    written.map_err(|error| error.to_string())?;
    Ok(bytes)
}

/// Asks under which path.
pub(super) fn export_ui(ui: &mut Ui, what: Exported, path: &mut String, desk: &mut Desk<'_>) {
    dialogs::title(ui, what.heading());
    let condition = desk.session.analysis().map_or("", |analysis| analysis.condition.label.as_str());
    let hint = if what.is_picture() { "The ending decides: .png or .svg." } else { "Comma-separated values." };
    ui.label(RichText::new(format!("At {condition}. {hint}")).color(palette(ui).weak));
    let entered = dialogs::path_ui(ui, path, desk);
    dialogs::failure_ui(ui, desk);
    let target = PathBuf::from(path.as_str());
    if !path.is_empty() && target.exists() {
        ui.label(RichText::new("This file exists and will be replaced.").color(palette(ui).problem));
    }
    ui.add_space(4.0);
    dialogs::buttons(ui, |ui| {
        let save = ui.add_enabled(!path.is_empty(), dialogs::primary(ui, "Save")).clicked();
        if save || (entered && !path.is_empty()) {
            desk.ask(Command::ExportPath { what, path: target });
        }
        if ui.button("Cancel").clicked() {
            desk.ask(Command::Dismiss);
        }
    });
}
