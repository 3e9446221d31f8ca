//! Lines carried into another system, with vertices added where a straight edge bends.

use geo::{Coord, Intersects, LineString, Rect};

use super::{Crs, carry};
use crate::error::{Error, Result};

/// Where an edge is tested and split. Off the middle, so that an edge whose image bends like an S is seen as well.
const SHARE: f64 = 0.4;
/// Splits of one edge at most; each shortens the error about fourfold.
const MOST_SPLITS: usize = 16;

/// A vertex in both systems.
#[derive(Clone, Copy)]
struct Vertex {
    old: Coord<f64>,
    new: Coord<f64>,
    /// True if the edge that starts here has yet to be tested.
    open: bool,
}

/// Carries lines from one system into another.
///
/// An edge near `ground` is split until its image strays less than `tolerance` (units of the new system) from the
/// straight line between its ends. Both directions of an edge are split at the same places, so that neighbours which
/// share it still share it.
///
/// # Errors
/// A vertex that has no place in the new system.
pub(super) fn carry_lines(
    lines: Vec<LineString<f64>>,
    (from, into): (&Crs, &Crs),
    ground: &Rect<f64>,
    tolerance: f64,
) -> Result<Vec<LineString<f64>>> {
    if let Some(at) = lines.iter().flat_map(|line| &line.0).find(|at| !(at.x.is_finite() && at.y.is_finite())) {
        return Err(lost((at.x, at.y), from, into));
    }
    if from.wkt == into.wkt {
        return Ok(lines);
    }
    let lines: Vec<LineString<f64>> = if from.geographic { lines.into_iter().map(unwrapped).collect() } else { lines };
    let new = carried(lines.iter().flat_map(|line| line.0.iter().copied()), from, into)?;
    let mut new = new.into_iter();
    let mut placed: Vec<Vec<Vertex>> = lines
        .iter()
        .map(|line| line.0.iter().zip(new.by_ref()).map(|(&old, new)| Vertex { old, new, open: true }).collect())
        .collect();
    for _ in 0..MOST_SPLITS {
        for line in &mut placed {
            close_distant(line, ground, tolerance);
        }
        let tests: Vec<Coord<f64>> =
            placed.iter().flat_map(|line| line.windows(2)).filter(|pair| pair[0].open).map(split_place).collect();
        if tests.is_empty() {
            break;
        }
        let images = carried(tests.iter().copied(), from, into)?;
        let mut tested = tests.into_iter().zip(images);
        for line in &mut placed {
            *line = split(line, &mut tested, tolerance);
        }
    }
    Ok(placed.into_iter().map(|line| line.into_iter().map(|vertex| vertex.new).collect()).collect())
}

/// The line with longitudes that do not jump where they pass 180 degrees.
fn unwrapped(mut line: LineString<f64>) -> LineString<f64> {
    for index in 1..line.0.len() {
        let jump = line.0[index].x - line.0[index - 1].x;
        line.0[index].x -= 360.0 * (jump / 360.0).round();
    }
    line
}

fn carried(points: impl Iterator<Item = Coord<f64>>, from: &Crs, into: &Crs) -> Result<Vec<Coord<f64>>> {
    let points: Vec<(f64, f64)> = points.map(|at| (at.x, at.y)).collect();
    let images = carry(&points, from, into)?;
    match images.iter().position(|(x, y)| !(x.is_finite() && y.is_finite())) {
        Some(index) => Err(lost(points[index], from, into)),
        None => Ok(images.into_iter().map(|(x, y)| Coord { x, y }).collect()),
    }
}

fn lost(place: (f64, f64), from: &Crs, into: &Crs) -> Error {
    Error::input("a point of a line")
        .found(format!("{place:?} in {}, which has no place in {}", from.name, into.name))
        .wanted("points that both systems cover")
        .mend("check the coordinate system of the layer")
}

/// Leaves alone the edges that cannot reach the ground, and those too short to stray.
fn close_distant(line: &mut [Vertex], ground: &Rect<f64>, tolerance: f64) {
    for index in 1..line.len() {
        let (a, b) = (line[index - 1].new, line[index].new);
        let reach = (b - a).x.hypot((b - a).y);
        let grown = Rect::new(
            Coord { x: a.x.min(b.x) - reach, y: a.y.min(b.y) - reach },
            Coord { x: a.x.max(b.x) + reach, y: a.y.max(b.y) + reach },
        );
        line[index - 1].open &= reach > tolerance && grown.intersects(ground);
    }
}

/// The place on an edge, in the old system, where it is tested; the same from both of its ends.
fn split_place(pair: &[Vertex]) -> Coord<f64> {
    let (a, b) = (pair[0].old, pair[1].old);
    let (first, second) = if (a.x, a.y) <= (b.x, b.y) { (a, b) } else { (b, a) };
    first + (second - first) * SHARE
}

/// Adds the tested places whose images stray.
fn split(line: &[Vertex], tested: &mut impl Iterator<Item = (Coord<f64>, Coord<f64>)>, tolerance: f64) -> Vec<Vertex> {
    let mut grown = Vec::with_capacity(line.len());
    for (index, &vertex) in line.iter().enumerate() {
        let next = line.get(index + 1);
        match next {
            Some(next) if vertex.open => {
                let Some((old, new)) = tested.next() else { continue };
                let strays = distance(new, vertex.new, next.new) > tolerance;
                grown.push(Vertex { open: strays, ..vertex });
                if strays {
                    grown.push(Vertex { old, new, open: true });
                }
            }
            _ => grown.push(vertex),
        }
    }
    grown
}

/// Distance of a point from the straight line between two others.
fn distance(at: Coord<f64>, from: Coord<f64>, to: Coord<f64>) -> f64 {
    let (along, off) = (to - from, at - from);
    let length = along.x.hypot(along.y);
    if length > 0.0 { (along.x * off.y - along.y * off.x).abs() / length } else { off.x.hypot(off.y) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn systems() -> (Crs, Crs) {
        (Crs::from_definition("EPSG:4326").unwrap(), Crs::from_definition("EPSG:32633").unwrap())
    }

    fn everywhere() -> Rect<f64> {
        Rect::new(Coord { x: -1e8, y: -1e8 }, Coord { x: 1e8, y: 1e8 })
    }

    #[test]
    fn a_parallel_is_followed_as_closely_as_asked() {
        // Each place of the parallel, carried by PROJ on its own, lies within the tolerance of the line.
        let (geographic, utm) = systems();
        let line = LineString::from(vec![(12.0, 60.0), (18.0, 60.0)]);
        let bent = carry_lines(vec![line], (&geographic, &utm), &everywhere(), 1.0).unwrap().remove(0);
        assert!(bent.0.len() > 20, "{}", bent.0.len());
        let places: Vec<(f64, f64)> = (0..=1000).map(|k| (12.0 + 0.006 * f64::from(k), 60.0)).collect();
        let worst = carry(&places, &geographic, &utm).unwrap().into_iter().fold(0.0f64, |worst, (x, y)| {
            let off = bent.0.windows(2).filter(|pair| pair[0].x <= x && x <= pair[1].x);
            worst.max(off.map(|pair| distance(Coord { x, y }, pair[0], pair[1])).fold(f64::INFINITY, f64::min))
        });
        assert!(worst < 1.1, "{worst} m");
    }

    #[test]
    fn both_directions_of_an_edge_are_one_line() {
        let (geographic, utm) = systems();
        let forth = LineString::from(vec![(12.0, 58.0), (18.0, 61.0)]);
        let back = forth.0.iter().rev().copied().collect();
        let mut both = carry_lines(vec![forth, back], (&geographic, &utm), &everywhere(), 1.0).unwrap();
        let mut back = both.remove(1);
        back.0.reverse();
        assert_eq!(both[0], back);
    }

    #[test]
    fn a_line_across_the_antimeridian_goes_the_short_way() {
        let geographic = Crs::from_definition("EPSG:4326").unwrap();
        let utm = Crs::from_definition("EPSG:32660").unwrap();
        let line = LineString::from(vec![(179.5, 10.0), (-179.5, 10.0)]);
        let bent = carry_lines(vec![line], (&geographic, &utm), &everywhere(), 1.0).unwrap().remove(0);
        // One degree of longitude at 10 degrees of latitude: about 111.320 km x cos 10 (from memory), 109.6 km.
        let ends = bent.0[bent.0.len() - 1].x - bent.0[0].x;
        assert!((ends - 109_640.0).abs() < 300.0, "{ends}");
        assert!(bent.0.windows(2).all(|pair| pair[1].x > pair[0].x));
    }

    #[test]
    fn a_place_without_an_image_is_refused() {
        let (geographic, utm) = systems();
        let unknown = LineString::from(vec![(15.0, 50.0), (f64::NAN, 50.0)]);
        for into in [&utm, &geographic] {
            assert!(carry_lines(vec![unknown.clone()], (&geographic, into), &everywhere(), 1.0).is_err());
        }
        let line = LineString::from(vec![(15.0, 50.0), (15.0, 95.0)]);
        let error = carry_lines(vec![line], (&geographic, &utm), &everywhere(), 1.0).unwrap_err().to_string();
        assert_eq!(
            error,
            "a point of a line: found (15.0, 95.0) in EPSG:4326, which has no place in EPSG:32633; wanted points that \
             both systems cover. To mend it: check the coordinate system of the layer."
        );
    }
}
