//! Outlines of bodies along the edges of their cells.

use geo::{Coord, LineString, MultiPolygon, Polygon};
use ndarray::Array2;

use super::body::Bodies;
use super::label::{Connection, labels, pieces};
use crate::grid::Frame;

/// The sides of a cell in the order in which a walk with the cell on its left meets them: south, east, north, west; as
/// (rows, columns) of the step across the side.
const ACROSS: [(isize, isize); 4] = [(1, 0), (0, 1), (-1, 0), (0, -1)];

/// Where such a walk along a side ends, as (rows, columns) from the cell's north-western corner.
const END: [(usize, usize); 4] = [(1, 1), (0, 1), (0, 0), (1, 0)];

type Corner = (usize, usize);

/// The rings of one part: the outer one and the holes.
#[derive(Default, Clone)]
struct Rings {
    outer: Option<LineString<f64>>,
    holes: Vec<LineString<f64>>,
}

/// The outline of each body in map coordinates (m), in the order of [`Bodies::bodies`].
///
/// Outer rings run anticlockwise and holes clockwise, all are closed and none touches itself; cells that meet only at a
/// corner come in different polygons of one body, so that each polygon is valid. Vertices stand only where the outline turns.
pub fn outlines(bodies: &Bodies, frame: &Frame) -> Vec<MultiPolygon<f64>> {
    let parts = pieces(&bodies.mask, Connection::Sides);
    let part_of = labels(bodies.mask.shape(), &parts);
    let mut rings = vec![Rings::default(); parts.len()];
    for (part, corners) in walked(&part_of) {
        for ring in simple(corners) {
            let places: Vec<Coord<f64>> = ring
                .iter()
                .chain(ring.first())
                .map(|&(row, col)| frame.position(row as f64 - 0.5, col as f64 - 0.5).into())
                .collect();
            let line = LineString(places);
            let rings = &mut rings[part as usize - 1];
            if twice_area(&ring) > 0 { rings.outer = Some(line) } else { rings.holes.push(line) }
        }
    }
    let mut outlines = vec![MultiPolygon(Vec::new()); bodies.bodies.len()];
    for (cells, Rings { outer, holes }) in parts.iter().zip(rings) {
        let body = bodies.labels[cells[0]] as usize;
        if let (Some(outer), Some(outline)) = (outer, outlines.get_mut(body.wrapping_sub(1))) {
            outline.0.push(Polygon::new(outer, holes));
        }
    }
    outlines
}

/// Every closed walk around a part, the part on its left, as the part's label and the corners where the walk turns.
fn walked(part_of: &Array2<u32>) -> Vec<(u32, Vec<Corner>)> {
    let same = |cell: Corner, side: usize| {
        let (down, across) = ACROSS[side];
        let next = (cell.0.wrapping_add_signed(down), cell.1.wrapping_add_signed(across));
        (part_of.get(next) == Some(&part_of[cell])).then_some(next)
    };
    let mut seen = Array2::from_elem(part_of.dim(), [false; 4]);
    let mut walks = Vec::new();
    for (start, &part) in part_of.indexed_iter().filter(|(_, part)| **part != 0) {
        for first in 0..4 {
            if seen[start][first] || same(start, first).is_some() {
                continue;
            }
            let (mut cell, mut side) = (start, first);
            let mut corners = Vec::new();
            while !seen[cell][side] {
                seen[cell][side] = true;
                let corner = (cell.0 + END[side].0, cell.1 + END[side].1);
                let onward = (side + 1) % 4;
                match same(cell, onward) {
                    None => {
                        corners.push(corner);
                        side = onward;
                    }
                    Some(beside) => match same(beside, side) {
                        None => cell = beside,
                        Some(ahead) => {
                            corners.push(corner);
                            cell = ahead;
                            side = (side + 3) % 4;
                        }
                    },
                }
            }
            walks.push((part, corners));
        }
    }
    walks
}

/// A closed walk cut at each corner that it passes twice.
fn simple(walk: Vec<Corner>) -> Vec<Vec<Corner>> {
    let mut rings = Vec::new();
    let mut path: Vec<Corner> = Vec::new();
    let mut place = std::collections::BTreeMap::new();
    for corner in walk {
        if let Some(&at) = place.get(&corner) {
            let ring: Vec<Corner> = path.split_off(at);
            for passed in &ring {
                place.remove(passed);
            }
            rings.push(ring);
        }
        place.insert(corner, path.len());
        path.push(corner);
    }
    rings.push(path);
    rings
}

/// Twice the signed area of a ring in cells, positive if it runs anticlockwise on the map (rows run south).
fn twice_area(ring: &[Corner]) -> i64 {
    let next = ring.iter().cycle().skip(1);
    ring.iter().zip(next).map(|(a, b)| a.0 as i64 * b.1 as i64 - a.1 as i64 * b.0 as i64).sum()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::conductor::{Side, Threshold, find_bodies};
    use crate::grid::Grid;
    use geo::orient::{Direction, Orient};
    use geo::{Area, Validation};
    use proptest::prelude::*;

    fn bodies(cells: Array2<bool>) -> (Bodies, Frame) {
        let frame = Frame::local(10.0, cells.nrows(), cells.ncols()).unwrap();
        let slice = Grid::new(frame.clone(), cells.mapv(|set| if set { 1.0 } else { 3.0 })).unwrap();
        (find_bodies(&slice, Side::Conductor, Threshold::Absolute(100.0), 0.0, 0).unwrap(), frame)
    }

    fn drawn(lines: &[&str]) -> Array2<bool> {
        let cells: Vec<bool> = lines.iter().flat_map(|line| line.bytes().map(|byte| byte == b'#')).collect();
        Array2::from_shape_vec((lines.len(), lines[0].len()), cells).unwrap()
    }

    #[test]
    fn a_frame_with_a_hole_has_two_rings() {
        let (bodies, frame) = bodies(drawn(&["###.", "#.#.", "###."]));
        let outline = &outlines(&bodies, &frame)[0];
        assert_eq!(outline.0.len(), 1);
        assert_eq!((outline.0[0].exterior().0.len(), outline.0[0].interiors().len()), (5, 1));
        assert_eq!(outline.unsigned_area(), 800.0);
    }

    #[test]
    fn a_hole_that_touches_a_corner_or_another_hole_stays_valid() {
        for lines in [["#####", "#.###", "##.##", "####."], ["####.", "##.#.", "####.", "...#."]] {
            let (bodies, frame) = bodies(drawn(&lines));
            let outline = &outlines(&bodies, &frame)[0];
            assert!(outline.is_valid(), "{outline:?}");
            assert_eq!(outline.unsigned_area(), bodies.bodies[0].area_m2);
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(64) })]

        #[test]
        fn outlines_have_the_area_of_their_bodies(
            cells in proptest::collection::vec(proptest::bool::weighted(0.6), 99)
        ) {
            let cells = Array2::from_shape_vec((9, 11), cells).unwrap();
            prop_assume!(cells.iter().any(|set| *set) && !cells.iter().all(|set| *set));
            let (bodies, frame) = bodies(cells);
            let outlines = outlines(&bodies, &frame);
            prop_assert_eq!(outlines.len(), bodies.bodies.len());
            for (outline, body) in outlines.iter().zip(&bodies.bodies) {
                prop_assert!((outline.unsigned_area() - body.area_m2).abs() < 1e-6);
                // Source: geo's own check of simple features, and its own orientation.
                prop_assert!(outline.is_valid(), "{:?}", outline);
                prop_assert_eq!(&outline.orient(Direction::Default), outline);
            }
        }
    }
}
