//! Everything the window can be asked to do. One table names the commands that menus, shortcuts and lists offer.

use std::path::PathBuf;

use eframe::egui::{Key, KeyboardShortcut, Modifiers, ThemePreference};

use super::history::Gesture;
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

/// Where a command is offered.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Menu {
    /// Files.
    Design,
    /// Changes.
    Edit,
    /// What is seen.
    View,
}

/// A row of the command table.
#[derive(Clone, Debug)]
pub(super) struct Row {
    /// Name in menus and lists.
    pub name: &'static str,
    /// Menu that offers it.
    pub menu: Menu,
    /// Keys that ask for it.
    pub shortcut: Option<KeyboardShortcut>,
    /// What it does, in a sentence.
    pub help: &'static str,
    /// The command.
    pub command: Command,
}

const fn key(modifiers: Modifiers, key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(modifiers, key)
}

const fn row(
    name: &'static str,
    menu: Menu,
    shortcut: Option<KeyboardShortcut>,
    help: &'static str,
    command: Command,
) -> Row {
    Row { name, menu, shortcut, help, command }
}

const CTRL: Modifiers = Modifiers::COMMAND;
const CTRL_SHIFT: Modifiers = Modifiers::COMMAND.plus(Modifiers::SHIFT);

/// The command table, in the order of the menus.
pub(super) static COMMANDS: &[Row] = &[
    row("Open…", Menu::Design, Some(key(CTRL, Key::O)), "Open a design file or a sample.", Command::Open),
    row("Save", Menu::Design, Some(key(CTRL, Key::S)), "Save the design file.", Command::Save),
    row("Save as…", Menu::Design, Some(key(CTRL_SHIFT, Key::S)), "Save under another name.", Command::SaveAs),
    row("Quit", Menu::Design, Some(key(CTRL, Key::Q)), "Close the window.", Command::Quit),
    row("Undo", Menu::Edit, Some(key(CTRL, Key::Z)), "Take the last change back.", Command::Undo),
    row("Redo", Menu::Edit, Some(key(CTRL_SHIFT, Key::Z)), "Do again what was undone.", Command::Redo),
    row(
        "Round parts to their series",
        Menu::Edit,
        Some(key(CTRL, Key::R)),
        "Set resistors and capacitors of the compensator to preferred values; locked parts stay.",
        Command::RoundParts,
    ),
    row(
        "Place by K factor",
        Menu::Edit,
        None,
        "Place poles, zeros and gain for the phase margin and crossover aimed at beside the parts.",
        Command::Place(Method::KFactor),
    ),
    row(
        "Place by pole-zero rules",
        Menu::Edit,
        None,
        "Place zeros on the LC resonance, poles on the zeros of the plant or at half the switching frequency.",
        Command::Place(Method::Rules),
    ),
    row(
        "Tie the zeros",
        Menu::Edit,
        None,
        "Let both zeros move together, their ratio kept, or each by itself again.",
        Command::Tie(LaneKind::Zero),
    ),
    row(
        "Tie the poles",
        Menu::Edit,
        None,
        "Let both poles move together, their ratio kept, or each by itself again.",
        Command::Tie(LaneKind::Pole),
    ),
    row(
        "Next condition",
        Menu::View,
        Some(key(CTRL, Key::ArrowRight)),
        "Show the next of the nine operating conditions.",
        Command::NextCondition,
    ),
    row(
        "Previous condition",
        Menu::View,
        Some(key(CTRL, Key::ArrowLeft)),
        "Show the operating condition before.",
        Command::PreviousCondition,
    ),
    row(
        "Hold curves",
        Menu::View,
        Some(key(CTRL, Key::H)),
        "Keep the present curves beside the next try.",
        Command::Hold,
    ),
    row("Drop held curves", Menu::View, Some(key(CTRL_SHIFT, Key::H)), "Take all held tries away.", Command::DropHeld),
    row(
        "Review view",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F5)),
        "A page to read and not to change, for who reviews the design; Esc leaves it.",
        Command::Review,
    ),
    row(
        "Plant curve",
        Menu::View,
        Some(key(CTRL, Key::Num1)),
        "Show or hide the plant.",
        Command::Toggle(Curve::Plant),
    ),
    row(
        "Compensator curve",
        Menu::View,
        Some(key(CTRL, Key::Num2)),
        "Show or hide the compensator.",
        Command::Toggle(Curve::Compensator),
    ),
    row(
        "Loop curve",
        Menu::View,
        Some(key(CTRL, Key::Num3)),
        "Show or hide the loop gain.",
        Command::Toggle(Curve::Loop),
    ),
    row(
        "Band of conditions",
        Menu::View,
        Some(key(CTRL, Key::B)),
        "Show or hide the band the loop covers over the nine conditions.",
        Command::ToggleBand,
    ),
    row("Whole range", Menu::View, Some(key(CTRL, Key::Home)), "Show all frequencies again.", Command::WholeRange),
    row(
        "Zoom in",
        Menu::View,
        Some(key(CTRL, Key::ArrowUp)),
        "Show fewer frequencies, about the pointer or the crossover.",
        Command::Zoom(Zoom::In),
    ),
    row(
        "Zoom out",
        Menu::View,
        Some(key(CTRL, Key::ArrowDown)),
        "Show more frequencies, about the pointer or the crossover.",
        Command::Zoom(Zoom::Out),
    ),
    row(
        "Lower frequencies",
        Menu::View,
        Some(key(CTRL_SHIFT, Key::ArrowLeft)),
        "Move the frequency axis to lower frequencies.",
        Command::Pan(Pan::Lower),
    ),
    row(
        "Higher frequencies",
        Menu::View,
        Some(key(CTRL_SHIFT, Key::ArrowRight)),
        "Move the frequency axis to higher frequencies.",
        Command::Pan(Pan::Higher),
    ),
    row(
        "Power stage column",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F6)),
        "Show or hide the entries.",
        Command::ToggleStage,
    ),
    row(
        "Read-outs column",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F7)),
        "Show or hide margins, parts and findings.",
        Command::ToggleReadouts,
    ),
    row("Light", Menu::View, None, "Light colours.", Command::Theme(ThemePreference::Light)),
    row("Dark", Menu::View, None, "Dark colours.", Command::Theme(ThemePreference::Dark)),
    row("As the system", Menu::View, None, "Colours as the desktop has them.", Command::Theme(ThemePreference::System)),
    row("Larger", Menu::View, Some(key(CTRL, Key::Plus)), "Larger text and drawing.", Command::Larger),
    row("Smaller", Menu::View, Some(key(CTRL, Key::Minus)), "Smaller text and drawing.", Command::Smaller),
    row("Normal size", Menu::View, Some(key(CTRL, Key::Num0)), "Text and drawing at normal size.", Command::NormalSize),
    row(
        "All commands…",
        Menu::View,
        Some(key(CTRL, Key::K)),
        "A list of all commands to search.",
        Command::ListCommands,
    ),
];

/// Names of all commands, as menus and the searchable list show them.
pub fn command_names() -> impl Iterator<Item = &'static str> {
    COMMANDS.iter().map(|row| row.name)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_two_commands_share_a_name_or_keys() {
        for (index, row) in COMMANDS.iter().enumerate() {
            for other in &COMMANDS[index + 1..] {
                assert_ne!(row.name, other.name);
                assert!(row.shortcut.is_none() || row.shortcut != other.shortcut, "{} and {}", row.name, other.name);
                assert_ne!(row.command, other.command);
            }
            assert!(row.help.ends_with('.'));
        }
    }
}
