//! What more is known of the contacts of a field: depth, persistence with height, drift and dip.

use super::fields::PlacedField;
use super::plan::Plan;
use super::settings::PotentialKind;
use crate::contact::{
    Contact, DepthEstimate, Ladder, Level, Persistence, compass_point, find_contacts_above_noise, tilt_depth,
};
use crate::error::Result;

/// How much higher the levels are at which contacts are looked for again, in cells.
pub(super) const LADDER_CELLS: [f64; 3] = [2.0, 4.0, 8.0];

/// What is known of one contact beyond the line itself.
#[derive(Debug, Clone)]
pub struct ContactDetails {
    /// Depth below the ground, m: median and quartiles along the line; `None` where it cannot be measured.
    pub depth: Option<DepthEstimate>,
    /// What becomes of it on the way up the ladder; `None` where no ladder was climbed.
    pub persistence: Option<Persistence>,
}

/// The details of contacts found on a field at `height`; `ladder` asks to follow them further upward.
pub(super) fn details(
    plan: &Plan,
    potential: usize,
    field: &PlacedField,
    height: f64,
    contacts: &[Contact],
    ladder: bool,
) -> Result<Vec<ContactDetails>> {
    let depths = depths(plan.study.potentials[potential].kind, field, height, contacts)?;
    let persistence: Vec<Option<Persistence>> = if ladder && !contacts.is_empty() {
        let cell = plan.frame.cell;
        let settings = plan.contact_settings(potential)?;
        let mut levels = vec![Level { height, contacts: contacts.to_vec() }];
        for cells in LADDER_CELLS {
            let height = height + cells * cell;
            let gradient = field.prepared.gradient(height)?;
            let contacts = find_contacts_above_noise(&gradient, &field.gradient_noise(height)?, &settings)?;
            levels.push(Level { height, contacts });
        }
        Ladder::new(cell, levels)?.trace().into_iter().map(Some).collect()
    } else {
        vec![None; contacts.len()]
    };
    Ok(depths.into_iter().zip(persistence).map(|(depth, persistence)| ContactDetails { depth, persistence }).collect())
}

/// A depth is told where the gradient of the vertical derivative stands this many deviations above the noise (our convention),
/// along at least half of the contact: the tilt angle of what is weaker is that of the noise, and comes out too shallow.
const CLEAR: f64 = 10.0;

/// Depths below the ground by the tilt angle of the vertical derivative, which for pseudo-gravity is the anomaly reduced to
/// the pole. None for a field that is not known to be a potential, none from a continued one (over bodies of finite depth
/// extent the tilt does not deepen as the height grows, so that height cannot be taken off), none out of noise.
fn depths(
    kind: PotentialKind,
    field: &PlacedField,
    height: f64,
    contacts: &[Contact],
) -> Result<Vec<Option<DepthEstimate>>> {
    if kind == PotentialKind::Other || height > 0.0 || contacts.is_empty() {
        return Ok(vec![None; contacts.len()]);
    }
    let gradient = field.prepared.vertical()?.gradient(0.0)?;
    let least = CLEAR * field.vertical_noise()?.component();
    let clear = |contact: &Contact| {
        let strengths = contact.line.0.iter().filter_map(|place| {
            let cell = gradient.frame().cell_at(place.x, place.y)?;
            Some(gradient.east()[cell].hypot(gradient.north()[cell]))
        });
        let strengths: Vec<f64> = strengths.filter(|strength| strength.is_finite()).collect();
        2 * strengths.iter().filter(|strength| **strength >= least).count() >= strengths.len().max(1)
    };
    let measured = |contact| tilt_depth(contact, &gradient).filter(|found| found.low > 0.0 && clear(contact));
    Ok(contacts.iter().map(measured).collect())
}

impl ContactDetails {
    /// Which way the contact dips, in words; for a ring, each face with the direction that it looks toward.
    pub(super) fn dip(&self) -> String {
        let Some(persistence) = &self.persistence else { return String::new() };
        match persistence.faces.as_slice() {
            [] => String::new(),
            [only] => only.drift.dip.name().into(),
            faces => {
                let face = |face: &crate::contact::Face| {
                    format!("{}: {}", compass_point(face.light_side_deg), face.drift.dip.name())
                };
                faces.iter().map(face).collect::<Vec<_>>().join("; ")
            }
        }
    }
}
