//! What outlives the window: the journal of unsaved work, recent files, settings, and a watch over the open file.
//!
//! Everything is kept in one data folder and never in the user's own files. One thread writes there, another looks at the user's
//! files; both sleep while nothing changes, and neither a slow disk nor a share that hangs holds up the window.

mod folder;
mod journal;
mod keeper;
mod left;
mod path_text;
mod recent;
mod settings;
#[cfg(test)]
mod tests;
mod watch;

pub use folder::DataFolder;
pub(super) use journal::Snapshot;
pub(super) use keeper::{Keeper, News};
pub(super) use left::{Content, Left, find as find_left};
pub(super) use recent::{Recent, RecentChange, load as load_recent};
pub(super) use settings::{Look, Settings, load as load_settings};
pub(super) use watch::{OnDisk, Seen, Watch, look_at};
