//! The folder in which the program keeps what is its own, and the names of the files in it.

use std::path::{Path, PathBuf};

/// Names another data folder; for tests, and for those who want it elsewhere.
const OVERRIDE: &str = "POLEWRIGHT_DATA";

/// The program's data folder; it need not exist yet.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DataFolder(PathBuf);

impl DataFolder {
    /// The folder that `POLEWRIGHT_DATA` names, else the usual one of the system; none where the system has none.
    pub fn usual() -> Option<Self> {
        match std::env::var_os(OVERRIDE).filter(|folder| !folder.is_empty()) {
            Some(folder) => Some(Self::at(PathBuf::from(folder))),
            None => eframe::storage_dir("polewright").map(DataFolder),
        }
    }

    /// This folder.
    pub fn at(folder: PathBuf) -> Self {
        DataFolder(std::path::absolute(&folder).unwrap_or(folder))
    }

    /// The folder itself.
    pub fn path(&self) -> &Path {
        &self.0
    }

    /// The folder of the journals.
    pub(super) fn journals(&self) -> PathBuf {
        self.0.join("journals")
    }

    /// The file of the settings.
    pub(super) fn settings(&self) -> PathBuf {
        self.0.join("settings.ron")
    }

    /// The file of the recent files.
    pub(super) fn recent(&self) -> PathBuf {
        self.0.join("recent.ron")
    }
}
