//! Derivatives, continuation, filters and the table of transforms against closed forms.

mod closed_forms;

use closed_forms::*;
use ndarray::Array2;
use salband::field::{PreparedField, Regularisation, Toward};
use salband::grid::{Frame, Grid};

fn gravity() -> PreparedField {
    PreparedField::new(&file("gz")).unwrap()
}

fn check(name: &str, found: &Array2<f64>, exact: &Array2<f64>, bound: f64) {
    let error = error(found, exact);
    println!("{name}: error {error:.2e}, bound {bound:.0e}");
    assert!(error <= bound, "{name}: {error:e} is over {bound:e}");
}

#[test]
fn the_vertical_derivative_is_a_field_of_its_own() {
    let vertical = gravity().vertical().unwrap();
    check("gzz", vertical.values().unwrap().values(), file("gzz").values(), 0.001);
    check("gzzz", vertical.gradient(0.0).unwrap().down(), file("gzzz").values(), 1e-5);
    let exact = layer(&frame(), 0.0, |at| GRAVITY * DENSITY * PRISM.third(at)[2]);
    check("gzz toward east", vertical.gradient(0.0).unwrap().east(), exact.values(), 1e-4);
}

#[test]
fn second_derivatives_are_those_of_the_prism() {
    // Source: the third derivatives of the potential of a prism in closed form, 300 m up and on the ground.
    for height in [0.0, 300.0] {
        let second = gravity().second_derivatives(height).unwrap();
        let exact = |part: usize| layer(&frame(), height, |at| GRAVITY * DENSITY * PRISM.third(at)[part]).into_values();
        check("east east", second.east_east(), &exact(0), 1e-4);
        check("east north", second.east_north(), &exact(1), 1e-4);
        check("east down", second.east_down(), &exact(2), 1e-4);
        check("north north", second.north_north(), &exact(3), 1e-4);
        check("north down", second.north_down(), &exact(4), 1e-4);
        check("down down", second.down_down(), &-(exact(0) + exact(3)), 1e-4);
        for (toward, part) in [
            (Toward::East, second.east_east()),
            (Toward::North, second.north_north()),
            (Toward::Down, second.down_down()),
        ] {
            assert_eq!(&gravity().second_derivative(toward, height).unwrap(), part);
        }
    }
}

#[test]
fn laplaces_equation_holds_to_rounding() {
    // Source: k_east^2 + k_north^2 = k^2; on white noise, whose second derivatives are as large as they can be.
    let grid = Grid::new(Frame::local(100.0, 61, 90).unwrap(), noise((61, 90), 3)).unwrap();
    let second = PreparedField::new(&grid).unwrap().second_derivatives(0.0).unwrap();
    let size = second.down_down().iter().fold(0.0_f64, |most, value| most.max(value.abs()));
    let most = second.laplacian().iter().fold(0.0_f64, |most, value| most.max(value.abs()));
    assert!(size > 1e-4 && most < 1e-13 * size, "{most:e} of {size:e}");
}

#[test]
fn downward_continuation_undoes_upward() {
    // Without noise: what was raised 1,000 m (four cells) in closed form comes down again.
    let raised = PreparedField::new(&file("gz_up1000")).unwrap();
    let down = |gain: f64| raised.downward(1000.0, Regularisation::LargestGain(gain)).unwrap().values().unwrap();
    check("down 1000, gain 10", down(10.0).values(), file("gz").values(), 0.003);
    check("down 1000, gain 1000", down(1000.0).values(), file("gz").values(), 5e-4);
    // In one spectrum nothing is lost but what the gain holds back.
    let back = gravity().raised(500.0).unwrap().downward(500.0, Regularisation::LargestGain(1e4)).unwrap();
    check("up and down 500", back.values().unwrap().values(), file("gz").values(), 1e-8);
}

#[test]
fn noise_sets_the_regularisation_by_its_own_size() {
    let exact = file("gz");
    let (low, high) = file("gz_up1000").range().unwrap();
    let sigma = 0.01 * (high - low);
    let noisy = file("gz_up1000").values() + &(noise((128, 128), 7) * sigma);
    let raised = PreparedField::new(&exact.with(noisy.clone()).unwrap()).unwrap();
    let down = raised.downward(1000.0, Regularisation::Noise(sigma)).unwrap();
    let found = down.values().unwrap();
    let held = error(found.values(), exact.values());
    let loose = raised.downward(1000.0, Regularisation::LargestGain(1000.0)).unwrap().values().unwrap();
    let loose = error(loose.values(), exact.values());
    println!("down 1000 with 1 % noise: {held:.4} by the noise, {loose:.4} with gain 1000");
    assert!(held < 0.012 && loose > 10.0 * held, "{held} {loose}");
    // Noise stated too high costs little, far too low is not believed.
    let careful = raised.downward(1000.0, Regularisation::Noise(1.2 * sigma)).unwrap().values().unwrap();
    let careful = error(careful.values(), exact.values());
    let short = raised.downward(1000.0, Regularisation::Noise(0.9 * sigma)).unwrap().values().unwrap();
    let short = error(short.values(), exact.values());
    println!("stated 20 % too high {careful:.4}, 10 % too low {short:.4}");
    assert!(careful < 0.012 && short > careful, "{careful} {short}");
    let bold = raised.downward(1000.0, Regularisation::Noise(0.8 * sigma)).unwrap_err().to_string();
    assert!(bold.contains("would magnify the shortest waves"), "{bold}");
    // The definition: raised again, the result misses the data by the noise.
    let again = down.upward(1000.0).unwrap();
    let misfit = (again.values() - &noisy).mapv(|value| value * value).mean().unwrap().sqrt();
    assert!((misfit / sigma - 1.0).abs() < 0.011, "{}", misfit / sigma);
}

#[test]
fn each_bad_number_of_a_downward_continuation_is_refused() {
    let field = gravity();
    let refused = |depth: f64, how: Regularisation| field.downward(depth, how).unwrap_err().to_string();
    for depth in [f64::NAN, f64::INFINITY, 0.0, -100.0] {
        assert!(refused(depth, Regularisation::LargestGain(10.0)).contains("the depth"), "{depth}");
    }
    for gain in [f64::NAN, f64::INFINITY, 1.0, -5.0] {
        assert!(refused(500.0, Regularisation::LargestGain(gain)).contains("the largest gain"), "{gain}");
    }
    for noise in [f64::NAN, f64::INFINITY, 0.0, -0.1, 1e6] {
        assert!(refused(500.0, Regularisation::Noise(noise)).contains("the noise of a layer"), "{noise}");
    }
}

/// A Gaussian hill of standard deviation 900 m in the middle of 80 x 96 cells of 100 m.
fn hill(spread: f64, height: f64) -> Grid {
    layer(&Frame::local(100.0, 80, 96).unwrap(), 0.0, |[x, y, _]| {
        height * (-((x - 4800.0).powi(2) + (y - 4000.0).powi(2)) / (2.0 * spread * spread)).exp()
    })
}

#[test]
fn a_low_pass_widens_a_gaussian_hill() {
    // Source: the convolution of two Gaussians: variances add and the volume stays. The filter has the standard deviation
    // sqrt(ln 2 / 2) / pi wavelengths.
    let spread = 700.0_f64;
    let field = PreparedField::new(&hill(spread, 5.0)).unwrap();
    for wavelength in [200.0, 1500.0, 3000.0_f64] {
        let square = spread * spread + wavelength * wavelength * (2.0_f64.ln() / 2.0) / std::f64::consts::PI.powi(2);
        let exact = hill(square.sqrt(), 5.0 * spread * spread / square);
        check("low pass", field.low_pass(wavelength).unwrap().values().unwrap().values(), exact.values(), 2e-5);
    }
    // Half the amplitude of a wave of that length is left: exp(-ln 2).
    let wave =
        layer(&Frame::local(100.0, 80, 200).unwrap(), 0.0, |[x, _, _]| (std::f64::consts::TAU * x / 1000.0).sin());
    let half = PreparedField::new(&wave).unwrap().low_pass(1000.0).unwrap().values().unwrap();
    for row in 30..50 {
        for col in 70..130 {
            assert!((half.values()[[row, col]] - 0.5 * wave.values()[[row, col]]).abs() < 2e-3);
        }
    }
}

#[test]
fn a_low_pass_does_not_overshoot_a_step() {
    // Source: a mean under positive weights stays within the range of what it averages.
    let step = layer(&Frame::local(100.0, 64, 100).unwrap(), 0.0, |[x, _, _]| if x > 5000.0 { 1.0 } else { 0.0 });
    let smooth = PreparedField::new(&step).unwrap().low_pass(1200.0).unwrap().values().unwrap();
    let inner = smooth.values().slice(ndarray::s![20..44, 20..80]).to_owned();
    let (low, high) = inner.iter().fold((f64::MAX, f64::MIN), |(low, high), &value| (low.min(value), high.max(value)));
    assert!(low > -1e-4 && high < 1.0 + 1e-4 && low < 0.01 && high > 0.99, "{low} {high}");
    assert!(inner.rows().into_iter().all(|row| row.iter().zip(row.iter().skip(1)).all(|(a, b)| b - a > -1e-4)));
}

#[test]
fn a_band_pass_is_the_difference_of_two_low_passes() {
    // Source: the closed form of both on a Gaussian hill (see above).
    let spread = 700.0_f64;
    let smoothed = |wavelength: f64| {
        let square = spread * spread + wavelength * wavelength * (2.0_f64.ln() / 2.0) / std::f64::consts::PI.powi(2);
        hill(square.sqrt(), 5.0 * spread * spread / square).into_values()
    };
    let found = PreparedField::new(&hill(spread, 5.0)).unwrap().band_pass(1500.0, 4000.0).unwrap().values().unwrap();
    check("band pass", found.values(), &(smoothed(1500.0) - smoothed(4000.0)), 1e-4);
}

#[test]
fn each_bad_wavelength_is_refused() {
    let field = PreparedField::new(&hill(900.0, 1.0)).unwrap();
    for wavelength in [f64::NAN, f64::INFINITY, 0.0, -500.0, 199.0, 19_300.0] {
        assert!(field.low_pass(wavelength).unwrap_err().to_string().contains("the wavelength"), "{wavelength}");
        assert!(field.band_pass(wavelength, 5000.0).unwrap_err().to_string().contains("wavelength"), "{wavelength}");
        assert!(field.band_pass(500.0, wavelength).unwrap_err().to_string().contains("wavelength"), "{wavelength}");
    }
    for long in [500.0, 400.0] {
        assert!(field.band_pass(500.0, long).unwrap_err().to_string().contains("a long end"), "{long}");
    }
    assert!(field.low_pass(200.0).is_ok() && field.low_pass(19_200.0).is_ok());
}

#[test]
fn the_tilt_gradient_of_a_point_mass() {
    // Source: gz = D / R^3, so that h = 3 D rho / R^5 and d = (2 D^2 - rho^2) / R^5; the slope of atan2(d, h) by hand is
    // 3 D (rho^2 + 2 D^2) / (9 D^2 rho^2 + (2 D^2 - rho^2)^2).
    let (depth, x0, y0) = (2000.0_f64, 15_930.0, 16_080.0);
    let square = |at: [f64; 3]| (at[0] - x0).powi(2) + (at[1] - y0).powi(2);
    let grid = layer(&frame(), 0.0, |at| 1e9 * depth / (square(at) + depth * depth).powf(1.5));
    let field = PreparedField::new(&grid).unwrap();
    let found = field.gradient(0.0).unwrap().tilt_gradient(&field.second_derivatives(0.0).unwrap()).unwrap();
    let mut cells = 0;
    for ((row, col), found) in found.indexed_iter() {
        let (x, y) = grid.frame().position(row as f64, col as f64);
        let (rho, two) = (square([x, y, 0.0]), 2.0 * depth * depth);
        if rho < (2.0 * depth).powi(2) {
            let exact = 3.0 * depth * (rho + two) / (9.0 * depth * depth * rho + (two - rho).powi(2));
            assert!((found / exact - 1.0).abs() < 0.01, "{row} {col}: {found:e} for {exact:e}");
            cells += 1;
        }
    }
    assert!(cells > 780);
}

#[test]
fn derivatives_of_one_frame_do_not_mix_with_another() {
    let other = PreparedField::new(&hill(900.0, 1.0)).unwrap().second_derivatives(0.0).unwrap();
    let error = gravity().gradient(0.0).unwrap().tilt_gradient(&other).unwrap_err().to_string();
    assert!(error.contains("another frame"), "{error}");
}
