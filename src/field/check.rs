//! What every transform asks of a layer before it starts.

use crate::error::{Error, Result};
use crate::grid::Grid;

/// Lets a layer pass if it holds at least two different numbers.
///
/// # Errors
/// No cell that holds a number, or one number throughout.
pub(super) fn checked_layer(grid: &Grid) -> Result<()> {
    let Some((low, high)) = grid.range() else {
        return Err(Error::input("a potential-field layer")
            .found("no cell that holds a number")
            .wanted("data on the frame")
            .mend("check the no-data value, and that the layer overlaps the frame"));
    };
    if high - low <= 1e-12 * high.abs().max(low.abs()) {
        return Err(Error::input("a potential-field layer")
            .found(format!("the layer is constant: {low} everywhere"))
            .wanted("a field that varies")
            .mend("check that this is the right band of the file"));
    }
    Ok(())
}

/// Lets a number pass if it is finite and greater than zero.
///
/// # Errors
/// Any other number; the message names the `thing` and its `unit`.
pub(super) fn checked_positive(number: f64, thing: &str, unit: &str) -> Result<f64> {
    if number.is_finite() && number > 0.0 {
        return Ok(number);
    }
    Err(Error::input(thing)
        .found(number)
        .wanted(format!("a positive number of {unit}"))
        .mend(format!("give {thing} as a number above zero")))
}
