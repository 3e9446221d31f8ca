//! A measure against distance, one small chart for each depth.

use super::axis::{Scale, range};
use super::depth_curve::{KEY_HEIGHT, key};
use super::figure::{Canvas, Figure, WIDTH, path_data};
use super::number::depth_label;
use super::reading::Reading;

/// One distance of a [`ProfilePanel`].
#[derive(Debug, Clone, PartialEq)]
pub struct ProfilePoint {
    /// The distance within which the measure was taken, m.
    pub within_m: f64,
    /// The measure and its null.
    pub reading: Reading,
}

/// The chart of one depth.
#[derive(Debug, Clone, PartialEq)]
pub struct ProfilePanel {
    /// Depth, m, positive down.
    pub depth_m: f64,
    /// The points, from the shortest distance to the longest.
    pub points: Vec<ProfilePoint>,
}

/// A measure against distance: small charts with common axes, one for each depth.
#[derive(Debug, Clone, PartialEq)]
pub struct DistanceProfile {
    /// Name of the file, without extension.
    pub name: String,
    /// Title, drawn above.
    pub title: String,
    /// What the figure shows, in words.
    pub description: String,
    /// The measure with its unit: up to about 50 letters.
    pub measure: String,
    /// The value that means "no association", drawn as a dotted line.
    pub neutral: Option<f64>,
    /// A marker is filled where `p_family` is at or below this.
    pub alpha: f64,
    /// The charts, in the order in which they are drawn.
    pub panels: Vec<ProfilePanel>,
}

const LEFT: f64 = 40.0;
const GAP: f64 = 26.0;
const PANEL_WIDTH: f64 = (WIDTH - LEFT - GAP - 8.0) / 2.0;
const PANEL_HEIGHT: f64 = 118.0;
const PITCH: f64 = PANEL_HEIGHT + 58.0;
const TOP: f64 = 76.0;

impl DistanceProfile {
    /// Draws the figure.
    pub fn draw(&self) -> Figure {
        let rows = self.panels.len().div_ceil(2).max(1);
        let bottom = TOP + PITCH * rows as f64;
        let mut canvas = Canvas::new(&self.name, &self.title, &self.description, bottom + 24.0 + KEY_HEIGHT);
        canvas.text("sb-small", (0.0, 41.0), "start", &self.measure);
        for (index, panel) in self.panels.iter().enumerate() {
            self.chart(&mut canvas, index, panel);
        }
        canvas.text("", (LEFT + (WIDTH - LEFT) / 2.0, bottom - 8.0), "middle", "Distance from a contact, km");
        key(&mut canvas, bottom + 22.0, self.alpha, true);
        canvas.finish()
    }

    fn points(&self) -> impl Iterator<Item = &ProfilePoint> {
        self.panels.iter().flat_map(|panel| &panel.points)
    }

    fn chart(&self, canvas: &mut Canvas, index: usize, panel: &ProfilePanel) {
        let left = LEFT + (index % 2) as f64 * (PANEL_WIDTH + GAP);
        let top = TOP + (index / 2) as f64 * PITCH;
        let (right, bottom) = (left + PANEL_WIDTH, top + PANEL_HEIGHT);
        let values =
            self.points().map(|point| point.reading.finite()).flat_map(|r| [r.observed, r.null_low, r.null_high]);
        let up = Scale::new(range(values.flatten().chain(self.neutral), 0.06), (bottom, top));
        let (_, furthest) = range(self.points().map(|point| point.within_m), 0.0);
        let across = Scale::new((0.0, furthest * 1.04 / 1000.0), (left, right));
        let points: Vec<(f64, Reading)> =
            panel.points.iter().map(|point| (across.at(point.within_m / 1000.0), point.reading.finite())).collect();

        canvas.text("", (left, top - 8.0), "start", &depth_label(panel.depth_m));
        for (value, label) in up.ticks(4) {
            canvas.line("sb-rule", (left, up.at(value)), (right, up.at(value)));
            if index.is_multiple_of(2) {
                canvas.text("sb-small", (left - 7.0, up.at(value) + 4.5), "end", &label);
            }
        }
        for (value, label) in across.ticks(4) {
            canvas.line("sb-tick", (across.at(value), bottom), (across.at(value), bottom + 4.0));
            canvas.text("sb-small", (across.at(value), bottom + 19.0), "middle", &label);
        }
        let shown = |value: fn(&Reading) -> Option<f64>| {
            points.iter().filter_map(move |(x, reading)| value(reading).map(|value| (*x, up.at(value))))
        };
        let band =
            points.iter().filter_map(|(x, reading)| Some((*x, up.at(reading.null_low?), up.at(reading.null_high?))));
        let band: Vec<(f64, f64, f64)> = band.collect();
        let upper = band.iter().map(|(x, _, high)| (*x, *high));
        let lower = band.iter().rev().map(|(x, low, _)| (*x, *low));
        canvas.outline("sb-band", path_data(upper.chain(lower), true));
        if let Some(neutral) = self.neutral {
            canvas.line("sb-neutral", (left, up.at(neutral)), (right, up.at(neutral)));
        }
        canvas.outline("sb-mean", path_data(shown(|reading| reading.null_mean), false));
        canvas.outline("sb-observed", path_data(shown(|reading| reading.observed), false));
        for (x, reading) in &points {
            if let Some(observed) = reading.observed {
                canvas.marker((*x, up.at(observed)), 4.0, reading.p_family.is_some_and(|p| p <= self.alpha));
            }
        }
        if points.iter().all(|(_, reading)| reading.observed.is_none()) {
            canvas.text("sb-small sb-place", ((left + right) / 2.0, top + 16.0), "middle", "not tested");
        }
        canvas.line("sb-tick", (left, bottom), (right, bottom));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_depth_has_a_chart_and_each_point_a_marker() {
        let point = |within_m: f64, p: f64| ProfilePoint {
            within_m,
            reading: Reading {
                observed: Some(1.5),
                null_low: Some(0.8),
                null_mean: Some(1.0),
                null_high: Some(1.2),
                p_family: Some(p),
            },
        };
        let panel = |depth_m: f64| ProfilePanel { depth_m, points: vec![point(500.0, 0.01), point(1000.0, 0.2)] };
        let profile = DistanceProfile {
            name: "profile".into(),
            title: "Title <b>".into(),
            description: "Words".into(),
            measure: "Enrichment".into(),
            neutral: Some(1.0),
            alpha: 0.05,
            panels: vec![panel(500.0), panel(900.0), panel(1500.0)],
        };
        let svg = profile.draw().svg;
        assert_eq!(svg.matches("class=\"sb-full\"").count(), 3 + 1);
        assert_eq!(svg.matches("class=\"sb-hollow\"").count(), 3 + 1);
        assert!(!svg.contains("<b>") && !svg.contains("NaN"));
        let empty = DistanceProfile { panels: vec![], ..profile };
        assert!(!empty.draw().svg.contains("NaN"));
    }
}
