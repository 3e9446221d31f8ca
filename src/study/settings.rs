//! A checked study: what is to be compared, with what is left to choose once the files are seen.

use std::path::PathBuf;

use crate::conductor::{Quantity, Threshold};
use crate::grid::{LineSource, Source};

/// A study whose every value has been checked; the layers have not been opened yet.
#[derive(Debug, Clone)]
pub struct Study {
    /// Path of the study file.
    pub path: PathBuf,
    /// Title of the page.
    pub title: String,
    /// Seed of every random choice.
    pub seed: u64,
    /// The frame, as far as the study states it.
    pub frame: FrameChoice,
    /// The conductivity model and what counts as a body in it.
    pub conductivity: Conductivity,
    /// Potential fields whose contacts are references.
    pub potentials: Vec<Potential>,
    /// Mapped lines that are references.
    pub lines: Vec<MappedLines>,
    /// Known deposits, drawn on the maps.
    pub deposits: Option<Deposits>,
    /// Distances and level of the test.
    pub test: TestChoice,
}

/// The frame, as far as the study states it.
#[derive(Debug, Clone, Default)]
pub struct FrameChoice {
    /// The coordinate system; `None` takes that of the first projected layer, or the UTM zone.
    pub crs: Option<String>,
    /// Side of a cell, m; `None` is chosen from the layers.
    pub cell: Option<f64>,
}

/// The conductivity model.
#[derive(Debug, Clone)]
pub struct Conductivity {
    /// What the files hold.
    pub quantity: Quantity,
    /// Where they are.
    pub model: Model,
    /// What counts as a conductor.
    pub conductors: BodyChoice,
    /// What counts as a resistor, if those are tested too.
    pub resistors: Option<BodyChoice>,
}

/// Where the conductivity model is.
#[derive(Debug, Clone)]
pub enum Model {
    /// One raster for each depth, from the shallowest down.
    Slices(Vec<SliceChoice>),
    /// One file whose bands are depths.
    Volume {
        /// The file.
        source: Source,
        /// Depth of each band in metres, where the file does not say.
        depths: Option<Vec<f64>>,
    },
}

/// One depth slice.
#[derive(Debug, Clone)]
pub struct SliceChoice {
    /// The file.
    pub source: Source,
    /// The band, counted from 1.
    pub band: usize,
    /// Depth in metres, positive down.
    pub depth: f64,
}

/// What counts as a body.
#[derive(Debug, Clone, Copy)]
pub struct BodyChoice {
    /// The threshold.
    pub threshold: Threshold,
    /// The least area in square metres; `None` is four cells of the frame.
    pub least_area: Option<f64>,
}

/// A potential field.
#[derive(Debug, Clone)]
pub struct Potential {
    /// Its name in tables and on the page.
    pub name: String,
    /// The file.
    pub source: Source,
    /// The band, counted from 1.
    pub band: usize,
    /// What it measures.
    pub kind: PotentialKind,
    /// Heights of upward continuation at which contacts are picked, m.
    pub heights: Vec<f64>,
    /// Quantiles of the crests' strengths at which a contact starts (strong) and ends (weak).
    pub contacts: (f64, f64),
    /// The least length of a contact, m; `None` is five cells of the frame.
    pub least_length: Option<f64>,
}

/// What a potential field measures.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PotentialKind {
    /// Gravity, mGal.
    Gravity,
    /// Total-field magnetic anomaly, nT; contacts are picked on its pseudo-gravity.
    Magnetic {
        /// Inclination of the inducing field in degrees, positive down.
        inclination: f64,
        /// Declination in degrees, positive east of true north, as reference models give it.
        declination: f64,
    },
    /// Any grid whose gradient marks margins.
    Other,
}

impl PotentialKind {
    /// Name in the study file and in tables.
    pub fn name(self) -> &'static str {
        match self {
            Self::Gravity => "gravity",
            Self::Magnetic { .. } => "magnetic",
            Self::Other => "other",
        }
    }

    /// Unit of the field that contacts are picked on.
    pub fn unit(self) -> &'static str {
        match self {
            Self::Gravity => "mGal",
            Self::Magnetic { .. } => "mGal (pseudo-gravity)",
            Self::Other => "units of the grid",
        }
    }
}

/// Mapped lines: faults, dykes, boundaries.
#[derive(Debug, Clone)]
pub struct MappedLines {
    /// Their name in tables and on the page.
    pub name: String,
    /// The vector file and what to read of it.
    pub source: LineSource,
}

/// Known deposits.
#[derive(Debug, Clone)]
pub struct Deposits {
    /// The table (CSV).
    pub path: PathBuf,
    /// The coordinate system of its positions; `None` is EPSG:4326.
    pub crs: Option<String>,
    /// Columns of x (or longitude), y (or latitude) and name; `None` is longitude, latitude, name.
    pub columns: Option<[String; 3]>,
}

/// Distances and level of the test.
#[derive(Debug, Clone)]
pub struct TestChoice {
    /// Distances at which enrichment is tested, m; `None` is 1, 2 and 4 cells.
    pub within: Option<Vec<f64>>,
    /// Distances of the profile, m; `None` is a ladder around the tested ones.
    pub profile: Option<Vec<f64>>,
    /// The cap of the mean distance, m; `None` is 8 cells.
    pub distance_cap: Option<f64>,
    /// The level at which the family is judged.
    pub level: f64,
}
