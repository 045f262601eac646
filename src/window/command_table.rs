//! The command table: names, keys and menus of the commands that menus, shortcuts and the searchable list offer.

use eframe::egui::{Key, KeyboardShortcut, Modifiers, ThemePreference};

use super::command::{Command, Curve, Exported, Pan, Zoom};
use super::pages::Page;
use super::placing::Method;
use crate::compensator::LaneKind;

/// Where a command is offered.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Menu {
    /// Files.
    Design,
    /// Pictures, curves, tables.
    Export,
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
    row(
        "New design…",
        Menu::Design,
        Some(key(CTRL, Key::N)),
        "Begin a design from what it has to do; every assumption is told first.",
        Command::NewDesign,
    ),
    row("Open…", Menu::Design, Some(key(CTRL, Key::O)), "Open a design file or a sample.", Command::Open),
    row("Save", Menu::Design, Some(key(CTRL, Key::S)), "Save the design file.", Command::Save),
    row("Save as…", Menu::Design, Some(key(CTRL_SHIFT, Key::S)), "Save under another name.", Command::SaveAs),
    row(
        "Copy parts list",
        Menu::Export,
        Some(key(CTRL_SHIFT, Key::P)),
        "Put the compensator's parts onto the clipboard, with tabs between the columns.",
        Command::CopyParts,
    ),
    row(
        "Copy margin table",
        Menu::Export,
        Some(key(CTRL_SHIFT, Key::M)),
        "Put all read-outs with their worst conditions and requirements onto the clipboard.",
        Command::CopyMargins,
    ),
    row(
        "Bode plot as picture…",
        Menu::Export,
        Some(key(CTRL, Key::E)),
        "Save gain and phase as PNG or SVG.",
        Command::Export(Exported::Bode),
    ),
    row(
        "Time plot as picture…",
        Menu::Export,
        None,
        "Save the step response that is shown as PNG or SVG.",
        Command::Export(Exported::Step),
    ),
    row(
        "Closed-loop plot as picture…",
        Menu::Export,
        None,
        "Save the closed-loop response that is shown as PNG or SVG.",
        Command::Export(Exported::Response),
    ),
    row(
        "Load sweep as picture…",
        Menu::Export,
        None,
        "Save crossover, phase margin and duty ratio over the load as PNG or SVG.",
        Command::Export(Exported::Sweep),
    ),
    row(
        "Frequency curves as CSV…",
        Menu::Export,
        Some(key(CTRL_SHIFT, Key::E)),
        "Save all frequency curves of the condition shown as comma-separated values.",
        Command::Export(Exported::Curves),
    ),
    row(
        "Time curve as CSV…",
        Menu::Export,
        None,
        "Save the step response that is shown as comma-separated values.",
        Command::Export(Exported::StepCurve),
    ),
    row(
        "Waveforms as picture…",
        Menu::Export,
        None,
        "Save the waveforms of one steady period as PNG or SVG.",
        Command::Export(Exported::Waves),
    ),
    row(
        "Waveforms as CSV…",
        Menu::Export,
        None,
        "Save the waveforms of one steady period as comma-separated values.",
        Command::Export(Exported::WaveCurves),
    ),
    row(
        "Transient as picture…",
        Menu::Export,
        None,
        "Save the run that the transient page shows as PNG or SVG.",
        Command::Export(Exported::Transient),
    ),
    row(
        "Transient as CSV…",
        Menu::Export,
        None,
        "Save the run that the transient page shows as comma-separated values.",
        Command::Export(Exported::TransientCurves),
    ),
    row("Reload", Menu::Design, None, "Take over what the file holds now; can be undone.", Command::Reload),
    row(
        "Recover unsaved work…",
        Menu::Design,
        None,
        "Offer work that a window left behind unsaved.",
        Command::FindUnsaved,
    ),
    row("Clear recent files", Menu::Design, None, "Empty the list of recent files.", Command::ForgetAllRecent),
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
    row(
        "Exact curves",
        Menu::View,
        Some(key(CTRL, Key::Num4)),
        "Show or hide what the exact switched model says beside the averaged one.",
        Command::ToggleExact,
    ),
    row(
        "Loop",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F2)),
        "Show the Bode plots with their lanes.",
        Command::Page(Page::Loop),
    ),
    row(
        "Waveforms",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F3)),
        "Show one steady period of the switched loop and what its parts bear.",
        Command::Page(Page::Waveforms),
    ),
    row(
        "Transient",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F4)),
        "Show the switched loop cycle by cycle after an event.",
        Command::Page(Page::Transient),
    ),
    row(
        "Run the transient again",
        Menu::View,
        Some(key(CTRL, Key::T)),
        "Run the event of the transient page again, from the start.",
        Command::RunTransient,
    ),
    row(
        "Stop the transient",
        Menu::View,
        Some(key(CTRL_SHIFT, Key::T)),
        "Stop the run that is under way; what it has found so far stays.",
        Command::StopTransient,
    ),
    row(
        "Load sweep…",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F9)),
        "Show crossover, phase margin and duty ratio over the load, and where conduction changes.",
        Command::SweepLoad,
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
    row(
        "Schematics",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F8)),
        "Show or fold the schematics of stage and compensator.",
        Command::ToggleSchematics,
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
    row(
        "Show the hint",
        Menu::View,
        Some(key(Modifiers::NONE, Key::F1)),
        "Three sentences for who is new here.",
        Command::Hint(true),
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
