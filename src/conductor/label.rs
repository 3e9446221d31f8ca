//! Connected pieces of a mask.

use ndarray::Array2;

use crate::grid::Mask;

/// The steps to the four sides, then to the four corners.
const STEPS: [(isize, isize); 8] = [(-1, 0), (1, 0), (0, -1), (0, 1), (-1, -1), (-1, 1), (1, -1), (1, 1)];

/// How cells hang together.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Connection {
    /// By sides only.
    Sides,
    /// By sides and corners.
    SidesAndCorners,
}

/// The pieces of a mask, each as its cells in row order, the pieces in the order of their first cells.
pub(super) fn pieces(mask: &Mask, connection: Connection) -> Vec<Vec<(usize, usize)>> {
    let steps = match connection {
        Connection::Sides => &STEPS[..4],
        Connection::SidesAndCorners => &STEPS[..],
    };
    let mut left = mask.0.clone();
    let mut pieces = Vec::new();
    let mut waiting = Vec::new();
    for (start, _) in mask.0.indexed_iter().filter(|(_, set)| **set) {
        if !left[start] {
            continue;
        }
        left[start] = false;
        waiting.push(start);
        let mut cells = Vec::new();
        while let Some((row, col)) = waiting.pop() {
            cells.push((row, col));
            for (down, across) in steps {
                let next = (row.wrapping_add_signed(*down), col.wrapping_add_signed(*across));
                if let Some(set) = left.get_mut(next)
                    && *set
                {
                    *set = false;
                    waiting.push(next);
                }
            }
        }
        cells.sort_unstable();
        pieces.push(cells);
    }
    pieces
}

/// Labels of pieces on an array: 0 for none, and one more than the piece's index.
pub(super) fn labels(shape: (usize, usize), pieces: &[Vec<(usize, usize)>]) -> Array2<u32> {
    let mut labels = Array2::zeros(shape);
    for (label, cells) in (1..).zip(pieces) {
        for cell in cells {
            labels[*cell] = label;
        }
    }
    labels
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn corners_join_or_part() {
        let mask = Mask(array![[true, false, true], [false, true, false], [false, false, false]]);
        assert_eq!(pieces(&mask, Connection::SidesAndCorners).len(), 1);
        let parted = pieces(&mask, Connection::Sides);
        assert_eq!(parted, [vec![(0, 0)], vec![(0, 2)], vec![(1, 1)]]);
        assert_eq!(labels((3, 3), &parted), array![[1, 0, 2], [0, 3, 0], [0, 0, 0]]);
        assert!(pieces(&Mask::none((2, 2)), Connection::Sides).is_empty());
    }
}
