//! Contacts: lines along the crest of a potential field's horizontal gradient, the margins of dense or magnetic bodies.

mod crest;
mod depth;
mod drift;
mod ladder;
mod limits;
mod line;
mod prominence;
mod settings;
mod thin;
mod trace;

pub use crest::{CrestPoint, crest_points};
pub use depth::{DepthEstimate, tilt_depth};
pub use drift::{DipSide, Drift};
pub use ladder::{Face, Ladder, Level, Persistence};
pub use line::{Contact, Significance, compass_point};
pub use settings::ContactSettings;

use limits::Limits;
use rayon::prelude::*;

use crate::error::Result;
use crate::field::{Gradient, GradientNoise};
use crate::quantile::quantile_in_place;

/// A line is followed down to this share below the weak quantile, so that a contact of even strength, whose crests differ
/// only by how the cells sample it, is not cut to pieces by its own quantile.
const SLACK: f64 = 0.1;

/// Finds the contacts of a field from its gradient, the longest first.
///
/// `gradient` is that of gravity (mGal) or pseudo-gravity, at the height of interest; only its horizontal parts are used.
/// A field without crests (a constant or a plane) has no contact, and the list is then empty.
///
/// Steps: crest points of the horizontal gradient magnitude ([`crest_points`]); hysteresis between the weak and the strong
/// quantile of their strengths (a line is followed to a tenth below the weak one); thinning to chains one cell wide; chains walked from ends and junctions, then rings;
/// sub-cell points as vertices, smoothed once by weights 1, 2, 1; lines shorter than the least length dropped.
///
/// # Errors
/// Only a defect in the shapes of the gradient; the settings are checked where they are made.
///
/// ```
/// use ndarray::Array2;
/// use salband::contact::{ContactSettings, find_contacts};
/// use salband::field::Gradient;
/// use salband::grid::Frame;
/// // The eastward gradient over a margin that runs north, with the dense ground in the east.
/// let frame = Frame::local(100.0, 40, 40)?;
/// let east = Array2::from_shape_fn((40, 40), |(_, col)| 1.0 / (1.0 + (col as f64 - 20.25).powi(2) / 9.0));
/// let gradient = Gradient::new(frame, east, Array2::zeros((40, 40)), Array2::zeros((40, 40)))?;
/// let contacts = find_contacts(&gradient, &ContactSettings::new(0.6, 0.3, 1000.0)?)?;
/// assert_eq!(contacts.len(), 1);
/// assert_eq!(contacts[0].dense_side(), "E");
/// # Ok::<(), salband::Error>(())
/// ```
pub fn find_contacts(gradient: &Gradient, settings: &ContactSettings) -> Result<Vec<Contact>> {
    linked(gradient, settings, None)
}

/// As [`find_contacts`], but only of what stands above the noise of the layer: a line must hold at least one crest that
/// noise alone would reach *anywhere* in the layer with a chance of at most the significance of the settings
/// ([`GradientNoise::layer_bound`] over the cells of the footprint), and it is followed while each crest is significant in
/// its own cell at the same level ([`GradientNoise::pointwise_bound`]). The quantiles of the settings hold as well;
/// [`ContactSettings::above_noise`] sets none. Each contact gets its [`Significance`].
///
/// A crest must also stand out from its flanks: followed up and down the slope, the magnitude must fall by the square root of
/// two times the pointwise bound on both sides before it rises (by more than the square root of two times the deviation
/// of the noise, along a line; at all, where it starts). Without that, every bump of noise on the flank of a strong contact,
/// where the gradient is far from zero, would be a line.
///
/// So that a layer on a slope keeps the level too, the first crest must also fall to both sides by what noise would not give
/// anywhere. The price is weak contacts: over a step in noise a line was found in nine of ten layers at a signal to noise of
/// 10 three cells up, in half of them at the ground, and in one of ten at 5 (tests/contact_noise.rs).
///
/// A line may run to the edge of the frame but not start within two cells plus the height of it, where the padding of the
/// transform makes the noise of the gradient larger. The noise must be that of this gradient: of the same product at the
/// same height; with [`GradientNoise::near_edges`], without which noise makes lines along the edges. A layer without noise loses nothing.
///
/// # Errors
/// As [`find_contacts`].
pub fn find_contacts_above_noise(
    gradient: &Gradient,
    noise: &GradientNoise,
    settings: &ContactSettings,
) -> Result<Vec<Contact>> {
    linked(gradient, settings, Some(noise))
}

fn linked(gradient: &Gradient, settings: &ContactSettings, noise: Option<&GradientNoise>) -> Result<Vec<Contact>> {
    let strength = gradient.horizontal();
    let crests = crest::points(&strength);
    let mut strengths: Vec<f64> = crests.iter().map(|crest| crest.strength).collect();
    let mut at = |share| quantile_in_place(&mut strengths, share);
    let (Some(weak), Some(strong)) = (at(settings.weak()), at(settings.strong())) else {
        return Ok(Vec::new());
    };
    drop(strengths);
    let cells = strength.iter().filter(|value| value.is_finite()).count();
    let limits = noise.map(|noise| Limits::new(noise, settings.significance(), cells));
    let follows = |crest: &CrestPoint| {
        crest.strength >= (1.0 - SLACK) * weak
            && limits.as_ref().is_none_or(|limits| limits.follow(gradient, &strength, crest.cell))
    };
    let starts = |crest: &CrestPoint| {
        crest.strength >= strong && limits.as_ref().is_none_or(|limits| limits.start(gradient, &strength, crest.cell))
    };
    let mut contacts: Vec<Contact> = trace::chains(strength.dim(), &crests, follows, starts)
        .into_par_iter()
        .filter_map(|chain| {
            let mut contact = Contact::along(&chain, &crests, gradient)?;
            contact.significance = noise.and_then(|noise| {
                let along = chain
                    .points
                    .iter()
                    .map(|at| {
                        let cell = crests[*at as usize].cell;
                        strength[cell] / noise.growth(strength.dim(), cell)
                    })
                    .collect();
                Significance::of(along, noise, cells)
            });
            Some(contact)
        })
        .filter(|contact| contact.length_m >= settings.least_length())
        .collect();
    contacts.sort_by(|a, b| {
        let start = |contact: &Contact| contact.line.0.first().map_or((0.0, 0.0), |place| (-place.y, place.x));
        let ((a_y, a_x), (b_y, b_x)) = (start(a), start(b));
        b.length_m.total_cmp(&a.length_m).then(a_y.total_cmp(&b_y)).then(a_x.total_cmp(&b_x))
    });
    Ok(contacts)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::PreparedField;
    use crate::grid::{Frame, Grid};
    use ndarray::Array2;

    #[test]
    fn a_plane_has_no_contact() {
        let settings = ContactSettings::new(0.6, 0.3, 0.0).unwrap();
        let frame = Frame::local(250.0, 48, 70).unwrap();
        let values = Array2::from_shape_fn((48, 70), |(row, col)| 980_000.0 + 0.37 * col as f64 - 0.11 * row as f64);
        let field = PreparedField::new(&Grid::new(frame.clone(), values).unwrap()).unwrap();
        assert!(find_contacts(&field.gradient(0.0).unwrap(), &settings).unwrap().is_empty());
        let zero = || Array2::zeros((48, 70));
        let still = Gradient::new(frame, zero(), zero(), zero()).unwrap();
        assert!(find_contacts(&still, &settings).unwrap().is_empty());
    }

    #[test]
    fn a_gap_breaks_a_contact_and_longer_ones_come_first() {
        let frame = Frame::local(100.0, 60, 40).unwrap();
        let mut east = Array2::from_shape_fn((60, 40), |(_, col)| 1.0 / (1.0 + (col as f64 - 20.25).powi(2) / 9.0));
        east.slice_mut(ndarray::s![20..23, ..]).fill(f64::NAN);
        let gradient = Gradient::new(frame, east, Array2::zeros((60, 40)), Array2::zeros((60, 40))).unwrap();
        let found = |least| find_contacts(&gradient, &ContactSettings::new(0.6, 0.3, least).unwrap()).unwrap();
        // Crests need both neighbours in two directions: rows 1-18 and 24-58, that is 17 and 34 steps of 100 m.
        let lengths: Vec<f64> = found(0.0).iter().map(|contact| contact.length_m.round()).collect();
        assert_eq!(lengths, [3400.0, 1700.0]);
        assert_eq!(found(2000.0).len(), 1);
    }
}
