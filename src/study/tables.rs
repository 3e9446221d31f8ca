//! The evidence tables, made from the findings.

use super::contact_details::ContactDetails;
use super::fields::FieldNoise;
use super::references::ReferenceFinding;
use super::run::{Findings, SubjectFinding};
use super::slices::SliceFinding;
use crate::coincidence::{Measure, Test};
use crate::conductor::{Body, Side};
use crate::contact::{Contact, Drift};
use crate::evidence::{Column, Table, distance_label};
use crate::grid::{Grid, Placed};

/// Name of the null in tables.
const NULL_NAME: &str = "shifts without wrapping";

/// Smaller chances than this are not told: no noise is known to be Gaussian that far out.
const LEAST_LOG10_P: f64 = -300.0;

/// A number, or an empty cell where it is not one.
fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

fn side_name(side: Side) -> &'static str {
    match side {
        Side::Conductor => "conductors",
        Side::Resistor => "resistors",
    }
}

/// A column of numbers from a list of anything.
fn number<T>(name: &str, unit: &str, meaning: &str, rows: &[T], value: impl Fn(&T) -> Option<f64>) -> Column {
    Column::number(name, unit, meaning, rows.iter().map(value))
}

fn count<T>(name: &str, unit: &str, meaning: &str, rows: &[T], value: impl Fn(&T) -> usize) -> Column {
    Column::count(name, unit, meaning, rows.iter().map(|row| i64::try_from(value(row)).ok()))
}

fn text<T>(name: &str, meaning: &str, rows: &[T], value: impl Fn(&T) -> String) -> Column {
    Column::text(name, meaning, rows.iter().map(value))
}

/// One contact, for the table.
struct ContactRow<'a> {
    reference: &'a ReferenceFinding,
    number: usize,
    contact: &'a Contact,
    details: &'a ContactDetails,
    drift: Option<Drift>,
}

/// The drift of the face with the most places.
fn widest_drift(details: &ContactDetails) -> Option<Drift> {
    details.persistence.as_ref()?.faces.first().map(|face| face.drift)
}

impl Findings {
    /// All tables, in the order in which they are shown.
    pub(super) fn tables(&self) -> Vec<Table> {
        let mut tables = vec![self.coincidence_table(), self.profile_table(), self.bodies_table(Side::Conductor)];
        if self.plan.study.conductivity.resistors.is_some() {
            tables.push(self.bodies_table(Side::Resistor));
        }
        tables.push(self.contacts_table());
        if !self.units.is_empty() {
            tables.push(self.units_table());
        }
        if !self.deposits.is_empty() {
            tables.push(self.deposits_table());
        }
        tables.push(self.layers_table());
        tables
    }

    /// What a test's subject is called: for the correlation it is the conductivity itself.
    fn subject_name(&self, test: &Test) -> String {
        match (test.measure, self.subjects[test.subject]) {
            (Measure::Correlation, _) => "log10 conductivity".into(),
            (_, SubjectFinding::Bodies { side, .. }) => side_name(side).into(),
            (_, SubjectFinding::Units(index)) => self.plan.study.units[index].name.clone(),
        }
    }

    fn reference_name(&self, test: &Test) -> String {
        let series = self.series_of(test);
        match (test.measure, series.potential()) {
            (Measure::Correlation, Some(index)) => format!("{} gradient", self.plan.study.potentials[index].name),
            (_, Some(index)) => format!("{} contacts", self.plan.study.potentials[index].name),
            (_, None) => self.plan.series_label(series),
        }
    }

    /// Resolving length of a test's subject, m; `None` for mapped units.
    fn subject_length(&self, test: &Test) -> Option<f64> {
        match self.subjects[test.subject] {
            SubjectFinding::Bodies { slice, .. } => finite(self.slices[slice].resolving_length),
            SubjectFinding::Units(_) => None,
        }
    }

    /// Which subject at which depth is told of, against which reference: the first columns of every table of tests.
    fn place_columns(&self, rows: &[&Test]) -> Vec<Column> {
        vec![
            number("depth_m", "m", "Depth of the slice, positive down; empty for mapped units", rows, |t| {
                self.depth(t)
            }),
            text("subject", "The pattern that is moved under the null", rows, |t| self.subject_name(t)),
            text("reference", "The pattern that stays in place", rows, |t| self.reference_name(t)),
            number(
                "height_m",
                "m",
                "Height of upward continuation before contacts are picked; empty for what is mapped",
                rows,
                |t| self.references[t.reference].height,
            ),
        ]
    }

    fn coincidence_table(&self) -> Table {
        let rows: Vec<&Test> = self.comparison.tests.iter().filter(|test| test.tested).collect();
        let rows = rows.as_slice();
        Table {
            name: "coincidence".into(),
            caption: "One row for each test of a subject against a reference.".into(),
            columns: [self.place_columns(rows), vec![
                text(
                    "measure",
                    "enrichment: share of the subject within the distance over the share of all cells within it; \
                     mean_distance: mean capped distance of the subject to the nearest line, m; \
                     correlation: Pearson's coefficient, a plane taken out of both",
                    rows,
                    |t| t.measure.name().into(),
                ),
                number("within_m", "m", "The distance of the enrichment; 0 means inside mapped units", rows, |t| {
                    t.measure.within()
                }),
                number("observed", "own scale", "The measure as observed: ratio, metres or coefficient", rows, |t| {
                    finite(t.observed)
                }),
                number("expected", "own scale", "Its mean over all admissible shifts", rows, |t| finite(t.expected)),
                number(
                    "effect",
                    "own scale",
                    "Observed over expected for enrichment, observed less expected otherwise",
                    rows,
                    |t| finite(t.effect),
                ),
                number("null_low", "own scale", "2.5 % point of the measure over the shifts", rows, |t| finite(t.low)),
                number("null_high", "own scale", "97.5 % point of the measure over the shifts", rows, |t| {
                    finite(t.high)
                }),
                number(
                    "p",
                    "",
                    "One-sided p-value of this test alone, not below smallest_p; empty where the data cannot tell",
                    rows,
                    |t| t.p,
                ),
                number(
                    "p_family",
                    "",
                    "p-value with the whole family counted; empty where the data cannot tell or the measure is outside it",
                    rows,
                    |t| t.p_family,
                ),
                text(
                    "p_at_bound",
                    "Whether p_family stands at the smallest value told, so that the true one may be smaller",
                    rows,
                    |t| match t.p_family {
                        Some(p) if p <= t.family_smallest_p => "yes".into(),
                        Some(_) => "no".into(),
                        None => String::new(),
                    },
                ),
                text("verdict", "What may be said", rows, |t| t.verdict.to_string()),
                number(
                    "independent_shifts",
                    "",
                    "Effectively independent shifts among the admissible ones",
                    rows,
                    |t| (t.shifts > 0).then_some(t.independent_shifts),
                ),
                number("smallest_p", "", "Smallest p-value that this footprint resolves", rows, |t| {
                    (t.shifts > 0).then_some(t.smallest_p)
                }),
                count("shifts", "", "Admissible shifts where the measure is defined", rows, |t| t.shifts),
                number("subject_share", "", "Share of the subject's cells within the distance", rows, |t| {
                    finite(t.subject_share)
                }),
                number("ground_share", "", "Share of all cells within the distance", rows, |t| finite(t.ground_share)),
                count(
                    "subject_cells",
                    "cells",
                    "Cells of the subject where the reference has data; for the correlation, all cells",
                    rows,
                    |t| t.subject_cells,
                ),
                count("footprint_cells", "cells", "Cells where both have data", rows, |t| t.footprint_cells),
                number(
                    "subject_resolves_m",
                    "m",
                    "Resolving length of the slice as compared: half the wavelength beyond which nine tenths of its gradient's power lie",
                    rows,
                    |t| self.subject_length(t),
                ),
                number(
                    "reference_resolves_m",
                    "m",
                    "Resolving length of the potential field at height_m; empty for what is mapped",
                    rows,
                    |t| self.references[t.reference].resolving_length,
                ),
                text("null", "How the subject was displaced", rows, |_| NULL_NAME.into()),
                text("control", "Layers taken out beforehand", rows, |_| "none".into()),
            ]].concat(),
        }
    }

    fn profile_table(&self) -> Table {
        let mut rows: Vec<&Test> =
            self.comparison.tests.iter().filter(|test| test.measure.within().is_some()).collect();
        let within = |test: &Test| test.measure.within().unwrap_or(0.0);
        rows.sort_by(|a, b| {
            (a.subject, a.reference).cmp(&(b.subject, b.reference)).then(within(a).total_cmp(&within(b)))
        });
        let rows = rows.as_slice();
        Table {
            name: "distance_profile".into(),
            caption:
                "Enrichment against distance, with the pointwise null band; only the rows marked as tested belong to \
                      the family."
                    .into(),
            columns: [
                self.place_columns(rows),
                vec![
                    number("within_m", "m", "The distance; 0 means inside mapped units", rows, |t| t.measure.within()),
                    text("tested", "Whether this distance belongs to the family of tests", rows, |t| {
                        if t.tested { "yes" } else { "no" }.into()
                    }),
                    number("subject_share", "", "Share of the subject's cells within the distance", rows, |t| {
                        finite(t.subject_share)
                    }),
                    number("ground_share", "", "Share of all cells within the distance", rows, |t| {
                        finite(t.ground_share)
                    }),
                    number("enrichment", "", "The first share over the second", rows, |t| finite(t.observed)),
                    number("null_mean", "", "Mean enrichment over all admissible shifts", rows, |t| finite(t.expected)),
                    number("null_low", "", "2.5 % point of the enrichment over the shifts", rows, |t| finite(t.low)),
                    number("null_high", "", "97.5 % point of the enrichment over the shifts", rows, |t| finite(t.high)),
                    number("p_family", "", "p-value with the whole family counted, for tested distances", rows, |t| {
                        t.p_family
                    }),
                ],
            ]
            .concat(),
        }
    }

    /// (slice, body) for all bodies of one side, from the shallowest down.
    pub(super) fn bodies(&self, side: Side) -> Vec<(&SliceFinding, &Body)> {
        let mut all = Vec::new();
        for slice in &self.slices {
            if let Some(bodies) = slice.side(side) {
                all.extend(bodies.bodies.iter().map(|body| (slice, body)));
            }
        }
        all
    }

    /// Fields of bodies, for the table and for the map layer.
    pub(super) fn body_columns(&self, side: Side) -> Vec<Column> {
        let rows = self.bodies(side);
        let rows = rows.as_slice();
        let extreme = match side {
            Side::Conductor => "Lowest resistivity in the body",
            Side::Resistor => "Highest resistivity in the body",
        };
        vec![
            number("depth_m", "m", "Depth of the slice, positive down", rows, |(slice, _)| Some(slice.depth)),
            count("body", "", "Number of the body in its slice, the largest first", rows, |(_, body)| body.id as usize),
            number("threshold_ohm_m", "ohm m", "Threshold of the slice", rows, |(slice, _)| {
                slice.side(side).and_then(|bodies| finite(10f64.powf(bodies.threshold_log10)))
            }),
            count("cells", "cells", "Cells of the body", rows, |(_, body)| body.cells),
            number("area_km2", "km2", "Area of the body", rows, |(_, body)| Some(body.area_m2 / 1e6)),
            number("mean_resistivity_ohm_m", "ohm m", "Geometric mean of the resistivity", rows, |(_, body)| {
                finite(10f64.powf(body.mean_log10))
            }),
            number("extreme_resistivity_ohm_m", "ohm m", extreme, rows, |(_, body)| {
                finite(10f64.powf(body.peak_log10))
            }),
            number("extreme_x_m", "m", "Easting of that cell", rows, |(_, body)| Some(body.peak.0)),
            number("extreme_y_m", "m", "Northing of that cell", rows, |(_, body)| Some(body.peak.1)),
            number("x_m", "m", "Easting of the centroid", rows, |(_, body)| Some(body.centroid.0)),
            number("y_m", "m", "Northing of the centroid", rows, |(_, body)| Some(body.centroid.1)),
            number("axis_m", "m", "Length of the principal axis", rows, |(_, body)| {
                let delta = body.axis.end - body.axis.start;
                finite(delta.x.hypot(delta.y))
            }),
            number(
                "strike_deg",
                "degrees",
                "Strike of the principal axis, clockwise from grid north",
                rows,
                |(_, body)| finite(body.strike_deg),
            ),
            number("elongation", "", "Longer principal axis over the shorter one", rows, |(_, body)| {
                finite(body.elongation)
            }),
        ]
    }

    fn bodies_table(&self, side: Side) -> Table {
        let name = side_name(side);
        Table {
            name: name.into(),
            caption: format!("The {name} of each slice: connected bodies beyond the threshold."),
            columns: self.body_columns(side),
        }
    }

    /// Fields of contacts, for the table and for the map layer: one row for each contact or mapped line.
    pub(super) fn contact_columns(&self) -> Vec<Column> {
        let mut rows: Vec<ContactRow<'_>> = Vec::new();
        for reference in &self.references {
            let numbered = reference.contacts.iter().zip(&reference.details).enumerate();
            rows.extend(numbered.map(|(index, (contact, details))| ContactRow {
                reference,
                number: index + 1,
                contact,
                details,
                drift: widest_drift(details),
            }));
        }
        let rows = rows.as_slice();
        let name = |reference: &ReferenceFinding| {
            let potential = self.series[reference.series].potential();
            potential.map_or_else(String::new, |index| self.plan.study.potentials[index].name.clone())
        };
        vec![
            text("reference", "The potential field", rows, |row| name(row.reference)),
            number("height_m", "m", "Height of upward continuation", rows, |row| row.reference.height),
            number("for_depth_m", "m", "Depth of the slice that this height belongs to; empty for all", rows, |row| {
                row.reference.slice.map(|slice| self.slices[slice].depth)
            }),
            count("contact", "", "Number of the contact, the longest first", rows, |row| row.number),
            number("length_m", "m", "Length along the line", rows, |row| finite(row.contact.length_m)),
            number("strike_deg", "degrees", "Strike, clockwise from grid north", rows, |row| {
                finite(row.contact.strike_deg)
            }),
            number(
                "mean_gradient_per_km",
                "field/km",
                "Mean horizontal gradient along the line, in the unit of the field (see layers) per kilometre",
                rows,
                |row| finite(1000.0 * row.contact.mean_strength),
            ),
            text(
                "dense_side",
                "Side of the higher values (dense or magnetic ground): a compass point, or inside or outside of a ring",
                rows,
                |row| row.contact.dense_side().into(),
            ),
            number("dense_side_deg", "degrees", "Azimuth toward the higher values; empty for a ring", rows, |row| {
                finite(row.contact.dense_side_deg)
            }),
            text("closed", "Whether the line is a ring", rows, |row| {
                if row.contact.closed { "yes" } else { "no" }.into()
            }),
            number(
                "signal_to_noise",
                "",
                "Median gradient along the line over the standard deviation that the layer's noise gives a component of it",
                rows,
                |row| row.contact.significance.and_then(|found| finite(found.signal_to_noise)),
            ),
            number(
                "log10_p_noise",
                "",
                "log10 of a bound on the chance that noise alone gives a crest as strong anywhere in the layer; not told below -300",
                rows,
                |row| row.contact.significance.and_then(|found| finite(found.log10_p_layer.max(LEAST_LOG10_P))),
            ),
            number(
                "persists_levels",
                "",
                "At how many of the three levels 2, 4 and 8 cells higher at least half of the line is found again; empty where \
                 heights belong to depths",
                rows,
                |row| row.details.persistence.as_ref().map(|found| found.levels as f64),
            ),
            number(
                "drift_m_per_m",
                "",
                "How far the crest moves toward the lower values for a metre upward (median; of a ring, its longest face)",
                rows,
                |row| row.drift.and_then(|drift| finite(drift.rate)),
            ),
            number("drift_low", "", "Lower end of the drift's interval at 95 %", rows, |row| {
                row.drift.and_then(|drift| finite(drift.low))
            }),
            number("drift_high", "", "Upper end of the drift's interval at 95 %", rows, |row| {
                row.drift.and_then(|drift| finite(drift.high))
            }),
            text(
                "dip",
                "Which way the contact dips, as far as the drift tells; of a ring, by the direction that each face looks toward",
                rows,
                |row| row.details.dip(),
            ),
            number(
                "depth_m",
                "m",
                "Depth below the ground by the tilt angle of the vertical derivative: median along the line; right for a \
                 vertical contact of great depth extent",
                rows,
                |row| row.details.depth.map(|depth| depth.median),
            ),
            number("depth_low_m", "m", "Lower quartile of the depth along the line", rows, |row| {
                row.details.depth.map(|depth| depth.low)
            }),
            number("depth_high_m", "m", "Upper quartile of the depth along the line", rows, |row| {
                row.details.depth.map(|depth| depth.high)
            }),
            number("depth_places", "", "Places along the line at which the depth could be measured", rows, |row| {
                row.details.depth.map(|depth| depth.places as f64)
            }),
        ]
    }

    fn contacts_table(&self) -> Table {
        Table {
            name: "contacts".into(),
            caption: "Contacts: traced crests of the horizontal gradient.".into(),
            columns: self.contact_columns(),
        }
    }

    fn units_table(&self) -> Table {
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
                number("area_km2", "km2", "Area of their cells on the frame", rows, |(_, found)| {
                    Some(found.mask.count() as f64 * self.plan.frame.cell_area() / 1e6)
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

    fn deposits_table(&self) -> Table {
        Table {
            name: "deposits".into(),
            caption: "Known deposits, where they fall. Described, not tested.".into(),
            columns: self.deposit_columns(),
        }
    }

    fn layers_table(&self) -> Table {
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
                    "Standard deviation of the noise of one cell: given, or estimated from the shortest waves; fields only",
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
