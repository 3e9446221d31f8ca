//! From a checked study to a plan: which frame, how each layer comes onto it, what is tested, what it costs.

use std::fmt::Write as _;
use std::path::PathBuf;

use super::settings::{Model, Study};
use crate::error::{Error, Result};
use crate::grid::{Crs, Extent, Frame, Raster, Resampler, Source, carry};

/// The most cells that a potential field may use beyond the frame, so that its edges fall outside.
const MOST_RING: usize = 64;

/// Everything that a run will do, chosen from the study and from what the files say of themselves.
#[derive(Debug, Clone)]
pub struct Plan {
    /// The study.
    pub study: Study,
    /// The frame.
    pub frame: Frame,
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

/// A raster that has been opened to see what it says of itself.
struct Seen {
    source: Source,
    band: usize,
    raster: Raster,
}

impl Seen {
    fn open(source: &Source, band: usize) -> Result<Self> {
        let raster = source.open()?;
        if band > raster.bands {
            return Err(Error::input("the band")
                .file(&source.path)
                .found(format!("band {band} asked for, {} in the file", raster.bands))
                .wanted(format!("a band from 1 to {}", raster.bands))
                .mend("set band"));
        }
        Ok(Self { source: source.clone(), band, raster })
    }

    fn planned(&self, frame: &Frame) -> Result<PlannedLayer> {
        let raster_cell = self.raster.cell_in(&frame.crs)?;
        Ok(PlannedLayer {
            source: self.source.clone(),
            band: self.band,
            format: self.raster.format.clone(),
            shape: self.raster.shape,
            crs: self.raster.crs.name.clone(),
            crs_stated: self.raster.crs_stated,
            raster_cell,
            resampler: Resampler::fit_for(raster_cell, frame.cell),
        })
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
        let within = study.test.within.clone().unwrap_or_else(|| vec![cell, 2.0 * cell, 4.0 * cell]);
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
            reasons,
            frame,
            study,
        })
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
        for lines in &self.study.lines {
            let _ = writeln!(text, "  {:<24} {}", format!("{} (lines)", lines.name), lines.path.display());
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
        let _ = writeln!(text, "\nCost: about {} MB of memory at most.", self.memory() >> 20);
        text
    }

    /// Every raster and vector file that the run reads, each once.
    pub fn files(&self) -> Vec<PathBuf> {
        let mut files: Vec<PathBuf> = Vec::new();
        let slices = self.slices.iter().map(|slice| &slice.layer.source.path);
        let potentials = self.potentials.iter().map(|field| &field.layer.source.path);
        let lines = self.study.lines.iter().map(|lines| &lines.path);
        let deposits = self.study.deposits.iter().map(|deposits| &deposits.path);
        for path in slices.chain(potentials).chain(lines).chain(deposits) {
            if !files.contains(path) {
                files.push(path.clone());
            }
        }
        files
    }
}

fn see_slices(study: &Study) -> Result<Vec<(f64, Seen)>> {
    match &study.conductivity.model {
        Model::Slices(slices) => {
            slices.iter().map(|slice| Ok((slice.depth, Seen::open(&slice.source, slice.band)?))).collect()
        }
        Model::Volume { source, depths } => {
            let bands = source.open()?.depths;
            if let Some(depths) = depths {
                if depths.len() != bands.len() {
                    return Err(Error::input("conductivity.depths")
                        .file(&study.path)
                        .found(format!("{} depths for {} bands", depths.len(), bands.len()))
                        .wanted("one for each band of the volume"));
                }
            }
            let depth = |band: usize| {
                depths.as_ref().and_then(|depths| depths.get(band).copied()).or(bands[band]).filter(|d| d.is_finite())
            };
            let mut slices = Vec::new();
            for band in 0..bands.len() {
                let depth = depth(band).ok_or_else(|| {
                    Error::input("the depths of the volume")
                        .file(&source.path)
                        .found(format!("none for band {}", band + 1))
                        .wanted("a depth axis in the file, or depths in the study")
                        .mend("add depths = [...] under [conductivity], one for each band, in metres")
                })?;
                if slices.iter().any(|(other, _)| *other == depth) {
                    return Err(Error::input("the depths of the volume")
                        .file(&source.path)
                        .found(format!("{depth} m twice"))
                        .wanted("each depth once"));
                }
                slices.push((depth, Seen::open(source, band + 1)?));
            }
            slices.sort_by(|a, b| a.0.total_cmp(&b.0));
            Ok(slices)
        }
    }
}

fn choose_crs(study: &Study, slices: &[(f64, Seen)], potentials: &[Seen], reasons: &mut Vec<String>) -> Result<Crs> {
    if let Some(stated) = &study.frame.crs {
        reasons.push("The study states the coordinate system.".into());
        return Crs::from_definition(stated);
    }
    let all = || slices.iter().map(|(_, seen)| seen).chain(potentials);
    let metric = |seen: &&Seen| !seen.raster.crs.geographic && (seen.raster.crs.metres_per_unit - 1.0).abs() < 1e-9;
    if let Some(seen) = all().find(metric) {
        reasons.push(format!(
            "The coordinate system is that of the first projected layer in metres, {}.",
            seen.source.path.display()
        ));
        return Ok(seen.raster.crs.clone());
    }
    let first = &slices[0].1.raster;
    let extent = first.extent();
    let middle = ((extent.west + extent.east) / 2.0, (extent.south + extent.north) / 2.0);
    let (longitude, latitude) = carry(&[middle], &first.crs, &Crs::from_definition("EPSG:4326")?)?[0];
    reasons.push("No layer is projected in metres, so the UTM zone of the model's middle is taken.".into());
    Crs::utm_at(longitude, latitude)
}

fn choose_cell(
    study: &Study,
    crs: &Crs,
    slices: &[(f64, Seen)],
    potentials: &[Seen],
    reasons: &mut Vec<String>,
) -> Result<f64> {
    if let Some(cell) = study.frame.cell {
        reasons.push("The study states the cell size.".into());
        return Ok(cell);
    }
    let finest = |layers: &mut dyn Iterator<Item = &Seen>| -> Result<Option<(f64, PathBuf)>> {
        let mut finest: Option<(f64, PathBuf)> = None;
        for seen in layers {
            let cell = seen.raster.cell_in(crs)?;
            if finest.as_ref().is_none_or(|(other, _)| cell < *other) {
                finest = Some((cell, seen.source.path.clone()));
            }
        }
        Ok(finest)
    };
    let slice = finest(&mut slices.iter().map(|(_, seen)| seen))?;
    let field = finest(&mut potentials.iter())?;
    // A comparison is no sharper than the coarser of its two sides, so that side's finest layer decides.
    let (own, path) = match (slice, field) {
        (Some(slice), Some(field)) => {
            if slice.0 >= field.0 {
                slice
            } else {
                field
            }
        }
        (Some(only), None) | (None, Some(only)) => only,
        (None, None) => return Err(Error::ours("choosing a cell size without layers")),
    };
    let mut cell = round_down(own);
    reasons.push(format!(
        "The cell is the coarsest round number that resolves {} ({own:.0} m), the finest layer of the coarser side.",
        path.display()
    ));
    if let Some(least) = study.test.within.as_ref().and_then(|within| within.first()).filter(|least| **least < cell) {
        cell = *least;
        reasons.push("It is made smaller to resolve the shortest distance tested.".into());
    }
    Ok(cell)
}

/// The largest of 1, 2, 2.5 or 5 times a power of ten that is not above a number.
fn round_down(number: f64) -> f64 {
    let power = 10f64.powf(number.log10().floor());
    let steps = [5.0, 2.5, 2.0, 1.0];
    // A hair of tolerance, so that a cell of 499.9999 m counts as one of 500 m.
    let step = steps.into_iter().find(|step| step * power <= number * (1.0 + 1e-6)).unwrap_or(1.0);
    if number * (1.0 + 1e-6) >= 10.0 * power { 10.0 * power } else { step * power }
}

/// West, north, rows and columns of the overlap of the model with the potential fields.
fn choose_extent(
    crs: &Crs,
    cell: f64,
    slices: &[(f64, Seen)],
    potentials: &[Seen],
    reasons: &mut Vec<String>,
) -> Result<(f64, f64, usize, usize)> {
    let together = |layers: &mut dyn Iterator<Item = &Seen>| -> Result<Option<Extent>> {
        let mut together: Option<Extent> = None;
        for seen in layers {
            let extent = seen.raster.extent_in(crs)?;
            together = Some(together.map_or(extent, |other| other.or(extent)));
        }
        Ok(together)
    };
    let Some(model) = together(&mut slices.iter().map(|(_, seen)| seen))? else {
        return Err(Error::ours("choosing an extent without slices"));
    };
    for seen in potentials {
        let own = seen.raster.extent_in(crs)?;
        if model.and(own).is_none() {
            let say = |extent: Extent| {
                format!(
                    "{:.0} to {:.0} east, {:.0} to {:.0} north",
                    extent.west, extent.east, extent.south, extent.north
                )
            };
            return Err(Error::input("the extent")
                .file(&seen.source.path)
                .found(format!("{} in {}", say(own), crs.name))
                .wanted(format!("some overlap with the conductivity model at {}", say(model)))
                .mend("check the coordinate systems of both, or leave the layer out"));
        }
    }
    let overlap = match together(&mut potentials.iter())? {
        Some(fields) => model.and(fields).unwrap_or(model),
        None => model,
    };
    reasons.push("It covers the overlap of the conductivity model with the potential fields.".into());
    let west = (overlap.west / cell + 1e-6).floor() * cell;
    let north = (overlap.north / cell - 1e-6).ceil() * cell;
    let count = |length: f64| ((length / cell - 1e-6).ceil().max(1.0)) as usize;
    Ok((west, north, count(north - overlap.south), count(overlap.east - west)))
}

/// Ten distances around the tested ones, from one cell to twice the longest, in whole cells.
fn profile_ladder(within: &[f64], cell: f64) -> Vec<f64> {
    let longest = within.iter().copied().fold(cell, f64::max) * 2.0;
    let mut ladder: Vec<f64> = Vec::new();
    for step in 1..=10 {
        let distance = (longest * f64::from(step) / 10.0 / cell).round().max(1.0) * cell;
        if !ladder.contains(&distance) {
            ladder.push(distance);
        }
    }
    ladder
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn round_numbers_do_not_exceed_what_they_round() {
        for (number, expected) in [
            (500.0, 500.0),
            (499.999_999, 500.0),
            (400.0, 250.0),
            (240.0, 200.0),
            (1.0, 1.0),
            (99.0, 50.0),
            (1250.0, 1000.0),
            (0.7, 0.5),
        ] {
            assert!((round_down(number) - expected).abs() < 1e-9, "{number}: {}", round_down(number));
        }
    }

    #[test]
    fn the_profile_is_a_ladder_of_whole_cells() {
        assert_eq!(profile_ladder(&[500.0, 1000.0], 500.0), [500.0, 1000.0, 1500.0, 2000.0]);
        assert_eq!(profile_ladder(&[1000.0, 5000.0], 250.0).len(), 10);
    }
}
