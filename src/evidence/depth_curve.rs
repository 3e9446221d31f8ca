//! A measure against depth, with what chance would give.

use super::axis::{Scale, range};
use super::figure::{Canvas, Figure, WIDTH, path_data};
use super::number::depth_label;
use super::reading::Reading;

/// One depth of a [`DepthCurve`].
#[derive(Debug, Clone, PartialEq)]
pub struct DepthRow {
    /// Depth, m, positive down.
    pub depth_m: f64,
    /// The measure and its null.
    pub reading: Reading,
    /// At most a dozen letters at the end of the row, such as `p = 0.012` or `too small`.
    pub label: String,
}

/// A measure against depth: one row for each depth, evenly spaced, from the shallowest down.
#[derive(Debug, Clone, PartialEq)]
pub struct DepthCurve {
    /// Name of the file, without extension.
    pub name: String,
    /// Title, drawn above.
    pub title: String,
    /// What the figure shows, in words.
    pub description: String,
    /// The measure with its unit, drawn at the axis: up to about 45 letters.
    pub measure: String,
    /// The value that means "no association" (1 for a ratio, 0 for a coefficient), drawn as a dotted line.
    pub neutral: Option<f64>,
    /// A marker is filled where `p_family` is at or below this.
    pub alpha: f64,
    /// The rows, in the order in which they are drawn.
    pub rows: Vec<DepthRow>,
}

const LEFT: f64 = 92.0;
const RIGHT: f64 = 96.0;
const TOP: f64 = 62.0;

impl DepthCurve {
    /// Draws the figure. Numbers that are not finite count as absent.
    pub fn draw(&self) -> Figure {
        let readings: Vec<Reading> = self.rows.iter().map(|row| row.reading.finite()).collect();
        let rows = &self.rows;
        let step = if rows.len() > 14 { 25.0 } else { 34.0 };
        let bottom = TOP + step * rows.len().max(1) as f64;
        let mut canvas = Canvas::new(&self.name, &self.title, &self.description, bottom + 76.0 + KEY_HEIGHT);
        let values = readings.iter().flat_map(|r| [r.observed, r.null_low, r.null_high, r.null_mean]);
        let scale = Scale::new(range(values.flatten().chain(self.neutral), 0.07), (LEFT, WIDTH - RIGHT));
        let row_at = |index: usize| TOP + step * (index as f64 + 0.5);

        canvas.text("sb-small", (LEFT - 10.0, TOP - 10.0), "end", "Depth");
        for (value, label) in scale.ticks(4) {
            canvas.line("sb-rule", (scale.at(value), TOP), (scale.at(value), bottom));
            canvas.text("sb-small", (scale.at(value), bottom + 19.0), "middle", &label);
        }
        if let Some(neutral) = self.neutral {
            canvas.line("sb-neutral", (scale.at(neutral), TOP), (scale.at(neutral), bottom));
        }
        for (index, reading) in readings.iter().enumerate() {
            if let (Some(low), Some(high)) = (reading.null_low, reading.null_high) {
                let (start, end) = (scale.at(low), scale.at(high));
                canvas.rectangle("sb-band", (start, row_at(index) - step * 0.27), (end - start, step * 0.54));
            }
            if let Some(mean) = reading.null_mean.map(|mean| scale.at(mean)) {
                canvas.line("sb-mean", (mean, row_at(index) - step * 0.27), (mean, row_at(index) + step * 0.27));
            }
        }
        for (index, pair) in readings.windows(2).enumerate() {
            if let (Some(above), Some(below)) = (pair[0].observed, pair[1].observed) {
                let points = [(scale.at(above), row_at(index)), (scale.at(below), row_at(index + 1))];
                canvas.outline("sb-observed", path_data(points, false));
            }
        }
        for (index, (row, reading)) in rows.iter().zip(&readings).enumerate() {
            let baseline = row_at(index) + 5.0;
            let established = reading.p_family.is_some_and(|p| p <= self.alpha);
            if let Some(observed) = reading.observed {
                canvas.marker((scale.at(observed), row_at(index)), 5.0, established);
            }
            let weight = if established { "sb-strong" } else { "" };
            canvas.text(weight, (LEFT - 10.0, baseline), "end", &depth_label(row.depth_m));
            canvas.text(if established { "sb-strong" } else { "sb-small" }, (WIDTH, baseline), "end", &row.label);
        }
        canvas.line("sb-tick", (LEFT, bottom), (WIDTH - RIGHT, bottom));
        canvas.text("", ((LEFT + WIDTH - RIGHT) / 2.0, bottom + 41.0), "middle", &self.measure);
        key(&mut canvas, bottom + 74.0, self.alpha, false);
        canvas.finish()
    }
}

/// The height of the legend below its first baseline, with some air.
pub(super) const KEY_HEIGHT: f64 = 36.0;

/// The legend shared by the figures that compare an observation with its null; `across` if the mean is a line along the
/// figure and not a stroke in each bar.
pub(super) fn key(canvas: &mut Canvas, y: f64, alpha: f64, across: bool) {
    canvas.rectangle("sb-band", (0.0, y - 11.0), (26.0, 14.0));
    let mean = if across { [(0.0, y - 4.0), (26.0, y - 4.0)] } else { [(13.0, y - 11.0), (13.0, y + 3.0)] };
    canvas.line("sb-mean", mean[0], mean[1]);
    canvas.key((36.0, y), "95 % of what chance gives, and its mean");
    let y = y + 25.0;
    canvas.marker((13.0, y - 4.5), 5.0, true);
    canvas.key((36.0, y), &format!("observed, family p \u{2264} {alpha}"));
    canvas.marker((283.0, y - 4.5), 5.0, false);
    canvas.key((300.0, y), "observed, not beyond chance");
}

#[cfg(test)]
mod tests {
    use super::*;

    fn row(depth_m: f64, observed: Option<f64>, p_family: Option<f64>) -> DepthRow {
        let (null_low, null_mean, null_high) = (Some(0.7), Some(1.0), Some(1.3));
        let reading = Reading { observed, null_low, null_mean, null_high, p_family };
        DepthRow { depth_m, reading, label: "p <script>".into() }
    }

    fn curve(rows: Vec<DepthRow>) -> String {
        let (name, title, description) = ("curve".into(), "Title".into(), "Words".into());
        let measure = "Enrichment (ratio)".into();
        DepthCurve { name, title, description, measure, neutral: Some(1.0), alpha: 0.05, rows }.draw().svg
    }

    #[test]
    fn a_marker_is_filled_at_or_below_alpha_only() {
        let rows = [Some(0.05), Some(0.051), None].map(|p| row(500.0, Some(1.5), p)).to_vec();
        let svg = curve(rows);
        // One more of each in the legend.
        assert_eq!(svg.matches("class=\"sb-full\"").count(), 2);
        assert_eq!(svg.matches("class=\"sb-hollow\"").count(), 3);
        assert!(!svg.contains("<script>"));
    }

    #[test]
    fn what_cannot_be_told_has_no_marker_and_breaks_the_line() {
        let svg = curve(vec![row(500.0, Some(1.2), None), row(900.0, None, None), row(1500.0, Some(1.4), None)]);
        assert_eq!(svg.matches("class=\"sb-hollow\"").count(), 3);
        assert_eq!(svg.matches("class=\"sb-observed\"").count(), 0);
        assert!(svg.contains("1,500 m"));
    }

    #[test]
    fn nothing_to_draw_is_still_a_figure() {
        assert!(!curve(vec![]).contains("NaN"));
        let mut bare = row(500.0, Some(f64::INFINITY), None);
        bare.reading.null_low = Some(f64::NAN);
        let svg = curve(vec![bare]);
        assert!(!svg.contains("NaN") && !svg.contains("inf"));
    }
}
