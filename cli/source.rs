//! Where the text of a bench comes from: a file, standard input, or the demo bench that is built in.

use std::fmt;
use std::io::{self, Read};
use std::path::{Path, PathBuf};

/// The demo bench, an invented one.
pub const DEMO: &str = include_str!("demo/bench.json");

/// Longest bench accepted, in bytes: a real one has a thousandth of that.
const LONGEST: u64 = 1 << 20;

/// Where a bench comes from.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Source {
    /// A file.
    File(PathBuf),
    /// Standard input, written `-`.
    Stdin,
    /// The built-in demo bench.
    Demo,
}

impl fmt::Display for Source {
    fn fmt(&self, f: &mut fmt::Formatter) -> fmt::Result {
        match self {
            Source::File(path) => write!(f, "{path:?}"),
            Source::Stdin => f.write_str("standard input"),
            Source::Demo => f.write_str("the demo bench"),
        }
    }
}

/// Why there is no text.
#[derive(Debug, thiserror::Error)]
pub enum SourceError {
    /// No such file.
    #[error("there is no file {0:?}; check the path, or begin with `tiltgap demo > bench.json`")]
    Missing(PathBuf),
    /// A directory.
    #[error("{0:?} is a directory; name the bench file in it")]
    Directory(PathBuf),
    /// Anything else the system says.
    #[error("{from} cannot be read: {error}")]
    Unreadable {
        /// From where.
        from: Source,
        /// What the system says.
        error: io::Error,
    },
    /// Not UTF-8.
    #[error("{from} is not text in UTF-8 (byte {at}); save it as a UTF-8 text file")]
    Encoding {
        /// From where.
        from: Source,
        /// Number of the first byte that is not.
        at: usize,
    },
    /// Far too long.
    #[error("{from} is longer than 1 MiB, which no bench file is; check the path")]
    Long {
        /// From where.
        from: Source,
    },
}

impl Source {
    /// The source that an argument names; none is the demo bench.
    pub fn new(argument: Option<&Path>) -> Source {
        match argument {
            None => Source::Demo,
            Some(path) if path == Path::new("-") => Source::Stdin,
            Some(path) => Source::File(path.into()),
        }
    }

    /// The whole text.
    ///
    /// # Errors
    /// See [`SourceError`].
    pub fn read(&self, stdin: &mut dyn Read) -> Result<String, SourceError> {
        let from = || self.clone();
        let bytes = match self {
            Source::Demo => return Ok(DEMO.into()),
            Source::Stdin => limited(stdin),
            Source::File(path) if path.is_dir() => return Err(SourceError::Directory(path.clone())),
            Source::File(path) => std::fs::File::open(path).and_then(|mut file| limited(&mut file)),
        };
        let bytes = bytes.map_err(|error| match (error.kind(), self) {
            (io::ErrorKind::NotFound, Source::File(path)) => SourceError::Missing(path.clone()),
            _ => SourceError::Unreadable { from: from(), error },
        })?;
        if bytes.len() as u64 > LONGEST {
            return Err(SourceError::Long { from: from() });
        }
        String::from_utf8(bytes)
            .map_err(|e| SourceError::Encoding { from: from(), at: e.utf8_error().valid_up_to() + 1 })
    }
}

/// At most one byte more than the longest bench.
fn limited(from: &mut dyn Read) -> io::Result<Vec<u8>> {
    let mut bytes = Vec::new();
    from.take(LONGEST + 1).read_to_end(&mut bytes)?;
    Ok(bytes)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn stdin(mut bytes: &[u8]) -> Result<String, String> {
        Source::Stdin.read(&mut bytes).map_err(|e| e.to_string())
    }

    #[test]
    fn arguments_name_sources() {
        assert_eq!(Source::new(None), Source::Demo);
        assert_eq!(Source::new(Some(Path::new("-"))), Source::Stdin);
        assert_eq!(Source::new(Some(Path::new("a b.json"))).to_string(), "\"a b.json\"");
        assert_eq!(Source::Demo.read(&mut io::empty()).unwrap(), DEMO);
    }

    #[test]
    fn what_is_not_there_or_not_text_is_a_sentence() {
        let file = |path: &str| Source::File(path.into()).read(&mut io::empty()).unwrap_err().to_string();
        assert_eq!(
            file("no/such.json"),
            "there is no file \"no/such.json\"; check the path, or begin with `tiltgap demo > bench.json`"
        );
        assert_eq!(file("."), "\".\" is a directory; name the bench file in it");
        assert_eq!(stdin(b"{}").unwrap(), "{}");
        assert_eq!(
            stdin(b"{\xff").unwrap_err(),
            "standard input is not text in UTF-8 (byte 2); save it as a UTF-8 text file"
        );
        assert_eq!(
            stdin(&vec![b' '; 2 << 20]).unwrap_err(),
            "standard input is longer than 1 MiB, which no bench file is; check the path"
        );
    }
}
