//! The desktop window: shows an analysis, edits a design, computes no electronics.
//!
//! [`App`] is the whole of it: its `logic` carries out [`Command`] values and keeps the [`Session`] (document, history, file,
//! latest results) up to date, its `ui` draws. Drawing functions end in `_ui`; they read the session, keep what is only seen in
//! the view, and send commands, which are carried out before the next frame. One command table feeds menus, shortcuts and the
//! searchable list. Colours, distances and line styles stand in `theme.rs` alone.
//!
//! *The one frequency axis.* Gain, phase and lanes are painted from one `axis` value per frame, so a handle stands under its
//! place in the curve by construction, at every size and scale.

mod app;
mod bar;
mod bode;
mod brush;
mod command;
mod command_table;
mod conditions;
mod crossover;
mod dialogs;
mod drawing;
mod exact;
mod exact_curves;
mod exact_readouts;
mod explain;
mod export;
mod files;
mod finder;
mod findings;
mod form;
mod goal;
mod held;
mod hint;
mod history;
mod icon;
mod keep;
mod labels;
mod lane_card;
mod lanes;
mod layout;
mod ledger;
mod legend;
mod marks;
mod measure;
mod new_design;
mod on_disk;
mod operating;
mod pages;
mod parts;
mod perform;
mod placing;
mod plot;
mod pointed;
mod readouts;
mod recents;
mod recovery;
mod responses;
mod review;
mod run;
mod safety;
mod schematic;
mod session;
mod stage;
mod step_marks;
mod steps;
mod sweep;
mod theme;
mod thin;
mod ties;
mod time_export;
mod time_plot;
mod transient;
mod transient_figures;
mod tries;
mod verdict;
mod view;
mod waves;
mod what_if;
mod worker;
mod zoom;

use crate::figure::axis;

pub use app::App;
pub use command::{Command, Curve, Exported, Pan, Zoom};
pub use command_table::command_names;
pub use held::{Held, MOST_HELD};
pub use history::{Gesture, History};
pub use keep::DataFolder;
pub use measure::Measurement;
pub use pages::Page;
pub use placing::Method;
pub use run::{WindowError, run};
pub use session::{BadText, Document, Session};
pub use view::Message;
