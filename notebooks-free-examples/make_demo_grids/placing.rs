//! Where the bodies lie and along which of their margins conductors are planted: by a rule, from the seed.

use crate::bodies::{Body, CORNER, SIZE, Side};
use crate::random::{Dice, Purpose, between, dice};

/// Names of the bodies, row by row from the south-west.
const NAMES: [&str; 42] = [
    "Alder", "Birch", "Cedar", "Damson", "Elm", "Fir", "Gorse", "Hazel", "Ivy", "Juniper", "Larch", "Maple", "Nettle",
    "Oak", "Poplar", "Quince", "Rowan", "Sorrel", "Thyme", "Umbel", "Vetch", "Willow", "Yarrow", "Aspen", "Bracken",
    "Clover", "Dogwood", "Elder", "Fern", "Gale", "Heather", "Iris", "Lime", "Mallow", "Osier", "Plum", "Rush",
    "Sedge", "Tansy", "Woodruff", "Bramble", "Teasel",
];
/// How many bodies lie from west to east and from south to north.
const PLOTS: [usize; 2] = [7, 6];
/// How far a body's centre may lie from the middle of its plot, east or north, m.
const JITTER: f64 = 3_000.0;
/// Least distance between two bodies, m.
const GAP: f64 = 2_000.0;
/// Least distance from a body to the edge of the area, m: the conductors beside it lie where the survey has data.
const INSET: f64 = 2_500.0;
/// After so many draws refused in a row, all bodies are placed anew.
const PATIENCE: usize = 5_000;

/// The bodies of a seed, in the order of their names.
///
/// 1. The area is cut into plots, one a body. A body draws its size, strike, depths and contrasts, and its centre near
///    the middle of its plot; all are drawn again until it keeps clear of the edge and of the bodies before it.
/// 2. Every tenth is light; three others show in the magnetics only; the rest are dense.
/// 3. Of every four dense bodies the last is bare; each of the others has conductors along one long side and one end,
///    by lot.
pub fn bodies(seed: u64) -> Vec<Body> {
    let mut dice = dice(seed, Purpose::Bodies);
    let mut bodies: Vec<Body> = Vec::new();
    let mut refused = 0;
    while bodies.len() < NAMES.len() {
        let body = draw(bodies.len(), &mut dice);
        if keeps_clear(&body, &bodies) {
            bodies.push(body);
            refused = 0;
        } else {
            refused += 1;
        }
        if refused == PATIENCE {
            bodies.clear();
            refused = 0;
        }
    }
    for (count, body) in bodies.iter_mut().filter(|body| body.density > 0.0).enumerate() {
        let mut one_of = |sides: [Side; 2]| sides[usize::from(between(&mut dice, 0.0, 1.0) < 0.5)];
        let sides = [one_of([Side::Left, Side::Right]), one_of([Side::Head, Side::Tail])];
        if count % 4 != 3 {
            body.planted = sides.to_vec();
        }
    }
    bodies
}

/// Draws the body of an index in [`NAMES`].
fn draw(index: usize, dice: &mut Dice) -> Body {
    // Whole steps, so that the tables of the truth hold the exact values.
    let mut step = |low: f64, high: f64, step: f64| (between(dice, low, high) / step).round() * step;
    let (length, width, strike) =
        (step(8_000.0, 15_000.0, 500.0), step(5_000.0, 7_000.0, 500.0), step(0.0, 179.0, 1.0));
    let (top, bottom) = (step(350.0, 800.0, 50.0), step(3_500.0, 6_000.0, 500.0));
    let (density, susceptibility) = (step(260.0, 320.0, 10.0), step(10.0, 60.0, 5.0) / 1_000.0);
    let (top, density, susceptibility) = match index {
        _ if index % 10 == 9 => (top + 1_000.0, -220.0, 0.0),
        _ if index % 13 == 10 => (top, 0.0, susceptibility),
        // A dense body that the magnetics do not show.
        _ if index % 5 == 3 => (top, density, 0.0),
        _ => (top, density, susceptibility),
    };
    let plot = [index % PLOTS[0], index / PLOTS[0]];
    let centre = [0, 1].map(|i| {
        let middle = INSET + (plot[i] as f64 + 0.5) * (SIZE[i] - 2.0 * INSET) / PLOTS[i] as f64;
        CORNER[i] + step(middle - JITTER, middle + JITTER, 100.0)
    });
    let (size, depth) = ([length, width], [top, bottom]);
    Body { name: NAMES[index], centre, size, strike, depth, density, susceptibility, planted: Vec::new() }
}

/// Whether a body keeps its distance from the edge of the area and from the others.
fn keeps_clear(body: &Body, others: &[Body]) -> bool {
    let within =
        |corner: [f64; 2]| (0..2).all(|i| corner[i] >= CORNER[i] + INSET && corner[i] <= CORNER[i] + SIZE[i] - INSET);
    body.corners().into_iter().all(within) && others.iter().all(|other| distance(body, other) >= GAP)
}

/// Distance between the outlines of two bodies, m, to within some 100 m: the outline of one is walked in short steps.
fn distance(body: &Body, other: &Body) -> f64 {
    let apart = (body.centre[0] - other.centre[0]).hypot(body.centre[1] - other.centre[1]);
    let reach = |body: &Body| body.size[0].hypot(body.size[1]) / 2.0;
    if apart > reach(body) + reach(other) + GAP {
        return apart - reach(body) - reach(other);
    }
    let margins = other.margins();
    let mut least = f64::INFINITY;
    for margin in body.margins() {
        let steps = (margin.length() / 200.0).ceil() as usize;
        for step in 0..steps {
            let share = step as f64 / steps as f64;
            let place = [0, 1].map(|i| margin.start[i] + share * (margin.end[i] - margin.start[i]));
            least = margins.iter().map(|margin| margin.distance(place)).fold(least, f64::min);
        }
    }
    least
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The outlines are checked point against point, another way than in the placing.
    #[test]
    fn bodies_lie_inside_the_area_and_apart() {
        let bodies = bodies(5);
        assert_eq!(bodies.len(), 42);
        for body in &bodies {
            for corner in body.corners() {
                assert!((0..2).all(|i| corner[i] > CORNER[i] + 2_400.0 && corner[i] < CORNER[i] + SIZE[i] - 2_400.0));
            }
            for other in bodies.iter().filter(|other| other.name != body.name) {
                for [from, to] in [[body, other], [other, body]] {
                    for corner in from.corners() {
                        assert!(to.margins().iter().all(|margin| margin.distance(corner) > 1_800.0), "{}", from.name);
                        let (sin, cos) = to.strike.to_radians().sin_cos();
                        let [x, y] = [corner[0] - to.centre[0], corner[1] - to.centre[1]];
                        let beyond = (x * sin + y * cos).abs() > to.size[0] / 2.0;
                        assert!(beyond || (x * cos - y * sin).abs() > to.size[1] / 2.0, "{} in {}", from.name, to.name);
                    }
                }
            }
        }
    }

    /// By the rule: 35 dense bodies in fours, the last of each bare, and one long side and one end of each other one.
    #[test]
    fn only_dense_bodies_are_planted_and_as_many_as_stated() {
        let bodies = bodies(5);
        let dense = bodies.iter().filter(|body| body.density > 0.0).count();
        let planted: Vec<&Body> = bodies.iter().filter(|body| !body.planted.is_empty()).collect();
        assert_eq!((dense, planted.len()), (35, 27));
        assert!(planted.iter().all(|body| body.density > 0.0));
        for body in planted {
            let length: f64 = body.margins().iter().filter(|margin| margin.planted).map(|margin| margin.length()).sum();
            assert!((length - body.size[0] - body.size[1]).abs() < 1e-6, "{}", body.name);
        }
    }
}
