//! From a checked study to a plan: which frame, how each layer comes onto it, what is tested, what it costs.

use std::fmt::Write as _;
use std::path::PathBuf;

use super::frame_choice::{choose_cell, choose_crs, choose_extent, profile_ladder, refuse_distortion};
use super::seen::{Seen, see_slices};
use super::series::Series;
use super::settings::{Angles, ContactChoice, FieldDirection, Potential, PotentialKind, Study, UnitRole};
use crate::contact::ContactSettings;
use crate::error::{Error, Result};
use crate::field::{LEAST_EXACT_INCLINATION, LEAST_SIDE, ReferenceField, reference_field};
use crate::grid::{Crs, Frame, Resampler, Source, carry, files_of_vector, true_north};

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
    /// Directions of field and magnetisation, from true north; `None` for what is not magnetic.
    pub directions: Option<PlannedDirections>,
}

/// Directions behind a magnetic anomaly.
#[derive(Debug, Clone, Copy)]
pub struct PlannedDirections {
    /// The earth's field, as given or from the reference model.
    pub field: Angles,
    /// The magnetisation, where it does not run along the field.
    pub magnetisation: Option<Angles>,
}

impl PlannedDirections {
    /// Settles the directions of a field; `None` for what is not magnetic.
    fn of(field: &Potential, frame: &Frame, reasons: &mut Vec<String>) -> Result<Option<Self>> {
        let PotentialKind::Magnetic { field: direction, magnetisation } = field.kind else { return Ok(None) };
        let field = match direction {
            FieldDirection::Given(angles) => angles,
            FieldDirection::Year(year) => {
                let middle = ((frame.west + frame.east()) / 2.0, (frame.south() + frame.north) / 2.0);
                let (longitude, latitude) = carry(&[middle], &frame.crs, &Crs::from_definition("EPSG:4326")?)?[0];
                let found = reference_field(longitude, latitude, 0.0, year)?;
                reasons.push(format!(
                    "The earth's field under {} is that of {} at the frame's middle in {year}.",
                    field.name,
                    ReferenceField::MODEL
                ));
                Angles { inclination: found.inclination, declination: found.declination }
            }
        };
        Ok(Some(Self { field, magnetisation }))
    }
}

impl PlannedPotential {
    /// The shallower of field and magnetisation, where its inclination is below the guard of the transforms.
    pub(super) fn shallow_direction(&self) -> Option<Angles> {
        let PlannedDirections { field, magnetisation } = self.directions?;
        let shallow = |angles: &Angles| angles.inclination.abs() < LEAST_EXACT_INCLINATION;
        [Some(field), magnetisation]
            .into_iter()
            .flatten()
            .filter(shallow)
            .min_by(|a, b| a.inclination.abs().total_cmp(&b.inclination.abs()))
    }
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
        if frame.rows.min(frame.cols) < LEAST_SIDE && !study.potentials.is_empty() {
            return Err(at_study(
                Error::input("the frame's shape")
                    .found(format!("{} rows x {} columns of {cell} m", frame.rows, frame.cols))
                    .wanted(format!("at least {LEAST_SIDE} rows and {LEAST_SIDE} columns, which a transform needs"))
                    .mend("choose a smaller frame.cell, or layers that overlap more"),
            ));
        }
        let longest = frame.rows.max(frame.cols) as f64 * cell;
        for field in &study.potentials {
            if let Some(height) = field.heights.iter().flatten().find(|height| **height > longest) {
                return Err(at_study(
                    Error::input(format!("heights of potential {:?}", field.name))
                        .found(format!("{height} m"))
                        .wanted(format!(
                            "at most the frame's longer side, {longest} m: nothing of the field is left higher up"
                        ))
                        .mend("check that heights are in metres"),
                ));
            }
        }
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
                least_length: field.contacts.least_length.unwrap_or(5.0 * cell),
                directions: PlannedDirections::of(field, &frame, &mut reasons).map_err(at_study)?,
            })
        });
        let planned_potentials = planned_potentials.collect::<Result<_>>()?;
        let area = |choice: Option<f64>| choice.unwrap_or(4.0 * frame.cell_area());
        Ok(Self {
            slices: planned_slices.collect::<Result<_>>()?,
            potentials: planned_potentials,
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

    /// How many layers the subjects are tested against.
    pub fn references(&self) -> usize {
        self.series().into_iter().map(|series| self.layers_of(series)).sum()
    }

    /// How many tests the family holds at most.
    pub fn family_tests(&self) -> usize {
        let tests = |series: Series| {
            let distances = self.within.len() + usize::from(series.is_area());
            let bodies = self.slices_met(series).len() * (self.sides() * distances + usize::from(series.is_field()));
            bodies + self.moved_units(series) * distances
        };
        self.series().into_iter().map(tests).sum()
    }

    /// How many sums over every shift the comparison takes: for each subject and reference one for each distance, the
    /// subject's own cells and the mean distance; for each slice and field three for the correlation; and what they share.
    pub fn sums(&self) -> usize {
        let ladder = self.within.len() + self.profile.iter().filter(|far| !self.within.contains(far)).count();
        let sums = |series: Series| {
            let distances = ladder + usize::from(series.is_area()) + 2;
            let field = usize::from(series.is_field());
            let bodies = self.slices_met(series).len() * (self.sides() * distances + 3 * field);
            bodies + self.moved_units(series) * distances + self.layers_of(series) * (distances + 2 * field)
        };
        self.series().into_iter().map(sums).sum()
    }

    /// Conductors alone, or resistors too.
    fn sides(&self) -> usize {
        1 + usize::from(self.study.conductivity.resistors.is_some())
    }

    /// How many units that are moved meet a series.
    fn moved_units(&self, series: Series) -> usize {
        let moved = self.study.units.iter().filter(|units| units.role == UnitRole::Subject).count();
        if series.meets_units() { moved } else { 0 }
    }

    /// The settings under which the contacts of a field are found.
    ///
    /// # Errors
    /// None that a checked study can cause.
    pub fn contact_settings(&self, potential: usize) -> Result<ContactSettings> {
        let ContactChoice { quantiles: (strong, weak), significance, .. } = self.study.potentials[potential].contacts;
        ContactSettings::new(strong, weak, self.potentials[potential].least_length)?.with_significance(significance)
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
        for (field, planned) in self.study.potentials.iter().zip(&self.potentials) {
            if let Some(directions) = planned.directions {
                let mut direction = |of: &str, Angles { inclination, declination }: Angles| {
                    let _ = writeln!(
                        text,
                        "  {:<24} {of} inclination {inclination:.2}, declination {declination:.2} from true north, {:.2} from grid north",
                        field.name,
                        declination + self.true_north
                    );
                };
                direction("field:", directions.field);
                if let Some(own) = directions.magnetisation {
                    direction("magnetisation:", own);
                }
            }
        }
        for lines in &self.study.lines {
            let _ = writeln!(text, "  {:<24} {}", format!("{} (lines)", lines.name), lines.source.path.display());
        }
        for units in &self.study.units {
            let name = format!("{} (units, {})", units.name, units.role.name());
            let _ = writeln!(text, "  {name:<24} {}", units.source.path.display());
        }
        let distances: Vec<String> = self.within.iter().map(|within| format!("{within}")).collect();
        let _ = writeln!(text, "\nTests:");
        let sides = if self.study.conductivity.resistors.is_some() { "conductors and resistors" } else { "conductors" };
        let _ = writeln!(
            text,
            "  {sides} at {} depth{} against {}: enrichment within {} m{}{};",
            self.slices.len(),
            if self.slices.len() == 1 { "" } else { "s" },
            self.series().into_iter().map(|series| self.series_label(series)).collect::<Vec<_>>().join(", "),
            distances.join(", "),
            if self.series().into_iter().any(Series::is_area) { " and inside units" } else { "" },
            if self.series().into_iter().any(Series::is_field) { ", and correlation" } else { "" }
        );
        for units in self.study.units.iter().filter(|units| units.role == UnitRole::Subject) {
            let met = self.series().into_iter().filter(|series| series.meets_units());
            let met: Vec<String> = met.map(|series| self.series_label(series)).collect();
            let _ = writeln!(text, "  {} moved over {};", units.name, met.join(", "));
        }
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
        let lines = self.study.lines.iter().map(|lines| &lines.source.path);
        let units = self.study.units.iter().map(|units| &units.source.path);
        let vectors = lines.chain(units).flat_map(|path| files_of_vector(path));
        let deposits = self.study.deposits.iter().map(|deposits| deposits.path.clone());
        for path in slices.chain(potentials).chain(vectors).chain(deposits) {
            if !files.contains(&path) {
                files.push(path);
            }
        }
        files
    }
}
