//! Pods: long, thin, winding conductors, drawn as rows of discs.

use crate::bodies::{CORNER, Margin, SIZE};
use crate::canvas::{Canvas, RIM};
use crate::random::{Dice, between};
use std::f64::consts::TAU;

/// Distance between the discs of a pod, m.
const STEP: f64 = 100.0;

/// A winding conductor.
#[derive(Debug, Clone)]
pub struct Pod {
    /// log10 of its resistivity in ohm m.
    pub level: f64,
    /// Places along its middle, easting and northing, with the half-width there; m.
    pub discs: Vec<([f64; 2], f64)>,
}

impl Pod {
    /// Draws a pod that runs `length` metres beside a straight line from `start` in direction `azimuth`, on the side to
    /// which `outward` points. It winds, swells and pinches, and its near edge keeps to within 400 m of the line.
    fn beside(start: [f64; 2], azimuth: f64, outward: f64, length: f64, dice: &mut Dice) -> Self {
        let level = between(dice, 0.8, 1.3);
        let half_width = between(dice, 400.0, 720.0);
        let clearance = between(dice, 0.0, 100.0);
        let (swing, wave, phase) = (between(dice, 40.0, 140.0), between(dice, 3000.0, 6000.0), between(dice, 0.0, TAU));
        let (pinch, pinch_phase) = (between(dice, 1200.0, 2500.0), between(dice, 0.0, TAU));
        let (sin, cos) = azimuth.to_radians().sin_cos();
        let (out_sin, out_cos) = outward.to_radians().sin_cos();
        let steps = (length / STEP).ceil() as usize;
        let discs = (0..=steps)
            .map(|step| {
                let along = length * step as f64 / steps as f64;
                // Round ends, and a width that swells and pinches by a fifth.
                let taper = (1.0 - (2.0 * along / length - 1.0).powi(6)).max(0.05).sqrt();
                let radius = half_width * taper * (0.9 + 0.2 * (TAU * along / pinch + pinch_phase).sin());
                let away = clearance + half_width + swing * (1.0 + (TAU * along / wave + phase).sin());
                ([start[0] + along * sin + away * out_sin, start[1] + along * cos + away * out_cos], radius)
            })
            .collect();
        Self { level, discs }
    }

    /// Lowers the canvas to the pod's level where the pod lies.
    pub fn draw(&self, canvas: &mut Canvas) {
        for (place, radius) in &self.discs {
            canvas.lower_disc(*place, *radius, self.level);
        }
    }

    /// The place half-way along.
    pub fn middle(&self) -> [f64; 2] {
        self.discs[self.discs.len() / 2].0
    }

    /// The same pod, wider or narrower.
    pub fn scaled(&self, factor: f64) -> Self {
        let discs = self.discs.iter().map(|(place, radius)| (*place, radius * factor)).collect();
        Self { level: self.level, discs }
    }
}

/// Pods along the outer side of a margin, end to end with gaps between.
pub fn along_margin(margin: &Margin, dice: &mut Dice) -> Vec<Pod> {
    let azimuth = margin.outward + 90.0;
    let (sin, cos) = azimuth.to_radians().sin_cos();
    let mut pods = Vec::new();
    let mut from = between(dice, 0.0, 500.0);
    while margin.length() - from > 1500.0 {
        let length = between(dice, 3000.0, 6500.0).min(margin.length() - from);
        let start = [margin.start[0] + from * sin, margin.start[1] + from * cos];
        pods.push(Pod::beside(start, azimuth, margin.outward, length, dice));
        from += length + between(dice, 300.0, 1000.0);
    }
    pods
}

/// A pod anywhere on the canvas and in any direction, whatever bodies may lie there.
pub fn anywhere(dice: &mut Dice) -> Pod {
    let middle = [0, 1].map(|i| between(dice, CORNER[i] - RIM, CORNER[i] + SIZE[i] + RIM));
    let (azimuth, length) = (between(dice, 0.0, 360.0), between(dice, 3000.0, 6500.0));
    let (sin, cos) = azimuth.to_radians().sin_cos();
    let start = [middle[0] - 0.5 * length * sin, middle[1] - 0.5 * length * cos];
    Pod::beside(start, azimuth, azimuth - 90.0, length, dice)
}

/// The ground that pods cover, counted as they are added.
#[derive(Debug)]
pub struct Covered {
    canvas: Canvas,
    /// Share of the survey area.
    pub share: f64,
}

impl Covered {
    /// No pod yet.
    pub fn nothing() -> Self {
        Self { canvas: Canvas::filled(f64::INFINITY), share: 0.0 }
    }

    /// Adds a pod.
    pub fn add(&mut self, pod: &Pod) {
        pod.draw(&mut self.canvas);
        let inside = self.canvas.inside();
        self.share = inside.iter().filter(|value| value.is_finite()).count() as f64 / inside.len() as f64;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bodies::gravity_margins;
    use crate::placing::bodies;
    use crate::random::{Purpose, dice};

    /// By construction: outside the body means beyond the margin in its outward direction.
    #[test]
    fn pods_lie_outside_their_margin_and_near_it() {
        for margin in gravity_margins(&bodies(5)) {
            let (sin, cos) = margin.outward.to_radians().sin_cos();
            let pods = along_margin(&margin, &mut dice(3, Purpose::Planted));
            assert!(!pods.is_empty());
            for (place, radius) in pods.iter().flat_map(|pod| &pod.discs) {
                let outside = (place[0] - margin.start[0]) * sin + (place[1] - margin.start[1]) * cos;
                assert!(outside - radius > -60.0 && outside + radius < 2000.0, "{outside} {radius}");
            }
        }
    }
}
