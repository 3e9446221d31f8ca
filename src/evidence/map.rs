//! A map of one depth: conductors over contacts over a quiet background.

use geo::{LineString, MultiPolygon};
use svg::Node;
use svg::node::element::{ClipPath, Group, Image, Line, Path as Outline, Pattern, Rectangle};

use super::colours::Colours;
use super::figure::{Canvas, Figure, WIDTH, place};
use super::map_key::{key, key_height};
use super::map_shapes::{area_data, contact_data, line_data, tick_data, void_data};
use super::picture::{data_uri, png, quantile_range, reduced};
use crate::error::Result;
use crate::grid::{Frame, Grid, Mask};

/// A raster drawn under everything else.
#[derive(Debug, Clone)]
pub struct Background<'a> {
    /// The layer, on the frame of the map.
    pub grid: &'a Grid,
    /// How its numbers become colours.
    pub colours: Colours,
    /// The unit and what it shows, for the legend behind the highest number: `mGal/km, gravity gradient`; up to about 30
    /// letters.
    pub label: String,
}

/// The side of a line, seen along its direction from the first vertex to the last.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// To the left.
    Left,
    /// To the right.
    Right,
}

/// A contact as drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct ContactLine {
    /// The line, in the frame's coordinates.
    pub line: LineString<f64>,
    /// The dense side, on which ticks are drawn; `None` where it is not known.
    pub dense_side: Option<Side>,
}

/// A known deposit, or any other named place.
#[derive(Debug, Clone, PartialEq)]
pub struct Deposit {
    /// The name, drawn where there is room for it.
    pub name: String,
    /// Easting, m.
    pub x: f64,
    /// Northing, m.
    pub y: f64,
}

/// A map of one depth.
#[derive(Debug, Clone)]
pub struct MapFigure<'a> {
    /// Name of the file, without extension.
    pub name: String,
    /// Title, drawn above.
    pub title: String,
    /// What the figure shows, in words.
    pub description: String,
    /// The frame, which is also the extent of the map.
    pub frame: &'a Frame,
    /// What is drawn underneath.
    pub background: Option<Background<'a>>,
    /// The cells with data; the others are hatched.
    pub footprint: Option<&'a Mask>,
    /// The outlines of the conductors, in the frame's coordinates.
    pub conductors: &'a [MultiPolygon<f64>],
    /// The contacts.
    pub contacts: &'a [ContactLine],
    /// Lines from a map: faults, dykes, outlines of units.
    pub mapped: &'a [LineString<f64>],
    /// Known deposits.
    pub deposits: &'a [Deposit],
}

pub(super) const LEFT: f64 = 58.0;
pub(super) const RIGHT: f64 = 10.0;
const TOP: f64 = 58.0;
/// The tallest that a map may be, so that a narrow strip does not fill several screens.
const TALLEST: f64 = 620.0;
/// The most pixels on a side of the background: more cannot be seen, and every map of a page carries its own.
const MOST_PIXELS: usize = 1024;

/// From the frame's coordinates to places in the figure.
#[derive(Debug, Clone, Copy)]
pub(super) struct Projection {
    west: f64,
    north: f64,
    left: f64,
    top: f64,
    /// Units of the figure in one metre.
    pub(super) per_metre: f64,
}

impl Projection {
    fn new(frame: &Frame) -> Self {
        let (width, height) = (frame.east() - frame.west, frame.north - frame.south());
        let room = WIDTH - LEFT - RIGHT;
        let per_metre = (room / width).min(TALLEST / height);
        let left = LEFT + (room - width * per_metre) / 2.0;
        Self { west: frame.west, north: frame.north, left, top: TOP, per_metre }
    }

    /// The place of an easting and northing.
    pub(super) fn at(&self, x: f64, y: f64) -> (f64, f64) {
        (self.left + (x - self.west) * self.per_metre, self.top + (self.north - y) * self.per_metre)
    }
}

impl MapFigure<'_> {
    /// Draws the figure.
    ///
    /// # Errors
    /// A background that cannot be drawn.
    pub fn draw(&self) -> Result<Figure> {
        let projection = Projection::new(self.frame);
        let (left, top) = projection.at(self.frame.west, self.frame.north);
        let (right, bottom) = projection.at(self.frame.east(), self.frame.south());
        let size = (right - left, bottom - top);
        let key_top = bottom + 66.0;
        let mut canvas = Canvas::new(&self.name, &self.title, &self.description, key_top + key_height(self));
        canvas.rectangle("sb-void", (left, top), size);

        let clip = format!("{}-clip", canvas.id);
        let edge = Rectangle::new().set("x", place(left)).set("y", place(top));
        let edge = edge.set("width", place(size.0)).set("height", place(size.1));
        canvas.add(ClipPath::new().set("id", clip.clone()).add(edge));
        let mut inside = Group::new().set("clip-path", format!("url(#{clip})"));
        let range = self.background(&mut inside, (left, top), size)?;
        let mut draw = |class: &str, data: String| {
            if !data.is_empty() {
                inside.append(Outline::new().set("class", class).set("d", data).set("fill-rule", "evenodd"));
            }
        };
        if let Some(footprint) = self.footprint {
            draw("sb-void", void_data(footprint, self.frame, &projection));
        }
        for body in self.conductors {
            draw("sb-conductor", area_data(body, &projection));
        }
        // On a coloured background a line of any one colour is lost somewhere, so the contacts get a pale casing.
        let coloured = self.background.as_ref().is_some_and(|background| background.colours != Colours::Quiet);
        for contact in self.contacts.iter().filter(|_| coloured) {
            draw("sb-casing", contact_data(contact, &projection));
            draw("sb-casing", tick_data(contact, &projection));
        }
        for line in self.mapped.iter().filter(|_| coloured) {
            draw("sb-casing", line_data(line, &projection, false));
        }
        for line in self.mapped {
            draw("sb-mapped", line_data(line, &projection, false));
        }
        for contact in self.contacts {
            draw("sb-contact", contact_data(contact, &projection));
            draw("sb-contact", tick_data(contact, &projection));
        }
        canvas.add(inside);
        self.hatching(&mut canvas, &projection);
        self.deposits(&mut canvas, &projection, (right, bottom));
        self.border(&mut canvas, &projection, (left, top), (right, bottom));
        key(&mut canvas, self, range, key_top);
        Ok(canvas.finish())
    }

    /// Draws the background and returns the values at the ends of its colours.
    fn background(
        &self,
        group: &mut Group,
        (left, top): (f64, f64),
        (width, height): (f64, f64),
    ) -> Result<Option<(f64, f64)>> {
        let Some(background) = &self.background else { return Ok(None) };
        let (values, side) = reduced(background.grid.values(), MOST_PIXELS);
        let Some(range) = quantile_range(&values, 0.01, 0.99) else { return Ok(None) };
        let picture = data_uri(&png(&values, range, background.colours)?);
        let class = if background.colours == Colours::Quiet { "sb-quiet" } else { "sb-raster" };
        // Blocks of cells at the eastern and southern edge may reach beyond the frame; there they are clipped.
        let (rows, cols) = self.frame.shape();
        let (height, width) = (
            height * (values.nrows() * side) as f64 / rows as f64,
            width * (values.ncols() * side) as f64 / cols as f64,
        );
        group.append(
            Image::new()
                .set("class", class)
                .set("x", place(left))
                .set("y", place(top))
                .set("width", place(width))
                .set("height", place(height))
                .set("preserveAspectRatio", "none")
                .set("href", picture),
        );
        Ok(Some(range))
    }

    /// Diagonal hatching over the cells without data.
    fn hatching(&self, canvas: &mut Canvas, projection: &Projection) {
        let Some(footprint) = self.footprint else { return };
        let void = void_data(footprint, self.frame, projection);
        if void.is_empty() {
            return;
        }
        let id = format!("{}-hatch", canvas.id);
        let line = Line::new().set("class", "sb-hatch").set("x1", 0).set("x2", 0).set("y1", 0).set("y2", 6);
        canvas.add(
            Pattern::new()
                .set("id", id.clone())
                .set("width", 6)
                .set("height", 6)
                .set("patternUnits", "userSpaceOnUse")
                .set("patternTransform", "rotate(45)")
                .add(line),
        );
        canvas.add(Outline::new().set("d", void).set("fill", format!("url(#{id})")));
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use geo::{Coord, polygon};
    use ndarray::Array2;

    fn drawn(deposits: &[Deposit], footprint: Option<&Mask>, background: Option<&Grid>, frame: &Frame) -> String {
        let body = MultiPolygon(vec![polygon![(x: 0.0, y: 0.0), (x: 1000.0, y: 0.0), (x: 1000.0, y: 1000.0)]]);
        let line = LineString::from(vec![(0.0, 0.0), (4000.0, 3000.0)]);
        let contacts =
            [ContactLine { line: line.clone(), dense_side: Some(Side::Left) }, ContactLine { line, dense_side: None }];
        let figure = MapFigure {
            name: "map".into(),
            title: "Map <b>".into(),
            description: "Words".into(),
            frame,
            background: background.map(|grid| Background { grid, colours: Colours::Quiet, label: "Gradient".into() }),
            footprint,
            conductors: &[body],
            contacts: &contacts,
            mapped: &[LineString::from(vec![(0.0, 2000.0), (4000.0, 2000.0)])],
            deposits,
        };
        figure.draw().unwrap().svg
    }

    #[test]
    fn everything_is_drawn_where_it_belongs() {
        let frame = Frame::local(100.0, 30, 40).unwrap();
        let grid = Grid::new(frame.clone(), Array2::from_shape_fn((30, 40), |(row, col)| (row + col) as f64)).unwrap();
        let mut holes = Mask::all((30, 40));
        holes.0[(3, 4)] = false;
        let deposit = |name: &str, x: f64, y: f64| Deposit { name: name.into(), x, y };
        let deposits = [deposit("<Alder>", 2000.0, 1500.0), deposit("Outside", -50.0, 0.0)];
        let svg = drawn(&deposits, Some(&holes), Some(&grid), &frame);
        assert!(svg.contains("data:image/png;base64,") && svg.contains("&lt;Alder&gt;") && !svg.contains("Outside"));
        assert!(!svg.contains("NaN") && svg.contains("sb-hatch") && svg.contains("No data"));
        assert_eq!(svg.matches("class=\"sb-mapped\"").count(), 2, "the line and the legend");
        // The scale of the figure: 4,000 m over the room of 520 - 58 - 10 units.
        let projection = Projection::new(&frame);
        assert_eq!(projection.at(0.0, 3000.0), (58.0, 58.0));
        assert!((projection.at(4000.0, 0.0).0 - 510.0).abs() < 1e-9);
        assert!((projection.per_metre - 452.0 / 4000.0).abs() < 1e-12);
    }

    #[test]
    fn names_give_way_to_each_other() {
        let frame = Frame::local(100.0, 30, 40).unwrap();
        let crowd: Vec<Deposit> = (0..30)
            .map(|index| Deposit { name: format!("Hill {index}"), x: 2000.0 + f64::from(index), y: 1500.0 })
            .collect();
        let svg = drawn(&crowd, None, None, &frame);
        // One in the legend besides.
        assert_eq!(svg.matches("class=\"sb-deposit\"").count(), 31);
        let named = svg.matches("class=\"sb-place\"").count();
        assert!((1..=4).contains(&named), "{named}");
    }

    #[test]
    fn a_narrow_strip_stays_on_the_page_and_missing_layers_are_left_out() {
        let frame = Frame::local(100.0, 4000, 2).unwrap();
        let empty = Grid::new(frame.clone(), Array2::from_elem((4000, 2), f64::NAN)).unwrap();
        let svg = drawn(&[], None, Some(&empty), &frame);
        assert!(!svg.contains("NaN") && !svg.contains("data:image") && !svg.contains("Known deposit"));
        let (_, bottom) = Projection::new(&frame).at(0.0, 0.0);
        assert!(bottom <= TOP + TALLEST + 1e-9);
    }

    #[test]
    fn ticks_stand_on_the_dense_side() {
        let frame = Frame::local(100.0, 30, 40).unwrap();
        let projection = Projection::new(&frame);
        // Eastwards along northing 1,500: the left side is north, which is up, so ticks have smaller y.
        let eastward = LineString(vec![Coord { x: 0.0, y: 1500.0 }, Coord { x: 4000.0, y: 1500.0 }]);
        let (_, y) = projection.at(0.0, 1500.0);
        for (side, sign) in [(Side::Left, -1.0), (Side::Right, 1.0)] {
            let data = tick_data(&ContactLine { line: eastward.clone(), dense_side: Some(side) }, &projection);
            let tips: Vec<f64> = data
                .split('M')
                .skip(1)
                .map(|tick| tick.rsplit(' ').next().unwrap().parse::<f64>().unwrap() - y)
                .collect();
            assert!(tips.len() > 10 && tips.iter().all(|tip| (tip - sign * 5.0).abs() < 0.02), "{data}");
        }
    }
}
