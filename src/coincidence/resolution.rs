//! How small a p-value a footprint resolves.

use super::null::SMALLEST_P;
use super::verdict::Refusal;

/// The level at which the shift null was found to hold whatever the number of independent shifts.
///
/// Few independent shifts limit how small a p-value can be told, not the validity at this level (measured; see the table
/// in the contributors' guide).
pub const VALID_LEVEL: f64 = 0.05;

/// Below this number of independent shifts the footprint cannot tell at all: fewer were not measured often enough.
pub const LEAST_INDEPENDENT: f64 = 3.0;

/// The smallest p-value that a number of shifts, and of effectively independent ones among them, resolves.
///
/// Among k independent shifts no p-value below 1 / (1 + k) is resolved; but at [`VALID_LEVEL`] the level holds for few of
/// them too, so the bound stops there.
pub(super) fn smallest_p(shifts: usize, independent: f64) -> f64 {
    let resolved = (1.0 / (1.0 + independent)).min(VALID_LEVEL);
    SMALLEST_P.max(1.0 / (1.0 + shifts as f64)).max(resolved)
}

/// Refuses where there are next to no independent shifts, or where not even the smallest p-value reaches the level.
pub(super) fn enough_shifts(shifts: usize, independent: f64, level: f64) -> Result<(), Refusal> {
    let needed = (1.0 / level - 1.0).ceil();
    if (shifts as f64) < needed {
        return Err(Refusal::TooFewShifts { found: shifts as f64, independent: false, needed });
    }
    if independent < LEAST_INDEPENDENT {
        return Err(Refusal::TooFewShifts { found: independent, independent: true, needed: LEAST_INDEPENDENT });
    }
    if smallest_p(shifts, independent) > level {
        return Err(Refusal::TooFewShifts { found: independent, independent: true, needed });
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_smallest_p_follows_the_scarcer_of_the_two() {
        // By hand: 1 / (1 + 99) = .01; few independent ones stop at .05; never below .005.
        assert!((smallest_p(10_000, 99.0) - 0.01).abs() < 1e-15);
        assert_eq!(smallest_p(10_000, 8.0), 0.05);
        assert_eq!(smallest_p(10_000, 5_000.0), 0.005);
        assert!((smallest_p(9, 9.0) - 0.1).abs() < 1e-15, "ten values rank no finer than a tenth");
    }

    #[test]
    fn too_few_shifts_are_refused_with_the_number_needed() {
        assert_eq!(enough_shifts(1000, 8.0, 0.05), Ok(()));
        let refused = |shifts, found, level| enough_shifts(shifts, found, level).unwrap_err();
        let scarce = |found, needed| Refusal::TooFewShifts { found, independent: true, needed };
        assert_eq!(refused(1000, 2.5, 0.05), scarce(2.5, 3.0));
        assert_eq!(refused(1000, 8.0, 0.01), scarce(8.0, 99.0));
        assert_eq!(refused(12, 8.0, 0.05), Refusal::TooFewShifts { found: 12.0, independent: false, needed: 19.0 });
    }
}
