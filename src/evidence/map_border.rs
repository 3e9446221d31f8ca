//! What stands on and around a map: the border with its coordinates, the scale bar, the north arrow, named places.

use super::axis::{Scale, round_step};
use super::figure::{Canvas, WIDTH, path_data, place};
use super::map::{LEFT, MapFigure, Projection, RIGHT};
use super::number::distance_label;

impl MapFigure<'_> {
    /// Deposits as diamonds, each with its name where that covers no other name.
    pub(super) fn deposits(&self, canvas: &mut Canvas, projection: &Projection, (right, bottom): (f64, f64)) {
        let mut taken: Vec<[f64; 4]> = Vec::new();
        let places: Vec<(f64, f64)> = self.deposits.iter().map(|deposit| projection.at(deposit.x, deposit.y)).collect();
        let (left, top) = projection.at(self.frame.west, self.frame.north);
        let on_map = |&(x, y): &(f64, f64)| x >= left && x <= right && y >= top && y <= bottom;
        taken.extend(places.iter().filter(|at| on_map(at)).map(|(x, y)| [x - 6.0, y - 6.0, x + 6.0, y + 6.0]));
        for (deposit, &(x, y)) in self.deposits.iter().zip(&places).filter(|(_, at)| on_map(at)) {
            canvas.outline("sb-deposit", path_data([(x, y - 6.0), (x + 5.0, y), (x, y + 6.0), (x - 5.0, y)], true));
            // Seven units for a letter: what the wider of the common sans-serifs take at a size of 12.
            let width = deposit.name.chars().count() as f64 * 7.0;
            let sides = [
                ("start", x + 9.0, y + 4.0),
                ("end", x - 9.0, y + 4.0),
                ("middle", x, y - 11.0),
                ("middle", x, y + 19.0),
            ];
            for (anchor, text_x, text_y) in sides {
                let start = match anchor {
                    "start" => text_x,
                    "end" => text_x - width,
                    _ => text_x - width / 2.0,
                };
                let span = [start, text_y - 11.0, start + width, text_y + 3.0];
                let fits = span[0] >= left && span[1] >= top && span[2] <= right && span[3] <= bottom;
                let free = |other: &[f64; 4]| {
                    span[2] < other[0] || other[2] < span[0] || span[3] < other[1] || other[3] < span[1]
                };
                if fits && taken.iter().all(free) {
                    canvas.text("sb-place", (text_x, text_y), anchor, &deposit.name);
                    taken.push(span);
                    break;
                }
            }
        }
    }

    /// The border with its coordinates, the scale bar and the north arrow.
    pub(super) fn border(
        &self,
        canvas: &mut Canvas,
        projection: &Projection,
        (left, top): (f64, f64),
        (right, bottom): (f64, f64),
    ) {
        canvas.rectangle("sb-frame", (left, top), (right - left, bottom - top));
        let frame = self.frame;
        let wanted = |length: f64, each: f64| ((length / each) as usize).clamp(1, 5);
        let east = Scale::new((frame.west / 1000.0, frame.east() / 1000.0), (left, right));
        for (value, label) in east.ticks(wanted(right - left, 80.0)) {
            canvas.line("sb-tick", (east.at(value), bottom), (east.at(value), bottom + 5.0));
            canvas.text("sb-small", (east.at(value), bottom + 20.0), "middle", &label);
        }
        let north = Scale::new((frame.south() / 1000.0, frame.north / 1000.0), (bottom, top));
        for (value, label) in north.ticks(wanted(bottom - top, 60.0)) {
            canvas.line("sb-tick", (left - 5.0, north.at(value)), (left, north.at(value)));
            canvas.text("sb-small", (left - 9.0, north.at(value) + 4.5), "end", &label);
        }
        canvas.text("sb-small", (left, top - 10.0), "start", "Northing, km");
        // A long name would run into the scale bar.
        let easting: String = format!("Easting, km ({}", frame.crs.name).chars().take(32).collect();
        canvas.text("sb-small", (LEFT, bottom + 42.0), "start", &format!("{easting})"));

        canvas.text("sb-small", (right - 18.0, top - 10.0), "end", "Grid north");
        canvas.outline("sb-ink", format!("M{0} {1}l5 14l-5 -4l-5 4Z", place(right - 8.0), place(top - 23.0)));

        // Two tones, so that half the length can be read too.
        let metres = round_step((frame.east() - frame.west) * 1.2, 6).min(frame.east() - frame.west);
        let length = metres * projection.per_metre;
        let (bar_left, bar_top) = (WIDTH - RIGHT - length, bottom + 34.0);
        canvas.rectangle("sb-ink", (bar_left, bar_top), (length / 2.0, 5.0));
        canvas.rectangle("sb-frame", (bar_left, bar_top), (length, 5.0));
        canvas.text("sb-small", (bar_left - 8.0, bar_top + 8.0), "end", &distance_label(metres));
    }
}
