//! The crest over a dipping contact: its shift at the ground and its drift with height, against the closed form.

use ndarray::Array2;
use salband::contact::{Contact, ContactSettings, DipSide, Ladder, Level, find_contacts};
use salband::field::Gradient;
use salband::grid::Frame;

const CELL: f64 = 100.0;
const SIDE: usize = 120;
/// Depths of the top and bottom of the slab, m.
const TOP: f64 = 500.0;
const BOTTOM: f64 = 3500.0;

/// dg/dx, up to scale, at `x` (m from over the upper edge) and `height` above a slab that fills x > x_face(z) from the top
/// to the bottom depth, with a plane face that dips at `dip` degrees below the +x axis: under 90 it dips toward the dense
/// side, over 90 toward the light side.
///
/// Each thin sheet gives z / ((x - x_face(z))^2 + z^2) (Telford, Geldart & Sheriff 1990, section 2.7, from memory); its
/// integral over z, with b = x + z_top cot(dip) and c = cot(dip), is
/// [ln((b - c z)^2 + z^2) / 2 + c atan(((1 + c^2) z - b c) / b)] / (1 + c^2).
fn slope(x: f64, height: f64, dip: f64) -> f64 {
    let c = dip.to_radians().tan().recip();
    let (top, bottom) = (TOP + height, BOTTOM + height);
    let b = x + c * top;
    let whole = |z: f64| {
        let log = ((b - c * z).powi(2) + z * z).ln() / 2.0;
        let angle = if b.abs() < 1e-9 { 0.0 } else { (((1.0 + c * c) * z - b * c) / b).atan() };
        (log + c * angle) / (1.0 + c * c)
    };
    whole(bottom) - whole(top)
}

/// Where the closed form is largest, m from over the upper edge: where the derivative vanishes,
/// cot(dip) z_top (z_bottom - z_top) / (z_bottom + z_top), with the depths below the height.
fn crest(height: f64, dip: f64) -> f64 {
    let (top, bottom) = (TOP + height, BOTTOM + height);
    top * (bottom - top) / ((bottom + top) * dip.to_radians().tan())
}

/// Contacts of a field whose eastward derivative is `of` x, m from the middle of the frame.
fn contacts(of: impl Fn(f64) -> f64) -> Vec<Contact> {
    let frame = Frame::local(CELL, SIDE, SIDE).unwrap();
    let middle = CELL * SIDE as f64 / 2.0;
    let east = Array2::from_shape_fn((SIDE, SIDE), |(row, col)| of(frame.position(row as f64, col as f64).0 - middle));
    let zero = || Array2::zeros((SIDE, SIDE));
    let gradient = Gradient::new(frame, east, zero(), zero()).unwrap();
    find_contacts(&gradient, &ContactSettings::above_noise(1000.0).unwrap()).unwrap()
}

#[test]
fn the_crest_is_where_the_closed_form_is_largest() {
    for dip in [30.0, 60.0, 90.0, 135.0, 150.0] {
        for height in [0.0, 1000.0] {
            let place = crest(height, dip);
            let top = slope(place, height, dip);
            assert!(slope(place - 20.0, height, dip) < top && slope(place + 20.0, height, dip) < top, "{dip} {height}");
        }
    }
}

#[test]
fn the_width_of_a_body_is_not_taken_for_a_dip() {
    let heights = [0.0, 250.0, 500.0, 1000.0];
    for (half, dip) in [(1000.0, 90.0), (1500.0, 90.0), (3000.0, 90.0), (3000.0, 45.0)] {
        let level = |height: f64| Level {
            height,
            contacts: contacts(|x| slope(x + half, height, dip) - slope(x - half, height, dip)),
        };
        let levels: Vec<Level> = heights.iter().copied().map(level).collect();
        let east_side: Vec<bool> = levels[0].contacts.iter().map(|contact| contact.dense_side() == "E").collect();
        let found = Ladder::new(CELL, levels).unwrap().with_depth((TOP + BOTTOM) / 2.0).unwrap().trace();
        assert_eq!(found.len(), 2, "half width {half}");
        for (dense_is_east, persistence) in east_side.into_iter().zip(&found) {
            let drift = persistence.faces[0].drift;
            println!("half width {half}, dip {dip}, dense side east {dense_is_east}: {drift:?}");
            if dip == 90.0 {
                assert!(drift.rate > 0.0, "the width drives the crest outward");
                assert!([DipSide::Undecided, DipSide::Vertical].contains(&drift.dip));
            } else {
                // Both faces dip toward the east: the western one under the body.
                assert_eq!(drift.dip, if dense_is_east { DipSide::Dense } else { DipSide::Light });
            }
        }
    }
}

#[test]
fn the_integral_is_that_of_its_sheets() {
    // Source: the trapezoidal rule over thin sheets.
    for dip in [30.0, 90.0, 135.0] {
        for x in [-900.0, 0.0, 400.0] {
            let c = f64::to_radians(dip).tan().recip();
            let sheet = |z: f64| z / ((x - c * (z - TOP)).powi(2) + z * z);
            let count = 30_000;
            let step = (BOTTOM - TOP) / f64::from(count);
            let sum: f64 = (0..count).map(|at| sheet(TOP + (f64::from(at) + 0.5) * step)).sum();
            assert!((sum * step / slope(x, 0.0, dip) - 1.0).abs() < 1e-6, "{dip} {x}");
        }
    }
}

#[test]
fn the_shift_is_measured_and_the_dip_side_is_right() {
    let heights = [0.0, 250.0, 500.0, 1000.0];
    for dip in [30.0, 45.0, 60.0, 90.0, 120.0, 135.0, 150.0] {
        let levels: Vec<Level> = heights
            .iter()
            .map(|&height| Level { height, contacts: contacts(|x| slope(x - 30.0, height, dip)) })
            .collect();
        let base = &levels[0].contacts;
        assert_eq!(base.len(), 1, "dip {dip}");
        // East is dense, so the shift toward x is down-dip for dips under 90.
        let middle = base[0].line.0.len() / 2;
        let shift = base[0].line.0[middle].x - CELL * SIDE as f64 / 2.0 - 30.0;
        let exact = crest(0.0, dip);
        let rates: Vec<f64> = heights[1..].iter().map(|&height| -(crest(height, dip) - exact) / height).collect();
        let found = Ladder::new(CELL, levels).unwrap().with_depth((TOP + BOTTOM) / 2.0).unwrap().trace();
        let drift = found[0].faces[0].drift;
        println!(
            "dip {dip}: shift {shift:.1} m, exact {exact:.1}; drift {:.3} ({:.3} to {:.3}), exact {:.3} to {:.3}: {}",
            drift.rate,
            drift.low,
            drift.high,
            rates[0],
            rates[2],
            drift.dip.name()
        );
        assert!((shift - exact).abs() < 0.1 * CELL, "dip {dip}: {shift} {exact}");
        assert_eq!((found[0].levels, found[0].faces.len()), (3, 1));
        assert!(found[0].shares.iter().all(|share| *share > 0.98));
        let (least, most) =
            (rates.iter().copied().fold(f64::INFINITY, f64::min), rates.iter().copied().fold(-9.0, f64::max));
        assert!(drift.rate > least - 0.02 && drift.rate < most + 0.02, "dip {dip}");
        let expected = match dip {
            dip if dip < 90.0 => DipSide::Dense,
            dip if dip > 90.0 => DipSide::Light,
            _ => DipSide::Vertical,
        };
        assert_eq!(drift.dip, expected, "dip {dip}");
    }
}

#[test]
fn a_contact_of_the_opposite_sense_is_not_the_same() {
    let base = contacts(|x| slope(x, 0.0, 90.0));
    let trace = |above: Vec<Contact>| {
        let levels = vec![Level { height: 0.0, contacts: base.clone() }, Level { height: 500.0, contacts: above }];
        Ladder::new(CELL, levels).unwrap().trace().remove(0)
    };
    assert_eq!(trace(base.clone()).shares, [1.0]);
    let mut turned = base.clone();
    turned[0].line.0.reverse();
    // Half of the line: its share is its part of the length, to within a vertex.
    let mut half = base.clone();
    half[0].line.0.truncate(base[0].line.0.len() / 2);
    assert!((trace(half).shares[0] - 0.5).abs() < 0.02);
    for nothing in [trace(turned), trace(Vec::new())] {
        assert_eq!((nothing.shares, nothing.levels, nothing.faces.len()), (vec![0.0], 0, 0));
    }
}
