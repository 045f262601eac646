//! Everything the window can be asked to do; `command_table.rs` names what menus, shortcuts and lists offer.

use std::path::PathBuf;

use eframe::egui::ThemePreference;

pub(super) use super::command_table::{COMMANDS, Menu, Row};
use super::history::Gesture;
use super::pages::Page;
use super::placing::Method;
use crate::analysis::Level;
use crate::compensator::LaneKind;
use crate::finding::Remedy;

/// Curves of the Bode plots that can be shown or hidden.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Curve {
    /// Control voltage to output voltage.
    Plant,
    /// Output voltage to control voltage.
    Compensator,
    /// Their product.
    Loop,
}

/// Which way the frequency axis is zoomed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Zoom {
    /// Fewer frequencies, drawn wider.
    In,
    /// More frequencies, drawn narrower.
    Out,
}

/// Which way the frequency axis is moved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Pan {
    /// To lower frequencies.
    Lower,
    /// To higher frequencies.
    Higher,
}

/// What can be put out into a file.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Exported {
    /// The Bode plot.
    Bode,
    /// The time plot.
    Step,
    /// The closed-loop plot.
    Response,
    /// The load sweep.
    Sweep,
    /// The frequency curves.
    Curves,
    /// The time curve.
    StepCurve,
    /// Waveforms of a steady period.
    Waves,
    /// The same as numbers.
    WaveCurves,
    /// What follows an event.
    Transient,
    /// The same as numbers.
    TransientCurves,
}

/// A request to the window, from a menu, a key, a field or a handle.
#[derive(Clone, Debug, PartialEq)]
pub enum Command {
    /// Ask for a design file to open.
    Open,
    /// Ask for what a new design needs to know.
    NewDesign,
    /// Make the design that the form of a new design proposes.
    CreateDesign,
    /// Open this file.
    OpenPath(PathBuf),
    /// Open the sample design with this file name.
    OpenSample(&'static str),
    /// Save under the known path, or ask for one.
    Save,
    /// Ask for a path and save.
    SaveAs,
    /// Save under this path.
    SavePath(PathBuf),
    /// Ask where to put something out.
    Export(Exported),
    /// Put it out into this file.
    ExportPath {
        /// What is put out.
        what: Exported,
        /// The file.
        path: PathBuf,
    },
    /// Put the parts list onto the clipboard.
    CopyParts,
    /// Put the margin table onto the clipboard.
    CopyMargins,
    /// Let the system's dialog choose a path.
    Browse,
    /// Close the window.
    Quit,
    /// Go on with what unsaved changes held up, without saving them.
    DiscardAndGoOn,
    /// Save, then go on with what unsaved changes held up.
    SaveAndGoOn,
    /// Close the question or the list that is open.
    Dismiss,
    /// Save over this file although it changed since it was read.
    Overwrite(PathBuf),
    /// Take over what the file holds now, as one step.
    Reload,
    /// Keep the design as it is here although its file changed.
    KeepMine,
    /// Look for unsaved work that was left behind, and offer it.
    FindUnsaved,
    /// Take up the work in this journal.
    Recover(PathBuf),
    /// Remove this journal.
    DiscardJournal(PathBuf),
    /// Take this file off the list of recent files.
    ForgetRecent(PathBuf),
    /// Empty the list of recent files.
    ForgetAllRecent,

    /// Take the last step back.
    Undo,
    /// Do it again.
    Redo,
    /// Enter text for a number of the table of entries.
    Enter {
        /// Path of the entry.
        path: &'static str,
        /// What was typed.
        text: String,
    },
    /// Choose an option of the table of entries.
    Choose {
        /// Path of the choice.
        path: &'static str,
        /// Key of the option.
        key: &'static str,
    },
    /// Enter the design's title.
    Title(String),
    /// Move a pole, zero or gain of the compensator.
    MoveLane {
        /// Key of the lane.
        key: &'static str,
        /// Wanted frequency [Hz].
        frequency_hz: f64,
        /// Moves of one gesture are one step, all reckoned from where it began.
        gesture: Gesture,
    },
    /// Move the crossover: the gain follows.
    MoveCrossover {
        /// Wanted crossover [Hz].
        frequency_hz: f64,
        /// Moves of one gesture are one step.
        gesture: Gesture,
    },
    /// Return a pole, zero or gain to where the placement rules put it.
    ReturnLane(&'static str),
    /// Let the zeros, or the poles, move together, or each by itself.
    Tie(LaneKind),
    /// Place all poles and zeros by a method, for the crossover and margin that are aimed at.
    Place(Method),
    /// Keep a part as it is, or let it be changed again.
    Lock {
        /// Path of the part.
        path: &'static str,
        /// True to keep it.
        locked: bool,
    },
    /// Round the parts of the compensator to their series.
    RoundParts,
    /// Take the remedy a finding offers.
    Mend(Remedy),

    /// Show this operating condition in full.
    Show(Level, Level),
    /// Show the next of the nine conditions.
    NextCondition,
    /// Show the one before.
    PreviousCondition,
    /// Show the condition this many levels of input and load higher.
    StepLevels {
        /// Levels of input voltage.
        input: isize,
        /// Levels of load.
        load: isize,
    },
    /// Show a condition beside the nine.
    WhatIf {
        /// Input voltage [V], positive.
        input_voltage: f64,
        /// Load current [A], positive.
        load_current: f64,
    },
    /// Open the review view, or leave it.
    Review,
    /// Review the held try with this number, or the present design.
    ReviewTry(Option<usize>),
    /// Review the next of present design and held tries, or the one before.
    StepTry {
        /// True for the next one.
        forward: bool,
    },
    /// Show or hide a curve.
    Toggle(Curve),
    /// Show or hide the band over the nine conditions.
    ToggleBand,
    /// Show or hide the exact curves beside the averaged ones.
    ToggleExact,
    /// Show another page in the middle column.
    Page(Page),
    /// Run the transient that is shown again.
    RunTransient,
    /// Stop the run of the transient.
    StopTransient,
    /// Show the whole frequency range again.
    WholeRange,
    /// Show fewer frequencies, or more.
    Zoom(Zoom),
    /// Show lower frequencies, or higher.
    Pan(Pan),
    /// Keep the present curves to compare with.
    Hold,
    /// Draw this held try beside the present design; asked again, none.
    CompareWith(usize),
    /// Drop this held try.
    DropTry(usize),
    /// Drop all held tries.
    DropHeld,
    /// Colours of the window.
    Theme(ThemePreference),
    /// Larger text and drawing.
    Larger,
    /// Smaller text and drawing.
    Smaller,
    /// Text and drawing at their normal size.
    NormalSize,
    /// Show or hide the column of the power stage.
    ToggleStage,
    /// Show or hide the column of read-outs.
    ToggleReadouts,
    /// Show or fold the schematics.
    ToggleSchematics,
    /// Go to the field of the entry with this path.
    GoTo(&'static str),
    /// Show how the loop changes over the load.
    SweepLoad,
    /// Show the searchable list of commands.
    ListCommands,
    /// Show the hint for who is new here, or close it.
    Hint(bool),
}

impl Command {
    /// Whether it changes the design.
    pub(super) fn edits(&self) -> bool {
        matches!(
            self,
            Command::Undo
                | Command::Redo
                | Command::Enter { .. }
                | Command::Choose { .. }
                | Command::Title(_)
                | Command::MoveLane { .. }
                | Command::MoveCrossover { .. }
                | Command::ReturnLane(_)
                | Command::Place(_)
                | Command::Lock { .. }
                | Command::RoundParts
                | Command::Mend(_)
        )
    }
}
