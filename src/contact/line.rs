//! A contact as a line on the map, with what is known of it.

use geo::{Coord, LineString};

use super::crest::CrestPoint;
use super::trace::Chain;
use crate::field::{Gradient, GradientNoise};
use crate::quantile::quantile;

/// One contact.
#[derive(Debug, Clone, PartialEq)]
pub struct Contact {
    /// The line in map coordinates, m. It runs with the higher values (the dense side) on its right; a closed one
    /// repeats its first vertex at the end.
    pub line: LineString<f64>,
    /// Length, m.
    pub length_m: f64,
    /// Axial mean of the segments' strikes weighted by their lengths, degrees clockwise from grid north in [0, 180); it says
    /// little for a closed line.
    pub strike_deg: f64,
    /// Mean gradient on the crest, units of the field per metre.
    pub mean_strength: f64,
    /// Azimuth of the dense side, degrees in [0, 360): the one of the two normals to the strike that the mean gradient is
    /// nearer to. NaN for a closed line, whose dense side is inside or outside.
    pub dense_side_deg: f64,
    /// True for a closed line.
    pub closed: bool,
    /// Where the noise is known, what it says of the line.
    pub significance: Option<Significance>,
}

/// How far a contact stands above the noise of its layer. Strengths are those at the centres of its cells, since the top of
/// a fitted parabola lies above the values that the noise is known for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Significance {
    /// Median strength along the line over the standard deviation of a gradient component; infinite without noise.
    pub signal_to_noise: f64,
    /// log10 of the chance that noise alone reaches the strongest crest of the line in a given cell.
    pub log10_p_strongest: f64,
    /// The same for the median crest of the line.
    pub log10_p_median: f64,
    /// log10 of a bound on the chance that noise alone reaches the strongest crest anywhere in the layer; at most 0.
    pub log10_p_layer: f64,
}

impl Significance {
    /// From the strengths in the cells along a line of a layer of `cells` cells; `None` without any.
    pub(super) fn of(strengths: Vec<f64>, noise: &GradientNoise, cells: usize) -> Option<Self> {
        let strongest = strengths.iter().copied().fold(0.0, f64::max);
        let median = quantile(strengths, 0.5)?;
        Some(Self {
            signal_to_noise: if noise.component() > 0.0 { median / noise.component() } else { f64::INFINITY },
            log10_p_strongest: noise.log10_p(strongest),
            log10_p_median: noise.log10_p(median),
            log10_p_layer: noise.log10_p_layer(strongest, cells),
        })
    }
}

impl Contact {
    /// The contact along a chain of crest points; `None` if it has fewer than two.
    pub(super) fn along(chain: &Chain, crests: &[CrestPoint], gradient: &Gradient) -> Option<Self> {
        if chain.points.len() < 2 {
            return None;
        }
        let points: Vec<&CrestPoint> = chain.points.iter().map(|at| &crests[*at as usize]).collect();
        let placed: Vec<Coord<f64>> =
            points.iter().map(|point| gradient.frame().position(point.row, point.col).into()).collect();
        let mut places = smoothed(&placed, chain.closed);
        if chain.closed {
            places.push(places[0]);
        }
        let uphill: Vec<Coord<f64>> = points
            .iter()
            .map(|point| Coord { x: gradient.east()[point.cell], y: gradient.north()[point.cell] })
            .collect();
        // How far the field rises to the right of the line as it runs, summed along it.
        let right: f64 = places
            .windows(2)
            .enumerate()
            .map(|(at, pair)| {
                let (along, next) = (pair[1] - pair[0], (at + 1) % uphill.len());
                let rise = (uphill[at] + uphill[next]) / 2.0;
                along.y * rise.x - along.x * rise.y
            })
            .sum();
        if right < 0.0 {
            places.reverse();
        }
        let (mut length, mut cosine, mut sine) = (0.0, 0.0, 0.0);
        for pair in places.windows(2) {
            let along = pair[1] - pair[0];
            let piece = along.x.hypot(along.y);
            let double = 2.0 * along.x.atan2(along.y);
            length += piece;
            cosine += piece * double.cos();
            sine += piece * double.sin();
        }
        let strike = axial(sine.atan2(cosine).to_degrees() / 2.0);
        let mean = uphill.iter().fold(Coord { x: 0.0, y: 0.0 }, |sum, rise| sum + *rise);
        let (east, north) = (strike.to_radians().cos(), -strike.to_radians().sin());
        let normal = if mean.x * east + mean.y * north >= 0.0 { strike + 90.0 } else { strike + 270.0 };
        Some(Self {
            line: LineString(places),
            length_m: length,
            strike_deg: strike,
            mean_strength: points.iter().map(|point| point.strength).sum::<f64>() / points.len() as f64,
            dense_side_deg: if chain.closed { f64::NAN } else { normal % 360.0 },
            closed: chain.closed,
            significance: None,
        })
    }

    /// The dense side in words: a compass point, or "inside" or "outside" for a closed line.
    pub fn dense_side(&self) -> &'static str {
        if !self.closed {
            return compass_point(self.dense_side_deg);
        }
        let places = &self.line.0;
        let twice_area: f64 = places.windows(2).map(|pair| pair[0].x * pair[1].y - pair[1].x * pair[0].y).sum();
        if twice_area < 0.0 { "inside" } else { "outside" }
    }
}

/// An angle in degrees brought to [0, 180).
fn axial(angle: f64) -> f64 {
    let axial = angle.rem_euclid(180.0);
    if axial >= 180.0 { 0.0 } else { axial }
}

/// The nearest of the eight compass points to an azimuth in degrees: N, NE, E, SE, S, SW, W or NW; "none" for NaN.
///
/// ```
/// assert_eq!(salband::contact::compass_point(350.0), "N");
/// assert_eq!(salband::contact::compass_point(115.0), "SE");
/// ```
pub fn compass_point(azimuth: f64) -> &'static str {
    const POINTS: [&str; 8] = ["N", "NE", "E", "SE", "S", "SW", "W", "NW"];
    if !azimuth.is_finite() {
        return "none";
    }
    POINTS[(azimuth.rem_euclid(360.0) / 45.0).round() as usize % 8]
}

/// Each vertex but the ends of an open line replaced by the mean of itself (weight 2) and its neighbours (weight 1).
fn smoothed(places: &[Coord<f64>], closed: bool) -> Vec<Coord<f64>> {
    let count = places.len();
    (0..count)
        .map(|at| {
            if !closed && (at == 0 || at + 1 == count) {
                return places[at];
            }
            (places[(at + count - 1) % count] + places[at] * 2.0 + places[(at + 1) % count]) / 4.0
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn azimuths_have_names() {
        let names: Vec<&str> = (0..8).map(|step| compass_point(f64::from(step) * 45.0 + 22.4)).collect();
        assert_eq!(names, ["N", "NE", "E", "SE", "S", "SW", "W", "NW"]);
        assert_eq!((compass_point(-90.0), compass_point(f64::NAN)), ("W", "none"));
    }

    #[test]
    fn smoothing_keeps_the_ends_and_a_straight_line() {
        let line: Vec<Coord<f64>> = (0..5).map(|at| Coord { x: f64::from(at), y: 2.0 * f64::from(at) }).collect();
        assert_eq!(smoothed(&line, false), line);
        let ring = [(0.0, 0.0), (0.0, 4.0), (4.0, 4.0), (4.0, 0.0)].map(Coord::from);
        assert_eq!(smoothed(&ring, true)[0], Coord { x: 1.0, y: 1.0 });
    }

    #[test]
    fn strikes_never_reach_180() {
        assert_eq!((axial(180.0), axial(-1e-20), axial(-45.0)), (0.0, 0.0, 135.0));
    }
}
