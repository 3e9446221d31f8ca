//! Contacts in noise: how often noise alone makes a line, and what noise does to the line over a step.

use ndarray::Array2;
use rayon::prelude::*;
use salband::contact::{ContactSettings, find_contacts_above_noise};
use salband::field::{Direction, EdgeNoise, GradientNoise, MagneticDirections, PreparedField, estimate_noise};
use salband::grid::{Frame, Grid};

#[path = "../src/field/chance.rs"]
mod chance;
use chance::gaussian;

const CELL: f64 = 100.0;
/// The first seed: other layers than those that `near_edges` measures with and that the rules were chosen on.
const SEEDS: u64 = 10_000;
/// Noise of the layers, in units of the field.
const SIGMA: f64 = 0.3;

fn layer(values: Array2<f64>) -> Grid {
    Grid::new(Frame::local(CELL, values.nrows(), values.ncols()).unwrap(), values).unwrap()
}

/// How many layers: few enough for every day here, in full by `make calibrate`, which sets SALBAND_LAYERS to 400.
fn layers(everyday: u64) -> u64 {
    std::env::var("SALBAND_LAYERS").ok().and_then(|number| number.parse().ok()).unwrap_or(everyday)
}

/// Heights at which the rates are measured, m.
const HEIGHTS: [f64; 3] = [0.0, CELL, 3.0 * CELL];

/// In how many of `layers` layers of noise any line is found at each height, as a share, with the noise known and with it
/// estimated. `spoilt` may take cells out; `product` is the field whose gradient is taken, `noise` that of the gradient, for
/// a layer of so many cells on a side with so much noise at such a height.
fn rates(
    layers: u64,
    spoilt: impl Fn(&mut Array2<f64>) + Sync,
    product: impl Fn(PreparedField) -> PreparedField + Sync,
    noise: impl Fn(usize, f64, f64) -> GradientNoise + Sync,
) -> [[f64; 2]; 3] {
    let settings = ContactSettings::above_noise(0.0).unwrap();
    let found: Vec<[[bool; 2]; 3]> = (0..layers)
        .into_par_iter()
        .map(|seed| {
            let side = SIDES[seed as usize % 3];
            let mut values = gaussian((side, side), SEEDS + seed) * SIGMA;
            spoilt(&mut values);
            let grid = layer(values);
            let field = product(PreparedField::new(&grid).unwrap());
            let estimated = estimate_noise(&grid).unwrap().cautious();
            HEIGHTS.map(|height| {
                let gradient = field.gradient(height).unwrap();
                [SIGMA, estimated].map(|sigma| {
                    let noise = noise(side, sigma, height);
                    !find_contacts_above_noise(&gradient, &noise, &settings).unwrap().is_empty()
                })
            })
        })
        .collect();
    let share =
        |height: usize, which: usize| found.iter().filter(|of| of[height][which]).count() as f64 / layers as f64;
    [0, 1, 2].map(|height| [0, 1].map(|which| share(height, which)))
}

/// Cells on a side of the layers of noise.
const SIDES: [usize; 3] = [64, 96, 128];

#[test]
fn noise_alone_makes_a_line_no_more_often_than_stated() {
    // Source: the significance itself, 0.05; of 400 layers a rate of 0.05 has a standard error of 0.011, of 60 one of 0.028.
    // So many layers may be over by two of their standard errors.
    let told = |what: &str, layers: u64, rates: [[f64; 2]; 3]| {
        let most = 0.05 + 2.0 * (0.05 * 0.95 / layers as f64).sqrt();
        for (height, [known, estimated]) in HEIGHTS.into_iter().zip(rates) {
            println!("{what}, {height} m: {known:.4} with the noise known, {estimated:.4} with it estimated");
            assert!(known <= most && estimated <= most, "{what}, {height} m: {known} {estimated}");
        }
    };
    let plain = |_: usize, sigma: f64, height: f64| GradientNoise::of_field(sigma, CELL, height).unwrap();
    told("whole", layers(120), rates(layers(120), |_| (), |field| field, plain));
    let holes = |values: &mut Array2<f64>| {
        values.slice_mut(ndarray::s![..30, ..25]).fill(f64::NAN);
        values.slice_mut(ndarray::s![40..50, 30..45]).fill(f64::NAN);
    };
    told("with gaps", layers(60), rates(layers(60), holes, |field| field, plain));
    // On a slope of ten deviations of the noise for each cell every cell is strong, and only what rises above the flank counts.
    let own =
        SIDES.map(|side| EdgeNoise::new(&Frame::local(CELL, side, side).unwrap(), |field| Ok(field.clone())).unwrap());
    let sloping = |values: &mut Array2<f64>| {
        values
            .indexed_iter_mut()
            .for_each(|((row, col), value)| *value += SIGMA * (10.0 * col as f64 + 3.0 * row as f64));
    };
    let near_edges = |side: usize, sigma: f64, height: f64| {
        let at = SIDES.iter().position(|known| *known == side).unwrap();
        plain(side, sigma, height).near_edges(&own[at]).unwrap()
    };
    told("on a slope", layers(60), rates(layers(60), sloping, |field| field, near_edges));
    let inducing = MagneticDirections::induced(Direction::new(60.0, 10.0).unwrap());
    let product = |field: &PreparedField| field.to_pseudo_gravity(inducing, 1.0);
    let edges = SIDES.map(|side| EdgeNoise::new(&Frame::local(CELL, side, side).unwrap(), product).unwrap());
    let magnetic = |side: usize, sigma: f64, height: f64| {
        let at = SIDES.iter().position(|known| *known == side).unwrap();
        let noise = GradientNoise::of_pseudo_gravity(sigma, CELL, height, inducing, 1.0).unwrap();
        noise.near_edges(&edges[at]).unwrap()
    };
    told("pseudo-gravity", layers(30), rates(layers(30), |_| (), |field| product(&field).unwrap(), magnetic));
}

/// The gradient over the edge of a semi-infinite sheet at depth `z` that strikes at `strike`, dense side to the right,
/// through the middle of the layer: its values 2 G sigma (pi / 2 + atan(s / z)), scaled so that the crest is 1 per cell
/// (Telford, Geldart & Sheriff 1990, section 2.7, from memory).
fn step(side: usize, strike: f64, z: f64) -> Array2<f64> {
    let (sin, cos) = strike.to_radians().sin_cos();
    let middle = (side as f64 - 1.0) / 2.0;
    Array2::from_shape_fn((side, side), |(row, col)| {
        let (x, y) = (col as f64 - middle, middle - row as f64);
        z / CELL * ((x * cos - y * sin) * CELL / z).atan()
    })
}

/// Mean and standard deviation of the distances of vertices from the true edge, in cells, over the layers; how many
/// lines were found in all, and how many of them true.
fn noisy_step(signal_to_noise: f64, height: f64) -> (f64, f64, usize, usize) {
    const SIDE: usize = 96;
    let (strike, z): (f64, f64) = (25.0, 300.0);
    let (sin, cos) = strike.to_radians().sin_cos();
    // At height h the crest is z / (z + h) of the strength at the ground.
    let unit = GradientNoise::of_field(1.0, CELL, height).unwrap().component() * CELL;
    let sigma = z / (z + height) / (signal_to_noise * unit);
    let settings = ContactSettings::above_noise(10.0 * CELL).unwrap();
    let noise = GradientNoise::of_field(sigma, CELL, height).unwrap();
    let runs: Vec<(Vec<f64>, usize)> = (0..layers(80))
        .into_par_iter()
        .map(|seed| {
            let field =
                PreparedField::new(&layer(step(SIDE, strike, z) + gaussian((SIDE, SIDE), SEEDS + seed) * sigma))
                    .unwrap();
            let found = find_contacts_above_noise(&field.gradient(height).unwrap(), &noise, &settings).unwrap();
            let half = SIDE as f64 / 2.0;
            // The padding bends the field near the edge of the frame, so the middle half is looked at.
            let inner = |at: &geo::Coord<f64>| (at.x / CELL - half).abs().max((at.y / CELL - half).abs()) < half / 2.0;
            let off = |at: &geo::Coord<f64>| (at.x / CELL - half) * cos - (at.y / CELL - half) * sin;
            let places =
                found.iter().flat_map(|contact| contact.line.0.iter()).filter(|at| inner(at)).map(off).collect();
            (places, found.len())
        })
        .collect();
    let lines = runs.iter().map(|(_, count)| count).sum();
    let found = runs.iter().filter(|(places, _)| places.len() > SIDE / 4).count();
    let places: Vec<f64> = runs.into_iter().flat_map(|(places, _)| places).collect();
    let mean = places.iter().sum::<f64>() / places.len() as f64;
    let spread = (places.iter().map(|place| (place - mean).powi(2)).sum::<f64>() / places.len() as f64).sqrt();
    (mean, spread, lines, found)
}

#[test]
fn a_step_in_noise_is_placed_without_bias() {
    for height in [0.0, 3.0 * CELL] {
        for ratio in [10.0, 5.0] {
            let (mean, spread, lines, found) = noisy_step(ratio, height);
            println!(
                "S/N {ratio}, {height} m: bias {mean:.3}, scatter {spread:.3} cells, {lines} lines, {found} of {}",
                layers(80)
            );
            // A line of a layer holds about eight independent places, so the mean has this standard error.
            let error = spread / (8.0 * found as f64).sqrt();
            println!("standard error of the bias {error:.3}");
            assert!(mean.abs() < 3.0 * error, "bias {mean}, standard error {error}");
            // At 5 few lines are found: a crest must fall to both sides by what noise would not anywhere in the layer, which
            // keeps the level on slopes and costs weak contacts.
            if height > 0.0 && ratio == 10.0 {
                // To first order a crest moves by the noise of its slope over its bend. Over the wavenumber plane the slope
                // of a component along itself has 3/4 of the mean squared wavenumber, 5 / h^2, times its variance; the
                // sheet bends by 2 / (z + h)^2 of its crest. Lines are smoothed, and the strongest of several crests is
                // kept, so the scatter stays somewhat below that.
                let expected = 3.75_f64.sqrt() / (height / CELL) * (600.0 / CELL).powi(2) / 2.0 / ratio;
                assert!((0.7..1.1).contains(&(spread / expected)), "scatter {spread}, expected {expected}");
                assert!(found as u64 >= layers(80) * 6 / 10, "{found} of {}", layers(80));
            }
        }
    }
}
