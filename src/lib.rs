//! salband tells whether conductors in resistivity slices keep to the margins of dense or magnetic bodies more closely
//! than chance would give: at which depth, within what distance, and whether the survey could have shown it at all.
//!
//! Data flows one way through the rooms below, and imports only ever point up this list.
//!
//! | room | holds |
//! | --- | --- |
//! | [`grid`] | frames, grids, masks, volumes; reading and writing rasters; placing them on a frame |
//! | [`field`] | potential-field transforms |
//! | [`contact`] | crests of the horizontal gradient, traced into lines |
//! | [`conductor`] | thresholds and connected bodies in a slice |
//! | [`coincidence`] | measures, nulls, tests and families: arrays and masks in, numbers out |
//! | [`evidence`] | tables, figures, map layers, the report page, provenance |
//! | [`study`] | the study file, its plan, the run, and what is written of it |
//! | [`cli`] | commands, progress, exit codes |

#![warn(missing_docs)]

pub mod cli;
pub mod coincidence;
pub mod conductor;
pub mod contact;
pub mod error;
pub mod evidence;
pub mod field;
pub mod grid;
mod quantile;
pub mod study;

pub use error::{Error, Result};
