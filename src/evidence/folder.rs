//! The output folder, written whole or not at all.

use std::fs::{self, File};
use std::io;
use std::path::{Path, PathBuf};

use super::leftovers;
use crate::error::{Error, Result};

/// The file that marks a folder as one of ours.
const MARK: &str = "provenance.json";

/// A folder in the making: a hidden sibling of the target, renamed into place by [`OutputFolder::finish`].
///
/// Killed at any moment, the target is absent, or the complete old folder, or the complete new one. When an old folder
/// is replaced there is one short moment, between two renames, in which the target is absent; a run that is killed just
/// then leaves the old folder complete beside it, and the next [`OutputFolder::prepare`] puts it back. If dropped
/// unfinished, the hidden sibling is removed.
#[derive(Debug)]
pub struct OutputFolder {
    target: PathBuf,
    parent: PathBuf,
    name: String,
    partial: PathBuf,
    replace: bool,
    finished: bool,
    /// Held so that no other run takes the unfinished folder for a leftover.
    lock: Option<File>,
}

impl OutputFolder {
    /// Checks the target and makes the hidden sibling `.NAME.partial-PID` in the same parent, which is made if need be.
    ///
    /// # Errors
    /// A target without a name, one that exists (without `replace`), one that is a file, a link or somebody else's
    /// folder (with `replace`), or a parent that cannot be written.
    pub fn prepare(target: &Path, replace: bool) -> Result<Self> {
        let Some(name) = target.file_name().and_then(|name| name.to_str()).map(str::to_owned) else {
            return Err(Error::input("the output folder")
                .file(target)
                .wanted("a path that ends in a folder's name, in UTF-8")
                .mend("name a folder, such as --out results"));
        };
        let parent = match target.parent() {
            Some(parent) if parent != Path::new("") => parent.to_path_buf(),
            _ => PathBuf::from("."),
        };
        let unwritable = |error: io::Error| {
            Error::input("the parent of the output folder cannot be written")
                .file(&parent)
                .because(error)
                .mend("choose another --out, or change the permissions of its parent")
        };
        fs::create_dir_all(&parent).map_err(unwritable)?;
        leftovers::clean(&parent, &name, target);
        check(target, replace)?;
        let partial = leftovers::sibling(&parent, &name, "partial");
        fs::create_dir(&partial).map_err(unwritable)?;
        let lock = leftovers::lock(&partial);
        Ok(Self { target: target.to_path_buf(), parent, name, partial, replace, finished: false, lock })
    }

    /// Where to write meanwhile.
    pub fn path(&self) -> &Path {
        &self.partial
    }

    /// Where the folder will stand.
    pub fn target(&self) -> &Path {
        &self.target
    }

    /// Brings every byte to the disk, then renames the folder into place. Returns where it stands.
    ///
    /// # Errors
    /// No provenance record in the folder, a target that has appeared or changed in the meantime, or a failing disk.
    /// The target is then what it was before.
    pub fn finish(mut self) -> Result<PathBuf> {
        let failed =
            |error: io::Error| Error::ours("putting the output folder in place").file(&self.target).because(error);
        if !self.partial.join(MARK).is_file() {
            return Err(Error::ours("finishing the output folder").found(format!("no {MARK} in it")));
        }
        sync_all_below(&self.partial).map_err(failed)?;
        check(&self.target, self.replace)?;
        if self.target.symlink_metadata().is_ok() {
            let old = leftovers::sibling(&self.parent, &self.name, "old");
            fs::rename(&self.target, &old).map_err(failed)?;
            if let Err(error) = fs::rename(&self.partial, &self.target) {
                fs::rename(&old, &self.target).map_err(failed)?;
                return Err(failed(error));
            }
            sync_folder(&self.parent).map_err(failed)?;
            // The new folder stands; an old one that cannot be deleted is removed by the next run.
            let _ = leftovers::discard(&old, &leftovers::sibling(&self.parent, &self.name, "gone"));
        } else {
            fs::rename(&self.partial, &self.target).map_err(failed)?;
            sync_folder(&self.parent).map_err(failed)?;
        }
        self.finished = true;
        Ok(self.target.clone())
    }
}

impl Drop for OutputFolder {
    fn drop(&mut self) {
        self.lock = None;
        if !self.finished {
            // Nothing can be reported from here; what stays is removed by the next run.
            let _ = fs::remove_dir_all(&self.partial);
        }
    }
}

/// Whether the target may be written: absent, or (with `replace`) a folder of ours.
fn check(target: &Path, replace: bool) -> Result<()> {
    let Ok(found) = target.symlink_metadata() else { return Ok(()) };
    let refused = |what: &str| Error::input("the output folder").file(target).found(what);
    if !found.is_dir() {
        let what = if found.is_symlink() { "a link" } else { "a file" };
        Err(refused(what).wanted("a folder, or nothing yet").mend("choose another --out"))
    } else if !replace {
        Err(Error::input("the output folder already exists")
            .file(target)
            .mend("choose another --out, or add --replace to put the new results in its place"))
    } else if !target.join(MARK).is_file() {
        Err(refused(&format!("a folder without {MARK}, so not one that salband wrote"))
            .wanted("an earlier output folder to replace")
            .mend("choose another --out, or remove the folder yourself"))
    } else {
        Ok(())
    }
}

/// Brings every file and folder below `folder`, and itself, to the disk.
fn sync_all_below(folder: &Path) -> io::Result<()> {
    for entry in fs::read_dir(folder)? {
        let path = entry?.path();
        if path.is_dir() {
            sync_all_below(&path)?;
        } else {
            File::open(&path)?.sync_all()?;
        }
    }
    sync_folder(folder)
}

/// Brings the entries of one folder to the disk, where the system can do that.
fn sync_folder(folder: &Path) -> io::Result<()> {
    if cfg!(unix) { File::open(folder)?.sync_all() } else { Ok(()) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn written(target: &Path, text: &str, replace: bool) -> Result<PathBuf> {
        let folder = OutputFolder::prepare(target, replace)?;
        fs::write(folder.path().join(MARK), text).unwrap();
        fs::create_dir(folder.path().join("tables")).unwrap();
        fs::write(folder.path().join("tables/a.csv"), "x\n").unwrap();
        folder.finish()
    }

    fn names(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> =
            fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
        names.sort();
        names
    }

    /// A process number that is certainly free: a child that has ended and been waited for.
    fn dead_pid() -> u32 {
        let mut child = std::process::Command::new("true").spawn().unwrap();
        child.wait().unwrap();
        child.id()
    }

    #[test]
    fn the_target_appears_only_when_finished() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("deep/er/out");
        let folder = OutputFolder::prepare(&target, false).unwrap();
        fs::write(folder.path().join(MARK), "{}").unwrap();
        assert!(!target.exists());
        assert_eq!(folder.path().parent(), target.parent());
        assert_eq!(folder.finish().unwrap(), target);
        assert_eq!(names(target.parent().unwrap()), ["out"]);
        assert_eq!(names(&target), [MARK]);
    }

    #[test]
    fn an_unfinished_folder_is_removed() {
        let home = tempfile::tempdir().unwrap();
        drop(OutputFolder::prepare(&home.path().join("out"), false).unwrap());
        assert!(names(home.path()).is_empty());
        let without_record = OutputFolder::prepare(&home.path().join("out"), false).unwrap();
        assert!(without_record.finish().unwrap_err().to_string().contains(MARK));
        assert!(names(home.path()).is_empty());
    }

    #[test]
    fn an_existing_folder_needs_replace() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("out");
        written(&target, "first", false).unwrap();
        let error = written(&target, "second", false).unwrap_err().to_string();
        assert!(error.contains("already exists") && error.contains("add --replace"), "{error}");
        assert_eq!(fs::read_to_string(target.join(MARK)).unwrap(), "first");
        written(&target, "second", true).unwrap();
        assert_eq!(fs::read_to_string(target.join(MARK)).unwrap(), "second");
        assert_eq!(names(home.path()), ["out"]);
    }

    #[test]
    fn what_is_not_ours_is_never_replaced() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("precious");
        fs::create_dir(&target).unwrap();
        fs::write(target.join("thesis.txt"), "x").unwrap();
        assert!(OutputFolder::prepare(&target, true).unwrap_err().to_string().contains("not one that salband wrote"));
        let file = home.path().join("file");
        fs::write(&file, "x").unwrap();
        for replace in [false, true] {
            assert!(OutputFolder::prepare(&file, replace).unwrap_err().to_string().contains("found a file"));
        }
        #[cfg(unix)]
        {
            let link = home.path().join("link");
            std::os::unix::fs::symlink(&target, &link).unwrap();
            assert!(OutputFolder::prepare(&link, true).unwrap_err().to_string().contains("found a link"));
        }
        assert_eq!(names(&target), ["thesis.txt"]);
    }

    #[test]
    fn a_target_that_appears_in_the_meantime_is_kept() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("out");
        let folder = OutputFolder::prepare(&target, false).unwrap();
        fs::write(folder.path().join(MARK), "late").unwrap();
        fs::create_dir(&target).unwrap();
        fs::write(target.join(MARK), "early").unwrap();
        assert!(folder.finish().unwrap_err().to_string().contains("already exists"));
        assert_eq!(fs::read_to_string(target.join(MARK)).unwrap(), "early");
        assert_eq!(names(home.path()), ["out"]);
    }

    #[test]
    fn bad_targets_are_named() {
        let home = tempfile::tempdir().unwrap();
        for nameless in ["/", "..", ""] {
            assert!(OutputFolder::prepare(Path::new(nameless), true).is_err(), "{nameless}");
        }
        let file = home.path().join("file");
        fs::write(&file, "x").unwrap();
        let error = OutputFolder::prepare(&file.join("below"), false).unwrap_err().to_string();
        assert!(error.contains(file.to_str().unwrap()) && error.contains("parent"), "{error}");
    }

    #[test]
    #[cfg(target_os = "linux")]
    fn a_killed_run_leaves_nothing_behind_for_long() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("out");
        let dead = dead_pid();
        // Killed while writing, beside one that still runs (process 1 always does).
        fs::create_dir(home.path().join(format!(".out.partial-{dead}"))).unwrap();
        fs::create_dir(home.path().join(".out.partial-1")).unwrap();
        fs::create_dir(home.path().join(".other.partial-7x")).unwrap();
        written(&target, "first", false).unwrap();
        assert_eq!(names(home.path()), [".other.partial-7x", ".out.partial-1", "out"]);

        // Killed between the two renames: the old folder comes back, and is treated as any existing one.
        fs::rename(&target, home.path().join(format!(".out.old-{dead}"))).unwrap();
        assert!(OutputFolder::prepare(&target, false).unwrap_err().to_string().contains("already exists"));
        assert_eq!(fs::read_to_string(target.join(MARK)).unwrap(), "first");

        // Killed after the renames, before the old folder was deleted.
        let old = home.path().join(format!(".out.old-{dead}"));
        fs::create_dir(&old).unwrap();
        written(&target, "second", true).unwrap();
        assert!(!old.exists());

        // Killed while the old folder was being deleted, the target since removed: what is left of it never comes back.
        let gone = home.path().join(format!(".out.gone-{dead}"));
        fs::create_dir(&gone).unwrap();
        fs::write(gone.join(MARK), "half").unwrap();
        fs::remove_dir_all(&target).unwrap();
        let folder = OutputFolder::prepare(&target, false).unwrap();
        assert!(!target.exists() && !gone.exists());
        drop(folder);
    }

    #[test]
    fn an_old_folder_is_renamed_before_it_is_deleted() {
        // Put back by `clean` is only what is called old, so no folder of that name may ever be half deleted: the deletion
        // is stopped here by a file in the way of the new name, and the old folder must then be whole.
        let home = tempfile::tempdir().unwrap();
        let (old, gone) = (home.path().join(".out.old-1"), home.path().join(".out.gone-1"));
        fs::create_dir(&old).unwrap();
        fs::write(old.join(MARK), "whole").unwrap();
        fs::write(&gone, "in the way").unwrap();
        assert!(leftovers::discard(&old, &gone).is_err());
        assert_eq!(fs::read_to_string(old.join(MARK)).unwrap(), "whole");
        fs::remove_file(&gone).unwrap();
        leftovers::discard(&old, &gone).unwrap();
        assert!(!old.exists() && !gone.exists());
    }

    #[test]
    #[cfg(target_os = "linux")]
    fn two_runs_at_once_do_not_disturb_each_other() {
        let home = tempfile::tempdir().unwrap();
        let target = home.path().join("out");
        let first = OutputFolder::prepare(&target, false).unwrap();
        assert!(OutputFolder::prepare(&target, false).is_err(), "the unfinished folder is in use");
        assert!(first.path().is_dir());
        // The same number, left by an earlier process of a container: nobody holds its lock.
        let partial = first.path().to_path_buf();
        drop(first);
        fs::create_dir(&partial).unwrap();
        assert!(OutputFolder::prepare(&target, false).is_ok());
    }
}
