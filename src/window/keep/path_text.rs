//! Paths as text: as they are where they are UTF-8, else as their bytes in hexadecimal.

use std::path::{Path, PathBuf};

/// Begins a path that is not UTF-8. Kept paths are absolute, so none begins like this by itself.
#[cfg(unix)]
const BYTES: &str = "bytes:";

/// A path as text. Where paths are no bytes, what is no text is replaced by U+FFFD.
pub(super) fn to_text(path: &Path) -> String {
    if let Some(text) = path.to_str() {
        return text.to_owned();
    }
    #[cfg(unix)]
    {
        use std::fmt::Write as _;
        use std::os::unix::ffi::OsStrExt;
        let mut text = BYTES.to_owned();
        for byte in path.as_os_str().as_bytes() {
            let _ = write!(text, "{byte:02x}");
        }
        text
    }
    #[cfg(not(unix))]
    path.to_string_lossy().into_owned()
}

/// The path a text stands for.
pub(super) fn from_text(text: &str) -> PathBuf {
    #[cfg(unix)]
    if let Some(path) = text.strip_prefix(BYTES).and_then(from_hexadecimal) {
        return path;
    }
    PathBuf::from(text)
}

#[cfg(unix)]
fn from_hexadecimal(digits: &str) -> Option<PathBuf> {
    use std::os::unix::ffi::OsStringExt;
    let digit = |byte: u8| char::from(byte).to_digit(16);
    let byte = |pair: &[u8]| match pair {
        [high, low] => u8::try_from(digit(*high)? * 16 + digit(*low)?).ok(),
        _ => None,
    };
    let bytes: Option<Vec<u8>> = digits.as_bytes().chunks(2).map(byte).collect();
    Some(PathBuf::from(std::ffi::OsString::from_vec(bytes?)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[cfg(unix)]
    #[test]
    fn every_path_comes_back() {
        use std::os::unix::ffi::OsStringExt;
        let odd = std::ffi::OsString::from_vec(b"/a/\xff\xfe b.ron".to_vec());
        for path in [PathBuf::from("/home/π/design.ron"), PathBuf::from(odd)] {
            let text = to_text(&path);
            assert_eq!(from_text(&text), path, "{text}");
        }
        assert_eq!(from_text("bytes:zz"), PathBuf::from("bytes:zz"));
    }
}
