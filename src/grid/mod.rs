//! Grids on a common frame, and how files come onto it.

mod crs;
mod describe;
mod distance;
mod files;
mod frame;
mod lines;
mod mask;
mod place;
mod plane;
mod raster;
mod reason;
mod source;
mod volume;
mod warp;
mod write;

pub use crs::{carry, ground_scale, true_north};
pub use describe::describe_layers;
pub use distance::distance_to_lines;
pub use files::files_of_vector;
pub use frame::{Crs, Frame};
pub use lines::{LineSource, read_lines};
pub use mask::Mask;
pub use place::{Placed, Resampler};
pub use plane::Plane;
pub use raster::Grid;

pub use source::{Extent, Raster, Source};
pub use volume::Volume;
pub use write::write_raster;
