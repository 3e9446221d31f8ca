//! A body, a right prism turned against the grid, and its margins.

use crate::prism::Prism;

/// South-west corner of the survey area, easting and northing in EPSG:32633, m.
pub const CORNER: [f64; 2] = [468_000.0, 5_600_000.0];
/// Width (west to east) and height (south to north) of the survey area, m.
pub const SIZE: [f64; 2] = [128_000.0, 96_000.0];
/// Inclination and declination of the inducing field, degrees.
pub const FIELD_ANGLES: [f64; 2] = [-61.0, 6.5];
/// Strength of the inducing field, nT.
pub const FIELD_STRENGTH: f64 = 56_000.0;

/// A side of a body, seen by someone who looks along its strike.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Side {
    /// The end ahead.
    Head,
    /// The long side on the right hand.
    Right,
    /// The end behind.
    Tail,
    /// The long side on the left hand.
    Left,
}

impl Side {
    /// All four, clockwise.
    pub const ALL: [Side; 4] = [Side::Head, Side::Right, Side::Tail, Side::Left];

    /// Outward direction, degrees clockwise from the strike.
    fn turn(self) -> f64 {
        match self {
            Side::Head => 0.0,
            Side::Right => 90.0,
            Side::Tail => 180.0,
            Side::Left => 270.0,
        }
    }
}

/// A right rectangular prism, turned against the grid.
#[derive(Debug, Clone)]
pub struct Body {
    /// Name of the body.
    pub name: &'static str,
    /// Centre: easting and northing, m.
    pub centre: [f64; 2],
    /// Length along strike and width across it, m.
    pub size: [f64; 2],
    /// Strike, degrees clockwise from grid north.
    pub strike: f64,
    /// Depth of top and bottom, m.
    pub depth: [f64; 2],
    /// Density contrast, kg/m3.
    pub density: f64,
    /// Susceptibility, SI.
    pub susceptibility: f64,
    /// Sides along which conductors are planted.
    pub planted: Vec<Side>,
}

/// One straight margin of a body.
#[derive(Debug, Clone)]
pub struct Margin {
    /// Name of the body.
    pub body: &'static str,
    /// Compass direction in which the margin faces, such as `north-west`.
    pub faces: &'static str,
    /// Direction away from the body, degrees clockwise from grid north.
    pub outward: f64,
    /// First end: easting and northing, m.
    pub start: [f64; 2],
    /// Other end, m. Someone who walks from start to end has the body on the right hand.
    pub end: [f64; 2],
    /// Density contrast of the body, kg/m3.
    pub density: f64,
    /// Whether conductors were planted along it.
    pub planted: bool,
}

impl Body {
    /// The prism in the body's own frame: x across strike to the right, y along strike.
    fn prism(&self) -> Prism {
        let [length, width] = self.size;
        Prism { x: [-width / 2.0, width / 2.0], y: [-length / 2.0, length / 2.0], z: self.depth }
    }

    /// Turns a vector (east, north) into the body's own frame.
    fn turn(&self, [east, north]: [f64; 2]) -> [f64; 2] {
        let (sin, cos) = self.strike.to_radians().sin_cos();
        [east * cos - north * sin, east * sin + north * cos]
    }

    /// A place on the surface in the body's own frame.
    fn local(&self, place: [f64; 2]) -> [f64; 3] {
        let [x, y] = self.turn([place[0] - self.centre[0], place[1] - self.centre[1]]);
        [x, y, 0.0]
    }

    /// Vertical attraction at a place on the surface, mGal.
    pub fn gravity(&self, place: [f64; 2]) -> f64 {
        if self.density == 0.0 { 0.0 } else { self.prism().gravity(self.local(place), self.density) }
    }

    /// Total-field anomaly at a place on the surface, nT.
    pub fn magnetics(&self, place: [f64; 2]) -> f64 {
        if self.susceptibility == 0.0 {
            return 0.0;
        }
        let [inclination, declination] = FIELD_ANGLES.map(f64::to_radians);
        let level = [inclination.cos() * declination.sin(), inclination.cos() * declination.cos()];
        let [fx, fy] = self.turn(level);
        let direction = [fx, fy, inclination.sin()];
        self.prism().total_field_anomaly(self.local(place), self.susceptibility, FIELD_STRENGTH, direction)
    }

    /// The four corners on the map, clockwise from the right of the head: easting and northing, m.
    pub fn corners(&self) -> [[f64; 2]; 4] {
        let [length, width] = self.size;
        let (sin, cos) = self.strike.to_radians().sin_cos();
        [(0.5, 0.5), (0.5, -0.5), (-0.5, -0.5), (-0.5, 0.5)].map(|(right, ahead)| {
            let (across, along) = (right * width, ahead * length);
            [self.centre[0] + across * cos + along * sin, self.centre[1] - across * sin + along * cos]
        })
    }

    /// The four margins, in the order of [`Side::ALL`].
    pub fn margins(&self) -> Vec<Margin> {
        let corners = self.corners();
        Side::ALL
            .iter()
            .enumerate()
            .map(|(i, side)| {
                let outward = (self.strike + side.turn()) % 360.0;
                Margin {
                    body: self.name,
                    faces: compass(outward),
                    outward,
                    start: corners[(i + 3) % 4],
                    end: corners[i],
                    density: self.density,
                    planted: self.planted.contains(side),
                }
            })
            .collect()
    }
}

impl Margin {
    /// Length, m.
    pub fn length(&self) -> f64 {
        (self.end[0] - self.start[0]).hypot(self.end[1] - self.start[1])
    }

    /// Distance from a place to the nearest point of the margin, m.
    pub fn distance(&self, place: [f64; 2]) -> f64 {
        let along = [self.end[0] - self.start[0], self.end[1] - self.start[1]];
        let from = [place[0] - self.start[0], place[1] - self.start[1]];
        let share = (from[0] * along[0] + from[1] * along[1]) / self.length().powi(2);
        let share = share.clamp(0.0, 1.0);
        (from[0] - share * along[0]).hypot(from[1] - share * along[1])
    }
}

/// The nearest of the eight points of the compass.
fn compass(azimuth: f64) -> &'static str {
    const POINTS: [&str; 8] =
        ["north", "north-east", "east", "south-east", "south", "south-west", "west", "north-west"];
    POINTS[(azimuth / 45.0).round() as usize % 8]
}

/// The margins that a gravity map can show: those of every body with a density contrast.
pub fn gravity_margins(bodies: &[Body]) -> Vec<Margin> {
    bodies.iter().filter(|body| body.density != 0.0).flat_map(Body::margins).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::placing::bodies;

    /// A body turned by 90 degrees with length and width exchanged is the same body.
    #[test]
    fn a_quarter_turn_with_sides_exchanged_changes_nothing() {
        let body = bodies(5).remove(0);
        let turned = Body { size: [body.size[1], body.size[0]], strike: body.strike + 90.0, ..body.clone() };
        let place = [body.centre[0] + 3100.0, body.centre[1] - 1700.0];
        assert!(body.gravity(place).abs() > 1.0 && body.magnetics(place).abs() > 1.0);
        assert!((body.gravity(place) - turned.gravity(place)).abs() < 1e-9);
        assert!((body.magnetics(place) - turned.magnetics(place)).abs() < 1e-9);
    }

    /// By the definition of strike: the head of a body that strikes 90 faces east, its right side south.
    #[test]
    fn margins_face_away_from_the_body() {
        let body = Body { strike: 90.0, ..bodies(5).remove(0) };
        let faces: Vec<_> = body.margins().iter().map(|margin| margin.faces).collect();
        assert_eq!(faces, ["east", "south", "west", "north"]);
        for margin in body.margins() {
            let (sin, cos) = margin.outward.to_radians().sin_cos();
            let middle = [0, 1].map(|i| (margin.start[i] + margin.end[i]) / 2.0);
            let reach = (middle[0] - body.centre[0]) * sin + (middle[1] - body.centre[1]) * cos;
            assert!((reach - (body.size[0] + body.size[1] - margin.length()) / 2.0).abs() < 1e-6);
            assert!((margin.distance([middle[0] + 300.0 * sin, middle[1] + 300.0 * cos]) - 300.0).abs() < 1e-6);
        }
    }

    /// By the definition of strike: it points along the body, so that the corners lie at half its length and width.
    #[test]
    fn the_map_and_the_body_frame_agree() {
        for body in bodies(5) {
            let (sin, cos) = body.strike.to_radians().sin_cos();
            let [across, along] = body.turn([sin, cos]);
            assert!(across.abs() < 1e-12 && (along - 1.0).abs() < 1e-12);
            let [length, width] = body.size.map(|side| side / 2.0);
            let wanted = [[width, length], [width, -length], [-width, -length], [-width, length]];
            for (corner, wanted) in body.corners().into_iter().zip(wanted) {
                let [x, y, _] = body.local(corner);
                assert!((x - wanted[0]).abs() < 1e-6 && (y - wanted[1]).abs() < 1e-6, "{}", body.name);
            }
        }
    }
}
