//! Replacing a file so that it always holds either all of the old bytes or all of the new ones.
//!
//! The new bytes go to a temporary file in the same folder, reach the disk, and take the old file's place by one rename.
//! A process killed on the way leaves at most a hidden temporary file beside the untouched old one. Permissions of the old file are kept;
//! a symbolic link stays a link and the file it names is replaced.

use std::fs;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Links followed before a chain of them is taken for a circle.
const MOST_LINKS: usize = 40;

/// Replaces the file at a path.
///
/// # Errors
/// What the system says, or that the file is read-only. The old file is untouched then.
pub fn replace(path: &Path, bytes: &[u8]) -> io::Result<()> {
    let target = follow_links(path)?;
    let old = match fs::metadata(&target) {
        Ok(about) if about.is_dir() => return Err(io::Error::new(io::ErrorKind::IsADirectory, "it is a folder")),
        // A rename would replace a read-only file without asking.
        Ok(about) if about.permissions().readonly() => {
            return Err(io::Error::new(io::ErrorKind::PermissionDenied, "the file is read-only"));
        }
        Ok(about) if !about.is_file() => return Err(io::Error::other("it is a pipe or a device, not a file")),
        Ok(about) => Some(about.permissions()),
        Err(error) if error.kind() == io::ErrorKind::NotFound => None,
        Err(error) => return Err(error),
    };
    let folder = folder_of(&target);
    // The reason alone: the name of the temporary file tells nobody anything.
    let reason = |error: io::Error| io::Error::from(error.kind());
    let mut temporary = builder(old.is_none()).tempfile_in(folder).map_err(reason)?;
    temporary.write_all(bytes).map_err(reason)?;
    temporary.flush().map_err(reason)?;
    if let Some(permissions) = old {
        temporary.as_file().set_permissions(permissions)?;
    }
    temporary.as_file().sync_all()?;
    temporary.persist(&target).map_err(|error| error.error)?;
    sync_folder(folder);
    Ok(())
}

/// The folder a file is to stand in, when that folder does not exist.
pub(super) fn missing_folder(path: &Path) -> Option<PathBuf> {
    let target = follow_links(path).ok()?;
    let folder = folder_of(&target);
    matches!(fs::metadata(folder), Err(error) if error.kind() == io::ErrorKind::NotFound).then(|| folder.to_owned())
}

fn folder_of(file: &Path) -> &Path {
    match file.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    }
}

/// A new file gets the permissions any program's new file gets; temporary files are private by default.
fn builder(new: bool) -> tempfile::Builder<'static, 'static> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".polewright-").suffix(".tmp");
    #[cfg(unix)]
    if new {
        use std::os::unix::fs::PermissionsExt;
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    #[cfg(not(unix))]
    let _ = new;
    builder
}

/// The file a path names once links are followed; it need not exist.
fn follow_links(path: &Path) -> io::Result<PathBuf> {
    let mut target = path.to_owned();
    for _ in 0..MOST_LINKS {
        match fs::read_link(&target) {
            Ok(next) if next.is_absolute() => target = next,
            Ok(next) => target = target.parent().unwrap_or(Path::new(".")).join(next),
            // Not a link, or not there yet.
            Err(_) => return Ok(target),
        }
    }
    Err(io::Error::other("the links to it go round in a circle"))
}

/// Makes the rename itself lasting. Where a folder cannot be opened like a file, the rename is still atomic.
fn sync_folder(folder: &Path) {
    if let Ok(folder) = fs::File::open(folder) {
        let _ = folder.sync_all();
    }
}
