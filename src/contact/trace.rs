//! Linking of crest points into chains.

use std::collections::BTreeSet;

use ndarray::Array2;

use super::crest::CrestPoint;
use super::thin::{neighbours, set_around, thin};

/// A side branch of fewer cells than this is taken for a fringe of the chain that it leaves, and cleared.
const LEAST_BRANCH: usize = 4;

/// Marks a cell without a crest.
const NONE: usize = usize::MAX;

/// A chain of crest points, as indices into their list, in order along the crest.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Chain {
    pub points: Vec<usize>,
    /// True if the last point leads back to the first (which is not repeated).
    pub closed: bool,
}

/// Links crest points on an array of `shape` into chains.
///
/// Steps: keep the points of at least the strength `weak` that hang together, by eight neighbours, with one of at least
/// `strong`; thin to one cell wide; clear short side branches; walk from ends and junctions, then around rings.
pub(super) fn chains(shape: (usize, usize), crests: &[CrestPoint], weak: f64, strong: f64) -> Vec<Chain> {
    let mut index = Array2::from_elem(shape, NONE);
    for (at, crest) in crests.iter().enumerate() {
        index[crest.cell] = at;
    }
    let mut cells = followed(&index, crests, weak, strong);
    let mut ordered: Vec<usize> = (0..crests.len()).filter(|at| cells[crests[*at].cell]).collect();
    ordered.sort_by(|a, b| crests[*a].strength.total_cmp(&crests[*b].strength).then(a.cmp(b)));
    let ordered: Vec<(usize, usize)> = ordered.into_iter().map(|at| crests[at].cell).collect();
    thin(&mut cells, &ordered);
    for (chain, ring) in walked(&cells) {
        let ends = [chain[0], chain[chain.len() - 1]];
        let joined = |cell| neighbours(&cells, cell).len() > 2;
        if !ring && chain.len() <= LEAST_BRANCH && joined(ends[0]) != joined(ends[1]) {
            let keep = if joined(ends[0]) { ends[0] } else { ends[1] };
            let fringe: Vec<_> = chain.into_iter().filter(|cell| *cell != keep).collect();
            for cell in fringe {
                cells[cell] = false;
            }
        }
    }
    thin(&mut cells, &ordered);
    walked(&cells)
        .into_iter()
        .map(|(chain, closed)| Chain { points: chain.into_iter().map(|cell| index[cell]).collect(), closed })
        .collect()
}

/// Hysteresis: the cells of crests at or above `weak` that are connected with one at or above `strong`.
fn followed(index: &Array2<usize>, crests: &[CrestPoint], weak: f64, strong: f64) -> Array2<bool> {
    let candidates = index.mapv(|at| at != NONE && crests[at].strength >= weak);
    let mut kept = Array2::from_elem(index.dim(), false);
    let mut waiting: Vec<(usize, usize)> =
        crests.iter().filter(|crest| crest.strength >= strong).map(|crest| crest.cell).collect();
    while let Some(cell) = waiting.pop() {
        if !kept[cell] {
            kept[cell] = true;
            waiting.extend(neighbours(&candidates, cell));
        }
    }
    kept
}

/// The neighbours that a walk may step to: a diagonal one only where no set side leads round the same corner, so that a
/// corner of three cells counts as one way on and not as two.
fn ways(cells: &Array2<bool>, cell: (usize, usize)) -> Vec<(usize, usize)> {
    let around = set_around(cells, cell);
    let mut open = Array2::from_elem((3, 3), false);
    for (at, (down, across)) in super::thin::AROUND.into_iter().enumerate() {
        let diagonal = at % 2 == 1;
        let free = !diagonal || !(around[at - 1] || around[(at + 1) % 8]);
        open[[1_usize.wrapping_add_signed(down), 1_usize.wrapping_add_signed(across)]] = around[at] && free;
    }
    neighbours(&open, (1, 1)).into_iter().map(|(row, col)| (cell.0 + row - 1, cell.1 + col - 1)).collect()
}

/// Every chain of set cells and whether it is a ring: first those that start at an end or a junction, in row order,
/// then the rings.
fn walked(cells: &Array2<bool>) -> Vec<(Vec<(usize, usize)>, bool)> {
    type Cell = (usize, usize);
    let set: Vec<Cell> = cells.indexed_iter().filter(|(_, set)| **set).map(|(cell, _)| cell).collect();
    let mut steps: BTreeSet<(Cell, Cell)> = BTreeSet::new();
    let mut reached = Array2::from_elem(cells.dim(), false);
    let mut chains = Vec::new();
    let mut walk = |start: Cell, first: Cell, steps: &mut BTreeSet<(Cell, Cell)>| {
        let mut chain = vec![start];
        let (mut from, mut to) = (start, first);
        loop {
            steps.insert((from, to));
            steps.insert((to, from));
            chain.push(to);
            reached[from] = true;
            reached[to] = true;
            let onward = ways(cells, to);
            if to == start || onward.len() != 2 {
                return chain;
            }
            let next = if onward[0] == from { onward[1] } else { onward[0] };
            (from, to) = (to, next);
        }
    };
    for &start in &set {
        let around = ways(cells, start);
        if around.len() != 2 {
            for first in around {
                if !steps.contains(&(start, first)) {
                    let mut chain = walk(start, first, &mut steps);
                    let ring = chain.len() > 3 && chain[0] == chain[chain.len() - 1];
                    if ring {
                        chain.pop();
                    }
                    chains.push((chain, ring));
                }
            }
        }
    }
    for &start in &set {
        if let [first, _] = ways(cells, start)[..]
            && !steps.contains(&(start, first))
        {
            let mut chain = walk(start, first, &mut steps);
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
        chains(shape, &crests, weak, strong).iter().map(|chain| (chain.points.len(), chain.closed)).collect()
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
