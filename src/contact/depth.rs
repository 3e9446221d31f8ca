//! Depth of a contact from the tilt angle.

use geo::Coord;

use super::ladder::vertices;
use super::line::Contact;
use crate::field::Gradient;

/// Step along the normal, in cells.
const STEP: f64 = 0.25;

/// How far the normal is followed on each side, in cells.
const REACH: f64 = 64.0;

/// The tilt may fall back by this much, degrees, on its way from -45 to 45; more, and another body interferes.
const BACKWARD: f64 = 5.0;

/// The fewest places for an estimate: with fewer, no two order statistics bound the median at 95 %.
const LEAST_PLACES: usize = 6;

/// The depth of a contact below the height of its gradient.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DepthEstimate {
    /// Median over the places, m.
    pub median: f64,
    /// Lower quartile, m.
    pub low: f64,
    /// Upper quartile, m.
    pub high: f64,
    /// In how many vertices of the contact it could be measured.
    pub places: usize,
}

/// The depth of a contact from the distance between the contours of -45 and +45 degrees of the tilt angle, which over a
/// vertical contact of great depth extent is twice the depth to its top. `None` where fewer than six places can be measured.
///
/// `gradient` must be that of magnetic anomalies reduced to the pole, or of the first vertical derivative of gravity or
/// pseudo-gravity, not of gravity itself. The depth counts from the height of that gradient: from the ground, take off the
/// height of the continuation and of the flight.
///
/// At each vertex: the normal of the contact is followed from the tilt's zero nearest to the vertex, within half of the
/// reach, up on the dense side and down on the light side, with components interpolated by cubics every quarter of a cell;
/// a place is left out where data end, where the tilt turns back by more than 5 degrees, or after 64 cells.
///
/// Limits: a dipping contact, one of small depth extent and neighbours within a few depths change the distance; the quartiles
/// say how the places differ, not how well the model fits. Depths under two cells come out too large.
///
/// Source: Salem, Williams, Fairhead, Ravat & Smith (2007), Tilt-depth method: a simple depth estimation method using
/// first-order magnetic derivatives, The Leading Edge 26, 1502-1505.
pub fn tilt_depth(contact: &Contact, gradient: &Gradient) -> Option<DepthEstimate> {
    let mut depths: Vec<f64> = vertices(contact)
        .iter()
        .filter_map(|vertex| {
            let profile =
                Profile { gradient, place: vertex.place, dense: Coord { x: -vertex.light.x, y: -vertex.light.y } };
            profile.half_distance()
        })
        .collect();
    if depths.len() < LEAST_PLACES {
        return None;
    }
    let mut at = |share| crate::quantile::quantile_in_place(&mut depths, share);
    let (median, low, high) = (at(0.5)?, at(0.25)?, at(0.75)?);
    Some(DepthEstimate { median, low, high, places: depths.len() })
}

/// The tilt along a normal.
struct Profile<'a> {
    gradient: &'a Gradient,
    place: Coord<f64>,
    /// Unit vector toward the dense side.
    dense: Coord<f64>,
}

impl Profile<'_> {
    /// Half the distance between -45 and +45 degrees, m.
    fn half_distance(&self) -> Option<f64> {
        let zero = self.zero()?;
        let up = self.reached(zero, 1.0)?;
        let down = self.reached(zero, -1.0)?;
        Some((up + down) / 2.0)
    }

    /// Where the tilt crosses zero upward toward the dense side, nearest to the vertex, m.
    fn zero(&self) -> Option<f64> {
        let step = STEP * self.gradient.frame().cell;
        (0..(REACH / 2.0 / STEP) as usize).find_map(|count| {
            let from = count as f64 * step;
            [from, -from - step].into_iter().find_map(|from| {
                let (low, high) = (self.tilt(from)?, self.tilt(from + step)?);
                (low <= 0.0 && high > 0.0).then(|| from + step * low / (low - high))
            })
        })
    }

    /// The distance from `zero`, on the dense side (1) or the light side (-1), at which the tilt reaches 45 degrees of that
    /// sign, m.
    fn reached(&self, zero: f64, side: f64) -> Option<f64> {
        let step = STEP * self.gradient.frame().cell;
        let (mut last, mut most) = (0.0, 0.0_f64);
        for count in 1..=(REACH / STEP) as usize {
            let next = side * self.tilt(zero + side * count as f64 * step)?;
            if next >= 45.0 {
                return Some(step * (count as f64 - 1.0 + (45.0 - last) / (next - last)));
            }
            if next < most - BACKWARD {
                return None;
            }
            most = most.max(next);
            last = next;
        }
        None
    }

    /// The tilt at a distance toward the dense side, degrees; `None` outside the data.
    fn tilt(&self, distance: f64) -> Option<f64> {
        let place = self.place + self.dense * distance;
        let (row, col) = self.gradient.frame().row_col(place.x, place.y);
        if !(row >= 1.0 && col >= 1.0) {
            return None;
        }
        let (top, left) = (row as usize - 1, col as usize - 1);
        let (down, across) = (cubic(row.fract()), cubic(col.fract()));
        let between = |part: &ndarray::Array2<f64>| {
            let mut sum = 0.0;
            for (by_row, weight_down) in down.into_iter().enumerate() {
                for (by_col, weight_across) in across.into_iter().enumerate() {
                    sum += weight_down * weight_across * part.get((top + by_row, left + by_col))?;
                }
            }
            Some(sum)
        };
        let (east, north) = (between(self.gradient.east())?, between(self.gradient.north())?);
        let tilt = between(self.gradient.down())?.atan2(east.hypot(north)).to_degrees();
        tilt.is_finite().then_some(tilt)
    }
}

/// Weights of four values in a row for a place a share of the way from the second to the third: a cubic through both with
/// the slopes of central differences (Catmull & Rom 1974; Keys 1981, from memory).
fn cubic(share: f64) -> [f64; 4] {
    let (one, two, three) = (share, share * share, share * share * share);
    [
        (-one + 2.0 * two - three) / 2.0,
        (2.0 - 5.0 * two + 3.0 * three) / 2.0,
        (one + 4.0 * two - 3.0 * three) / 2.0,
        (three - two) / 2.0,
    ]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_parabola_is_interpolated_exactly() {
        // Source: the slopes of central differences are exact for a parabola, and so is the cubic.
        for share in [0.0, 0.3, 0.5, 1.0] {
            let found: f64 =
                cubic(share).iter().zip([-1.0, 0.0, 1.0, 2.0]).map(|(weight, x)| weight * (x * x + x)).sum();
            assert!((found - share * share - share).abs() < 1e-12);
        }
    }
}
