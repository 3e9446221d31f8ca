//! The study file as it is written: every key, before anything is checked.

use std::path::PathBuf;

use serde::Deserialize;
use toml::Spanned;

/// The whole file.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct StudyKeys {
    pub title: String,
    pub seed: Option<Spanned<u64>>,
    #[serde(default)]
    pub frame: FrameKeys,
    pub conductivity: ConductivityKeys,
    #[serde(default)]
    pub potential: Vec<PotentialKeys>,
    #[serde(default)]
    pub lines: Vec<LinesKeys>,
    #[serde(default)]
    pub units: Vec<UnitsKeys>,
    /// Part of the study's contract, refused until controls can be taken out.
    pub control: Option<Spanned<toml::Value>>,
    pub deposits: Option<DepositsKeys>,
    #[serde(default)]
    pub test: TestKeys,
}

/// `[frame]`.
#[derive(Debug, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct FrameKeys {
    pub crs: Option<Spanned<String>>,
    pub cell: Option<Spanned<f64>>,
}

/// `[conductivity]`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ConductivityKeys {
    pub quantity: Spanned<String>,
    pub slices: Option<Vec<SliceKeys>>,
    pub volume: Option<PathBuf>,
    pub variable: Option<String>,
    pub crs: Option<String>,
    pub depths: Option<Vec<f64>>,
    /// Part of the study's contract, refused until models in tables can be gridded.
    pub table: Option<Spanned<toml::Value>>,
    pub columns: Option<Spanned<toml::Value>>,
    pub conductors: Option<BodyKeys>,
    pub resistors: Option<BodyKeys>,
}

/// One entry of `slices`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct SliceKeys {
    pub path: PathBuf,
    pub depth: Spanned<f64>,
    pub band: Option<usize>,
    pub variable: Option<String>,
    pub crs: Option<String>,
}

/// `conductors` or `resistors`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct BodyKeys {
    pub quantile: Option<Spanned<f64>>,
    pub below: Option<Spanned<f64>>,
    pub above: Option<Spanned<f64>>,
    pub mixture: Option<Spanned<bool>>,
    pub least_area: Option<Spanned<f64>>,
}

/// `[[potential]]`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct PotentialKeys {
    pub name: Spanned<String>,
    pub path: PathBuf,
    pub kind: Option<Spanned<String>>,
    pub band: Option<usize>,
    pub variable: Option<String>,
    pub crs: Option<String>,
    pub heights: Option<Vec<Spanned<f64>>>,
    pub inclination: Option<Spanned<f64>>,
    pub declination: Option<Spanned<f64>>,
    pub year: Option<Spanned<f64>>,
    pub magnetisation: Option<MagnetisationKeys>,
    pub noise: Option<Spanned<f64>>,
    #[serde(default)]
    pub contacts: ContactKeys,
}

/// `magnetisation` of a magnetic field, where it does not run along the inducing field.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct MagnetisationKeys {
    pub inclination: Spanned<f64>,
    pub declination: Spanned<f64>,
}

/// `contacts` of a potential field.
#[derive(Debug, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct ContactKeys {
    pub strong: Option<Spanned<f64>>,
    pub weak: Option<Spanned<f64>>,
    pub least_length: Option<Spanned<f64>>,
    pub significance: Option<Spanned<f64>>,
}

/// `[[lines]]`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct LinesKeys {
    pub name: Spanned<String>,
    pub path: PathBuf,
    pub layer: Option<String>,
    pub crs: Option<String>,
    pub keep: Option<Spanned<KeepKeys>>,
}

/// `[[units]]`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct UnitsKeys {
    pub name: Spanned<String>,
    pub path: PathBuf,
    pub layer: Option<String>,
    pub crs: Option<String>,
    pub keep: Option<Spanned<KeepKeys>>,
    pub role: Option<Spanned<String>>,
}

/// `keep` of a vector file: which of its features count, by what a column holds.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct KeepKeys {
    pub column: String,
    #[serde(default)]
    pub is: Vec<ValueKey>,
    #[serde(default)]
    pub not: Vec<ValueKey>,
}

/// A value of a column: a text, a number, or true or false.
#[derive(Debug, Deserialize)]
#[serde(untagged)]
pub(super) enum ValueKey {
    Text(String),
    Whole(i64),
    Number(f64),
    Truth(bool),
}

/// `[deposits]`.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct DepositsKeys {
    pub path: PathBuf,
    pub crs: Option<String>,
    pub columns: Option<DepositColumns>,
}

/// Which column of the deposit table holds what.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct DepositColumns {
    pub x: String,
    pub y: String,
    pub name: String,
}

/// `[test]`.
#[derive(Debug, Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct TestKeys {
    pub within: Option<Vec<Spanned<f64>>>,
    pub profile: Option<Vec<Spanned<f64>>>,
    pub distance_cap: Option<Spanned<f64>>,
    pub null: Option<Spanned<String>>,
    pub family: Option<Spanned<f64>>,
    pub height_per_depth: Option<Spanned<f64>>,
    pub resolution: Option<Spanned<String>>,
}
