//! The table of transforms: every product by name, its unit, and what is refused.

mod closed_forms;

use std::collections::BTreeMap;

use closed_forms::layer;
use ndarray::Array2;
use salband::field::{PreparedField, Transform, derive};
use salband::grid::{Frame, Grid, Mask};

/// A Gaussian hill of standard deviation 900 m in the middle of 80 x 96 cells of 100 m.
fn hill(spread: f64, height: f64) -> Grid {
    layer(&Frame::local(100.0, 80, 96).unwrap(), 0.0, |[x, y, _]| {
        height * (-((x - 4800.0).powi(2) + (y - 4000.0).powi(2)) / (2.0 * spread * spread)).exp()
    })
}

/// Parameters under which every transform of the list can run on a hill.
fn parameters(name: &str) -> BTreeMap<String, f64> {
    let numbers = [
        ("height", 100.0),
        ("depth", 200.0),
        ("gain", 20.0),
        ("wavelength", 1000.0),
        ("short", 500.0),
        ("long", 3000.0),
        ("inclination", -55.0),
        ("declination", 4.0),
        ("magnetisation-inclination", 40.0),
        ("magnetisation-declination", 100.0),
        ("ratio", 2.0),
        ("window", 400.0),
        ("degree", 2.0),
    ];
    let entry = Transform::list().iter().find(|entry| entry.name == name).unwrap();
    numbers
        .into_iter()
        .filter(|(name, _)| entry.parameters.iter().any(|known| known.name == *name))
        .map(|(name, number)| (name.to_string(), number))
        .collect()
}

#[test]
fn every_listed_transform_runs_and_keeps_the_footprint() {
    let mut values = hill(900.0, 3.0).into_values();
    values.slice_mut(ndarray::s![10..20, 5..25]).fill(f64::NAN);
    let grid = hill(900.0, 3.0).with(values).unwrap();
    let mut names: Vec<&str> = Transform::names().collect();
    for name in &names {
        let transform = Transform::named(name, &parameters(name)).unwrap();
        let product = derive(&grid, &transform).unwrap();
        let expected = if *name == "filled" { Mask::all(grid.frame().shape()) } else { grid.footprint() };
        assert_eq!(product.footprint(), expected, "{name}");
        assert!(product.range().is_some_and(|(low, high)| high > low), "{name} is not constant");
    }
    names.sort_unstable();
    names.dedup();
    assert_eq!(names.len(), 25, "names are unique");
}

#[test]
fn every_listed_transform_refuses_a_constant_and_an_empty_layer() {
    let flat =
        |value: f64| Grid::new(Frame::local(100.0, 20, 20).unwrap(), Array2::from_elem((20, 20), value)).unwrap();
    for name in Transform::names() {
        let transform = Transform::named(name, &parameters(name)).unwrap();
        let refused = |value: f64| derive(&flat(value), &transform).unwrap_err().to_string();
        assert!(refused(7.5).contains("the layer is constant"), "{name}");
        assert!(refused(f64::NAN).contains("no cell that holds a number"), "{name}");
    }
}

#[test]
fn products_are_the_same_on_any_number_of_threads() {
    let mut values = hill(900.0, 3.0).into_values();
    values.slice_mut(ndarray::s![10..20, 5..25]).fill(f64::NAN);
    let grid = hill(900.0, 3.0).with(values).unwrap();
    for name in Transform::names() {
        let transform = Transform::named(name, &parameters(name)).unwrap();
        let bits = |threads: usize| -> Vec<u64> {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
            let product = pool.install(|| derive(&grid, &transform)).unwrap();
            product.values().iter().map(|value| value.to_bits()).collect()
        };
        assert_eq!(bits(1), bits(3), "{name}");
    }
}

#[test]
fn products_are_those_of_the_library() {
    let grid = hill(900.0, 3.0);
    let field = PreparedField::new(&grid).unwrap();
    let gradient = field.gradient(100.0).unwrap();
    let second = field.second_derivatives(100.0).unwrap();
    let product =
        |name: &str| derive(&grid, &Transform::named(name, &parameters(name)).unwrap()).unwrap().into_values();
    for (name, expected) in [
        ("derivative-east", gradient.east().clone()),
        ("derivative-north", gradient.north().clone()),
        ("derivative-down", gradient.down().clone()),
        ("second-east", second.east_east().clone()),
        ("second-north", second.north_north().clone()),
        ("second-down", second.down_down().clone()),
        ("horizontal-gradient", gradient.horizontal()),
        ("analytic-signal", gradient.total()),
        ("tilt", gradient.tilt()),
        ("tilt-gradient", gradient.tilt_gradient(&second).unwrap()),
        ("theta", gradient.theta()),
        ("upward", field.upward(100.0).unwrap().into_values()),
    ] {
        assert_eq!(product(name), expected, "{name}");
    }
    let sum = product("regional") + product("residual");
    assert!(sum.iter().zip(grid.values()).all(|(a, b)| (a - b).abs() < 1e-12));
}

#[test]
fn units_of_products() {
    let unit = |name: &str, of: &str| Transform::named(name, &parameters(name)).unwrap().product_unit(of);
    for (name, of, expected) in [
        ("upward", "mGal", "mGal"),
        ("derivative-down", "mGal", "mGal/m"),
        ("derivative-down", "mGal/m", "mGal/m2"),
        ("second-east", "nT", "nT/m2"),
        ("second-down", "nT/m2", "nT/m4"),
        ("horizontal-gradient", "", "1/m"),
        ("tilt", "mGal", "degrees"),
        ("tilt-gradient", "mGal", "rad/m"),
        ("theta", "mGal", "1"),
        ("pole", "nT", "nT"),
        ("pseudo-gravity", "nT", "mGal"),
        ("magnetic-potential", "nT", "nT m"),
        ("potential-to-gravity", "nT m", "mGal"),
        ("fabric-strike", "nT", "degrees"),
        ("fabric-coherence", "nT", "1"),
        ("residual", "nT", "nT"),
        ("derivative-east", "kg/mol", "kg/mol/m"),
    ] {
        assert_eq!(unit(name, of), expected, "{name} of {of}");
    }
}

#[test]
fn each_bad_choice_of_parameters_is_refused() {
    let refused = |name: &str, given: &[(&str, f64)]| {
        let given = given.iter().map(|(name, number)| (name.to_string(), *number)).collect();
        Transform::named(name, &given).unwrap_err().to_string()
    };
    assert!(refused("sideways", &[]).contains("one of upward, downward"));
    assert!(refused("tilt", &[("depth", 1.0)]).contains("a parameter \"depth\""));
    assert!(refused("filled", &[("height", 1.0)]).contains("no parameter"));
    assert!(refused("upward", &[]).contains("no height"));
    assert!(refused("downward", &[("depth", 1.0)]).contains("neither a gain nor a noise level"));
    assert!(refused("downward", &[("depth", 1.0), ("gain", 2.0), ("noise", 1.0)]).contains("both"));
    assert!(refused("pole", &[("inclination", 60.0)]).contains("no declination"));
    assert!(refused("pole", &[("inclination", 95.0), ("declination", 0.0)]).contains("between -90 and 90"));
    let half = [("inclination", 60.0), ("declination", 0.0), ("magnetisation-inclination", 10.0)];
    assert!(refused("pole", &half).contains("no magnetisation-declination"));
    for degree in [f64::NAN, 1.5, -1.0, 1e9] {
        assert!(refused("regional", &[("degree", degree)]).contains("a whole number"), "{degree}");
    }
}
