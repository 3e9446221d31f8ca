//! GDAL's own words, without the wrapping that means nothing to a user.

use std::fmt;

use gdal::errors::GdalError;

/// An error of GDAL that displays as `GDAL: what it said`, or as nothing where it said nothing.
#[derive(Debug)]
pub(super) struct Reason(pub GdalError);

impl fmt::Display for Reason {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.0 {
            GdalError::CplError { msg, .. } | GdalError::NullPointer { msg, .. } if msg.is_empty() => Ok(()),
            GdalError::CplError { msg, .. } | GdalError::NullPointer { msg, .. } => write!(f, "GDAL: {msg}"),
            other => write!(f, "GDAL: {other}"),
        }
    }
}

impl std::error::Error for Reason {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        Some(&self.0)
    }
}
