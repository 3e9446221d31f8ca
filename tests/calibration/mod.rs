//! Does the null keep its level? Independent smooth fields that are not periodic, compared many times over.
//!
//! The construction is that of the prototype whose rates the tests name: A = log10 conductivity (Matern 1.5) with its
//! top 20 % as members, B = gravity (Matern 2.5) with the stronger crests of its horizontal gradient as lines.

#![allow(dead_code, reason = "the test and the bench each use their own part")]

pub mod fields;
mod footprints;
mod trial;

pub use footprints::{bent, square};
#[allow(unused_imports, reason = "the test takes the first, the bench the second")]
pub use trial::{Layers, Outcome, trial, trial_over};
