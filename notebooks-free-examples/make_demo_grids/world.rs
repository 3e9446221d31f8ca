//! The invented ground: log10 resistivity at eight depths, cover, and where the survey has data.

use crate::bodies::{Body, CORNER, Margin, SIZE, gravity_margins};
use crate::canvas::Canvas;
use crate::pods::{Covered, Pod, along_margin, anywhere};
use crate::random::{Dice, Purpose, between, dice, normal, smooth_field};
use std::f64::consts::TAU;

/// Depths of the slices, m.
pub const DEPTHS: [f64; 8] = [150.0, 400.0, 800.0, 1500.0, 2500.0, 4000.0, 6000.0, 9000.0];
/// Depths at which conductors follow some margins, m.
pub const PLANTED_DEPTHS: [f64; 3] = [1500.0, 2500.0, 4000.0];
/// Mean of the background's log10 resistivity (ohm m) and its standard deviation.
pub const BACKGROUND: [f64; 2] = [2.8, 0.20];
/// log10 resistivity (ohm m) of the conductive cover.
pub const COVER_LEVEL: f64 = 1.3;
/// At the planted depths decoys cover this share of the area that planted conductors cover; elsewhere as much as those.
pub const DECOY_SHARE: f64 = 0.2;

/// How many holes the resistivity model has.
pub const HOLES: usize = 12;

/// One depth of the model.
#[derive(Debug)]
pub struct Slice {
    /// Depth, m.
    pub depth: f64,
    /// log10 resistivity, ohm m.
    pub log10: Canvas,
    /// Conductors planted without regard to any body.
    pub decoys: Vec<Pod>,
}

/// The whole model.
#[derive(Debug)]
pub struct World {
    /// Slices from shallow to deep.
    pub slices: Vec<Slice>,
    /// Conductors along margins, as drawn before each depth's change of width.
    pub planted: Vec<(Margin, Vec<Pod>)>,
    /// Thickness of the cover, m; 0 where there is none.
    pub cover: Canvas,
    /// Where the resistivity model has data.
    pub footprint: Footprint,
}

/// Standard deviation of the Gaussian that stands for an inversion's loss of detail with depth, m.
pub fn blur(depth: f64) -> f64 {
    0.15 * depth + 200.0
}

/// Builds the ground from a seed.
pub fn build(seed: u64, bodies: &[Body]) -> World {
    let planted = plant(seed, bodies);
    let pods: Vec<Pod> = planted.iter().flat_map(|(_, pods)| pods.clone()).collect();
    let mut covered = Covered::nothing();
    pods.iter().for_each(|pod| covered.add(pod));
    let share = covered.share;
    let blank = Canvas::filled(0.0);
    let cover_shape = smooth_field(&blank, 3000.0, &mut dice(seed, Purpose::Cover));
    let cover = cover_shape.map(|value| (80.0 + 260.0 * value).max(0.0));

    let mut background_dice = dice(seed, Purpose::Background);
    let mut decoy_dice = dice(seed, Purpose::Decoys);
    let mut width_dice = dice(seed, Purpose::PodWidths);
    let mut shape = background_shape(&blank, &mut background_dice);
    let mut decoys: Vec<Pod> = Vec::new();
    let mut slices = Vec::new();
    for depth in DEPTHS {
        // Neighbouring depths are alike: 0.6 of the shape comes from above, the rest is new.
        let fresh = background_shape(&blank, &mut background_dice);
        shape.values.zip_mut_with(&fresh.values, |old, new| *old = 0.6 * *old + 0.8 * new);
        let mut log10 = shape.map(|value| BACKGROUND[0] + BACKGROUND[1] * value);

        let has_planted = PLANTED_DEPTHS.contains(&depth);
        let wanted = if has_planted { DECOY_SHARE * share } else { share };
        decoys = next_decoys(&decoys, wanted, &mut decoy_dice);
        decoys.iter().for_each(|pod| pod.draw(&mut log10));
        for pod in &pods {
            // Drawn at every depth, so that each pod's widths do not hang on which depths are planted.
            let factor = between(&mut width_dice, 0.9, 1.15);
            if has_planted {
                pod.scaled(factor).draw(&mut log10);
            }
        }
        let mut log10 = log10.smoothed(blur(depth));
        if depth < 500.0 {
            lay_cover(&mut log10, &cover, depth);
        }
        slices.push(Slice { depth, log10, decoys: decoys.clone() });
    }
    World { slices, planted, cover, footprint: Footprint::draw(&mut dice(seed, Purpose::Footprint)) }
}

/// Conductors along the margins that are to have them.
fn plant(seed: u64, bodies: &[Body]) -> Vec<(Margin, Vec<Pod>)> {
    let mut planted_dice = dice(seed, Purpose::Planted);
    let margins = gravity_margins(bodies).into_iter().filter(|margin| margin.planted);
    margins.map(|margin| (margin.clone(), along_margin(&margin, &mut planted_dice))).collect()
}

/// A background of two scales, with mean 0 and a standard deviation near 1.
fn background_shape(like: &Canvas, dice: &mut Dice) -> Canvas {
    let mut broad = smooth_field(like, 2000.0, dice);
    let fine = smooth_field(like, 900.0, dice);
    broad.values.zip_mut_with(&fine.values, |sum, part| *sum = 0.8 * *sum + 0.6 * part);
    broad
}

/// Decoys for the next depth: each of those above goes on with probability one half, then new ones come until they
/// cover the share that is wanted.
fn next_decoys(above: &[Pod], wanted: f64, dice: &mut Dice) -> Vec<Pod> {
    let mut pods = Vec::new();
    let mut covered = Covered::nothing();
    for pod in above {
        if between(dice, 0.0, 1.0) < 0.5 && covered.share < wanted {
            covered.add(pod);
            pods.push(pod.clone());
        }
    }
    while covered.share < wanted {
        let pod = anywhere(dice);
        covered.add(&pod);
        pods.push(pod);
    }
    pods
}

/// Blends the cover in: fully where it reaches 100 m below the depth of the slice, not at all where it ends 100 m
/// above it.
fn lay_cover(log10: &mut Canvas, cover: &Canvas, depth: f64) {
    log10.values.zip_mut_with(&cover.values, |value, thickness| {
        let share = ((thickness - depth + 100.0) / 200.0).clamp(0.0, 1.0);
        *value += share * (COVER_LEVEL + 0.3 * (*value - BACKGROUND[0]) - *value);
    });
}

/// Where the resistivity model has data: a ragged rectangle with holes.
#[derive(Debug)]
pub struct Footprint {
    /// Two waves along each edge: height in m, wavelength in m, phase.
    edge: Vec<[f64; 3]>,
    /// Middle, radius in m, phase and height of the wave around the rim.
    holes: Vec<([f64; 2], f64, f64)>,
}

impl Footprint {
    fn draw(dice: &mut Dice) -> Self {
        let edge = (0..8).map(|_| [between(dice, 200.0, 700.0), between(dice, 4e3, 15e3), between(dice, 0.0, TAU)]);
        let edge = edge.collect();
        let holes = (0..HOLES)
            .map(|_| {
                let middle = [0, 1].map(|i| CORNER[i] + SIZE[i] * between(dice, 0.15, 0.85));
                (middle, between(dice, 1000.0, 2000.0), between(dice, 0.0, TAU))
            })
            .collect();
        Self { edge, holes }
    }

    /// Whether the model has a value at a place.
    pub fn holds(&self, place: [f64; 2]) -> bool {
        let (x, y) = (place[0] - CORNER[0], place[1] - CORNER[1]);
        let inset = |side: usize, along: f64| -> f64 {
            let waves = &self.edge[2 * side..2 * side + 2];
            let sum: f64 = waves.iter().map(|[height, wave, phase]| height * (TAU * along / wave + phase).sin()).sum();
            1200.0 + sum
        };
        let inside = x > inset(0, y) && SIZE[0] - x > inset(1, y) && y > inset(2, x) && SIZE[1] - y > inset(3, x);
        inside
            && self.holes.iter().all(|(middle, radius, phase)| {
                let (dx, dy) = (place[0] - middle[0], place[1] - middle[1]);
                dx.hypot(dy) > radius * (1.0 + 0.25 * (3.0 * dy.atan2(dx) + phase).sin())
            })
    }
}

/// Bouguer gravity in mGal at a place: bodies, a plane and one long wave.
pub fn gravity(bodies: &[Body], place: [f64; 2]) -> f64 {
    let (x, y) = (place[0] - CORNER[0], place[1] - CORNER[1]);
    let plane = -18.0 + 0.060e-3 * x - 0.045e-3 * y;
    let wave = 2.0 * (TAU * (0.8 * x + 0.6 * y) / 140_000.0 + 0.7).cos();
    plane + wave + bodies.iter().map(|body| body.gravity(place)).sum::<f64>()
}

/// Total-field anomaly in nT at a place: bodies, a plane and one long wave.
pub fn magnetics(bodies: &[Body], place: [f64; 2]) -> f64 {
    let (x, y) = (place[0] - CORNER[0], place[1] - CORNER[1]);
    let plane = 35.0 - 0.5e-3 * x + 0.9e-3 * y;
    let wave = 15.0 * (TAU * (0.5 * x - 0.87 * y) / 120_000.0).cos();
    plane + wave + bodies.iter().map(|body| body.magnetics(place)).sum::<f64>()
}

/// Adds normal noise of standard deviation `deviation` to values in reading order.
pub fn add_noise(values: &mut [f64], deviation: f64, seed: u64, purpose: Purpose) {
    let mut noise = dice(seed, purpose);
    values.iter_mut().for_each(|value| *value += deviation * normal(&mut noise));
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::placing::bodies;

    #[test]
    fn the_same_seed_gives_the_same_ground_and_another_seed_another() {
        let (one, same, other) = (build(5, &bodies(5)), build(5, &bodies(5)), build(6, &bodies(5)));
        for (a, b) in one.slices.iter().zip(&same.slices) {
            assert_eq!(a.log10.values, b.log10.values);
        }
        assert_ne!(one.slices[3].log10.values, other.slices[3].log10.values);
    }

    /// Decoys and background must not know the bodies: with another set of bodies that plants as little or nothing,
    /// an unplanted depth may change only through the number of decoys, never through their places.
    #[test]
    fn decoys_do_not_know_the_bodies() {
        let real = build(5, &bodies(5));
        let mut moved = bodies(5);
        moved.iter_mut().for_each(|body| body.centre[0] += 500.0);
        let moved = build(5, &moved);
        let first = |world: &World| world.slices[0].decoys[..3].iter().map(|pod| pod.discs.clone()).collect::<Vec<_>>();
        assert_eq!(first(&real), first(&moved));
    }
}
