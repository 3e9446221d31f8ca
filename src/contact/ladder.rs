//! Contacts followed through a ladder of continuation heights.

use geo::Coord;
use rstar::{AABB, RTree, primitives::Line};

use super::drift::{Drift, Track};
use super::line::Contact;
use crate::error::{Error, Result};

/// A contact at another height counts as the same within this many cells, plus the difference of height.
const NEAR_CELLS: f64 = 1.5;

/// Cosine of the largest angle, 60 degrees, between two directions that count as the same sense.
const SAME_SENSE: f64 = 0.5;

/// A contact persists at a height where at least this share of its length is found again.
const PERSISTS: f64 = 0.5;

/// The contacts of one layer at one height.
#[derive(Debug, Clone)]
pub struct Level {
    /// Height of the upward continuation, m.
    pub height: f64,
    /// The contacts found there.
    pub contacts: Vec<Contact>,
}

/// What becomes of one contact of the lowest level on the way up.
#[derive(Debug, Clone, PartialEq)]
pub struct Persistence {
    /// For each higher level, the share of the contact's length that is found again there.
    pub shares: Vec<f64>,
    /// At how many of the higher levels at least half of the length is found again.
    pub levels: usize,
    /// Drift with height of each face, those with the most places first. An open contact has one face; a closed one up to
    /// four, since its sides may dip differently.
    pub faces: Vec<Face>,
}

/// A part of a contact that looks one way.
#[derive(Debug, Clone, PartialEq)]
pub struct Face {
    /// Azimuth that the light side lies toward, degrees in [0, 360): for a closed contact 0, 90, 180 or 270, each standing
    /// for the quarter around it; for an open one opposite to its dense side.
    pub light_side_deg: f64,
    /// How the crest moves.
    pub drift: Drift,
}

/// Contacts of one layer at rising heights, checked.
#[derive(Debug, Clone)]
pub struct Ladder {
    cell: f64,
    levels: Vec<Level>,
    depth: Option<f64>,
}

impl Ladder {
    /// A ladder on a grid with cells of `cell` metres.
    ///
    /// # Errors
    /// A cell that is not positive and finite, fewer than two levels, heights that are negative, not finite or do not rise.
    pub fn new(cell: f64, levels: Vec<Level>) -> Result<Self> {
        if !(cell.is_finite() && cell > 0.0) {
            return Err(Error::input("the cell of a ladder of heights")
                .found(cell)
                .wanted("a positive number of metres")
                .mend("give the frame's cell"));
        }
        if levels.len() < 2 {
            return Err(Error::input("a ladder of heights")
                .found(format!("{} levels", levels.len()))
                .wanted("at least two")
                .mend("continue the layer to more heights, such as 0, 500 and 1000"));
        }
        let good = |height: f64| height.is_finite() && height >= 0.0;
        if let Some(level) = levels.iter().find(|level| !good(level.height)) {
            return Err(Error::input("a ladder of heights")
                .found(level.height)
                .wanted("zero or a positive number of metres, upward")
                .mend("correct the height"));
        }
        if let Some(pair) = levels.windows(2).find(|pair| pair[1].height <= pair[0].height) {
            return Err(Error::input("a ladder of heights")
                .found(format!("{} after {}", pair[1].height, pair[0].height))
                .wanted("heights that rise")
                .mend("put the levels in order, each height once"));
        }
        Ok(Self { cell, levels, depth: None })
    }

    /// With the depth of the middle of the bodies below the ground (height zero), m, where it is known or may be assumed:
    /// better too deep than too shallow. It decides how much drift the width of a body explains. Without it no drift toward
    /// the light side that a narrow body could show is taken for a dip.
    ///
    /// # Errors
    /// A depth that is not positive and finite.
    pub fn with_depth(self, depth: f64) -> Result<Self> {
        if !(depth.is_finite() && depth > 0.0) {
            return Err(Error::input("the depth of bodies under a ladder of heights")
                .found(depth)
                .wanted("a positive number of metres")
                .mend("leave it out if it is not known"));
        }
        Ok(Self { depth: Some(depth), ..self })
    }

    /// Follows each contact of the lowest level upward; the answers stand in the order of its contacts.
    ///
    /// Steps, at each vertex: the normal of the line; where contacts of the next level cross it within 1.5 cells plus the
    /// difference of height, with their dense side on the same side (directions within 60 degrees), the crossing nearest to
    /// the last one; the offsets toward the light side then give the [`Drift`].
    pub fn trace(&self) -> Vec<Persistence> {
        let [base, above @ ..] = &self.levels[..] else { return Vec::new() };
        let trees: Vec<RTree<Line<[f64; 2]>>> = self.levels.iter().map(|level| tree(&level.contacts)).collect();
        let lift = self.levels.last().map_or(0.0, |level| level.height) - base.height;
        base.contacts
            .iter()
            .map(|contact| {
                let mut found = vec![0.0; above.len()];
                let mut whole = 0.0;
                let mut faces: [Vec<Track>; 4] = Default::default();
                for vertex in vertices(contact) {
                    whole += vertex.length;
                    let mut steps = vec![(base.height, 0.0)];
                    let mut last = 0.0;
                    for (at, level) in above.iter().enumerate() {
                        let reach = NEAR_CELLS * self.cell + level.height - base.height;
                        if let Some(offset) = vertex.crossing(&trees[at + 1], reach, SAME_SENSE, last) {
                            last = offset;
                            found[at] += vertex.length;
                            steps.push((level.height, offset));
                        }
                    }
                    // The far side of the body, as far as its width can matter.
                    let far = 8.0 * (self.depth.unwrap_or(lift) + lift);
                    let width = vertex.next_opposite(&trees[0], far, self.cell).unwrap_or(far);
                    let quarter = if contact.closed { vertex.quarter() } else { 0 };
                    faces[quarter].push(Track { steps, length: vertex.length, width });
                }
                let shares: Vec<f64> = found.iter().map(|length| length / whole).collect();
                let levels = shares.iter().filter(|share| **share >= PERSISTS).count();
                let mut faces: Vec<Face> = faces
                    .into_iter()
                    .enumerate()
                    .filter_map(|(quarter, tracks)| {
                        let light_side_deg = if contact.closed {
                            90.0 * quarter as f64
                        } else {
                            (contact.dense_side_deg + 180.0).rem_euclid(360.0)
                        };
                        Some(Face {
                            light_side_deg,
                            drift: Drift::of(&tracks, self.cell, lift, self.depth.map(|depth| depth + base.height))?,
                        })
                    })
                    .collect();
                faces.sort_by_key(|face| std::cmp::Reverse(face.drift.places));
                Persistence { shares, levels, faces }
            })
            .collect()
    }
}

/// The segments of contacts, each with its direction.
fn tree(contacts: &[Contact]) -> RTree<Line<[f64; 2]>> {
    let segments = contacts
        .iter()
        .flat_map(|contact| contact.line.lines())
        .map(|segment| Line::new([segment.start.x, segment.start.y], [segment.end.x, segment.end.y]));
    RTree::bulk_load(segments.collect())
}

/// A vertex of a contact.
pub(super) struct Vertex {
    pub place: Coord<f64>,
    /// Unit vector along the line.
    pub along: Coord<f64>,
    /// Unit vector toward the light side, to the left of the line.
    pub light: Coord<f64>,
    /// Half of the two segments that meet here, m.
    pub length: f64,
}

/// The vertices of a contact, each once, with directions from the neighbours on both sides.
pub(super) fn vertices(contact: &Contact) -> Vec<Vertex> {
    let places = &contact.line.0;
    let count = if contact.closed { places.len().saturating_sub(1) } else { places.len() };
    let neighbour = |at: usize, ahead: bool| match (ahead, contact.closed) {
        (true, true) => places[(at + 1) % count],
        (false, true) => places[(at + count - 1) % count],
        (true, false) => places[(at + 1).min(count - 1)],
        (false, false) => places[at.saturating_sub(1)],
    };
    (0..count)
        .filter_map(|at| {
            let (before, after, place) = (neighbour(at, false), neighbour(at, true), places[at]);
            let run = after - before;
            let length = run.x.hypot(run.y);
            let along = run / length;
            let half = |to: Coord<f64>| (to - place).x.hypot((to - place).y) / 2.0;
            (length > 0.0).then_some(Vertex {
                place,
                along,
                light: Coord { x: -along.y, y: along.x },
                length: half(before) + half(after),
            })
        })
        .collect()
}

impl Vertex {
    /// The offsets toward the light side, within `reach`, at which segments cross the normal, with the cosine between the
    /// directions of segment and contact.
    fn crossings(&self, tree: &RTree<Line<[f64; 2]>>, reach: f64) -> Vec<(f64, f64)> {
        let end = |side: f64| [self.place.x + side * reach * self.light.x, self.place.y + side * reach * self.light.y];
        tree.locate_in_envelope_intersecting(&AABB::from_corners(end(-1.0), end(1.0)))
            .filter_map(|segment| {
                let from = Coord { x: segment.from[0], y: segment.from[1] } - self.place;
                let run = Coord { x: segment.to[0], y: segment.to[1] } - self.place - from;
                // Along the contact the segment starts at `start` and gains `gain`; it crosses the normal at zero.
                let (start, gain) = (dot(from, self.along), dot(run, self.along));
                let share = -start / gain;
                let offset = dot(from, self.light) + share * dot(run, self.light);
                ((0.0..=1.0).contains(&share) && offset.abs() <= reach).then(|| (offset, gain / run.x.hypot(run.y)))
            })
            .collect()
    }

    /// The offset of the crossing of the same sense that is nearest to the offset `last`.
    fn crossing(&self, tree: &RTree<Line<[f64; 2]>>, reach: f64, least_cosine: f64, last: f64) -> Option<f64> {
        let same = self.crossings(tree, reach).into_iter().filter(|(_, cosine)| *cosine >= least_cosine);
        same.map(|(offset, _)| offset).min_by(|a, b| (a - last).abs().total_cmp(&(b - last).abs()).then(a.total_cmp(b)))
    }

    /// The distance on the dense side to the nearest contact of the opposite sense, more than a cell away.
    fn next_opposite(&self, tree: &RTree<Line<[f64; 2]>>, reach: f64, cell: f64) -> Option<f64> {
        let opposite = self.crossings(tree, reach).into_iter().filter(|(_, cosine)| *cosine < 0.0);
        opposite.map(|(offset, _)| -offset).filter(|distance| *distance > cell).min_by(f64::total_cmp)
    }

    /// Which quarter the light side lies toward: 0 north, 1 east, 2 south, 3 west.
    fn quarter(&self) -> usize {
        (self.light.x.atan2(self.light.y).to_degrees().rem_euclid(360.0) / 90.0).round() as usize % 4
    }
}

fn dot(a: Coord<f64>, b: Coord<f64>) -> f64 {
    a.x * b.x + a.y * b.y
}

#[cfg(test)]
mod tests {
    use super::*;

    fn level(height: f64) -> Level {
        Level { height, contacts: Vec::new() }
    }

    #[test]
    fn each_bad_ladder_is_refused() {
        let refused = |cell, heights: &[f64]| {
            Ladder::new(cell, heights.iter().copied().map(level).collect()).unwrap_err().to_string()
        };
        for cell in [f64::NAN, f64::INFINITY, 0.0, -1.0] {
            assert!(refused(cell, &[0.0, 1.0]).contains("the cell"));
        }
        for height in [f64::NAN, f64::INFINITY, -1.0] {
            assert!(refused(1.0, &[0.0, height]).contains("upward"));
        }
        assert!(refused(1.0, &[]).contains("0 levels"));
        assert!(refused(1.0, &[0.0]).contains("1 levels"));
        assert!(refused(1.0, &[0.0, 5.0, 5.0]).contains("5 after 5"));
        let ladder = Ladder::new(1.0, vec![level(0.0), level(5.0)]).unwrap();
        for depth in [f64::NAN, f64::INFINITY, 0.0, -1.0] {
            assert!(ladder.clone().with_depth(depth).unwrap_err().to_string().contains("the depth"));
        }
        assert!(ladder.trace().is_empty());
    }
}
