//! A checked study: what is to be compared, with what is left to choose once the files are seen.

use std::path::PathBuf;

use crate::conductor::{Quantity, Threshold};
use crate::grid::{Source, VectorSource};

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
    /// Mapped units that are references, subjects or both.
    pub units: Vec<MappedUnits>,
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
    /// Heights of upward continuation at which contacts are picked, m, for every slice; `None` picks them on the field as it
    /// is and, for each slice, at a height tied to its depth.
    pub heights: Option<Vec<f64>>,
    /// Standard deviation of the noise of one cell, in units of the field; `None` is estimated.
    pub noise: Option<f64>,
    /// What counts as a contact.
    pub contacts: ContactChoice,
}

/// What counts as a contact.
#[derive(Debug, Clone, Copy)]
pub struct ContactChoice {
    /// Quantiles of the crests' strengths at which a contact starts (strong) and ends (weak).
    pub quantiles: (f64, f64),
    /// The chance that noise alone gives a layer any contact at all.
    pub significance: f64,
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
        /// The direction of the earth's field.
        field: FieldDirection,
        /// The direction of the magnetisation, where it does not run along the field.
        magnetisation: Option<Angles>,
    },
    /// Any grid whose gradient marks margins.
    Other,
}

/// A direction in space.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Angles {
    /// Degrees, positive down.
    pub inclination: f64,
    /// Degrees, positive east of true north, as reference models give it.
    pub declination: f64,
}

/// How the direction of the earth's field is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum FieldDirection {
    /// The study gives it.
    Given(Angles),
    /// By the decimal year of the survey, from the reference model at the middle of the frame.
    Year(f64),
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

    /// Unit of the values in the file.
    pub fn file_unit(self) -> &'static str {
        match self {
            Self::Gravity => "mGal",
            Self::Magnetic { .. } => "nT",
            Self::Other => "units of the grid",
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
    pub source: VectorSource,
}

/// Mapped units: the ground of a rock, a suite, an age.
#[derive(Debug, Clone)]
pub struct MappedUnits {
    /// Their name in tables and on the page.
    pub name: String,
    /// The vector file and what to read of it.
    pub source: VectorSource,
    /// What they are in the comparison.
    pub role: UnitRole,
}

/// What mapped units are in the comparison.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum UnitRole {
    /// The pattern that stays: conductors are moved over them.
    Reference,
    /// The pattern that is moved, over contacts, mapped lines and other units.
    Subject,
}

impl UnitRole {
    /// Name in the study file.
    pub fn name(self) -> &'static str {
        match self {
            Self::Reference => "reference",
            Self::Subject => "subject",
        }
    }
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
    /// Height of upward continuation over depth of the slice, where a field lists no heights.
    pub height_per_depth: f64,
    /// Whether layers are brought to one resolving length.
    pub resolution: Resolution,
}

/// What is done about layers that resolve unlike detail.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Resolution {
    /// Nothing: each field is taken at the heights named, or at those tied to depth.
    AsIs,
    /// At each depth the fields are continued upward, and the slice is smoothed, to the resolving length of the coarsest.
    Matched,
}

impl Resolution {
    /// Name in the study file.
    pub fn name(self) -> &'static str {
        match self {
            Self::AsIs => "as-is",
            Self::Matched => "matched",
        }
    }
}
