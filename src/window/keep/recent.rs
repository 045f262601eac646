//! The list of files opened and saved last, the latest first.
//!
//! *Format*: RON in the data folder, `(files: ["…"])`; fields are only ever added. *Bad input*: a list that cannot be read counts
//! as empty and is replaced; nothing hangs on it.

use std::io;
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};

use super::folder::DataFolder;
use super::path_text;
use crate::design::file::replace;

/// Files remembered.
const MOST: usize = 12;

/// A file that was worked on.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(in crate::window) struct Recent {
    /// The file; absolute.
    pub path: PathBuf,
    /// Whether it is still there, once somebody has looked.
    pub there: Option<bool>,
}

/// A change of the list.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(in crate::window) enum RecentChange {
    /// This file was opened or saved.
    Used(PathBuf),
    /// This one is to be forgotten.
    Forget(PathBuf),
    /// All are.
    ForgetAll,
}

#[derive(Default, Deserialize, Serialize)]
#[serde(default)]
struct Kept {
    files: Vec<String>,
}

impl RecentChange {
    /// Carries the change out on a list.
    pub(in crate::window) fn apply(&self, files: &mut Vec<PathBuf>) {
        match self {
            RecentChange::Used(path) => {
                files.retain(|file| file != path);
                files.insert(0, path.clone());
                files.truncate(MOST);
            }
            RecentChange::Forget(path) => files.retain(|file| file != path),
            RecentChange::ForgetAll => files.clear(),
        }
    }
}

/// Reads the list in a data folder.
pub(in crate::window) fn load(folder: &DataFolder) -> Vec<PathBuf> {
    load_file(&folder.recent())
}

/// Reads the list in a file.
pub(super) fn load_file(file: &Path) -> Vec<PathBuf> {
    let kept: Kept = std::fs::read_to_string(file).ok().and_then(|text| ron::from_str(&text).ok()).unwrap_or_default();
    kept.files.iter().take(MOST).map(|text| path_text::from_text(text)).collect()
}

/// Writes the list.
pub(super) fn save(file: &Path, files: &[PathBuf]) -> io::Result<()> {
    let kept = Kept { files: files.iter().map(|path| path_text::to_text(path)).collect() };
    let pretty = ron::ser::PrettyConfig::new().new_line("\n");
    let mut text = ron::ser::to_string_pretty(&kept, pretty).map_err(io::Error::other)?;
    text.push('\n');
    replace(file, text.as_bytes())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_latest_stands_first_and_once() {
        let mut files = Vec::new();
        for number in 0..20 {
            RecentChange::Used(PathBuf::from(format!("/{number}.ron"))).apply(&mut files);
        }
        assert_eq!(files.len(), MOST);
        RecentChange::Used(PathBuf::from("/12.ron")).apply(&mut files);
        assert_eq!(files.len(), MOST);
        assert_eq!(files[..2], [PathBuf::from("/12.ron"), PathBuf::from("/19.ron")]);
        RecentChange::Forget(PathBuf::from("/19.ron")).apply(&mut files);
        assert_eq!(files.len(), MOST - 1);
        RecentChange::ForgetAll.apply(&mut files);
        assert!(files.is_empty());
    }

    #[test]
    fn a_list_comes_back_and_a_broken_one_is_empty() {
        let folder = tempfile::tempdir().expect("a folder");
        let file = folder.path().join("recent.ron");
        assert!(load_file(&file).is_empty());
        let files = vec![PathBuf::from("/b.ron"), PathBuf::from("/a \"b\".ron")];
        save(&file, &files).expect("saved");
        assert_eq!(load_file(&file), files);
        std::fs::write(&file, b"(files: [\"/a").expect("written");
        assert!(load_file(&file).is_empty());
        std::fs::write(&file, b"(later: 3, files: [\"/a\"])").expect("written");
        assert_eq!(load_file(&file), [PathBuf::from("/a")]);
    }
}
