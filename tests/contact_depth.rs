//! Depths from the tilt angle, against closed forms.

use ndarray::Array2;
use salband::contact::{Contact, ContactSettings, find_contacts, tilt_depth};
use salband::field::{Direction, Gradient, MagneticDirections, PreparedField};
use salband::grid::{Frame, Grid};

const CELL: f64 = 100.0;
const SIDE: usize = 192;

/// The longest contact of a gradient.
fn longest(gradient: &Gradient) -> Contact {
    find_contacts(gradient, &ContactSettings::new(0.6, 0.3, 3000.0).unwrap()).unwrap().remove(0)
}

/// Values over the frame of `of` s, m to the right of a line through the middle that strikes at `strike`.
fn across(strike: f64, of: impl Fn(f64) -> f64) -> Array2<f64> {
    let (sin, cos) = strike.to_radians().sin_cos();
    let middle = (SIDE as f64 - 1.0) / 2.0;
    Array2::from_shape_fn((SIDE, SIDE), |(row, col)| {
        of(CELL * ((col as f64 - middle) * cos - (middle - row as f64) * sin))
    })
}

#[test]
fn a_vertical_contact_has_its_depth() {
    // Source: over a vertical contact at the pole dM/ds = z / (s^2 + z^2) and dM/dz = s / (s^2 + z^2), so that
    // tilt = atan(s / z) (Salem et al. 2007, The Leading Edge 26, 1502-1505).
    for depth in [250.0, 500.0, 1200.0] {
        for strike in [0.0, 33.0, 110.0] {
            let (sin, cos) = f64::to_radians(strike).sin_cos();
            let rise = across(strike, |s| depth / (s * s + depth * depth));
            let down = across(strike, |s| s / (s * s + depth * depth));
            let frame = Frame::local(CELL, SIDE, SIDE).unwrap();
            let gradient = Gradient::new(frame, &rise * cos, &rise * -sin, down).unwrap();
            let found = tilt_depth(&longest(&gradient), &gradient).unwrap();
            println!("depth {depth}, strike {strike}: {found:?}");
            assert!((found.median / depth - 1.0).abs() < 0.02 && found.places > SIDE / 2);
            assert!(found.low <= found.median && found.median <= found.high);
        }
    }
}

#[test]
fn depths_survive_the_reduction_to_the_pole() {
    // A body without end along its strike and downward, with vertical sides at s = -a and a and its top at depth z. At the
    // pole it gives M = atan((s + a) / z) - atan((s - a) / z), up to scale; the factor Theta^2 of any other inclination,
    // (down + i sign(k) across)^2, mixes it with its Hilbert transform, where i sign(k) makes
    // -ln(((s + a)^2 + z^2) / ((s - a)^2 + z^2)) / 2 of M (Blakely 1995, section 12.3; the transform from memory).
    let half = 3000.0;
    for inclination in [60.0, 30.0] {
        for depth in [300.0, 500.0, 800.0] {
            let (declination, strike): (f64, f64) = (12.0, 60.0);
            let dip = f64::to_radians(inclination);
            // The part of the field across the strike, toward its right.
            let side = dip.cos() * (declination - strike - 90.0).to_radians().cos();
            let (even, odd) = (dip.sin().powi(2) - side * side, 2.0 * dip.sin() * side);
            let values = across(strike, |s| {
                let (left, right) = (s + half, s - half);
                let pole = (left / depth).atan() - (right / depth).atan();
                let turned = -((left * left + depth * depth) / (right * right + depth * depth)).ln() / 2.0;
                even * pole + odd * turned
            });
            let layer = Grid::new(Frame::local(CELL, SIDE, SIDE).unwrap(), values * 200.0).unwrap();
            let field = MagneticDirections::induced(Direction::new(inclination, declination).unwrap());
            let reduced = PreparedField::new(&layer).unwrap().to_pole(field).unwrap().gradient(0.0).unwrap();
            let contact = longest(&reduced);
            let found = tilt_depth(&contact, &reduced).unwrap();
            println!("inclination {inclination}, depth {depth}: {found:?}");
            assert!((found.median / depth - 1.0).abs() < 0.1 && found.places > SIDE / 4, "{inclination} {depth}");
        }
    }
}

#[test]
fn what_cannot_be_measured_is_none() {
    // Without a vertical derivative the tilt is zero throughout and never reaches 45 degrees.
    let rise = across(0.0, |s| 300.0 / (s * s + 90_000.0));
    let zero = || Array2::zeros((SIDE, SIDE));
    let gradient = Gradient::new(Frame::local(CELL, SIDE, SIDE).unwrap(), rise, zero(), zero()).unwrap();
    assert_eq!(tilt_depth(&longest(&gradient), &gradient), None);
}
