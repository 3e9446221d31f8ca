//! Contacts: lines along the crest of a potential field's horizontal gradient, the margins of dense or magnetic bodies.

mod crest;
mod line;
mod settings;
mod thin;
mod trace;

pub use crest::{CrestPoint, crest_points};
pub use line::{Contact, compass_point};
pub use settings::ContactSettings;

use crate::error::Result;
use crate::field::Gradient;
use crate::quantile::quantile;

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
    let crests = crest_points(gradient)?;
    let strengths: Vec<f64> = crests.iter().map(|crest| crest.strength).collect();
    let (Some(weak), Some(strong)) =
        (quantile(strengths.clone(), settings.weak()), quantile(strengths, settings.strong()))
    else {
        return Ok(Vec::new());
    };
    let mut contacts: Vec<Contact> = trace::chains(gradient.frame().shape(), &crests, (1.0 - SLACK) * weak, strong)
        .into_iter()
        .filter_map(|chain| Contact::along(&chain, &crests, gradient))
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
