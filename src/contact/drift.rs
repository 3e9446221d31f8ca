//! How the crest over a contact moves with height, and what that says of its dip.

use crate::quantile::quantile;

/// Share of the levels, the lowest included, that a place must be found at to have a drift.
const LEAST_SHARE: f64 = 0.5;

/// Crests are placed to about this share of a cell, whatever the number of vertices.
const PLACED: f64 = 0.1;

/// The fewest independent places for a verdict.
const LEAST_PLACES: f64 = 2.0;

/// A drift toward the light side must be this many times as fast as that of a thin vertical-sided body: bodies of great depth
/// extent drift somewhat faster than thin ones, and their widths are known only from crests.
const FASTER: f64 = 1.5;

/// The drift of a thin vertical-sided body far narrower than it is deep, 1 / sqrt(3): none drifts faster.
const FASTEST: f64 = 0.577_350_269_189_626;

/// Which side a contact dips toward, as far as the drift of its crest can tell.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DipSide {
    /// The interval of the drift holds zero, and the width of the body adds no more than half of that interval.
    Vertical,
    /// Toward the light side: the body widens downward.
    Light,
    /// Toward the dense side: the body narrows downward.
    Dense,
    /// The width of the body may explain the drift or hide a dip, or there are too few independent places.
    Undecided,
}

impl DipSide {
    /// In words.
    pub fn name(self) -> &'static str {
        match self {
            Self::Vertical => "vertical",
            Self::Light => "toward the light side",
            Self::Dense => "toward the dense side",
            Self::Undecided => "undecided",
        }
    }
}

/// The drift of a crest with height.
///
/// A crest moves down-dip as the field is continued upward, since deeper parts of the contact gain weight; how fast depends
/// on the dip and on the depths of top and bottom, so no dip angle is given. The crest over any body of finite width also
/// moves outward, toward the light side, on all sides, even if these are vertical. A drift toward the dense side therefore
/// tells a dip toward it in any case; one toward the light side tells a dip only where it is half as fast again as `outward`, and no drift tells a vertical contact only where
/// `outward` is small. The dip of the far side of a narrow body, and neighbours, move the crest as well.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Drift {
    /// Median over the places of the contact, m toward the light side per m upward.
    pub rate: f64,
    /// Lower end of its interval at 95 %.
    pub low: f64,
    /// Upper end.
    pub high: f64,
    /// The rate that a vertical-sided thin body of this width at this depth would show; 1 / sqrt(3), which none exceeds,
    /// where the depth is not known.
    pub outward: f64,
    /// How many vertices were followed.
    pub places: usize,
    /// What it says.
    pub dip: DipSide,
}

/// One vertex followed upward.
pub(super) struct Track {
    /// Height and offset toward the light side, m, the lowest level first.
    pub steps: Vec<(f64, f64)>,
    /// Length that the vertex stands for, m.
    pub length: f64,
    /// Width of the body on the dense side, m.
    pub width: f64,
}

impl Drift {
    /// The drift of a face; `lift` is the height of the ladder, `depth` that of the body below the lowest level, m, if known. `None`
    /// if no vertex was found at half of the levels or more.
    ///
    /// Steps: the median of the slopes between all pairs of levels at each vertex (Theil 1950; Sen 1968, Journal of the
    /// American Statistical Association 63, 1379-1389); the median over vertices; an interval of 1.96 standard errors of a
    /// median, 1.2533 x 1.4826 MAD / sqrt(n), with n the length over twice (cell + lift), as far as the noise at that
    /// height hangs together; never narrower than a tenth of a cell over the height of the ladder.
    pub(super) fn of(tracks: &[Track], cell: f64, lift: f64, depth: Option<f64>) -> Option<Self> {
        let levels = tracks.iter().map(|track| track.steps.len()).max()?;
        let least = (LEAST_SHARE * levels as f64).ceil().max(2.0) as usize;
        let followed: Vec<&Track> = tracks.iter().filter(|track| track.steps.len() >= least).collect();
        let rates: Vec<f64> = followed.iter().filter_map(|track| slope(&track.steps)).collect();
        let rate = quantile(rates.clone(), 0.5)?;
        let deviation = quantile(rates.iter().map(|one| (one - rate).abs()).collect(), 0.5)?;
        let independent = followed.iter().map(|track| track.length).sum::<f64>() / (2.0 * (cell + lift));
        let error = 1.2533 * 1.4826 * deviation / independent.max(1.0).sqrt();
        let half = (1.96 * error).max(PLACED * cell / lift);
        let (low, high) = (rate - half, rate + half);
        let width = quantile(followed.iter().map(|track| track.width).collect(), 0.5)?;
        let crest = |depth| vertical_crest(width / 2.0, depth);
        let outward = depth.map_or(FASTEST, |depth| (crest(depth + lift) - crest(depth)) / lift);
        // What the dip itself adds lies between `low - explained` and `high`.
        let explained = FASTER * outward;
        let dip = if independent < LEAST_PLACES {
            DipSide::Undecided
        } else if high < 0.0 {
            DipSide::Dense
        } else if low > explained {
            DipSide::Light
        } else if low <= 0.0 && explained <= half {
            DipSide::Vertical
        } else {
            DipSide::Undecided
        };
        Some(Self { rate, low, high, outward, places: rates.len(), dip })
    }
}

/// Median of the slopes between all pairs.
fn slope(steps: &[(f64, f64)]) -> Option<f64> {
    let pairs = steps.iter().enumerate().flat_map(|(at, low)| steps[at + 1..].iter().map(move |high| (low, high)));
    quantile(pairs.map(|(low, high)| (high.1 - low.1) / (high.0 - low.0)).collect(), 0.5)
}

/// How far from its middle the crest over the edge of a thin horizontal ribbon stands, m: of half width `half` at depth
/// `depth`.
///
/// The gradient of gravity is, up to scale, depth / ((x + a)^2 + depth^2) - depth / ((x - a)^2 + depth^2) (Telford, Geldart
/// & Sheriff 1990, section 2.7, from memory); its extreme lies between a and a + depth.
fn vertical_crest(half: f64, depth: f64) -> f64 {
    let inward = |x: f64| {
        let part = |s: f64| s / (s * s + depth * depth).powi(2);
        part(x + half) - part(x - half) > 0.0
    };
    let (mut low, mut high) = (half, half + depth);
    for _ in 0..60 {
        let middle = (low + high) / 2.0;
        if inward(middle) { low = middle } else { high = middle }
    }
    low
}

#[cfg(test)]
mod tests {
    use super::*;

    fn tracks(rate: impl Fn(usize) -> f64, width: f64) -> Vec<Track> {
        (0..101)
            .map(|at| Track {
                steps: [0.0, 200.0, 400.0, 800.0].map(|height| (height, height * rate(at))).to_vec(),
                length: 100.0,
                width,
            })
            .collect()
    }

    #[test]
    fn a_ribbon_drifts_outward_as_it_should() {
        // Source: for a far away ribbon the extreme of x depth / (x^2 + depth^2)^2 is at depth / sqrt(3); for one close by
        // the series of the condition above gives half + depth^4 / (8 half^3).
        assert!((vertical_crest(1.0, 1000.0) / (1000.0 / 3.0_f64.sqrt()) - 1.0).abs() < 1e-3);
        let shift = vertical_crest(1000.0, 100.0) - 1000.0;
        assert!((shift / (1e8 / 8e9) - 1.0).abs() < 0.02, "{shift}");
    }

    #[test]
    fn verdicts_follow_the_interval() {
        let verdict = |rate: f64, width| Drift::of(&tracks(|_| rate, width), 100.0, 800.0, Some(500.0)).unwrap();
        assert_eq!(verdict(0.3, 20_000.0).dip, DipSide::Light);
        assert_eq!(verdict(-0.3, 20_000.0).dip, DipSide::Dense);
        assert_eq!(verdict(-0.3, 1_000.0).dip, DipSide::Dense);
        assert_eq!(verdict(0.01, 20_000.0).dip, DipSide::Vertical);
        // A body 1 km wide at 500 m drifts outward by itself.
        let narrow = verdict(0.3, 1_000.0);
        assert!(narrow.outward > 0.3 && narrow.dip == DipSide::Undecided, "{narrow:?}");
        assert_eq!(Drift::of(&tracks(|_| 0.3, 2e4)[..9], 100.0, 800.0, Some(500.0)).unwrap().dip, DipSide::Undecided);
        // Under a body that narrow no drift does not tell a vertical contact either: a dip may hide in it.
        assert_eq!(verdict(0.0, 1_000.0).dip, DipSide::Undecided);
        // The same drift from an unknown depth could be that of any narrow body.
        assert_eq!(Drift::of(&tracks(|_| 0.3, 2e4), 100.0, 800.0, None).unwrap().dip, DipSide::Undecided);
        assert_eq!(Drift::of(&tracks(|_| -0.3, 2e4), 100.0, 800.0, None).unwrap().dip, DipSide::Dense);
        assert!(Drift::of(&[], 100.0, 800.0, Some(500.0)).is_none());
    }

    #[test]
    fn the_interval_is_that_of_a_median() {
        // Source: rates from -0.5 to 0.5 in steps of 0.01 have the median 0 and the MAD 0.25; 10,100 m over twice 900 m.
        let drift = Drift::of(&tracks(|at| at as f64 / 100.0 - 0.5, 2e4), 100.0, 800.0, Some(500.0)).unwrap();
        let half = 1.96 * 1.2533 * 1.4826 * 0.25 / (10_100.0_f64 / 1_800.0).sqrt();
        assert!(drift.rate.abs() < 1e-9 && (drift.high - half).abs() < 1e-9 && (drift.low + half).abs() < 1e-9);
        assert_eq!((drift.places, drift.dip), (101, DipSide::Vertical));
    }
}
