//! The frame and the distances that a study leaves open, chosen from its layers.

use std::path::PathBuf;

use super::seen::Seen;
use super::settings::Study;
use crate::error::{Error, Result};
use crate::grid::{Crs, Extent, Frame, carry, ground_scale};

/// How far a metre of the frame may be from a metre on the ground: no system made for an area this size comes near it.
const MOST_DISTORTION: f64 = 0.02;

/// Refuses a frame whose metres are not metres on the ground, as in a world-wide web map.
pub(super) fn refuse_distortion(frame: &Frame) -> Result<()> {
    let middle = ((frame.west + frame.east()) / 2.0, (frame.south() + frame.north) / 2.0);
    let scale = ground_scale(&frame.crs, middle)?;
    if (scale - 1.0).abs() <= MOST_DISTORTION {
        return Ok(());
    }
    Err(Error::input("the frame's coordinate system")
        .found(format!("{}, in which a metre is {scale:.3} m on the ground here", frame.crs.name))
        .wanted("a system made for the area, in which a metre is a metre")
        .mend("set frame.crs to one, such as the UTM zone"))
}

/// The frame's coordinate system.
pub(super) fn choose_crs(
    study: &Study,
    slices: &[(f64, Seen)],
    potentials: &[Seen],
    reasons: &mut Vec<String>,
) -> Result<Crs> {
    if let Some(stated) = &study.frame.crs {
        reasons.push("The study states the coordinate system.".into());
        return Crs::from_definition(stated);
    }
    let all = || slices.iter().map(|(_, seen)| seen).chain(potentials);
    let metric = |seen: &&Seen| {
        let crs = &seen.raster.crs;
        let extent = seen.raster.extent();
        let middle = ((extent.west + extent.east) / 2.0, (extent.south + extent.north) / 2.0);
        !crs.geographic
            && (crs.metres_per_unit - 1.0).abs() < 1e-9
            && ground_scale(crs, middle).is_ok_and(|scale| (scale - 1.0).abs() <= MOST_DISTORTION)
    };
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
    reasons.push(
        "No layer is projected in metres that hold on the ground, so the UTM zone of the model's middle is taken."
            .into(),
    );
    Crs::utm_at(longitude, latitude)
}

/// The frame's cell, m.
pub(super) fn choose_cell(
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
    // Not to less than a tenth of the layer's own cell: such a distance is more likely given in another unit.
    let shortest = study.test.within.as_ref().and_then(|within| within.first());
    if let Some(least) = shortest.filter(|least| **least < cell && **least >= own / 10.0) {
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
pub(super) fn choose_extent(
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
    reasons.push(if potentials.is_empty() {
        "It covers the conductivity model.".into()
    } else {
        "It covers the overlap of the conductivity model with the potential fields.".into()
    });
    let west = (overlap.west / cell + 1e-6).floor() * cell;
    let north = (overlap.north / cell - 1e-6).ceil() * cell;
    let count = |length: f64| ((length / cell - 1e-6).ceil().max(1.0)) as usize;
    Ok((west, north, count(north - overlap.south), count(overlap.east - west)))
}

/// About ten distances around the tested ones: even steps of whole cells, up to twice the longest.
pub(super) fn profile_ladder(within: &[f64], cell: f64) -> Vec<f64> {
    let longest = within.iter().copied().fold(cell, f64::max) * 2.0;
    let step = (longest / 10.0 / cell).round().max(1.0) * cell;
    let steps = (longest / step).ceil() as u32;
    (1..=steps).map(|number| f64::from(number) * step).collect()
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
    fn the_profile_is_an_even_ladder_of_whole_cells() {
        assert_eq!(profile_ladder(&[500.0, 1000.0], 500.0), [500.0, 1000.0, 1500.0, 2000.0]);
        assert_eq!(
            profile_ladder(&[1000.0, 5000.0], 250.0),
            (1..=10).map(|k| f64::from(k) * 1000.0).collect::<Vec<_>>()
        );
        assert_eq!(profile_ladder(&[3000.0], 500.0).len(), 12);
    }
}
