//! The output is the same on any number of threads, and is whole or absent whenever the program is killed.

mod common;

use std::collections::BTreeMap;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use common::{STUDY, Survey, stderr};

/// Every file below a folder with its bytes, by relative path.
fn contents(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    fn walk(folder: &Path, root: &Path, found: &mut BTreeMap<String, Vec<u8>>) {
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                walk(&path, root, found);
            } else {
                let name = path.strip_prefix(root).unwrap().display().to_string();
                found.insert(name, std::fs::read(&path).unwrap());
            }
        }
    }
    let mut found = BTreeMap::new();
    walk(folder, folder, &mut found);
    found
}

#[test]
fn the_same_bytes_on_one_thread_on_two_and_again() {
    let survey = Survey::new();
    let magnetics =
        "[[potential]]\nname = \"magnetics\"\npath = \"gravity.tif\"\nkind = \"magnetic\"\nyear = 2012.5\n\n[test]";
    let study = STUDY.replace("quantile = 0.80 }", "quantile = 0.80 }\nresistors = { quantile = 0.2 }");
    survey.file("study.toml", &study.replace("[test]", magnetics));
    for (out, threads) in [("one", "1"), ("two", "2"), ("again", "2")] {
        let output = survey.salband(&["run", "study.toml", "--out", out, "--threads", threads]);
        assert!(output.status.success(), "{}", stderr(&output));
        // Files that carry the time of writing would differ only across a full second.
        std::thread::sleep(Duration::from_millis(1100));
    }
    let one = contents(&survey.path("one"));
    assert!(one.len() > 30, "{:?}", one.keys());
    for other in ["two", "again"] {
        let other = contents(&survey.path(other));
        assert!(one.keys().eq(other.keys()));
        for (name, bytes) in &one {
            assert!(name == "provenance.json" || *bytes == other[name], "{name} differs");
        }
        assert_ne!(one["provenance.json"], other["provenance.json"], "the record alone knows of time and threads");
    }
}

#[test]
fn killed_at_any_moment_the_output_is_absent_or_complete() {
    let survey = Survey::new();
    let started = Instant::now();
    assert!(survey.salband(&["run", "study.toml", "--out", "out"]).status.success());
    let whole_time = started.elapsed();
    let complete: Vec<String> = contents(&survey.path("out")).into_keys().collect();
    let check = |moment: &str| {
        let out = survey.path("out");
        if out.exists() {
            assert_eq!(contents(&out).into_keys().collect::<Vec<_>>(), complete, "{moment}");
        }
        out.exists()
    };
    let (mut absent, mut whole) = (0, 0);
    // Moments spread over the run and a while beyond by the golden ratio, since a busy machine is slower; first without and then with an earlier output in place.
    for round in 0..40 {
        let replace = round % 2 == 1;
        if !replace && survey.path("out").exists() {
            std::fs::remove_dir_all(survey.path("out")).unwrap();
        }
        let share = (f64::from(round) * 0.618_034).fract() * 1.8;
        let mut child = Command::new(env!("CARGO_BIN_EXE_salband"))
            .args(["run", "study.toml", "--out", "out", "--replace"])
            .current_dir(survey.path(""))
            .stdout(Stdio::null())
            .stderr(Stdio::null())
            .spawn()
            .unwrap();
        std::thread::sleep(whole_time.mul_f64(share));
        // On Unix this is SIGKILL.
        child.kill().unwrap();
        child.wait().unwrap();
        if check(&format!("killed after {share:.2} of the run")) { whole += 1 } else { absent += 1 }
    }
    println!("absent {absent}, whole {whole}");
    assert!(absent > 0 && whole > 0, "the moments of killing reach both sides: absent {absent}, whole {whole}");
    // What the killed runs left beside the output is cleared by the next one.
    assert!(survey.salband(&["run", "study.toml", "--out", "out", "--replace"]).status.success());
    assert!(check("at the end"));
    let left: Vec<String> = std::fs::read_dir(survey.path(""))
        .unwrap()
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .filter(|name| name.starts_with('.'))
        .collect();
    assert!(left.is_empty(), "{left:?}");
}
