//! Lines cut at the edges of a box.

use geo::{Coord, LineString, Rect};

/// The parts of a line inside a box, its edges included.
///
/// Each segment is cut in closed form (Liang & Barsky 1984, ACM Transactions on Graphics 3, 1-22). Parts shorter than
/// `least` are dropped: a line that only touches the box at a point, or whose vertices are all one place, leaves nothing.
/// A ring that is cut does not come back in two parts where it merely starts.
pub(super) fn clip_line(line: &LineString<f64>, bounds: &Rect<f64>, least: f64) -> Vec<LineString<f64>> {
    let mut parts: Vec<Vec<Coord<f64>>> = Vec::new();
    let mut open = false;
    for pair in line.0.windows(2) {
        let (from, to) = (pair[0], pair[1]);
        let Some((enter, leave)) = inside(from, to, bounds) else {
            open = false;
            continue;
        };
        let at = |share: f64| match share {
            0.0 => from,
            1.0 => to,
            share => from + (to - from) * share,
        };
        match parts.last_mut() {
            Some(part) if open && enter == 0.0 => part.push(at(leave)),
            _ => parts.push(vec![at(enter), at(leave)]),
        }
        open = leave == 1.0;
    }
    join_ends(line, &mut parts);
    let length =
        |part: &[Coord<f64>]| part.windows(2).map(|pair| (pair[1] - pair[0]).x.hypot((pair[1] - pair[0]).y)).sum();
    parts.retain(|part| {
        let length: f64 = length(part);
        length > least
    });
    parts.into_iter().map(LineString).collect()
}

/// The shares of the segment at which it enters and leaves the box; `None` if it stays outside.
fn inside(from: Coord<f64>, to: Coord<f64>, bounds: &Rect<f64>) -> Option<(f64, f64)> {
    let (step, low, high) = (to - from, bounds.min(), bounds.max());
    let (mut enter, mut leave) = (0.0f64, 1.0f64);
    for (toward, room) in
        [(-step.x, from.x - low.x), (step.x, high.x - from.x), (-step.y, from.y - low.y), (step.y, high.y - from.y)]
    {
        if toward == 0.0 {
            if room < 0.0 {
                return None;
            }
        } else if toward < 0.0 {
            enter = enter.max(room / toward);
        } else {
            leave = leave.min(room / toward);
        }
    }
    (enter <= leave).then_some((enter, leave))
}

/// Makes one part of the first and the last if a ring's start lies between them.
fn join_ends(line: &LineString<f64>, parts: &mut Vec<Vec<Coord<f64>>>) {
    if parts.len() < 2 || !line.is_closed() {
        return;
    }
    let start = line.0[0];
    if parts[0].first() == Some(&start)
        && parts.last().and_then(|last| last.last()) == Some(&start)
        && let Some(mut last) = parts.pop()
    {
        last.extend(parts[0].drain(1..));
        parts[0] = last;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use geo::{Euclidean, Length, coord};

    fn clip(points: &[(f64, f64)]) -> Vec<LineString<f64>> {
        let bounds = Rect::new(coord! { x: 0.0, y: 0.0 }, coord! { x: 10.0, y: 10.0 });
        clip_line(&points.iter().copied().collect(), &bounds, 1e-9)
    }

    #[test]
    fn a_slanting_line_is_cut_at_both_edges() {
        // From (-5, 0) to (15, 10): y = (x + 5) / 2, inside for x in [0, 10], so (0, 2.5) to (10, 7.5).
        let parts = clip(&[(-5.0, 0.0), (15.0, 10.0)]);
        assert_eq!(parts, [LineString::from(vec![(0.0, 2.5), (10.0, 7.5)])]);
    }

    #[test]
    fn what_leaves_and_returns_becomes_two_parts() {
        let parts = clip(&[(2.0, 2.0), (2.0, 14.0), (6.0, 14.0), (6.0, 2.0)]);
        let lengths: Vec<f64> = parts.iter().map(|part| Euclidean.length(part)).collect();
        assert_eq!(lengths, [8.0, 8.0]);
    }

    #[test]
    fn a_ring_that_starts_inside_stays_whole_there() {
        let parts = clip(&[(5.0, 5.0), (5.0, -5.0), (20.0, -5.0), (20.0, 8.0), (5.0, 8.0), (5.0, 5.0)]);
        assert_eq!(parts, [LineString::from(vec![(10.0, 8.0), (5.0, 8.0), (5.0, 5.0), (5.0, 0.0)])]);
    }

    #[test]
    fn touching_and_standing_still_leave_nothing() {
        assert!(clip(&[(-2.0, 2.0), (2.0, -2.0)]).is_empty());
        assert!(clip(&[(-2.0, 12.0), (0.0, 10.0), (-2.0, 8.0)]).is_empty());
        assert!(clip(&[(3.0, 3.0), (3.0, 3.0)]).is_empty());
        assert!(clip(&[(3.0, 3.0)]).is_empty());
        assert!(clip(&[(-3.0, 3.0), (-3.0, 9.0)]).is_empty());
    }
}
