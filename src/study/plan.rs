//! From a checked study to a plan: which frame, how each layer comes onto it, what is tested, what it costs.

use std::fmt::Write as _;
use std::path::PathBuf;

use super::frame_choice::{choose_cell, choose_crs, choose_extent, profile_ladder, refuse_distortion};
use super::seen::{Seen, see_slices};
use super::settings::{PotentialKind, Study};
use crate::error::{Error, Result};
use crate::grid::{Frame, Resampler, Source, files_of_vector, true_north};

/// The most cells that a potential field may use beyond the frame, so that its edges fall outside.
const MOST_RING: usize = 64;

/// Everything that a run will do, chosen from the study and from what the files say of themselves.
#[derive(Debug, Clone)]
pub struct Plan {
    /// The study.
    pub study: Study,
    /// The frame.
    pub frame: Frame,
    /// Azimuth of true north on the frame, degrees clockwise from grid north; 0 where no declination needs it.
    pub true_north: f64,
    /// Why this frame, a sentence for each choice.
    pub reasons: Vec<String>,
    /// The slices, from the shallowest down.
    pub slices: Vec<PlannedSlice>,
    /// The potential fields, in the order of the study.
    pub potentials: Vec<PlannedPotential>,
    /// Distances at which enrichment is tested, m.
    pub within: Vec<f64>,
    /// Distances at which it is described, m.
    pub profile: Vec<f64>,
    /// Cap of the mean distance, m.
    pub distance_cap: f64,
    /// Least area of a conductor, m2.
    pub conductor_area: f64,
    /// Least area of a resistor, m2.
    pub resistor_area: f64,
}

/// How one raster will be read and placed.
#[derive(Debug, Clone)]
pub struct PlannedLayer {
    /// The file.
    pub source: Source,
    /// The band, counted from 1.
    pub band: usize,
    /// The format's name.
    pub format: String,
    /// (rows, columns) in the file.
    pub shape: (usize, usize),
    /// Name of its coordinate system.
    pub crs: String,
    /// True if the study states the system.
    pub crs_stated: bool,
    /// Side of its own cells, m, in the frame's system.
    pub raster_cell: f64,
    /// How it will be resampled.
    pub resampler: Resampler,
    /// Every file that it is read from.
    pub files: Vec<PathBuf>,
}

/// A depth slice.
#[derive(Debug, Clone)]
pub struct PlannedSlice {
    /// Depth in metres.
    pub depth: f64,
    /// The raster.
    pub layer: PlannedLayer,
}

/// A potential field.
#[derive(Debug, Clone)]
pub struct PlannedPotential {
    /// The raster.
    pub layer: PlannedLayer,
    /// Cells around the frame on which the field is known and transformed as well.
    pub ring: usize,
    /// Least length of a contact, m.
    pub least_length: f64,
}

impl Plan {
    /// Opens every raster of the study, chooses the frame, and settles what the study left open.
    ///
    /// # Errors
    /// Any raster that cannot be opened or placed, layers that do not overlap, a frame that cannot be used.
    pub fn make(study: Study) -> Result<Self> {
        let slices = see_slices(&study)?;
        let potentials =
            study.potentials.iter().map(|field| Seen::open(&field.source, field.band)).collect::<Result<Vec<_>>>()?;
        let mut reasons = Vec::new();
        let at_study = |error: Error| error.file(&study.path);
        let crs = choose_crs(&study, &slices, &potentials, &mut reasons).map_err(at_study)?;
        let cell = choose_cell(&study, &crs, &slices, &potentials, &mut reasons)?;
        let frame = choose_extent(&crs, cell, &slices, &potentials, &mut reasons)?;
        let frame = Frame::new(crs, frame.0, frame.1, cell, frame.2, frame.3).map_err(at_study)?;
        refuse_distortion(&frame).map_err(at_study)?;
        let magnetic = study.potentials.iter().any(|field| matches!(field.kind, PotentialKind::Magnetic { .. }));
        let true_north = if magnetic { true_north(&frame).map_err(at_study)? } else { 0.0 };
        let within = study.test.within.clone().unwrap_or_else(|| vec![cell, 2.0 * cell, 4.0 * cell]);
        if let Some(finest) = within.first().filter(|finest| **finest < 0.5 * cell) {
            return Err(at_study(
                Error::input("test.within")
                    .found(format!("{finest} m, less than half a cell of {cell} m"))
                    .wanted("distances in metres that the cells can show")
                    .mend("check that the distances are in metres, or choose a smaller frame.cell"),
            ));
        }
        let profile = study.test.profile.clone().unwrap_or_else(|| profile_ladder(&within, cell));
        let planned_slices =
            slices.iter().map(|(depth, seen)| Ok(PlannedSlice { depth: *depth, layer: seen.planned(&frame)? }));
        let planned_potentials = study.potentials.iter().zip(&potentials).map(|(field, seen)| {
            let beyond = seen.raster.extent_in(&frame.crs)?;
            let room = (frame.west - beyond.west)
                .min(beyond.east - frame.east())
                .min(frame.south() - beyond.south)
                .min(beyond.north - frame.north);
            Ok(PlannedPotential {
                layer: seen.planned(&frame)?,
                ring: ((room / cell).floor().max(0.0) as usize).min(MOST_RING),
                least_length: field.least_length.unwrap_or(5.0 * cell),
            })
        });
        let area = |choice: Option<f64>| choice.unwrap_or(4.0 * frame.cell_area());
        Ok(Self {
            slices: planned_slices.collect::<Result<_>>()?,
            potentials: planned_potentials.collect::<Result<_>>()?,
            distance_cap: study.test.distance_cap.unwrap_or(8.0 * cell),
            conductor_area: area(study.conductivity.conductors.least_area),
            resistor_area: area(study.conductivity.resistors.as_ref().and_then(|choice| choice.least_area)),
            within,
            profile,
            true_north,
            reasons,
            frame,
            study,
        })
    }

    /// No distance beyond this one matters to any measure, m.
    pub fn farthest(&self) -> f64 {
        let ladder = self.within.iter().chain(&self.profile).copied();
        // A cell more, so that the cap itself never counts as within.
        ladder.fold(self.distance_cap, f64::max) + self.frame.cell
    }

    /// How many references the conductors are tested against: each potential field at each height, and each line set.
    pub fn references(&self) -> usize {
        self.study.potentials.iter().map(|field| field.heights.len()).sum::<usize>() + self.study.lines.len()
    }

    /// How many tests the family holds at most.
    pub fn family_tests(&self) -> usize {
        let sides = 1 + usize::from(self.study.conductivity.resistors.is_some());
        let fields = self.references() - self.study.lines.len();
        self.slices.len() * (self.references() * sides * self.within.len() + fields)
    }

    /// How many sums over every shift the comparison takes: for each slice, side and reference one for each distance, the
    /// subject's own cells and the mean distance; for each slice and field three for the correlation; and what they share.
    pub fn sums(&self) -> usize {
        let sides = 1 + usize::from(self.study.conductivity.resistors.is_some());
        let ladder = self.within.len() + self.profile.iter().filter(|far| !self.within.contains(far)).count();
        let fields = self.references() - self.study.lines.len();
        let shared = self.references() * (ladder + 2) + 2 * fields;
        self.slices.len() * (self.references() * sides * (ladder + 2) + 3 * fields) + shared
    }

    /// Memory that the run will take at most, in bytes: an estimate from the sizes of layers and spectra.
    pub fn memory(&self) -> usize {
        let cells = self.frame.rows * self.frame.cols;
        // A padded half spectrum takes 16 bytes for each of about 1.25 x 1.25 / 2 cells; one is held for each distance
        // of one reference and some ten for what is in work; a layer of doubles takes 8 bytes a cell.
        let spectra = (self.within.len() + self.profile.len() + 14) * cells * 13;
        let layers = (self.slices.len() * 4 + self.references() * 4 + 12) * cells * 8;
        spectra + layers + (64 << 20)
    }

    /// The plan in words, for the terminal.
    pub fn describe(&self) -> String {
        let frame = &self.frame;
        let mut text = String::new();
        // Writing to a String cannot fail.
        let _ = writeln!(text, "{}", self.study.title);
        let _ = writeln!(
            text,
            "\nFrame: {}, {} rows x {} columns of {} m; {:.0} to {:.0} east, {:.0} to {:.0} north",
            frame.crs.name,
            frame.rows,
            frame.cols,
            frame.cell,
            frame.west,
            frame.east(),
            frame.south(),
            frame.north
        );
        for reason in &self.reasons {
            let _ = writeln!(text, "  {reason}");
        }
        let _ = writeln!(text, "\nLayers:");
        let mut layer = |name: String, layer: &PlannedLayer| {
            let _ = writeln!(
                text,
                "  {name:<24} {} ({}, {} x {}, {:.0} m, {}{}) by {}",
                layer.source.path.display(),
                layer.format,
                layer.shape.0,
                layer.shape.1,
                layer.raster_cell,
                layer.crs,
                if layer.crs_stated { ", stated" } else { "" },
                layer.resampler.name()
            );
        };
        for slice in &self.slices {
            layer(format!("resistivity {} m", slice.depth), &slice.layer);
        }
        for (field, planned) in self.study.potentials.iter().zip(&self.potentials) {
            layer(format!("{} ({})", field.name, field.kind.name()), &planned.layer);
        }
        for field in &self.study.potentials {
            if let PotentialKind::Magnetic { inclination, declination } = field.kind {
                let _ = writeln!(
                    text,
                    "  {:<24} inclination {inclination}, declination {declination} from true north, {:.2} from grid north",
                    "",
                    declination + self.true_north
                );
            }
        }
        for lines in &self.study.lines {
            let _ = writeln!(text, "  {:<24} {}", format!("{} (lines)", lines.name), lines.source.path.display());
        }
        let distances: Vec<String> = self.within.iter().map(|within| format!("{within}")).collect();
        let _ = writeln!(text, "\nTests:");
        let sides = if self.study.conductivity.resistors.is_some() { "conductors and resistors" } else { "conductors" };
        let _ = writeln!(
            text,
            "  {sides} at {} depths against {} references: enrichment within {} m, and correlation;",
            self.slices.len(),
            self.references(),
            distances.join(", ")
        );
        let _ = writeln!(
            text,
            "  a family of up to {} tests at the level {}; mean distance (capped at {} m) is described.",
            self.family_tests(),
            self.study.test.level,
            self.distance_cap
        );
        let _ = writeln!(
            text,
            "  null: every shift without wrapping, up to a quarter of the footprint, keeping half of the overlap."
        );
        let _ = writeln!(
            text,
            "\nCost: {} sums over every shift, and about {} MB of memory at most.",
            self.sums(),
            self.memory() >> 20
        );
        text
    }

    /// Every file that the run reads, each once: rasters and what they point to, vectors, tables.
    pub fn files(&self) -> Vec<PathBuf> {
        let mut files: Vec<PathBuf> = Vec::new();
        let slices = self.slices.iter().flat_map(|slice| slice.layer.files.clone());
        let potentials = self.potentials.iter().flat_map(|field| field.layer.files.clone());
        let lines = self.study.lines.iter().flat_map(|lines| files_of_vector(&lines.source.path));
        let deposits = self.study.deposits.iter().map(|deposits| deposits.path.clone());
        for path in slices.chain(potentials).chain(lines).chain(deposits) {
            if !files.contains(&path) {
                files.push(path);
            }
        }
        files
    }
}
