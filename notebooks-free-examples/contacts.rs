//! Contacts of an invented gravity layer: what stands above its noise, how deep, and which way it dips.
//!
//! Run with `cargo run --release --example contacts`.

use ndarray::Array2;
use salband::contact::{ContactSettings, Ladder, Level, find_contacts_above_noise, tilt_depth};
use salband::field::{GradientNoise, PreparedField, estimate_noise, vertical_derivative};
use salband::grid::{Frame, Grid};

fn main() -> salband::Result<()> {
    // A dense block 4 km wide that strikes at 20 degrees, between depths of 400 and 3,000 m, whose western face dips east at
    // 50 degrees and whose eastern face is vertical: sheets 50 m thick, each 2 G density thickness (atan to the west - atan
    // to the east).
    let frame = Frame::local(100.0, 128, 128)?;
    let mut state = 20_260_401_u64;
    let values = Array2::from_shape_fn((128, 128), |(row, col)| {
        let (east, north) = frame.position(row as f64, col as f64);
        let x = 6400.0 + (east - 6400.0) * 20.0_f64.to_radians().cos() - (north - 6400.0) * 20.0_f64.to_radians().sin();
        let sheets = (0..52).map(|sheet| {
            let z = 425.0 + 50.0 * f64::from(sheet);
            let west = 4400.0 + (z - 400.0) / 50.0_f64.to_radians().tan();
            ((x - west) / z).atan() - ((x - 8400.0) / z).atan()
        });
        // 250 kg/m3 give 2 x 6.6743e-11 x 250 x 50 x 1e5 mGal for each sheet and radian; the noise is about 0.1 mGal.
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        0.1669 * sheets.sum::<f64>() + 0.1 * 3.46 * ((state >> 11) as f64 / (1_u64 << 53) as f64 - 0.5)
    });
    let layer = Grid::new(frame, values)?;
    let noise = estimate_noise(&layer)?;
    println!("noise {:.4} mGal (white: {})", noise.sigma, noise.is_white());

    let field = PreparedField::new(&layer)?;
    let settings = ContactSettings::above_noise(2000.0)?;
    let mut levels = Vec::new();
    for height in [300.0, 500.0, 700.0, 1000.0] {
        let above = GradientNoise::of_field(noise.cautious(), layer.frame().cell, height)?;
        let contacts = find_contacts_above_noise(&field.gradient(height)?, &above, &settings)?;
        levels.push(Level { height, contacts });
    }
    let base = levels[0].contacts.clone();
    let tilted = PreparedField::new(&vertical_derivative(&field.upward(300.0)?)?)?.gradient(0.0)?;
    for (contact, persistence) in base.iter().zip(Ladder::new(layer.frame().cell, levels)?.trace()) {
        println!(
            "{:.1} km, strike {:.0}, dense side {}, persists at {} of 3 heights",
            contact.length_m / 1000.0,
            contact.strike_deg,
            contact.dense_side(),
            persistence.levels
        );
        if let Some(significance) = contact.significance {
            let (ratio, p) = (significance.signal_to_noise, significance.log10_p_layer);
            println!("  signal to noise {ratio:.0}, log10 of the chance in the whole layer {p:.1}");
        }
        if let Some(depth) = tilt_depth(contact, &tilted) {
            let below = |above: f64| above - 300.0;
            println!("  depth {:.0} m ({:.0} to {:.0})", below(depth.median), below(depth.low), below(depth.high));
        }
        for face in persistence.faces {
            let drift = face.drift;
            println!("  drift {:.2} ({:.2} to {:.2}) m/m, dip {}", drift.rate, drift.low, drift.high, drift.dip.name());
        }
    }
    Ok(())
}
