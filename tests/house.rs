//! Dependencies between the rooms point one way (DEVELOPERS.md).

use std::path::{Path, PathBuf};

/// Each room, and the rooms that it may use.
const ROOMS: [(&str, &[&str]); 8] = [
    ("grid", &[]),
    ("field", &["grid"]),
    ("contact", &["grid", "field"]),
    ("conductor", &["grid"]),
    ("coincidence", &["grid"]),
    ("evidence", &["grid"]),
    ("study", &["grid", "field", "contact", "conductor", "coincidence", "evidence"]),
    ("cli", &["study"]),
];

fn files(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            files(&path, found);
        } else if path.extension().is_some_and(|extension| extension == "rs") {
            found.push(path);
        }
    }
}

#[test]
fn no_room_uses_one_that_stands_after_it() {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut uses = 0;
    for (room, allowed) in ROOMS {
        let mut found = Vec::new();
        files(&source.join(room), &mut found);
        assert!(!found.is_empty(), "{room}");
        for path in found {
            let text = std::fs::read_to_string(&path).unwrap();
            // Tests inside a file may borrow from other rooms.
            let text = text.split("#[cfg(test)]").next().unwrap();
            for (other, _) in ROOMS {
                if other != room && text.contains(&format!("crate::{other}")) {
                    assert!(allowed.contains(&other), "{} uses {other}", path.display());
                    uses += 1;
                }
            }
        }
    }
    assert!(uses > 20, "the text of imports is still what this test looks for: {uses}");
}
