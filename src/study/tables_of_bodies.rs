//! The tables of what was found in the ground: conductors, resistors and contacts.

use super::columns::{count, finite, number, text};
use super::contact_details::ContactDetails;
use super::references::ReferenceFinding;
use super::run::Findings;
use super::slices::SliceFinding;
use super::tables::side_name;
use crate::conductor::{Body, Side};
use crate::contact::{Contact, Drift};
use crate::evidence::{Column, Table};

/// Smaller chances than this are not told: no noise is known to be Gaussian that far out.
const LEAST_LOG10_P: f64 = -300.0;

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

    pub(super) fn bodies_table(&self, side: Side) -> Table {
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
            Column::count(
                "persists_levels",
                "",
                "At how many of the three levels 2, 4 and 8 cells higher at least half of the line is found again; empty where \
                 heights belong to depths",
                rows.iter()
                    .map(|row| row.details.persistence.as_ref().and_then(|found| i64::try_from(found.levels).ok())),
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
                "Depth below the level of the field by the tilt angle of its vertical derivative: median along the line; right for \
                 a vertical contact of great depth extent; empty at heights above 0 and where noise decides",
                rows,
                |row| row.details.depth.map(|depth| depth.median),
            ),
            number("depth_low_m", "m", "Lower quartile of the depth along the line", rows, |row| {
                row.details.depth.map(|depth| depth.low)
            }),
            number("depth_high_m", "m", "Upper quartile of the depth along the line", rows, |row| {
                row.details.depth.map(|depth| depth.high)
            }),
            Column::count(
                "depth_places",
                "",
                "Places along the line at which the depth could be measured",
                rows.iter().map(|row| row.details.depth.and_then(|depth| i64::try_from(depth.places).ok())),
            ),
        ]
    }

    pub(super) fn contacts_table(&self) -> Table {
        Table {
            name: "contacts".into(),
            caption: "Contacts: traced crests of the horizontal gradient.".into(),
            columns: self.contact_columns(),
        }
    }
}
