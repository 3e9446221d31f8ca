//! The tables of what was read: rasters, mapped units and deposits.

use super::columns::{count, finite, number, text};
use super::fields::FieldNoise;
use super::run::Findings;
use super::slices::SliceFinding;
use crate::evidence::{Column, Table, distance_label};
use crate::grid::{Grid, Placed};

impl Findings {
    pub(super) fn units_table(&self) -> Table {
        let rows: Vec<_> = self.plan.study.units.iter().zip(&self.units).collect();
        let rows = rows.as_slice();
        let cells = (self.plan.frame.rows * self.plan.frame.cols) as f64;
        Table {
            name: "units".into(),
            caption: "Mapped units, as they came onto the frame.".into(),
            columns: vec![
                text("name", "Name of the units", rows, |(choice, _)| choice.name.clone()),
                text("role", "Whether they stay (reference) or are moved (subject)", rows, |(choice, _)| {
                    choice.role.name().into()
                }),
                text("path", "The file, as the study names it", rows, |(choice, _)| self.named(&choice.source.path)),
                count("features", "", "Features that were kept", rows, |(_, found)| found.features),
                number("area_km2", "km2", "Area of the polygons inside the frame", rows, |(_, found)| {
                    Some(found.area_m2 / 1e6)
                }),
                number("frame_share", "", "Share of the frame's cells that they cover", rows, |(_, found)| {
                    Some(found.mask.count() as f64 / cells)
                }),
            ],
        }
    }

    /// Fields of deposits, for the table and for the map layer.
    pub(super) fn deposit_columns(&self) -> Vec<Column> {
        let rows = self.deposits.as_slice();
        let mut columns = vec![
            text("name", "Name of the deposit", rows, |deposit| deposit.name.clone()),
            number("x_m", "m", "Easting in the frame's system", rows, |deposit| Some(deposit.x)),
            number("y_m", "m", "Northing in the frame's system", rows, |deposit| Some(deposit.y)),
            text("on_frame", "Whether it lies on the frame", rows, |deposit| {
                if deposit.cell.is_some() { "yes" } else { "no" }.into()
            }),
            text("conductor_depths_m", "Depths at which it lies in a conductor, m", rows, |deposit| {
                let inside = |slice: &&SliceFinding| deposit.cell.is_some_and(|cell| slice.conductors.mask.0[cell]);
                let depths: Vec<String> =
                    self.slices.iter().filter(inside).map(|slice| slice.depth.to_string()).collect();
                depths.join("; ")
            }),
        ];
        let farthest = self.plan.farthest();
        // Layers that belong to one slice would give a column for each depth.
        for reference in self.references.iter().filter(|reference| reference.slice.is_none()) {
            let series = self.series[reference.series];
            columns.push(number(
                &format!("nearest_{}_m", self.plan.series_stem(series)),
                "m",
                &format!(
                    "Distance of its cell to the nearest of {}; empty beyond {}",
                    self.plan.series_label(series),
                    distance_label(farthest)
                ),
                rows,
                |deposit| deposit.cell.map(|cell| reference.distance[cell]).filter(|distance| *distance < farthest),
            ));
        }
        columns
    }

    pub(super) fn deposits_table(&self) -> Table {
        Table {
            name: "deposits".into(),
            caption: "Known deposits, where they fall. Described, not tested.".into(),
            columns: self.deposit_columns(),
        }
    }

    pub(super) fn layers_table(&self) -> Table {
        struct Row<'a> {
            layer: String,
            unit: String,
            planned: &'a super::plan::PlannedLayer,
            placed: &'a Placed,
            noise: Option<FieldNoise>,
            resolving_length: Option<f64>,
            smoothed_by: Option<f64>,
        }
        let slices = self.slices.iter().zip(&self.plan.slices).map(|(slice, planned)| Row {
            layer: format!("resistivity at {} m", slice.depth),
            unit: "log10 ohm m".into(),
            planned: &planned.layer,
            placed: &slice.placed,
            noise: None,
            resolving_length: finite(slice.resolving_length),
            smoothed_by: Some(slice.smoothed_by),
        });
        let fields = self.plan.study.potentials.iter().zip(&self.plan.potentials).zip(&self.potentials).map(
            |((field, planned), found)| Row {
                layer: format!("{} ({})", field.name, field.kind.name()),
                unit: match field.kind {
                    super::settings::PotentialKind::Magnetic { .. } => "nT; contacts in mGal of pseudo-gravity".into(),
                    kind => kind.unit().into(),
                },
                planned: &planned.layer,
                placed: &found.placed,
                noise: Some(found.noise),
                resolving_length: finite(found.resolving_length),
                smoothed_by: None,
            },
        );
        let rows: Vec<Row<'_>> = slices.chain(fields).collect();
        let rows = rows.as_slice();
        let frame_cells = (self.plan.frame.rows * self.plan.frame.cols) as f64;
        let range = |grid: &Grid, high: bool| grid.range().map(|range| if high { range.1 } else { range.0 });
        Table {
            name: "layers".into(),
            caption: "What was read and how it was placed on the frame.".into(),
            columns: vec![
                text("layer", "The layer", rows, |row| row.layer.clone()),
                text("path", "The file, as the study names it", rows, |row| self.named(&row.planned.source.path)),
                count("band", "", "The band, counted from 1", rows, |row| row.planned.band),
                text("format", "The file's format", rows, |row| row.planned.format.clone()),
                count("rows", "cells", "Rows in the file", rows, |row| row.planned.shape.0),
                count("columns", "cells", "Columns in the file", rows, |row| row.planned.shape.1),
                text("crs", "Coordinate system of the file", rows, |row| row.planned.crs.clone()),
                text("crs_from", "Whether the file or the study states it", rows, |row| {
                    if row.planned.crs_stated { "study" } else { "file" }.into()
                }),
                number("cell_m", "m", "Side of the file's cells, measured in the frame's system", rows, |row| {
                    Some(row.planned.raster_cell)
                }),
                text("resampler", "How values moved to the frame's cells", rows, |row| {
                    row.placed.resampler.name().into()
                }),
                count("cells_read", "cells", "Cells of the file that were read", rows, |row| row.placed.cells_read),
                count("cells_with_data", "cells", "Those with a number", rows, |row| row.placed.cells_with_data),
                count("footprint_cells", "cells", "Cells of the frame with a number", rows, |row| {
                    row.placed.grid.footprint().count()
                }),
                number("footprint_share", "", "Their share of the frame", rows, |row| {
                    Some(row.placed.grid.footprint().count() as f64 / frame_cells)
                }),
                number("low", "see unit", "Smallest value on the frame", rows, |row| range(&row.placed.grid, false)),
                number("high", "see unit", "Largest value on the frame", rows, |row| range(&row.placed.grid, true)),
                text("unit", "Unit of the values on the frame", rows, |row| row.unit.clone()),
                number(
                    "noise",
                    "see unit",
                    "Standard deviation of the noise of one cell of the file: given, or estimated from the shortest waves, with one \
                     standard error on top; fields only",
                    rows,
                    |row| row.noise.map(|noise| noise.in_file),
                ),
                number(
                    "noise_on_frame",
                    "see unit",
                    "The same for one cell of the frame: white noise goes inversely as the side of the cell",
                    rows,
                    |row| row.noise.map(|noise| noise.sigma),
                ),
                text("noise_from", "Where the noise is known from", rows, |row| {
                    row.noise.map_or("", |noise| noise.origin()).into()
                }),
                number(
                    "resolving_length_m",
                    "m",
                    "Half the wavelength beyond which nine tenths of the gradient's power lie; of magnetics, as pseudo-gravity",
                    rows,
                    |row| row.resolving_length,
                ),
                number(
                    "smoothed_by_m",
                    "m",
                    "Standard deviation of the Gaussian that matched the slice to the fields; 0 where none did",
                    rows,
                    |row| row.smoothed_by,
                ),
            ],
        }
    }
}
