//! Distance from each cell to the nearest of a set of lines.

use ndarray::Array2;
use rayon::prelude::*;
use rstar::{AABB, PointDistance, RTree, RTreeObject};

use super::Frame;

/// Side of a tile in cells; its cells share one short list of segments. On 512 x 512 cells and 768 segments, sides of 4,
/// 8, 16 and 32 all took 4-12 ms with a cap of 8 cells and 34-61 ms without one.
const TILE: usize = 8;

/// A straight piece of a line in map coordinates, m. Both ends may be one place.
#[derive(Debug, Clone, Copy)]
struct Segment {
    from: [f64; 2],
    to: [f64; 2],
}

impl Segment {
    /// Squared distance to the nearest point of the segment, m2.
    fn squared_distance(&self, [x, y]: [f64; 2]) -> f64 {
        let (along_x, along_y) = (self.to[0] - self.from[0], self.to[1] - self.from[1]);
        let (dx, dy) = (x - self.from[0], y - self.from[1]);
        let squared_length = along_x * along_x + along_y * along_y;
        let share =
            if squared_length > 0.0 { ((dx * along_x + dy * along_y) / squared_length).clamp(0.0, 1.0) } else { 0.0 };
        let (off_x, off_y) = (dx - share * along_x, dy - share * along_y);
        off_x * off_x + off_y * off_y
    }
}

impl RTreeObject for Segment {
    type Envelope = AABB<[f64; 2]>;

    fn envelope(&self) -> Self::Envelope {
        AABB::from_corners(self.from, self.to)
    }
}

impl PointDistance for Segment {
    fn distance_2(&self, point: &[f64; 2]) -> f64 {
        self.squared_distance(*point)
    }
}

/// Distance in metres from each cell centre to the nearest point of any of the lines.
///
/// `lines` are in the frame's map coordinates (m); `most` caps the answer (m, infinity for no cap): cells farther away
/// hold `most`, and so do all cells when there is no line. A line of one vertex counts as a point; pieces with a
/// coordinate that is not finite are passed over. Shape (rows, columns).
///
/// Steps: the segments go into an R-tree; each tile of cells asks once for the segments that can be nearest to any of
/// its cells, namely those no farther from the tile's centre than the nearest one plus the tile's diagonal; each cell
/// then takes the least distance over that list. The answer is exact to rounding.
///
/// ```
/// use geo::line_string;
/// use salband::grid::{Frame, distance_to_lines};
/// let frame = Frame::local(10.0, 3, 3)?;
/// let line = line_string![(x: 5.0, y: 0.0), (x: 5.0, y: 30.0)];
/// let distance = distance_to_lines(&frame, &[line], 15.0);
/// assert_eq!(distance.row(0).to_vec(), [0.0, 10.0, 15.0]);
/// # Ok::<(), salband::Error>(())
/// ```
pub fn distance_to_lines(frame: &Frame, lines: &[geo::LineString<f64>], most: f64) -> Array2<f64> {
    let mut distance = Array2::from_elem(frame.shape(), most);
    let tree = RTree::bulk_load(segments(lines));
    if tree.size() == 0 {
        return distance;
    }
    let band = TILE * frame.cols;
    let Some(cells) = distance.as_slice_mut() else { return distance };
    cells.par_chunks_mut(band).enumerate().for_each(|(index, rows)| {
        let mut near = Vec::new();
        let height = rows.len() / frame.cols;
        for left in (0..frame.cols).step_by(TILE) {
            let width = TILE.min(frame.cols - left);
            let middle_row = (index * TILE) as f64 + (height - 1) as f64 / 2.0;
            let middle_col = left as f64 + (width - 1) as f64 / 2.0;
            let (x, y) = frame.position(middle_row, middle_col);
            let reach = ((height - 1) as f64).hypot((width - 1) as f64) * frame.cell / 2.0;
            let Some(nearest) = tree.nearest_neighbor(&[x, y]) else { continue };
            let closest = nearest.squared_distance([x, y]).sqrt();
            if closest > most + reach {
                continue;
            }
            // A little is added so that rounding never loses the nearest segment itself.
            let within = (closest + 2.0 * reach).min(most + reach) * (1.0 + 1e-9) + 1e-9 * frame.cell;
            near.clear();
            near.extend(tree.locate_within_distance([x, y], within * within).copied());
            for row in 0..height {
                for col in left..left + width {
                    let (x, y) = frame.position((index * TILE + row) as f64, col as f64);
                    let least = near.iter().map(|segment| segment.squared_distance([x, y])).fold(f64::MAX, f64::min);
                    let cell = &mut rows[row * frame.cols + col];
                    *cell = cell.min(least.sqrt());
                }
            }
        }
    });
    distance
}

/// The pieces of the lines whose ends are finite.
fn segments(lines: &[geo::LineString<f64>]) -> Vec<Segment> {
    let place = |coord: &geo::Coord<f64>| [coord.x, coord.y];
    let mut segments = Vec::new();
    for line in lines {
        if let [only] = line.0.as_slice() {
            segments.push(Segment { from: place(only), to: place(only) });
        }
        segments.extend(line.0.windows(2).map(|pair| Segment { from: place(&pair[0]), to: place(&pair[1]) }));
    }
    segments.retain(|segment| segment.from.iter().chain(&segment.to).all(|number| number.is_finite()));
    segments
}

#[cfg(test)]
mod tests {
    use super::*;
    use geo::{Distance, Euclidean, LineString, Point};

    /// Random walks from a linear congruential sequence, so that the test needs no generator.
    fn walks(count: usize, steps: usize, side: f64) -> Vec<LineString<f64>> {
        let mut state = 12345_u64;
        let mut next = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1_u64 << 53) as f64
        };
        (0..count)
            .map(|_| {
                let (mut x, mut y) = (next() * side, next() * side);
                LineString::from_iter((0..steps).map(|_| {
                    x += (next() - 0.5) * side / 50.0;
                    y += (next() - 0.5) * side / 50.0;
                    (x, y)
                }))
            })
            .collect()
    }

    #[test]
    fn equals_a_full_search_with_another_library() {
        let frame = Frame::local(100.0, 37, 53).unwrap();
        let lines = walks(6, 12, 4000.0);
        for most in [350.0, f64::INFINITY] {
            let distance = distance_to_lines(&frame, &lines, most);
            for ((row, col), found) in distance.indexed_iter() {
                let (x, y) = frame.position(row as f64, col as f64);
                // Source: geo's Euclidean distance from a point to a line string.
                let expected =
                    lines.iter().map(|line| Euclidean.distance(&Point::new(x, y), line)).fold(most, f64::min);
                assert!((found - expected).abs() < 1e-6, "{row} {col}: {found} {expected}");
            }
        }
    }

    #[test]
    fn no_usable_line_leaves_the_cap() {
        let frame = Frame::local(1.0, 4, 5).unwrap();
        let broken = LineString::from(vec![(0.0, f64::NAN), (2.0, 2.0)]);
        assert!(distance_to_lines(&frame, &[], 7.0).iter().all(|value| *value == 7.0));
        assert!(distance_to_lines(&frame, &[broken], 7.0).iter().all(|value| *value == 7.0));
    }

    #[test]
    fn a_line_of_one_vertex_is_a_point() {
        let frame = Frame::local(1.0, 9, 9).unwrap();
        let point = LineString::from(vec![(0.5, 8.5)]);
        assert_eq!(distance_to_lines(&frame, &[point], 100.0)[[4, 3]], 5.0);
    }
}
