//! salband

pub mod coincidence;
pub mod error;
pub mod grid;

pub use error::{Error, Result};
