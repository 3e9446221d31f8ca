//! Does one pattern keep to another more closely than chance would? Arrays and masks in, numbers out.
//!
//! Nothing here knows of files or of geophysics: any two layers of any science will do.
//!
//! ```
//! use ndarray::Array2;
//! use salband::coincidence::{Reference, Settings, Subject, compare};
//!
//! // A subject that sits on every eighth diagonal, and lines that run along the same diagonals.
//! let shape = (64, 64);
//! let footprint = Array2::from_elem(shape, true);
//! let phase = |row: usize, col: usize| (row + col) % 8;
//! let members = Array2::from_shape_fn(shape, |(row, col)| phase(row, col) == 0);
//! let distance = Array2::from_shape_fn(shape, |(row, col)| phase(row, col).min(8 - phase(row, col)) as f64);
//! let subject = Subject { footprint: footprint.clone(), members: Some(members), strength: None };
//! let reference = Reference { footprint, distance: Some(distance), strength: None, ..Reference::default() };
//! let settings = Settings { within: vec![1.0], profile: vec![], distance_cap: 8.0, level: 0.05 };
//! let comparison = compare(&[subject], &[reference], &settings)?;
//! assert!((comparison.tests[0].observed - 8.0 / 3.0).abs() < 0.05);
//! # Ok::<(), salband::Error>(())
//! ```

mod compare;
mod correlator;
mod engine;
mod family;
mod independent;
mod layer;
mod measure;
mod null;
mod resolution;
mod shift;
mod test;
mod trend;
mod verdict;
mod window;

pub use compare::{Comparison, compare};
pub use correlator::{Correlator, Masks, Spectrum};
pub use independent::independent_values;
pub use layer::{Reference, Settings, Subject};
pub use measure::{Measure, Moments, closeness, correlation, enrichment};
pub use null::{SMALLEST_P, ShiftNull};
pub use resolution::{LEAST_INDEPENDENT, VALID_LEVEL};
pub use shift::{LEAST_OVERLAP, LONGEST_SHIFT, Reach, admissible};
pub use test::Test;
pub use trend::Trend;
pub use verdict::{Refusal, Verdict};
