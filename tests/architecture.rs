//! Are the rooms in order? A room may use only rooms that stand above it in `src/lib.rs`.

use std::fs;
use std::path::{Path, PathBuf};

fn rooms() -> Vec<String> {
    let text = fs::read_to_string("src/lib.rs").unwrap();
    text.lines().filter_map(|line| line.strip_prefix("pub mod ")?.strip_suffix(';').map(str::to_owned)).collect()
}

fn files_below(path: &Path, list: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(path).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            files_below(&path, list);
        } else if path.extension().is_some_and(|e| e == "rs") {
            list.push(path);
        }
    }
}

fn room_of(path: &Path) -> String {
    let inner = path.strip_prefix("src").unwrap();
    let first = inner.components().next().unwrap().as_os_str().to_str().unwrap();
    first.trim_end_matches(".rs").to_owned()
}

#[test]
fn a_room_uses_only_rooms_above_it() {
    let rooms = rooms();
    assert!(rooms.len() >= 10, "the table of contents was not found");
    let mut files = Vec::new();
    files_below(Path::new("src"), &mut files);
    let mut seen = 0;
    for file in files {
        let room = room_of(&file);
        let Some(place) = rooms.iter().position(|r| *r == room) else { continue };
        let text = fs::read_to_string(&file).unwrap();
        // Unit tests may look down: what follows `#[cfg(test)]` is not part of the room.
        let text = text.split("#[cfg(test)]").next().unwrap();
        for part in text.split("crate::").skip(1) {
            let target: String = part.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect();
            if let Some(other) = rooms.iter().position(|r| *r == target) {
                seen += 1;
                assert!(other <= place, "{}: room `{room}` uses `{target}`, which stands below it", file.display());
            }
        }
    }
    assert!(seen > 5, "no uses were found: the check looks at nothing");
}

#[test]
fn every_room_is_listed() {
    let rooms = rooms();
    let mut files = Vec::new();
    files_below(Path::new("src"), &mut files);
    for file in files {
        let room = room_of(&file);
        assert!(rooms.contains(&room) || room == "main" || room == "lib", "{} is in no room", file.display());
    }
}

#[test]
fn physics_touches_no_files_and_prints_nothing() {
    let mut files = Vec::new();
    files_below(Path::new("src/physics"), &mut files);
    for file in files {
        let text = fs::read_to_string(&file).unwrap();
        let code = text.split("#[cfg(test)]").next().unwrap();
        for word in ["std::fs", "println!", "eprintln!", "Instant::now", "SystemTime"] {
            assert!(!code.contains(word), "{} uses {word}", file.display());
        }
    }
}
