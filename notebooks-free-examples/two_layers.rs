//! Two layers of any science: do the cafés of an invented town keep to its tram lines, and could chance do that?
//!
//! `cargo run --release --example two_layers`

use ndarray::Array2;
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use salband::coincidence::{Reference, Settings, Subject, compare};

const SIDE: usize = 120;

fn main() -> Result<(), salband::Error> {
    // Tram lines: three streets that wind across the town.
    let street = |row: usize| {
        let along = row as f64 / 11.0;
        [25.0 + 6.0 * along.sin(), 58.0 + 9.0 * (0.7 * along).cos(), 96.0 + 5.0 * (1.3 * along).sin()]
    };
    let distance = Array2::from_shape_fn((SIDE, SIDE), |(row, col)| {
        // To the nearest street in the same row: near enough for streets that run north.
        street(row).iter().map(|place| (col as f64 - place).abs()).fold(f64::INFINITY, f64::min)
    });
    // Cafés: half of them look for a tram, half stand anywhere. The lake in the north-east has none, and was not surveyed.
    let mut random = Xoshiro256PlusPlus::seed_from_u64(20260401);
    let land = Array2::from_shape_fn((SIDE, SIDE), |(row, col)| row + SIDE > col + 40);
    let mut cafes = Array2::from_elem((SIDE, SIDE), false);
    for number in 0..260 {
        let row = random.gen_range(0..SIDE);
        let col = if number % 2 == 0 {
            let near = street(row)[random.gen_range(0..3)] + random.gen_range(-2.5..2.5);
            near.round().clamp(0.0, SIDE as f64 - 1.0) as usize
        } else {
            random.gen_range(0..SIDE)
        };
        cafes[[row, col]] = land[[row, col]];
    }
    let subject = Subject { footprint: land.clone(), members: Some(cafes), strength: None };
    let reference = Reference { footprint: land, distance: Some(distance), strength: None, ..Reference::default() };
    let settings = Settings { within: vec![1.5, 3.0, 6.0], profile: vec![], distance_cap: 12.0, level: 0.05 };
    let comparison = compare(&[subject], &[reference], &settings)?;
    for test in &comparison.tests {
        println!(
            "{}: observed {:.2}, by chance {:.2} to {:.2}; {}",
            test.measure, test.observed, test.low, test.high, test.verdict
        );
    }
    Ok(())
}
