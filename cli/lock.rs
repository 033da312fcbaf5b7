//! One process at a time for one output: a lock of the operating system on a file beside it, which ends with the process
//! however it ends.

use std::fs::{File, TryLockError};
use std::io;
use std::path::{Path, PathBuf};

use crate::error::Error;
use crate::store::beside;

/// A lock; it ends when it is dropped.
pub struct Lock {
    file: File,
    path: PathBuf,
}

impl Lock {
    /// Locks an output.
    ///
    /// # Errors
    /// [`Error::Locked`] if another process is at work on it, [`Error::Save`] if there can be no file.
    pub fn of(output: &Path) -> Result<Lock, Error> {
        let path = beside(output, ".lock");
        let failed = |error: io::Error| Error::Save { path: path.clone(), error };
        loop {
            let file =
                File::options().create(true).truncate(false).write(true).open(&path).map_err(failed)?;
            match file.try_lock() {
                Ok(()) => {}
                Err(TryLockError::WouldBlock) => return Err(Error::Locked { output: output.into() }),
                Err(TryLockError::Error(error)) => return Err(failed(error)),
            }
            // Whoever held the lock before may have removed the file between the two steps.
            if same_file(&file, &path) {
                return Ok(Lock { file, path });
            }
        }
    }
}

#[cfg(unix)]
fn same_file(file: &File, path: &Path) -> bool {
    use std::os::unix::fs::MetadataExt;
    match (file.metadata(), std::fs::metadata(path)) {
        (Ok(a), Ok(b)) => (a.dev(), a.ino()) == (b.dev(), b.ino()),
        _ => false,
    }
}

/// Where files that are open cannot be removed, it is the same.
#[cfg(not(unix))]
fn same_file(_file: &File, _path: &Path) -> bool {
    true
}

impl Drop for Lock {
    fn drop(&mut self) {
        // While the lock is still held; what cannot be removed may stay.
        let _ = std::fs::remove_file(&self.path);
        let _ = self.file.unlock();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn there_is_one_lock_for_an_output() {
        let output = std::env::temp_dir().join(format!("tiltgap-lock-{}", std::process::id()));
        let first = Lock::of(&output).unwrap();
        assert!(matches!(Lock::of(&output), Err(Error::Locked { .. })));
        drop(first);
        assert!(!beside(&output, ".lock").exists());
        drop(Lock::of(&output).unwrap());
    }
}
