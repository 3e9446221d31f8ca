//! Arrays as pictures.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use ndarray::Array2;

use super::colours::Colours;
use crate::error::{Error, Result};

/// An array (row, column) as PNG, one pixel for each cell, first row on top; missing cells are transparent.
///
/// `range` is the pair of values at the ends of the colour map; where the two are equal every cell gets the middle colour.
///
/// # Errors
/// An array without cells, or with more than 2^32 - 1 on a side; a range that is not finite.
pub fn png(values: &Array2<f64>, range: (f64, f64), colours: Colours) -> Result<Vec<u8>> {
    let failed = || Error::ours("drawing a picture");
    let (rows, cols) = values.dim();
    let (Ok(height), Ok(width)) = (u32::try_from(rows), u32::try_from(cols)) else {
        return Err(failed().found(format!("{rows} x {cols} cells")));
    };
    let (low, high) = range;
    if !(low.is_finite() && high.is_finite()) {
        return Err(failed().found(format!("the range {low} to {high}")).wanted("finite numbers"));
    }
    let mut pixels = Vec::with_capacity(rows * cols * 4);
    for &value in values {
        if value.is_nan() {
            pixels.extend([0; 4]);
        } else {
            let position = if high == low { 0.5 } else { (value - low) / (high - low) };
            pixels.extend(colours.at(position));
            pixels.push(255);
        }
    }
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, width, height);
    encoder.set_color(png::ColorType::Rgba);
    encoder.set_depth(png::BitDepth::Eight);
    let mut writer = encoder.write_header().map_err(|error| failed().because(error))?;
    writer.write_image_data(&pixels).map_err(|error| failed().because(error))?;
    writer.finish().map_err(|error| failed().because(error))?;
    Ok(bytes)
}

/// A PNG as a `data:` address, for embedding in a page or figure.
pub fn data_uri(png: &[u8]) -> String {
    format!("data:image/png;base64,{}", STANDARD.encode(png))
}

/// An array reduced to at most `most` cells on a side, and the side of the square blocks of cells that were averaged (1 if
/// there was no need). Missing cells are left out of a mean; a block without a number is missing.
pub(super) fn reduced(values: &Array2<f64>, most: usize) -> (Array2<f64>, usize) {
    let (rows, cols) = values.dim();
    let side = rows.max(cols).div_ceil(most.max(1)).max(1);
    if side == 1 {
        return (values.clone(), 1);
    }
    let blocks = Array2::from_shape_fn((rows.div_ceil(side), cols.div_ceil(side)), |(row, col)| {
        let rows = row * side..((row + 1) * side).min(rows);
        let cols = col * side..((col + 1) * side).min(cols);
        let block = values.slice(ndarray::s![rows, cols]);
        let (sum, count) = block
            .iter()
            .filter(|value| value.is_finite())
            .fold((0.0, 0), |(sum, count), value| (sum + value, count + 1));
        // Nothing over nothing is NaN: missing.
        sum / f64::from(count)
    });
    (blocks, side)
}

/// The values below which `low` and `high` (fractions of 1) of the numbers lie: a range that a few extremes do not stretch.
pub(super) fn quantile_range(values: &Array2<f64>, low: f64, high: f64) -> Option<(f64, f64)> {
    let mut sorted: Vec<f64> = values.iter().copied().filter(|value| value.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    let at = |fraction: f64| sorted.get((fraction * sorted.len().saturating_sub(1) as f64).round() as usize).copied();
    Some((at(low)?, at(high)?))
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;
    use std::io::Cursor;

    #[test]
    fn pixels_decode_to_the_right_colours() {
        let values = array![[0.0, 10.0, f64::NAN], [20.0, -5.0, 5.0]];
        let bytes = png(&values, (0.0, 10.0), Colours::WarmLow).unwrap();
        let mut reader = png::Decoder::new(Cursor::new(&bytes)).read_info().unwrap();
        let mut pixels = vec![0; reader.output_buffer_size().unwrap()];
        let info = reader.next_frame(&mut pixels).unwrap();
        assert_eq!((info.width, info.height), (3, 2));
        let pixel = |row: usize, col: usize| <[u8; 4]>::try_from(&pixels[4 * (row * 3 + col)..][..4]).unwrap();
        let colour = |position: f64| {
            let [r, g, b] = Colours::WarmLow.at(position);
            [r, g, b, 255]
        };
        assert_eq!(pixel(0, 0), colour(0.0));
        assert_eq!(pixel(0, 1), colour(1.0));
        assert_eq!(pixel(0, 2), [0; 4]);
        assert_eq!(pixel(1, 0), colour(1.0));
        assert_eq!(pixel(1, 1), colour(0.0));
        assert_eq!(pixel(1, 2), colour(0.5));
        assert!(data_uri(&bytes).starts_with("data:image/png;base64,iVBORw0KGgo"), "the signature of PNG, RFC 2083");
    }

    #[test]
    fn each_bad_picture_is_refused() {
        assert!(png(&Array2::zeros((0, 3)), (0.0, 1.0), Colours::Quiet).is_err());
        assert!(png(&Array2::zeros((1, 1)), (f64::NAN, 1.0), Colours::Quiet).is_err());
        assert!(png(&Array2::zeros((1, 1)), (0.0, f64::INFINITY), Colours::Quiet).is_err());
        assert!(png(&Array2::zeros((1, 1)), (0.0, 0.0), Colours::Quiet).is_ok(), "a constant layer is drawn");
    }

    #[test]
    fn large_arrays_are_averaged_in_blocks() {
        let values = array![[1.0, 3.0, f64::NAN], [5.0, f64::NAN, f64::NAN], [7.0, 9.0, 2.0]];
        let (blocks, side) = reduced(&values, 2);
        assert_eq!((side, blocks.dim()), (2, (2, 2)));
        assert_eq!((blocks[(0, 0)], blocks[(1, 0)], blocks[(1, 1)]), (3.0, 8.0, 2.0));
        assert!(blocks[(0, 1)].is_nan());
        assert_eq!(reduced(&values, 3).1, 1);
    }

    #[test]
    fn the_range_ignores_the_tails_and_the_missing() {
        let values = Array2::from_shape_fn((1, 102), |(_, col)| if col == 101 { f64::NAN } else { col as f64 });
        assert_eq!(quantile_range(&values, 0.02, 0.98), Some((2.0, 98.0)));
        assert_eq!(quantile_range(&array![[f64::NAN]], 0.02, 0.98), None);
    }
}
