//! Transforms in worlds of prisms, against the exact answers and against a plainly padded transform.

use std::f64::consts::{PI, TAU};

use ndarray::Array2;
use rustfft::{FftPlanner, num_complex::Complex64};
use salband::field::PreparedField;
use salband::grid::Grid;

#[path = "worlds/prisms.rs"]
mod prisms;

use prisms::{CELL, Fields, HEIGHT, SIDE, blobs, inducing, six_bodies};

const WORLDS: u64 = 8;
const PRODUCTS: [&str; 5] = ["up 1000 m", "east", "north", "vertical", "pole"];

/// Root mean square error over the interior, a tenth of the width from the edge, divided by the range of the exact answer.
fn error(found: &Array2<f64>, exact: &Array2<f64>) -> f64 {
    let ring = SIDE / 10;
    let inner = ndarray::s![ring..SIDE - ring, ring..SIDE - ring];
    let (low, high) =
        exact.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &value| (low.min(value), high.max(value)));
    let difference = &found.slice(inner) - &exact.slice(inner);
    difference.mapv(|value| value * value).mean().unwrap().sqrt() / (high - low)
}

fn transform(values: &mut Array2<Complex64>, inverse: bool) {
    let side = values.nrows();
    let mut planner = FftPlanner::new();
    let fft = if inverse { planner.plan_fft_inverse(side) } else { planner.plan_fft_forward(side) };
    for _ in 0..2 {
        fft.process(values.as_slice_mut().unwrap());
        let turned = values.t().as_standard_layout().to_owned();
        *values = turned;
    }
}

/// The products of a plain transform: mean taken off, mirrored to twice the side. The filter gets east, north and length.
fn plainly(values: &Array2<f64>, keep_mean: bool, filter: impl Fn(f64, f64, f64) -> Complex64) -> Array2<f64> {
    let mean = values.mean().unwrap();
    let side = 2 * SIDE;
    let mirrored = |place: usize| {
        let at = place as isize - (SIDE / 2) as isize;
        (if at < 0 { -at - 1 } else { at.min(2 * SIDE as isize - 1 - at) }) as usize
    };
    let mut waves = Array2::from_shape_fn((side, side), |(row, col)| {
        Complex64::new(values[[mirrored(row), mirrored(col)]] - mean, 0.0)
    });
    transform(&mut waves, false);
    let turns = |at: usize| if 2 * at > side { at as f64 - side as f64 } else { at as f64 };
    let step = TAU / (side as f64 * CELL);
    let cut = |at: usize| if 2 * at == side { 0.0 } else { step * turns(at) };
    for ((row, col), wave) in waves.indexed_iter_mut() {
        *wave *= filter(cut(col), -cut(row), step * turns(row).hypot(turns(col)));
    }
    transform(&mut waves, true);
    let scale = 1.0 / (side * side) as f64;
    let inner = ndarray::s![SIDE / 2..SIDE / 2 + SIDE, SIDE / 2..SIDE / 2 + SIDE];
    waves.slice(inner).mapv(|value| value.re * scale + if keep_mean { mean } else { 0.0 })
}

/// 1 / Theta^2 (Blakely 1995, section 12.3.1) for inclination -60 and declination 5 degrees.
fn pole(east: f64, north: f64, length: f64) -> Complex64 {
    if length == 0.0 {
        return Complex64::new(1.0, 0.0);
    }
    let (dip, bearing) = (-PI / 3.0, PI / 36.0);
    let along = dip.cos() * (bearing.sin() * east + bearing.cos() * north);
    let theta = Complex64::new(dip.sin(), along / length);
    (theta * theta).inv()
}

/// The errors of the five products here and plainly.
fn errors(world: &Fields) -> [[f64; 2]; 5] {
    let field = PreparedField::new(&world.gravity).unwrap();
    let gradient = field.gradient(0.0).unwrap();
    let reduced = PreparedField::new(&world.magnetic).unwrap().to_pole(inducing()).unwrap().values().unwrap();
    let (gravity, magnetic) = (world.gravity.values(), world.magnetic.values());
    let plain_up = plainly(gravity, true, |_, _, length| Complex64::new((-length * HEIGHT).exp(), 0.0));
    let plain_east = plainly(gravity, false, |east, _, _| Complex64::new(0.0, east));
    let plain_north = plainly(gravity, false, |_, north, _| Complex64::new(0.0, north));
    let plain_down = plainly(gravity, false, |_, _, length| Complex64::new(length, 0.0));
    let plain_pole = plainly(magnetic, true, pole);
    [
        [field.upward(HEIGHT).unwrap().values(), &plain_up].map(|found| error(found, &world.raised)),
        [gradient.east(), &plain_east].map(|found| error(found, &world.east)),
        [gradient.north(), &plain_north].map(|found| error(found, &world.north)),
        [gradient.down(), &plain_down].map(|found| error(found, &world.down)),
        [reduced.values(), &plain_pole].map(|found| error(found, &world.reduced)),
    ]
}

/// Prints and returns, for each product, our error over that of a plain transform, both as root mean squares over worlds.
fn compared(name: &str, cut: usize) -> Vec<f64> {
    let all: Vec<_> = (0..WORLDS).map(|seed| errors(&Fields::of(&six_bodies(1 + seed, cut)))).collect();
    let over_worlds = |product: usize, which: usize| {
        (all.iter().map(|errors| errors[product][which].powi(2)).sum::<f64>() / all.len() as f64).sqrt()
    };
    println!("{name}: error over range, here and plainly padded; their ratio; the worst world's ratio");
    let one = |(at, product): (usize, &&str)| {
        let (ours, plain) = (over_worlds(at, 0), over_worlds(at, 1));
        let worst = all.iter().map(|errors| errors[at][0] / errors[at][1]).fold(0.0, f64::max);
        println!("  {product:<10} {ours:.2e} {plain:.2e}  {:.3}  {worst:.3}", ours / plain);
        ours / plain
    };
    PRODUCTS.iter().enumerate().map(one).collect()
}

#[test]
fn bodies_inside_the_frame() {
    for (product, ratio) in PRODUCTS.iter().zip(compared("six bodies inside", 0)) {
        assert!(ratio <= 0.5, "{product}: {ratio}");
    }
}

#[test]
fn bodies_cut_by_the_edge() {
    for cut in [2, 3] {
        for (product, ratio) in PRODUCTS.iter().zip(compared(&format!("six bodies, {cut} of them cut"), cut)) {
            assert!(ratio <= 0.5, "{product}: {ratio}");
        }
    }
}

#[test]
fn a_plane_added_to_the_field_changes_nothing_else() {
    // The zero level of a gravity grid means nothing: what is found must not lean on it.
    let world = Fields::of(&six_bodies(3, 2));
    let plane = |row: usize, col: usize| -480.0 + 0.05 * row as f64 - 0.02 * col as f64;
    let mut lifted = world.gravity.values().clone();
    lifted.indexed_iter_mut().for_each(|((row, col), value)| *value += plane(row, col));
    let lifted = PreparedField::new(&world.gravity.with(lifted).unwrap()).unwrap();
    let field = PreparedField::new(&world.gravity).unwrap();
    let (low, high) = world.gravity.range().unwrap();
    let (raised, both) = (field.upward(HEIGHT).unwrap(), lifted.upward(HEIGHT).unwrap());
    for ((row, col), value) in both.values().indexed_iter() {
        assert!((value - plane(row, col) - raised.values()[[row, col]]).abs() < 1e-6 * (high - low));
    }
    let (alone, both) = (field.gradient(0.0).unwrap(), lifted.gradient(0.0).unwrap());
    for (cell, down) in both.down().indexed_iter() {
        let off = (both.east()[cell] + 0.02 / CELL - alone.east()[cell]).abs();
        let off = off.max((both.north()[cell] + 0.05 / CELL - alone.north()[cell]).abs());
        assert!(off.max((down - alone.down()[cell]).abs()) < 1e-6 * (high - low) / CELL, "{cell:?}");
    }
}

#[test]
fn the_number_of_threads_changes_no_byte() {
    let world = Fields::of(&six_bodies(5, 2));
    let mut values = world.gravity.values().clone();
    values.zip_mut_with(&blobs(7), |value, missing| {
        if *missing {
            *value = f64::NAN
        }
    });
    let holed = world.gravity.with(values).unwrap();
    let bits = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        let down = pool.install(|| PreparedField::new(&holed).unwrap().gradient(300.0).unwrap().down().clone());
        down.mapv(f64::to_bits)
    };
    assert_eq!(bits(1), bits(3));
}

/// Each missing cell the mean of its neighbours: a harmonic filling by over-relaxation, to compare with.
fn filled_harmonically(grid: &Grid) -> Grid {
    let footprint = grid.footprint();
    let mut values = grid.values().mapv(|value| if value.is_nan() { 0.0 } else { value });
    for _ in 0..1500 {
        for ((row, col), known) in footprint.0.indexed_iter() {
            if !known {
                let sides = [(row.wrapping_sub(1), col), (row + 1, col), (row, col.wrapping_sub(1)), (row, col + 1)];
                let around: Vec<f64> = sides.iter().filter_map(|side| values.get(*side).copied()).collect();
                let mean = around.iter().sum::<f64>() / around.len() as f64;
                values[[row, col]] += 1.7 * (mean - values[[row, col]]);
            }
        }
    }
    grid.with(values).unwrap()
}

/// Root mean square errors, over the range of the exact answers, of the products in known cells within three cells of a
/// gap, and in those farther off.
fn errors_near_and_away(world: &Fields, gravity: &Grid, magnetic: &Grid, missing: &Array2<bool>) -> Vec<[f64; 2]> {
    let field = PreparedField::new(gravity).unwrap();
    let gradient = field.gradient(0.0).unwrap();
    let raised = field.upward(HEIGHT).unwrap().into_values();
    let reduced = PreparedField::new(magnetic).unwrap().to_pole(inducing()).unwrap().values().unwrap().into_values();
    let near = Array2::from_shape_fn((SIDE, SIDE), |(row, col)| {
        let reach = |at: usize| at.saturating_sub(3)..(at + 4).min(SIDE);
        reach(row)
            .any(|r| reach(col).any(|c| missing[[r, c]] && (r.abs_diff(row).pow(2) + c.abs_diff(col).pow(2)) <= 9))
    });
    let pairs = [
        (&raised, &world.raised),
        (gradient.east(), &world.east),
        (gradient.north(), &world.north),
        (gradient.down(), &world.down),
        (&reduced, &world.reduced),
    ];
    let one = |(found, exact): (&Array2<f64>, &Array2<f64>)| {
        let range = exact.iter().fold(f64::NEG_INFINITY, |most, value| most.max(*value))
            - exact.iter().fold(f64::INFINITY, |least, value| least.min(*value));
        [true, false].map(|which| {
            let inside = SIDE / 10..SIDE - SIDE / 10;
            let cells = found.indexed_iter().filter(|((row, col), _)| {
                inside.contains(row) && inside.contains(col) && !missing[[*row, *col]] && near[[*row, *col]] == which
            });
            let squares: Vec<f64> = cells.map(|(cell, found)| (found - exact[cell]).powi(2)).collect();
            (squares.iter().sum::<f64>() / squares.len() as f64).sqrt() / range
        })
    };
    pairs.into_iter().map(one).collect()
}

#[test]
fn a_tenth_of_the_cells_missing() {
    let mut squares = [[[0.0; 2]; 2]; 5];
    let worlds = 4;
    for seed in 1..=worlds {
        let world = Fields::of(&six_bodies(seed, if seed % 2 == 0 { 2 } else { 0 }));
        let missing = blobs(100 + seed);
        let holed = |grid: &Grid| {
            let mut values = grid.values().clone();
            values.zip_mut_with(&missing, |value, missing| {
                if *missing {
                    *value = f64::NAN
                }
            });
            grid.with(values).unwrap()
        };
        let (gravity, magnetic) = (holed(&world.gravity), holed(&world.magnetic));
        assert_eq!(PreparedField::new(&gravity).unwrap().upward(HEIGHT).unwrap().footprint(), gravity.footprint());
        let ours = errors_near_and_away(&world, &gravity, &magnetic, &missing);
        let (gravity, magnetic) = (filled_harmonically(&gravity), filled_harmonically(&magnetic));
        let harmonic = errors_near_and_away(&world, &gravity, &magnetic, &missing);
        for (product, square) in squares.iter_mut().enumerate() {
            for place in 0..2 {
                square[0][place] += ours[product][place].powi(2) / worlds as f64;
                square[1][place] += harmonic[product][place].powi(2) / worlds as f64;
            }
        }
    }
    println!("a tenth missing: error over range near gaps and away from them, here; the same if filled harmonically");
    for (product, square) in PRODUCTS.iter().zip(squares) {
        let [[near, away], [near_harmonic, away_harmonic]] = square.map(|places| places.map(f64::sqrt));
        println!("  {product:<10} {near:.2e} {away:.2e}  {near_harmonic:.2e} {away_harmonic:.2e}");
        // What the fill is for: derivatives at the rim of a gap.
        let share = if ["east", "north", "vertical"].contains(product) { 0.25 } else { 0.8 };
        assert!(near <= share * near_harmonic && away <= away_harmonic, "{product}");
    }
}
