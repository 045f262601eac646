//! The journal: the unsaved document as it stands, written so that a later start can offer it again.
//!
//! *Format*: the first line is a head in RON, the rest is a design file in its newest format; without its first line a journal is
//! a design file that opens by itself. The head is versioned and frozen like a design file; it holds length and checksum of the
//! design, so a journal that was cut off or damaged is known as such.

use std::collections::BTreeMap;
use std::fmt;
use std::path::{Path, PathBuf};
use std::time::{Duration, SystemTime, UNIX_EPOCH};

use serde::{Deserialize, Serialize};

use super::path_text;
use crate::design::{Design, file};

/// The version of the head this program writes, and the newest it reads.
const VERSION: u32 = 1;

/// The unsaved work at one moment.
#[derive(Clone, Debug, PartialEq)]
pub(in crate::window) struct Snapshot {
    /// The design.
    pub design: Design,
    /// Texts in fields that are no numbers, by entry path.
    pub bad_texts: BTreeMap<String, String>,
    /// The file the design belongs to; absolute.
    pub path: Option<PathBuf>,
}

/// The part of a head that every version shares.
#[derive(Deserialize)]
struct AnyHead {
    journal: u32,
}

/// A head of version 1; never changed.
#[derive(Deserialize, Serialize)]
#[serde(deny_unknown_fields)]
struct HeadV1 {
    journal: u32,
    /// When it was written [s since 1970 UTC].
    written_s: u64,
    file: Option<String>,
    texts: BTreeMap<String, String>,
    /// Length of the design below [bytes].
    length: usize,
    /// FNV-1a sum over it, hexadecimal.
    sum: String,
}

/// Why a journal cannot be used.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(in crate::window) enum JournalError {
    /// It cannot be read.
    Unreadable(String),
    /// It is not whole.
    CutOff,
    /// Its first line is none of this program's.
    NoHead,
    /// A later release wrote it.
    Newer,
    /// Its bytes are not those that were written.
    Damaged,
    /// The design in it cannot be read.
    Design(String),
}

impl fmt::Display for JournalError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            JournalError::Unreadable(reason) => write!(f, "it cannot be read: {reason}"),
            JournalError::CutOff => f.write_str("it ends too early"),
            JournalError::NoHead => f.write_str("its first line cannot be read"),
            JournalError::Newer => f.write_str("a later release of Polewright wrote it"),
            JournalError::Damaged => f.write_str("its content was changed or damaged after it was written"),
            JournalError::Design(reason) => write!(f, "the design in it cannot be read: {reason}"),
        }
    }
}

/// A journal's text for unsaved work.
pub(super) fn write(snapshot: &Snapshot, now: SystemTime) -> Result<Vec<u8>, String> {
    let mut design = Vec::new();
    file::write(&snapshot.design, &mut design).map_err(|error| error.to_string())?;
    let head = HeadV1 {
        journal: VERSION,
        written_s: now.duration_since(UNIX_EPOCH).map_or(0, |time| time.as_secs()),
        file: snapshot.path.as_deref().map(path_text::to_text),
        texts: snapshot.bad_texts.clone(),
        length: design.len(),
        sum: format!("{:016x}", checksum(&design)),
    };
    // Written plainly, RON escapes line ends within texts: the head is one line.
    let mut text = ron::to_string(&head).map_err(|error| error.to_string())?.into_bytes();
    text.push(b'\n');
    text.append(&mut design);
    Ok(text)
}

/// Reads a journal: the work, and when it was written.
pub(super) fn read(bytes: &[u8]) -> Result<(Snapshot, SystemTime), JournalError> {
    let end = bytes.iter().position(|byte| *byte == b'\n').ok_or(JournalError::CutOff)?;
    let (head, design) = (&bytes[..end], &bytes[end + 1..]);
    let head = std::str::from_utf8(head).map_err(|_not_text| JournalError::NoHead)?;
    let version: AnyHead = ron::from_str(head).map_err(|_not_ours| JournalError::NoHead)?;
    if version.journal > VERSION {
        return Err(JournalError::Newer);
    }
    let head: HeadV1 = ron::from_str(head).map_err(|_not_ours| JournalError::NoHead)?;
    if design.len() < head.length {
        return Err(JournalError::CutOff);
    }
    if design.len() > head.length || head.sum != format!("{:016x}", checksum(design)) {
        return Err(JournalError::Damaged);
    }
    let design = file::read(&mut &*design).map_err(|error| JournalError::Design(error.to_string()))?;
    let written = UNIX_EPOCH.checked_add(Duration::from_secs(head.written_s)).unwrap_or(UNIX_EPOCH);
    let path = head.file.as_deref().map(path_text::from_text);
    Ok((Snapshot { design, bad_texts: head.texts, path }, written))
}

/// Reads the journal in a file.
pub(super) fn load(path: &Path) -> Result<(Snapshot, SystemTime), JournalError> {
    let about = std::fs::metadata(path).map_err(|error| JournalError::Unreadable(error.to_string()))?;
    if !about.is_file() {
        return Err(JournalError::Unreadable("it is not a file".to_owned()));
    }
    // Twice a design: texts in fields may be long as well.
    if about.len() > 2 * file::LARGEST_FILE {
        return Err(JournalError::Damaged);
    }
    read(&std::fs::read(path).map_err(|error| JournalError::Unreadable(error.to_string()))?)
}

/// FNV-1a over bytes: tells a damaged text from a whole one; no protection against intent.
///
/// *Source*: G. Fowler, L. C. Noll, K.-P. Vo: FNV-1a, 64-bit offset basis and prime (from memory).
pub(super) fn checksum(bytes: &[u8]) -> u64 {
    bytes.iter().fold(0xcbf2_9ce4_8422_2325, |sum, byte| (sum ^ u64::from(*byte)).wrapping_mul(0x0000_0100_0000_01b3))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn snapshot() -> Snapshot {
        let mut design = Design { title: "Rail\nof two lines".to_owned(), ..Design::default() };
        design.set_from_text("stage.inductor.inductance", "8.2u").expect("a number");
        let text = "4x7 \"\n) µ".to_owned();
        let bad_texts = BTreeMap::from([("stage.inductor.resistance".to_owned(), text)]);
        Snapshot { design, bad_texts, path: Some(PathBuf::from("/home/someone/rail.ron")) }
    }

    #[test]
    fn a_journal_brings_back_design_texts_file_and_time() {
        let time = UNIX_EPOCH + Duration::from_secs(1_796_127_601);
        let text = write(&snapshot(), time).expect("written");
        assert_eq!(read(&text).expect("whole"), (snapshot(), time));
        let odd = Snapshot { path: None, bad_texts: BTreeMap::new(), ..snapshot() };
        assert_eq!(read(&write(&odd, time).expect("written")).expect("whole").0, odd);
    }

    #[test]
    fn without_its_first_line_a_journal_is_a_design_file() {
        let text = String::from_utf8(write(&snapshot(), UNIX_EPOCH).expect("written")).expect("text");
        let (head, design) = text.split_once('\n').expect("two parts");
        assert!(head.starts_with("(journal:1,"), "{head}");
        assert_eq!(file::read(&mut design.as_bytes()).expect("a design"), snapshot().design);
    }

    #[test]
    fn a_journal_cut_or_changed_anywhere_is_refused() {
        let text = write(&snapshot(), UNIX_EPOCH).expect("written");
        for cut in 0..text.len() {
            assert!(read(&text[..cut]).is_err(), "cut at {cut}");
        }
        let head = text.iter().position(|byte| *byte == b'\n').expect("a head");
        for at in (0..text.len()).step_by(3) {
            let mut changed = text.clone();
            changed[at] ^= 0x04;
            // In the head a changed letter may still read: then texts differ, and the design does not.
            match read(&changed) {
                Ok((read, _)) => assert!(at < head && read.design == snapshot().design, "{at}"),
                Err(error) => assert!(!error.to_string().is_empty()),
            }
        }
        let mut longer = text.clone();
        longer.extend_from_slice(b"more");
        assert_eq!(read(&longer), Err(JournalError::Damaged));
    }

    #[test]
    fn what_is_no_journal_is_told() {
        assert_eq!(read(b""), Err(JournalError::CutOff));
        assert_eq!(read(b"\0\0\0\0\n\0"), Err(JournalError::NoHead));
        assert_eq!(read(b"\xff\n"), Err(JournalError::NoHead));
        assert_eq!(read(b"(journal:2,anything:3)\nrest"), Err(JournalError::Newer));
        assert_eq!(read(b"(journal:1)\nrest"), Err(JournalError::NoHead));
        assert!(matches!(load(Path::new("/no/such/journal")), Err(JournalError::Unreadable(_))));
        assert!(matches!(load(Path::new("/")), Err(JournalError::Unreadable(_))));
    }

    #[test]
    fn the_checksum_is_fnv_1a() {
        // The authors' test vectors of FNV-1a, 64 bits (from memory).
        assert_eq!(checksum(b""), 0xcbf2_9ce4_8422_2325);
        assert_eq!(checksum(b"a"), 0xaf63_dc4c_8601_ec8c);
        assert_eq!(checksum(b"foobar"), 0x8594_4171_f739_67e8);
    }
}
