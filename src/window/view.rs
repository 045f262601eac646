//! What the window shows and how, apart from the work itself: none of it is saved with a design or undone.

use std::path::PathBuf;

use eframe::egui::{Rect, ThemePreference};

use super::command::{Command, Curve, Exported};
use super::goal::GoalFields;
use super::history::Gesture;
use super::new_design::NewDesign;
use super::pages::Page;
use super::pointed::{Pointed, Pointing};
use super::safety::Kept;
use super::schematic::Schematics;
use super::session::Session;
use super::time_plot::TimePlot;
use super::transient::TransientPage;
use super::what_if::WhatIf;

use crate::figure::Figure;
pub(super) use crate::figure::{ClosedLoop, Event};

/// A question or a list over the window.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Dialog {
    /// What a new design needs to know.
    New,
    /// Which file or sample to open.
    Open {
        /// Typed path.
        path: String,
    },
    /// Under which path to save.
    SaveAs {
        /// Typed path.
        path: String,
    },
    /// Under which path to put something out.
    Export {
        /// What is put out.
        what: Exported,
        /// Typed path.
        path: String,
    },
    /// Unsaved changes stand before this.
    Unsaved(Box<Command>),
    /// The file changed since it was read: whether to save over it.
    Overwrite {
        /// The file.
        path: PathBuf,
    },
    /// Unsaved work that an earlier window left behind.
    Recovery {
        /// Journal whose removal was asked for and waits for a second word.
        discarding: Option<PathBuf>,
    },
    /// The load sweep, worked out when it was asked for.
    Sweep(Box<Figure>),
    /// The searchable list of commands.
    Commands {
        /// What is searched for.
        search: String,
    },
}

/// A number being typed in the place of a lane's value.
#[derive(Clone, Debug)]
pub(super) struct Typing {
    /// Key of the lane.
    pub lane: &'static str,
    /// What is typed.
    pub text: String,
    /// Why it cannot be read.
    pub error: Option<String>,
}

/// A handle being dragged.
#[derive(Clone, Copy, Debug)]
pub(super) struct Drag {
    /// Where the hand has moved the handle, before snapping [points].
    pub handle_x: f32,
    /// Where the pointer stood at the last move [points].
    pub pointer_x: f32,
    /// The gesture its moves belong to.
    pub gesture: Gesture,
}

impl Drag {
    /// Whether the pointer has moved since the last call that followed it.
    pub(super) fn moved_to(&self, pointer_x: f32) -> bool {
        (pointer_x - self.pointer_x).abs() > 0.0
    }

    /// Follows the pointer, fine or not; where the handle is to go [points].
    pub(super) fn follow(&mut self, pointer_x: f32, share: f32) -> f32 {
        self.handle_x += (pointer_x - self.pointer_x) * share;
        self.pointer_x = pointer_x;
        self.handle_x
    }
}

/// Which field is edited, and what stands in it.
#[derive(Clone, Debug)]
pub(super) struct Field {
    /// Path of the entry.
    pub path: &'static str,
    /// What stands in it.
    pub text: String,
}

/// A message about something that failed or was done outside the document.
#[derive(Clone, Debug, PartialEq)]
pub struct Message {
    /// The message.
    pub text: String,
    /// True when something failed.
    pub failed: bool,
}

/// State of the view.
#[derive(Debug)]
pub(super) struct View {
    /// Curves shown.
    pub plant: bool,
    pub compensator: bool,
    pub loop_gain: bool,
    /// Band over the nine conditions.
    pub band: bool,
    /// Exact curves beside the averaged ones.
    pub exact: bool,
    /// What the middle column shows.
    pub page: Page,
    /// Waveforms of a steady period, as last drawn.
    pub waves: TimePlot,
    /// What follows an event.
    pub transient: TransientPage,
    /// Columns beside the plots.
    pub stage_column: bool,
    pub readout_column: bool,
    /// There is room for one column only, and which of the two it is.
    pub one_column: bool,
    pub readouts_first: bool,
    /// The column of the plots is higher than the window and scrolls.
    pub plots_scroll: bool,
    /// Height of all findings at the last frame [points].
    pub findings_height: f32,
    /// Frequencies shown [Hz]; the whole range when absent.
    pub range_hz: Option<(f64, f64)>,
    /// Width of the Bode plots at the last frame [points].
    pub plot_width: f32,
    /// Ranges of the gain and phase axes, kept still while a handle is dragged.
    pub axes: Option<((f64, f64), (f64, f64))>,
    /// Time response shown.
    pub event: Event,
    /// Closed-loop response shown.
    pub closed_loop: ClosedLoop,
    /// Frequency under the pointer, wherever among the plots over frequency it is [Hz].
    pub cursor_hz: Option<f64>,
    /// Where the keyboard has put the cursor [Hz].
    pub key_cursor_hz: Option<f64>,
    /// The same while the pointer is over the closed-loop responses, which are drawn after the others [Hz].
    pub cursor_below_hz: Option<f64>,
    /// Handle being dragged.
    pub drag: Option<Drag>,
    /// The last gesture given out.
    pub gesture: Gesture,
    /// Lane whose handle is dragged, has the focus or is under the pointer.
    pub lane: Option<&'static str>,
    /// What the pointer was at in the last frame, else what had the keyboard: what belongs to it is lit.
    pub pointed: Option<Pointed>,
    /// The same of the present frame, as far as it is drawn.
    pub pointing: Pointing,
    /// The schematics, worked out once per analysis.
    pub schematics: Schematics,
    /// Lane value being typed.
    pub typing: Option<Typing>,
    /// What placements aim at, as typed.
    pub goal: GoalFields,
    /// Field being edited.
    pub field: Option<Field>,
    /// Title being edited.
    pub title: Option<String>,
    /// Path of an entry whose field is to be brought into view and given the keyboard.
    pub seek: Option<String>,
    /// Question or list over the window.
    pub dialog: Option<Dialog>,
    /// The review view is open.
    pub review: bool,
    /// The hint for who is new here is shown.
    pub hint: bool,
    /// What is typed for a condition beside the nine.
    pub what_if: WhatIf,
    /// The form of a new design.
    pub new_design: NewDesign,
    /// The system's file dialog was asked for and has not answered.
    pub browsing: bool,
    /// What was last said.
    pub message: Option<Message>,
    /// Colours.
    pub theme: ThemePreference,
    /// Where the gain plot was drawn in the last frame, for tests and for what is laid over it.
    pub gain_rect: Rect,
}

impl Default for View {
    fn default() -> Self {
        View {
            plant: true,
            compensator: true,
            loop_gain: true,
            band: true,
            exact: true,
            page: Page::default(),
            waves: TimePlot::default(),
            transient: TransientPage::default(),
            stage_column: true,
            readout_column: true,
            one_column: false,
            readouts_first: true,
            plots_scroll: false,
            findings_height: 100.0,
            range_hz: None,
            plot_width: 640.0,
            axes: None,
            event: Event::default(),
            closed_loop: ClosedLoop::default(),
            cursor_hz: None,
            key_cursor_hz: None,
            cursor_below_hz: None,
            drag: None,
            gesture: Gesture::default(),
            lane: None,
            pointed: None,
            pointing: Pointing::default(),
            schematics: Schematics::default(),
            typing: None,
            goal: GoalFields::default(),
            field: None,
            title: None,
            seek: None,
            dialog: None,
            review: false,
            hint: false,
            what_if: WhatIf::default(),
            new_design: NewDesign::default(),
            browsing: false,
            message: None,
            theme: ThemePreference::System,
            gain_rect: Rect::NOTHING,
        }
    }
}

impl View {
    /// Whether a curve is shown.
    pub(super) fn shows(&self, curve: Curve) -> bool {
        match curve {
            Curve::Plant => self.plant,
            Curve::Compensator => self.compensator,
            Curve::Loop => self.loop_gain,
        }
    }

    /// What the line under the bar says. A failure that an open dialog tells is not told twice.
    pub(super) fn banner(&self) -> Option<&Message> {
        let in_dialog =
            matches!(self.dialog, Some(Dialog::Open { .. } | Dialog::SaveAs { .. } | Dialog::Export { .. }));
        self.message.as_ref().filter(|message| !(message.failed && in_dialog))
    }

    /// Leads to the field of an entry: its column is shown, its section opens, it gets the keyboard.
    pub(super) fn go_to(&mut self, path: &str) {
        self.readouts_first = path.starts_with("compensator.");
        if self.readouts_first {
            self.readout_column = true;
        } else {
            self.stage_column = true;
        }
        self.seek = Some(path.to_owned());
    }

    /// Drops what was said about a try that failed and is over.
    pub(super) fn forget_failure(&mut self) {
        self.message = self.message.take().filter(|message| !message.failed);
    }

    /// Shows a curve, or hides it.
    pub(super) fn toggle(&mut self, curve: Curve) {
        let shown = match curve {
            Curve::Plant => &mut self.plant,
            Curve::Compensator => &mut self.compensator,
            Curve::Loop => &mut self.loop_gain,
        };
        *shown = !*shown;
    }
}

/// What a drawing function gets: the work to read, the view to change, and where requests go.
#[derive(Debug)]
pub(super) struct Desk<'a> {
    /// The document and its results.
    pub session: &'a Session,
    /// What outlives the window, and what is known about the file.
    pub kept: &'a Kept,
    /// The view.
    pub view: &'a mut View,
    /// Requests for the next turn of `logic`.
    pub send: &'a mut Vec<Command>,
}

impl Desk<'_> {
    /// Asks for something.
    pub(super) fn ask(&mut self, command: Command) {
        self.send.push(command);
    }
}
