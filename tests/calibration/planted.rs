//! An association planted on purpose, to see that it is found, and moved away, to see that it is not.

use ndarray::{Array2, Axis, Zip, concatenate, s};

use super::calibration::Layers;
use super::calibration::fields::{crests, distance};

/// Plants an association of `share` (0 to 1) between the slices and exp(-distance / 3).
pub fn associate(mut layers: Layers, share: f64) -> Layers {
    let far = distance(&crests(&layers.strength, &Array2::from_elem(layers.strength.dim(), true)));
    let near = far.mapv(|far| (-far / 3.0).exp());
    let (mean, spread) = (near.mean().unwrap(), near.std(0.0));
    for slice in &mut layers.slices {
        Zip::from(slice).and(&near).for_each(|value, near| {
            *value = share * (near - mean) / spread + (1.0 - share * share).sqrt() * *value;
        });
    }
    layers
}

/// Moves the slices down by a quarter of the side; what leaves at the bottom comes in at the top.
pub fn displace(mut layers: Layers) -> Layers {
    for slice in &mut layers.slices {
        let cut = slice.nrows() - slice.nrows() / 4;
        let moved = concatenate![Axis(0), slice.slice(s![cut.., ..]), slice.slice(s![..cut, ..])];
        *slice = moved;
    }
    layers
}
