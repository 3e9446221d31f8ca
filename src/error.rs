//! One error type for the whole crate: who must mend it, and the five things a reader needs to do so.

use std::error::Error as StdError;
use std::fmt;
use std::path::{Path, PathBuf};

/// The result type used throughout the crate.
pub type Result<T, E = Error> = std::result::Result<T, E>;

/// Who has to act on an error.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Fault {
    /// Something in the input, the study or the command line; the program's exit code is 2.
    User,
    /// A defect of salband itself, or of the machine; the program's exit code is 1.
    Ours,
}

/// An error that names the file, the thing, what was found, what was wanted and what to do.
///
/// Built step by step:
///
/// ```
/// use salband::error::Error;
/// let error = Error::input("cell size").found("-500").wanted("a positive number of metres").mend("set frame.cell");
/// assert_eq!(error.to_string(), "cell size: found -500; wanted a positive number of metres. To mend it: set frame.cell.");
/// ```
#[derive(Debug)]
pub struct Error(Box<Parts>);

#[derive(Debug)]
struct Parts {
    fault: Fault,
    file: Option<PathBuf>,
    line: Option<usize>,
    thing: String,
    found: Option<String>,
    wanted: Option<String>,
    remedy: Option<String>,
    source: Option<Box<dyn StdError + Send + Sync>>,
}

impl Error {
    fn new(fault: Fault, thing: impl Into<String>) -> Self {
        Self(Box::new(Parts {
            fault,
            file: None,
            line: None,
            thing: thing.into(),
            found: None,
            wanted: None,
            remedy: None,
            source: None,
        }))
    }

    /// An error that the user can mend; `thing` is what was looked at.
    pub fn input(thing: impl Into<String>) -> Self {
        Self::new(Fault::User, thing)
    }

    /// A defect of salband or of the machine; `thing` is what could not be done.
    pub fn ours(thing: impl Into<String>) -> Self {
        Self::new(Fault::Ours, thing)
    }

    /// Names the file concerned, unless one is named already.
    pub fn file(mut self, path: impl AsRef<Path>) -> Self {
        self.0.file.get_or_insert_with(|| path.as_ref().to_path_buf());
        self
    }

    /// Names the line of the file, counted from 1.
    pub fn line(mut self, line: usize) -> Self {
        self.0.line = Some(line);
        self
    }

    /// Says what was found.
    pub fn found(mut self, found: impl fmt::Display) -> Self {
        self.0.found = Some(found.to_string());
        self
    }

    /// Says what was wanted instead.
    pub fn wanted(mut self, wanted: impl fmt::Display) -> Self {
        self.0.wanted = Some(wanted.to_string());
        self
    }

    /// Says what to do about it, as an imperative without a full stop.
    pub fn mend(mut self, remedy: impl fmt::Display) -> Self {
        self.0.remedy = Some(remedy.to_string());
        self
    }

    /// Keeps the error that caused this one; its text is shown as well.
    pub fn because(mut self, source: impl Into<Box<dyn StdError + Send + Sync>>) -> Self {
        self.0.source = Some(source.into());
        self
    }

    /// Who has to act.
    pub fn fault(&self) -> Fault {
        self.0.fault
    }

    /// What was looked at, without the rest of the message.
    pub fn thing(&self) -> &str {
        &self.0.thing
    }
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let parts = &*self.0;
        if let Some(file) = &parts.file {
            write!(f, "{}", file.display())?;
            if let Some(line) = parts.line {
                write!(f, ", line {line}")?;
            }
            write!(f, ": ")?;
        }
        write!(f, "{}", parts.thing)?;
        match (&parts.found, &parts.wanted) {
            (Some(found), Some(wanted)) => write!(f, ": found {found}; wanted {wanted}")?,
            (Some(found), None) => write!(f, ": found {found}")?,
            (None, Some(wanted)) => write!(f, ": wanted {wanted}")?,
            (None, None) => {}
        }
        let source = parts.source.as_ref().map(ToString::to_string).unwrap_or_default();
        if !source.is_empty() {
            write!(f, " ({})", source.trim_end_matches('.'))?;
        }
        write!(f, ".")?;
        if let Some(remedy) = &parts.remedy {
            write!(f, " To mend it: {remedy}.")?;
        }
        Ok(())
    }
}

impl StdError for Error {
    fn source(&self) -> Option<&(dyn StdError + 'static)> {
        self.0.source.as_deref().map(|source| source as &(dyn StdError + 'static))
    }
}
