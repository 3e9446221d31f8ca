//! Linking of crest points into chains.

use ndarray::Array2;
use rayon::prelude::*;

use super::crest::CrestPoint;
use super::thin::{beside, count_around, set_around, thin};

/// A side branch of fewer cells than this is taken for a fringe of the chain that it leaves, and cleared.
const LEAST_BRANCH: usize = 4;

/// Marks a cell without a crest. A frame has fewer cells than this ([`crate::grid::Frame::MOST_CELLS`]), so 32 bits do.
const NONE: u32 = u32::MAX;

/// A cell as (row, column).
type Cell = (usize, usize);

/// A chain of crest points, as indices into their list, in order along the crest.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Chain {
    pub points: Vec<u32>,
    /// True if the last point leads back to the first (which is not repeated).
    pub closed: bool,
}

/// Links crest points on an array of `shape` into chains.
///
/// Steps: keep the points to be followed that hang together, by eight neighbours, with one where a line may start; thin to
/// one cell wide; clear short side branches; walk from ends and junctions, then around rings.
pub(super) fn chains(
    shape: (usize, usize),
    crests: &[CrestPoint],
    follows: impl Fn(&CrestPoint) -> bool,
    starts: impl Fn(&CrestPoint) -> bool,
) -> Vec<Chain> {
    let mut index = Array2::from_elem(shape, NONE);
    for (at, crest) in (0..NONE).zip(crests) {
        index[crest.cell] = at;
    }
    let mut cells = followed(&index, crests, follows, starts);
    let mut ordered: Vec<u32> =
        (0..NONE).zip(crests).filter(|(_, crest)| cells[crest.cell]).map(|(at, _)| at).collect();
    ordered.par_sort_unstable_by(|a, b| {
        let strength = |at: &u32| crests[*at as usize].strength;
        strength(a).total_cmp(&strength(b)).then(a.cmp(b))
    });
    for place in &mut ordered {
        let (row, col) = crests[*place as usize].cell;
        *place = (row * shape.1 + col) as u32;
    }
    thin(&mut cells, &mut ordered);
    for (chain, ring) in walked(&cells) {
        let ends = [chain[0], chain[chain.len() - 1]];
        let joined = |cell| count_around(&cells, cell) > 2;
        if !ring && chain.len() <= LEAST_BRANCH && joined(ends[0]) != joined(ends[1]) {
            let keep = if joined(ends[0]) { ends[0] } else { ends[1] };
            for cell in chain.into_iter().filter(|cell| *cell != keep) {
                cells[cell] = false;
            }
        }
    }
    ordered.retain(|place| cells[(*place as usize / shape.1, *place as usize % shape.1)]);
    thin(&mut cells, &mut ordered);
    walked(&cells)
        .into_iter()
        .map(|(chain, closed)| Chain { points: chain.into_iter().map(|cell| index[cell]).collect(), closed })
        .collect()
}

/// Hysteresis: the cells of crests to be followed that are connected with one where a line may start.
fn followed(
    index: &Array2<u32>,
    crests: &[CrestPoint],
    follows: impl Fn(&CrestPoint) -> bool,
    starts: impl Fn(&CrestPoint) -> bool,
) -> Array2<bool> {
    let mut kept = Array2::from_elem(index.dim(), false);
    let mut waiting: Vec<Cell> = crests.iter().filter(|crest| starts(crest)).map(|crest| crest.cell).collect();
    for cell in &waiting {
        kept[*cell] = true;
    }
    while let Some(cell) = waiting.pop() {
        for way in 0..8 {
            let next = beside(cell, way);
            let Some(&at) = index.get(next) else { continue };
            if at != NONE && !kept[next] && follows(&crests[at as usize]) {
                kept[next] = true;
                waiting.push(next);
            }
        }
    }
    kept
}

/// The directions in which a walk may leave a cell: a diagonal one only where no set side leads round the same corner, so
/// that a corner of three cells counts as one way on and not as two.
struct Ways {
    open: [bool; 8],
    count: usize,
}

impl Ways {
    fn from(cells: &Array2<bool>, cell: Cell) -> Self {
        let around = set_around(cells, cell);
        let mut open = around;
        for at in [1, 3, 5, 7] {
            open[at] = around[at] && !around[at - 1] && !around[(at + 1) % 8];
        }
        Self { open, count: open.into_iter().filter(|open| *open).count() }
    }

    /// The open directions, from north clockwise.
    fn open(&self) -> impl Iterator<Item = usize> {
        let open = self.open;
        (0..8).filter(move |way| open[*way])
    }
}

/// Walks over set cells and remembers, a bit for each direction out of each cell, which steps have been taken.
struct Walker<'a> {
    cells: &'a Array2<bool>,
    taken: Array2<u8>,
}

impl Walker<'_> {
    fn has_taken(&self, from: Cell, way: usize) -> bool {
        self.taken[from] >> way & 1 == 1
    }

    /// The cells from `start` by way of `way` to the next end or junction, or back to `start`.
    fn walk(&mut self, start: Cell, way: usize) -> Vec<Cell> {
        let mut chain = vec![start];
        let (mut from, mut way) = (start, way);
        loop {
            let to = beside(from, way);
            let back = (way + 4) % 8;
            self.taken[from] |= 1 << way;
            self.taken[to] |= 1 << back;
            chain.push(to);
            let onward = Ways::from(self.cells, to);
            if to == start || onward.count != 2 {
                return chain;
            }
            let Some(next) = onward.open().find(|next| *next != back) else { return chain };
            (from, way) = (to, next);
        }
    }
}

/// Every chain of set cells and whether it is a ring: first those that start at an end or a junction, in row order,
/// then the rings.
fn walked(cells: &Array2<bool>) -> Vec<(Vec<Cell>, bool)> {
    let set: Vec<(u32, u32)> =
        cells.indexed_iter().filter(|(_, set)| **set).map(|((row, col), _)| (row as u32, col as u32)).collect();
    let set = || set.iter().map(|(row, col)| (*row as usize, *col as usize));
    let mut walker = Walker { cells, taken: Array2::zeros(cells.dim()) };
    let mut chains = Vec::new();
    for start in set() {
        let ways = Ways::from(cells, start);
        if ways.count == 2 {
            continue;
        }
        for way in ways.open() {
            if !walker.has_taken(start, way) {
                let mut chain = walker.walk(start, way);
                let ring = chain.len() > 3 && chain[0] == chain[chain.len() - 1];
                if ring {
                    chain.pop();
                }
                chains.push((chain, ring));
            }
        }
    }
    for start in set() {
        let ways = Ways::from(cells, start);
        let Some(first) = ways.open().next() else { continue };
        if ways.count == 2 && !walker.has_taken(start, first) {
            let mut chain = walker.walk(start, first);
            chain.pop();
            chains.push((chain, true));
        }
    }
    chains
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Crest points from a drawing: digits are strengths, dots are empty.
    fn drawn(lines: &[&str]) -> ((usize, usize), Vec<CrestPoint>) {
        let mut crests = Vec::new();
        for (row, line) in lines.iter().enumerate() {
            for (col, byte) in line.bytes().enumerate() {
                if byte.is_ascii_digit() {
                    let strength = f64::from(byte - b'0');
                    let cell = (row, col);
                    crests.push(CrestPoint { cell, row: row as f64, col: col as f64, strength, directions: 2 });
                }
            }
        }
        ((lines.len(), lines[0].len()), crests)
    }

    fn lengths(lines: &[&str], weak: f64, strong: f64) -> Vec<(usize, bool)> {
        let (shape, crests) = drawn(lines);
        let found = chains(shape, &crests, |crest| crest.strength >= weak, |crest| crest.strength >= strong);
        found.iter().map(|chain| (chain.points.len(), chain.closed)).collect()
    }

    #[test]
    fn hysteresis_follows_a_strong_line_and_drops_a_weak_one() {
        let picture = ["335333....", "..........", "3333333333", "......2111"];
        assert_eq!(lengths(&picture[..3], 3.0, 5.0), [(6, false)]);
        assert_eq!(lengths(&picture[..3], 3.0, 3.0), [(6, false), (10, false)]);
        assert_eq!(lengths(&picture[..3], 3.0, 9.0), []);
        assert_eq!(lengths(&["335311"], 3.0, 5.0), [(4, false)]);
    }

    #[test]
    fn a_ring_is_closed() {
        assert_eq!(lengths(&["......", "..33..", ".3..3.", ".3..3.", "..33..", "......"], 1.0, 1.0), [(8, true)]);
    }

    #[test]
    fn a_short_fringe_is_cleared_and_a_long_branch_is_kept() {
        let fringe = ["......5.....", "......5.....", "999999999999", "............"];
        assert_eq!(lengths(&fringe, 1.0, 1.0), [(12, false)]);
        let branch = ["......5.....", "......5.....", "......5.....", "......5.....", "......5.....", "999999999999"];
        let found = lengths(&branch, 1.0, 1.0);
        assert_eq!(found.len(), 3, "{found:?}");
        // Eleven steps along the line, by way of the foot of the branch, and four up the rest of it.
        assert_eq!(found.iter().map(|(points, _)| points - 1).sum::<usize>(), 11 + 4);
    }
}
