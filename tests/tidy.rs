//! The rules about rooms and files that no compiler checks.
//!
//! Rooms use only rooms above them; every file says first what it is for and can be read in one sitting; every topology file is
//! registered; every path that the documents name exists.
#![expect(clippy::expect_used, clippy::panic, reason = "a test may stop at a wrong value")]

use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};

/// The rooms, lowest floor first, as in `DEVELOPERS.md`. A room uses those above it in this list, never those below.
const ROOMS: [&str; 14] = [
    "quantity",
    "finding",
    "linear",
    "circuit",
    "converter",
    "compensator",
    "control",
    "switched",
    "design",
    "analysis",
    "figure",
    "sheet",
    "terminal",
    "window",
];

/// Pairs that the order would allow and the idea forbids: room, and the rooms it must not know.
const STRANGERS: [(&str, &[&str]); 6] = [
    ("finding", &["quantity"]),
    ("linear", &["quantity", "finding"]),
    ("compensator", &["converter"]),
    ("analysis", &["design::file"]),
    ("figure", &["design::file"]),
    ("window", &["terminal"]),
];

/// Lines of a file before its tests. About 400 is the wish; what is far above wants to be two files.
const MOST_LINES: usize = 500;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every Rust file below a folder.
fn rust_files(folder: &str) -> Vec<PathBuf> {
    let mut found = Vec::new();
    let mut folders = vec![root().join(folder)];
    while let Some(folder) = folders.pop() {
        for entry in fs::read_dir(&folder).expect("a folder").map(|entry| entry.expect("an entry")) {
            let path = entry.path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|extension| extension == "rs") {
                found.push(path);
            }
        }
    }
    found.sort();
    assert!(!found.is_empty());
    found
}

fn read(path: &Path) -> String {
    fs::read_to_string(path).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

fn shown(path: &Path) -> String {
    path.strip_prefix(root()).unwrap_or(path).display().to_string()
}

/// The room a file of `src/` belongs to; none for `lib.rs` and `main.rs`.
fn room_of(path: &Path) -> Option<&'static str> {
    let inside = path.strip_prefix(root().join("src")).expect("below src");
    let first = inside.components().next()?.as_os_str().to_str()?;
    ROOMS.into_iter().find(|room| *room == first.trim_end_matches(".rs"))
}

/// Code without comments: documents may name any room.
fn code(text: &str) -> String {
    text.lines().map(|line| line.find("//").map_or(line, |start| &line[..start])).collect::<Vec<_>>().join("\n")
}

/// What follows every `crate::` in code: paths, those inside braces one by one.
fn crate_paths(code: &str) -> Vec<String> {
    let mut paths = Vec::new();
    for (_, rest) in code.match_indices("crate::").map(|(at, word)| (at, &code[at + word.len()..])) {
        if let Some(group) = rest.strip_prefix('{') {
            let mut depth = 1;
            let mut item = String::new();
            for c in group.chars() {
                match c {
                    '{' => depth += 1,
                    '}' => depth -= 1,
                    _ => {}
                }
                if depth == 0 || (depth == 1 && c == ',') {
                    paths.push(item.trim().replace(char::is_whitespace, ""));
                    item.clear();
                } else {
                    item.push(c);
                }
                if depth == 0 {
                    break;
                }
            }
        } else {
            let end = rest.find(|c: char| !(c.is_alphanumeric() || c == '_' || c == ':')).unwrap_or(rest.len());
            paths.push(rest[..end].to_owned());
        }
    }
    paths
}

#[test]
fn rooms_use_only_rooms_above_them() {
    let mut wrong = Vec::new();
    for file in rust_files("src") {
        let Some(room) = room_of(&file) else { continue };
        let floor = ROOMS.iter().position(|r| *r == room).expect("a room");
        let strangers = STRANGERS.iter().find(|(of, _)| *of == room).map_or(&[][..], |(_, rooms)| rooms);
        for path in crate_paths(&code(&read(&file))) {
            let used = path.split("::").next().unwrap_or_default();
            let below = ROOMS.iter().position(|r| *r == used).is_some_and(|at| at > floor);
            if below || strangers.iter().any(|stranger| path.starts_with(stranger)) {
                wrong.push(format!("{}: crate::{path}", shown(&file)));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn paths_are_found_in_groups_and_in_code_alike() {
    let text = "use crate::{linear::Zpk, design::{Design, file}};\nlet x = crate::window::run(); // crate::terminal\n";
    assert_eq!(crate_paths(&code(text)), ["linear::Zpk", "design::{Design,file}", "window::run"]);
}

#[test]
fn every_room_is_declared_and_every_module_of_the_crate_is_a_room() {
    let declared: BTreeSet<String> = read(&root().join("src/lib.rs"))
        .lines()
        .filter_map(|line| line.strip_prefix("pub mod ")?.strip_suffix(';').map(str::to_owned))
        .collect();
    assert_eq!(declared, ROOMS.iter().map(|room| (*room).to_owned()).collect());
}

#[test]
fn the_documents_list_the_rooms_in_this_order() {
    let developers = read(&root().join("DEVELOPERS.md"));
    let rows: Vec<&str> = developers.lines().filter(|line| line.starts_with("| `src/")).collect();
    assert_eq!(rows.len(), ROOMS.len());
    for (row, room) in rows.iter().zip(ROOMS) {
        assert!(row.starts_with(&format!("| `src/{room}")), "{row} stands where {room} belongs");
    }
}

#[test]
fn every_file_says_first_what_it_is_for() {
    let mut wrong = Vec::new();
    for file in rust_files("src").into_iter().chain(rust_files("tests")) {
        let text = read(&file);
        let first = text.lines().next().unwrap_or_default();
        if first.strip_prefix("//! ").is_none_or(|purpose| purpose.len() <= 15) {
            wrong.push(shown(&file));
        }
    }
    assert!(wrong.is_empty(), "no first line that says what the file is for:\n{}", wrong.join("\n"));
}

#[test]
fn files_can_be_read_in_one_sitting() {
    let mut wrong = Vec::new();
    for file in rust_files("src") {
        let lines = read(&file).lines().take_while(|line| !line.starts_with("#[cfg(test)]")).count();
        let only_tests = file.file_name().is_some_and(|name| name == "tests.rs")
            || file.components().any(|part| part.as_os_str() == "tests");
        if lines > MOST_LINES && !only_tests {
            wrong.push(format!("{}: {lines} lines", shown(&file)));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn folders_document_and_declare_and_hold_no_logic() {
    let mut wrong = Vec::new();
    for file in rust_files("src").into_iter().filter(|file| file.ends_with("mod.rs")) {
        let logic = |line: &str| line.starts_with("impl") || line.contains("fn ");
        if code(&read(&file)).lines().any(logic) {
            wrong.push(shown(&file));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn every_topology_file_is_registered() {
    let folder = root().join("src/converter/topologies");
    let registry = read(&root().join("src/converter/registry.rs"));
    let declared = read(&folder.join("mod.rs"));
    let mut count = 0;
    for file in rust_files("src/converter/topologies").into_iter().filter(|file| !file.ends_with("mod.rs")) {
        let name = file.file_stem().and_then(|stem| stem.to_str()).expect("UTF-8").to_owned();
        assert!(declared.contains(&format!("mod {name};")), "{name} is not declared");
        assert!(registry.contains(&format!("&topologies::{name}::TOPOLOGY,")), "{name} is not registered");
        count += 1;
    }
    assert_eq!(count, polewright::converter::registry().len());
}

/// Words in code quotes that look like paths of this project.
fn named_paths(text: &str) -> Vec<String> {
    let top = ["src/", "tests/", "sample-designs/", "assets/", ".ci/"];
    let quoted = text.split('`').skip(1).step_by(2).flat_map(str::split_whitespace).map(str::to_owned);
    let linked = text.split("](").skip(1).filter_map(|rest| rest.split(')').next()).map(str::to_owned);
    quoted
        .chain(linked)
        .filter(|word| {
            top.iter().any(|start| word.starts_with(start)) || Path::new(word).extension().is_some_and(|e| e == "md")
        })
        .collect()
}

#[test]
fn paths_named_in_documents_exist() {
    let mut missing = Vec::new();
    let documents = ["README.md", "DEVELOPERS.md"].map(|name| root().join(name));
    for document in documents.into_iter().chain(rust_files("src")) {
        let text = read(&document);
        let comments = if document.extension().is_some_and(|extension| extension == "rs") {
            text.lines().filter(|line| line.trim_start().starts_with("//")).collect::<Vec<_>>().join("\n")
        } else {
            text
        };
        for path in named_paths(&comments) {
            // What CI writes is not there before CI has run.
            if !path.starts_with(".ci/out") && !root().join(&path).exists() {
                missing.push(format!("{}: {path}", shown(&document)));
            }
        }
    }
    assert!(missing.is_empty(), "{}", missing.join("\n"));
}
