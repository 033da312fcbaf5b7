//! Where a picture goes: a file, which appears whole or not at all, or standard output.

use std::fmt;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use crate::error::Error;

/// Where output goes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Target {
    /// Standard output, written `-`.
    Stdout,
    /// A file.
    File(PathBuf),
}

/// Why a file was not written. An older file of that name is still there.
#[derive(Debug, thiserror::Error)]
pub enum OutputError {
    /// The name will not do.
    #[error("{path:?} cannot be written: {reason}; give another name with -o")]
    Name {
        /// The file.
        path: PathBuf,
        /// What is wrong.
        reason: String,
    },
    /// The system did not take it.
    #[error("{path:?} cannot be written: {reason}; check the space and the permissions of its folder")]
    System {
        /// The file.
        path: PathBuf,
        /// What the system says.
        reason: String,
    },
}

impl fmt::Display for Target {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Target::Stdout => f.write_str("-"),
            Target::File(path) => write!(f, "{path:?}"),
        }
    }
}

impl Target {
    /// What an argument names.
    pub fn new(argument: &Path) -> Target {
        if argument == Path::new("-") {
            Target::Stdout
        } else {
            Target::File(argument.into())
        }
    }

    /// The ending of the file's name, in small letters.
    pub fn extension(&self) -> Option<String> {
        match self {
            Target::Stdout => None,
            Target::File(path) => path.extension().map(|e| e.to_string_lossy().to_lowercase()),
        }
    }

    /// Checks before the work what can be checked.
    ///
    /// # Errors
    /// No such folder, or a folder in place of the file.
    pub fn check(&self) -> Result<(), OutputError> {
        let Target::File(path) = self else { return Ok(()) };
        let wrong = |reason: String| Err(OutputError::Name { path: path.clone(), reason });
        if path.is_dir() {
            return wrong("it is a directory".into());
        }
        let folder = folder(path);
        if !folder.is_dir() {
            return wrong(format!("there is no folder {folder:?}"));
        }
        Ok(())
    }

    /// Writes everything at once: into a temporary file in the same folder, which then takes the name.
    ///
    /// # Errors
    /// What the system says. There is no half-written file then.
    pub fn write(&self, bytes: &[u8], stdout: &mut dyn Write) -> Result<(), Error> {
        match self {
            Target::Stdout => {
                stdout.write_all(bytes)?;
                Ok(stdout.flush()?)
            }
            Target::File(path) => replace(path, bytes)
                .map_err(|e| OutputError::System { path: path.clone(), reason: e.to_string() }.into()),
        }
    }
}

fn folder(path: &Path) -> &Path {
    match path.parent() {
        Some(parent) if parent != Path::new("") => parent,
        _ => Path::new("."),
    }
}

fn replace(path: &Path, bytes: &[u8]) -> io::Result<()> {
    // A device such as /dev/null cannot be replaced by a file.
    if path.exists() && !path.is_file() {
        return std::fs::write(path, bytes);
    }
    let mut builder = tempfile::Builder::new();
    builder.prefix(".tiltgap-");
    #[cfg(unix)]
    {
        // As any new file: what the system's mask leaves of this.
        use std::os::unix::fs::PermissionsExt;
        builder.permissions(std::fs::Permissions::from_mode(0o666));
    }
    let mut file = builder.tempfile_in(folder(path))?;
    file.write_all(bytes)?;
    file.as_file().sync_all()?;
    file.persist(path).map_err(|e| e.error)?;
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_file_is_replaced_whole_and_nothing_else_is_left() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("a b.svg");
        std::fs::write(&path, "old").unwrap();
        let target = Target::new(&path);
        target.check().unwrap();
        target.write(b"new", &mut io::sink()).unwrap();
        assert_eq!(std::fs::read(&path).unwrap(), b"new");
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);
        assert_eq!(target.extension().as_deref(), Some("svg"));
    }

    #[test]
    fn what_cannot_be_written_is_a_sentence() {
        let error = Target::new(Path::new("no/such/a.svg")).check().unwrap_err().to_string();
        assert!(error.starts_with("\"no/such/a.svg\" cannot be written: there is no folder \"no/such\""));
        assert!(Target::new(Path::new(".")).check().unwrap_err().to_string().contains("it is a directory"));
        assert!(Target::Stdout.check().is_ok());
    }
}
