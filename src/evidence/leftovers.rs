//! What a run that was killed left beside its target.

use std::fs::{self, File, TryLockError};
use std::io;
use std::path::{Path, PathBuf};
use std::process;

/// The hidden name beside `target` under which this process keeps a folder: `.NAME.KIND-PID`.
pub(super) fn sibling(parent: &Path, name: &str, kind: &str) -> PathBuf {
    parent.join(format!(".{name}.{kind}-{}", process::id()))
}

/// Cleans up beside `target` after dead processes: removes their unfinished folders, and where one died in the middle of
/// replacing the target, puts the complete old folder back. Anything that cannot be cleaned is left.
///
/// A folder counts as left over if its process is gone (looked up in `/proc`, so on Linux only) and nobody holds its lock.
pub(super) fn clean(parent: &Path, name: &str, target: &Path) {
    let Ok(entries) = fs::read_dir(parent) else { return };
    let mut paths: Vec<PathBuf> = entries.flatten().map(|entry| entry.path()).collect();
    paths.sort();
    for path in paths {
        let Some(file_name) = path.file_name().and_then(|file_name| file_name.to_str()) else { continue };
        let tail = file_name.strip_prefix('.').and_then(|rest| rest.strip_prefix(name));
        let Some((kind, pid)) = tail.and_then(|rest| rest.strip_prefix('.')).and_then(|rest| rest.split_once('-'))
        else {
            continue;
        };
        let Ok(pid) = pid.parse::<u32>() else { continue };
        if !is_dead(pid) || is_locked(&path) {
            continue;
        }
        // A failure to clean costs disk space, not correctness: the run itself does not depend on it.
        let _ = match kind {
            "partial" | "gone" => fs::remove_dir_all(&path),
            "old" if target.symlink_metadata().is_err() => fs::rename(&path, target),
            "old" => discard(&path, &path.with_file_name(format!(".{name}.gone-{pid}"))),
            _ => Ok(()),
        };
    }
}

/// Deletes an old folder under another name, `gone`: one that is half deleted must not be taken for a complete one and put
/// back, should the run be killed meanwhile and the target be absent the next time.
pub(super) fn discard(old: &Path, gone: &Path) -> io::Result<()> {
    // Sorted before the old ones, an earlier half-deleted folder of this name is usually cleaned already.
    if gone.exists() {
        fs::remove_dir_all(gone)?;
    }
    fs::rename(old, gone)?;
    fs::remove_dir_all(gone)
}

/// True if the process is known to be gone. Our own number is taken for an earlier owner's (in a container each run may get
/// the same one): a folder that this process really holds is locked.
fn is_dead(pid: u32) -> bool {
    pid == process::id() || (Path::new("/proc/self").exists() && !Path::new(&format!("/proc/{pid}")).exists())
}

/// True if another handle, in this process or another, holds the folder's lock.
fn is_locked(path: &Path) -> bool {
    let Ok(handle) = File::open(path) else { return false };
    matches!(handle.try_lock(), Err(TryLockError::WouldBlock))
}

/// Locks a folder for as long as the handle lives; `None` where the system cannot lock folders.
pub(super) fn lock(path: &Path) -> Option<File> {
    let handle = File::open(path).ok()?;
    handle.try_lock().ok()?;
    Some(handle)
}
