//! Thinning of crest cells to chains one cell wide.

use ndarray::Array2;

/// The eight neighbours of a cell in order around it, as (rows, columns) of the step, from north clockwise.
pub(super) const AROUND: [(isize, isize); 8] = [(-1, 0), (-1, 1), (0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, -1)];

/// The set neighbours of a cell, in the order of [`AROUND`]; cells outside the array count as empty.
pub(super) fn set_around(cells: &Array2<bool>, (row, col): (usize, usize)) -> [bool; 8] {
    AROUND.map(|(down, across)| {
        let place = (row.wrapping_add_signed(down), col.wrapping_add_signed(across));
        cells.get(place).copied().unwrap_or(false)
    })
}

/// The cell a step away in one of the directions of [`AROUND`].
pub(super) fn beside((row, col): (usize, usize), way: usize) -> (usize, usize) {
    let (down, across) = AROUND[way];
    (row.wrapping_add_signed(down), col.wrapping_add_signed(across))
}

/// How many neighbours of a cell are set.
pub(super) fn count_around(cells: &Array2<bool>, cell: (usize, usize)) -> usize {
    set_around(cells, cell).into_iter().filter(|set| *set).count()
}

/// Clears cells, the weakest first, as long as that neither breaks nor shortens a chain, until nothing changes.
///
/// `ordered` lists the set cells, by their place in row order, from the weakest to the strongest; those cleared are taken
/// out of it. A cell may go if it is simple (clearing it changes neither the number of 8-connected pieces nor of the
/// holes between them) and is not the end of a chain. What is left is one cell wide and keeps to the strongest cells.
///
/// Source: ordered homotopic thinning; the crossing number of Hilditch (1969) decides whether a cell is simple.
pub(super) fn thin(cells: &mut Array2<bool>, ordered: &mut Vec<u32>) {
    let cols = cells.ncols();
    loop {
        let before = ordered.len();
        ordered.retain(|&place| {
            let cell = (place as usize / cols, place as usize % cols);
            if cells[cell] {
                let around = set_around(cells, cell);
                cells[cell] = is_end(around) || !is_simple(around);
            }
            cells[cell]
        });
        if ordered.len() == before {
            return;
        }
    }
}

/// True at the end of a chain: one set neighbour, or two side by side, as at the end of a strip two cells wide (which
/// would otherwise be eaten from its end).
fn is_end(around: [bool; 8]) -> bool {
    let count = around.iter().filter(|set| **set).count();
    count <= 1 || (count == 2 && (0..8).any(|at| around[at] && around[(at + 1) % 8]))
}

/// True if the set neighbours form one 8-connected piece and at least one of the four sides is empty.
fn is_simple(around: [bool; 8]) -> bool {
    // Hilditch's crossing number: empty sides followed, within two steps around, by a set cell.
    (0..4).filter(|side| !around[2 * side] && (around[2 * side + 1] || around[(2 * side + 2) % 8])).count() == 1
}

#[cfg(test)]
mod tests {
    use super::*;

    fn drawn(lines: &[&str]) -> Array2<bool> {
        let cells: Vec<bool> = lines.iter().flat_map(|line| line.bytes().map(|byte| byte == b'#')).collect();
        Array2::from_shape_vec((lines.len(), lines[0].len()), cells).unwrap()
    }

    fn thinned(lines: &[&str]) -> Array2<bool> {
        let mut cells = drawn(lines);
        let mut ordered: Vec<u32> = (0..).zip(&cells).filter(|(_, set)| **set).map(|(place, _)| place).collect();
        thin(&mut cells, &mut ordered);
        cells
    }

    #[test]
    fn a_staircase_becomes_a_diagonal() {
        let cells = thinned(&["##....", ".##...", "..##..", "...##."]);
        assert!(cells.iter().filter(|set| **set).count() <= 5, "{cells}");
        let ends = cells.indexed_iter().filter(|(cell, set)| **set && count_around(&cells, *cell) == 1).count();
        assert_eq!(ends, 2);
    }

    #[test]
    fn a_strip_two_cells_wide_keeps_its_length() {
        let cells = thinned(&["........", ".######.", ".######.", "........"]);
        let cols: std::collections::BTreeSet<usize> =
            cells.indexed_iter().filter(|(_, set)| **set).map(|((_, col), _)| col).collect();
        assert_eq!(cols.len(), 6, "{cells}");
        assert!(cells.iter().filter(|set| **set).count() <= 7, "{cells}");
    }

    #[test]
    fn a_ring_stays_a_ring_and_a_line_stays_whole() {
        let ring = thinned(&["......", ".####.", ".#..#.", ".####.", "......"]);
        assert!(ring.indexed_iter().all(|(cell, set)| !*set || count_around(&ring, cell) == 2), "{ring}");
        assert!(ring.iter().any(|set| *set));
        let line = ["......", ".####.", "......"];
        assert_eq!(thinned(&line), drawn(&line));
    }
}
