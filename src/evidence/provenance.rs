//! The record of a run: what went in, what was understood, with which versions.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::{Read, Write};
use std::path::Path;

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

use super::table::create;
use crate::error::{Error, Result};

/// One input file.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Input {
    /// What the file is in the study, such as `slice at 500 m`.
    pub role: String,
    /// The path as the study names it.
    pub path: String,
    /// Size in bytes.
    pub bytes: u64,
    /// SHA-256 of its bytes, in hexadecimal.
    pub sha256: String,
}

/// All that is needed to repeat a run and to see whether the inputs are the same.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Provenance {
    /// The program's name.
    pub program: String,
    /// The program's version.
    pub version: String,
    /// The command that was given, as one line.
    pub command: String,
    /// The study as understood, with all defaults spelled out.
    pub study: String,
    /// The input files.
    pub inputs: Vec<Input>,
    /// The seed of every random choice.
    pub seed: u64,
    /// Number of threads; the results do not depend on it.
    pub threads: usize,
    /// When the run began, RFC 3339.
    pub started: String,
    /// When the run ended, RFC 3339.
    pub finished: String,
    /// How long the run took, s.
    pub seconds: f64,
    /// Versions of the libraries that matter, such as `gdal`.
    pub versions: BTreeMap<String, String>,
}

/// Writes the record as `provenance.json` into a folder.
///
/// # Errors
/// When the file cannot be written.
pub fn write_provenance(folder: &Path, provenance: &Provenance) -> Result<()> {
    let path = folder.join("provenance.json");
    let failed = |error: std::io::Error| Error::ours("writing the provenance record").file(&path).because(error);
    let mut text = serde_json::to_string_pretty(provenance).map_err(|error| failed(error.into()))?;
    text.push('\n');
    create(&path)?.write_all(text.as_bytes()).map_err(failed)
}

/// The size in bytes and the SHA-256 (hexadecimal) of a file, read in pieces of 64 KiB.
///
/// # Errors
/// When the file cannot be read.
pub fn hash_file(path: &Path) -> Result<(u64, String)> {
    let failed = |error: std::io::Error| {
        Error::input("an input file").file(path).because(error).mend("check the path and its permissions")
    };
    let mut file = File::open(path).map_err(failed)?;
    let mut hasher = Sha256::new();
    let mut piece = vec![0; 1 << 16];
    let mut bytes = 0;
    loop {
        let read = match file.read(&mut piece) {
            Ok(0) => break,
            Ok(read) => read,
            Err(error) if error.kind() == std::io::ErrorKind::Interrupted => continue,
            Err(error) => return Err(failed(error)),
        };
        hasher.update(&piece[..read]);
        bytes += read as u64;
    }
    Ok((bytes, hasher.finalize().iter().map(|byte| format!("{byte:02x}")).collect()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hashes_are_the_published_ones() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("million");
        // FIPS 180-2, appendix B.3: one million letters "a".
        std::fs::write(&path, "a".repeat(1_000_000)).unwrap();
        let expected = "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0";
        assert_eq!(hash_file(&path).unwrap(), (1_000_000, expected.into()));
        // FIPS 180-2, appendix B.1: "abc".
        std::fs::write(&path, "abc").unwrap();
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(hash_file(&path).unwrap(), (3, expected.into()));
    }

    #[test]
    fn a_missing_file_is_named() {
        let error = hash_file(Path::new("/nowhere/at/all.tif")).unwrap_err();
        assert!(error.to_string().contains("/nowhere/at/all.tif"), "{error}");
        assert!(hash_file(&std::env::temp_dir()).is_err(), "a folder has no bytes");
    }

    #[test]
    fn the_record_reads_back_equal() {
        let folder = tempfile::tempdir().unwrap();
        let record = Provenance {
            program: "salband".into(),
            version: "0.1.0".into(),
            command: "salband run study.toml --out out".into(),
            study: "title = \"x\"\nseed = 1\n".into(),
            inputs: vec![Input { role: "gravity".into(), path: "b.tif".into(), bytes: 3, sha256: "00".into() }],
            seed: u64::MAX,
            threads: 2,
            started: "2026-04-01T09:30:00Z".into(),
            finished: "2026-04-01T09:30:01Z".into(),
            seconds: 1.25,
            versions: [("gdal".to_owned(), "3.6.2".to_owned())].into(),
        };
        write_provenance(folder.path(), &record).unwrap();
        let text = std::fs::read_to_string(folder.path().join("provenance.json")).unwrap();
        assert_eq!(serde_json::from_str::<Provenance>(&text).unwrap(), record);
        assert!(write_provenance(folder.path(), &record).is_err(), "a record is never overwritten");
    }
}
