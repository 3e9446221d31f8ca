//! What the survey's files hold: each layer sampled where its own cells lie.

use crate::bodies::{Body, CORNER, SIZE};
use crate::layout::{GROUND, Layout, transform};
use crate::random::{Purpose, between, dice, normal};
use crate::sanity::crests;
use crate::world::{Slice, World, add_noise, gravity, magnetics};
use crate::write::{Layer, ascii, float_tiff, netcdf, scaled_tiff, virtual_halves};
use gdal::errors::Result;
use std::path::Path;

/// Standard deviation of the noise on gravity, mGal, and on magnetics, nT.
pub const NOISE: [f64; 2] = [0.03, 2.0];
/// EPSG code of the resistivity slices: the neighbouring zone, so that they lie turned against the gravity grid.
const SLICES: u32 = 32634;
/// Middle and radius of the gaps in the gravity grid: from the corner of the area, m.
const GRAVITY_GAPS: [([f64; 2], f64); 3] =
    [([30_500.0, 31_500.0], 1_100.0), ([71_000.0, 74_500.0], 1_100.0), ([108_500.0, 22_000.0], 1_300.0)];

/// The file of a slice, and the side of its cells in m.
pub fn slice_file(depth: f64) -> (String, f64) {
    let extension = match depth as u32 {
        400 => "vrt",
        800 => "asc",
        _ => "tif",
    };
    let cell = if depth < 3000.0 { 400.0 } else { 800.0 };
    (format!("rho_{:04}.{extension}", depth as u32), cell)
}

/// Writes the gravity grid and returns places on the crests of its horizontal gradient.
pub fn write_gravity(out: &Path, bodies: &[Body], seed: u64) -> Result<Vec<[f64; 2]>> {
    let cell = 500.0;
    let shape = [SIZE[1], SIZE[0]].map(|side| (side / cell) as usize + 12);
    let corner = [CORNER[0] - 6.0 * cell, CORNER[1] + SIZE[1] + 6.0 * cell];
    let layout = Layout { epsg: GROUND, corner, cell, shape: (shape[0], shape[1]) };
    let places = layout.places()?;
    let mut values: Vec<f64> = places.iter().map(|place| gravity(bodies, *place)).collect();
    add_noise(&mut values, NOISE[0], seed, Purpose::GravityNoise);
    let crests = crests(&values, shape[1], cell, |row, col| layout.centre(row, col));
    let inside = |place: &[f64; 2], ([x, y], radius): ([f64; 2], f64)| {
        (place[0] - CORNER[0] - x).hypot(place[1] - CORNER[1] - y) < radius
    };
    for (value, place) in values.iter_mut().zip(&places) {
        if GRAVITY_GAPS.into_iter().any(|gap| inside(place, gap)) {
            *value = f64::NAN;
        }
    }
    float_tiff(&out.join("gravity.tif"), &Layer { layout: &layout, values: &values, about: "Bouguer gravity, mGal" })?;
    Ok(crests)
}

/// Writes the magnetic grid, in longitude and latitude.
pub fn write_magnetics(out: &Path, bodies: &[Body], seed: u64) -> Result<()> {
    let layout = Layout::around(&outline(1500.0), 4326, 0.005, 0.4)?;
    let mut values: Vec<f64> = layout.places()?.iter().map(|place| magnetics(bodies, *place)).collect();
    add_noise(&mut values, NOISE[1], seed, Purpose::MagneticNoise);
    float_tiff(
        &out.join("magnetics.tif"),
        &Layer { layout: &layout, values: &values, about: "total-field magnetic anomaly, nT" },
    )
}

/// Writes the resistivity slices in their several formats.
pub fn write_slices(out: &Path, world: &World) -> Result<()> {
    let about = "electrical resistivity, ohm m";
    for slice in &world.slices {
        let (name, cell) = slice_file(slice.depth);
        let path = out.join(&name);
        let layout = Layout::around(&outline(0.0), SLICES, cell, 0.3)?;
        let values = resistivity(world, slice, &layout)?;
        let layer = Layer { layout: &layout, values: &values, about };
        if name.ends_with(".asc") {
            ascii(&path, &layer)?;
        } else if name.ends_with(".vrt") {
            let stem = name.trim_end_matches(".vrt");
            let halves = ["west", "east"].map(|half| out.join(format!("{stem}_{half}.tif")));
            virtual_halves(&path, [&halves[0], &halves[1]], &layer)?;
        } else if slice.depth == 6000.0 {
            scaled_tiff(&path, &layer, 0.1, 3000.0)?;
        } else {
            float_tiff(&path, &layer)?;
        }
    }
    Ok(())
}

/// Writes the same model as one volume with a depth axis, on coarser cells.
pub fn write_volume(out: &Path, world: &World) -> Result<()> {
    let layout = Layout::around(&outline(0.0), SLICES, 1000.0, 0.0)?;
    let depths: Vec<f64> = world.slices.iter().map(|slice| slice.depth).collect();
    let layers = world.slices.iter().map(|slice| resistivity(world, slice, &layout)).collect::<Result<Vec<_>>>()?;
    netcdf(&out.join("resistivity.nc"), &layout, &depths, &layers)
}

/// Writes the thickness of the cover.
pub fn write_cover(out: &Path, world: &World) -> Result<()> {
    let layout = Layout::around(&outline(0.0), GROUND, 500.0, 0.0)?;
    let values: Vec<f64> = layout.places()?.iter().map(|place| world.cover.at(*place)).collect();
    float_tiff(
        &out.join("cover_thickness.tif"),
        &Layer { layout: &layout, values: &values, about: "cover thickness, m" },
    )
}

/// Resistivity in ohm m at the cells of a layout, to three significant digits, since no model of the ground is known
/// better than that; NaN where the model has none.
fn resistivity(world: &World, slice: &Slice, layout: &Layout) -> Result<Vec<f64>> {
    let value = |place: [f64; 2]| {
        if world.footprint.holds(place) { three_digits(10.0_f64.powf(slice.log10.at(place))) } else { f64::NAN }
    };
    Ok(layout.places()?.into_iter().map(value).collect())
}

/// A positive number rounded to three significant digits.
fn three_digits(value: f64) -> f64 {
    let step = 10.0_f64.powi(value.log10().floor() as i32 - 2);
    (value / step).round() * step
}

/// Corners of the survey area, moved outwards by `rim` metres: easting and northing in EPSG:32633, m.
fn outline(rim: f64) -> [[f64; 2]; 4] {
    let [west, south] = CORNER.map(|side| side - rim);
    let [east, north] = [0, 1].map(|i| CORNER[i] + SIZE[i] + rim);
    [[west, south], [east, south], [east, north], [west, north]]
}

/// How many deposits lie beside planted conductors.
const AT_PODS: usize = 11;

/// A known deposit.
#[derive(Debug)]
pub struct Deposit {
    /// Invented name.
    pub name: &'static str,
    /// What is in it.
    pub commodity: &'static str,
    /// Mine, prospect or occurrence.
    pub status: &'static str,
    /// Easting and northing in EPSG:32633, m.
    pub place: [f64; 2],
    /// The margin whose planted conductor it lies beside, or nothing.
    pub margin: Option<String>,
}

/// The deposits: [`AT_PODS`] beside planted conductors, each on another pod, and the others anywhere.
pub fn deposits(world: &World, seed: u64) -> Vec<Deposit> {
    const ROWS: [(&str, &str, &str); 15] = [
        ("Tanselrig", "copper-gold", "mine"),
        ("Orrabeck", "copper", "prospect"),
        ("Windleshaw Deep", "gold", "mine"),
        ("Dunnockholm", "copper-gold", "prospect"),
        ("Merrowlode", "nickel-copper", "occurrence"),
        ("Pellincut", "copper", "occurrence"),
        ("Brackwithen", "gold", "prospect"),
        ("Sallowgarth", "copper-gold", "occurrence"),
        ("Ternholt", "lead-zinc", "mine"),
        ("Quarnlow", "copper", "prospect"),
        ("Hollinsedge Foot", "nickel-copper", "occurrence"),
        ("Kestlemoor", "gold", "occurrence"),
        ("Yarrowdene", "lead-zinc", "prospect"),
        ("Cobblewick Rise", "copper", "occurrence"),
        ("Thrawnholt", "gold", "prospect"),
    ];
    let mut dice = dice(seed, Purpose::Deposits);
    let pods: Vec<_> =
        world.planted.iter().flat_map(|(margin, pods)| pods.iter().map(move |pod| (margin, pod))).collect();
    ROWS.iter()
        .enumerate()
        .map(|(i, (name, commodity, status))| {
            let (place, margin) = if i < AT_PODS {
                // Spread over the pods, and a few hundred metres off the middle of each.
                let (margin, pod) = pods[i * pods.len() / AT_PODS];
                let disc = pod.discs[(between(&mut dice, 0.1, 0.9) * pod.discs.len() as f64) as usize].0;
                (disc.map(|side| side + 200.0 * normal(&mut dice)), Some(format!("{} {}", margin.body, margin.faces)))
            } else {
                ([0, 1].map(|k| CORNER[k] + SIZE[k] * between(&mut dice, 0.08, 0.92)), None)
            };
            Deposit { name, commodity, status, place, margin }
        })
        .collect()
}

/// The table of deposits, in longitude and latitude.
pub fn deposits_csv(deposits: &[Deposit]) -> Result<String> {
    let places: Vec<_> = deposits.iter().map(|deposit| deposit.place).collect();
    let mut text = String::from("name,commodity,status,longitude,latitude\n");
    for (deposit, [longitude, latitude]) in deposits.iter().zip(transform(&places, GROUND, 4326)?) {
        let Deposit { name, commodity, status, .. } = deposit;
        text.push_str(&format!("{name},{commodity},{status},{longitude:.5},{latitude:.5}\n"));
    }
    Ok(text)
}
