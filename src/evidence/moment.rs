//! Moments in time as text.

use std::time::{SystemTime, UNIX_EPOCH};

/// A moment in universal time as RFC 3339, to the second: `2026-04-01T09:30:00Z`.
///
/// The calendar is the proleptic Gregorian one; the day count follows H. Hinnant, "chrono-compatible low-level date
/// algorithms" (2013), `civil_from_days`. A moment before 1970 is given as the start of 1970.
pub fn rfc3339(moment: SystemTime) -> String {
    let seconds = moment.duration_since(UNIX_EPOCH).map_or(0, |since| since.as_secs());
    let (days, second) = (seconds / 86_400, seconds % 86_400);
    let shifted = days + 719_468;
    let (era, day_of_era) = (shifted / 146_097, shifted % 146_097);
    let year_of_era = (day_of_era - day_of_era / 1460 + day_of_era / 36_524 - day_of_era / 146_096) / 365;
    let day_of_year = day_of_era - (365 * year_of_era + year_of_era / 4 - year_of_era / 100);
    let month_from_march = (5 * day_of_year + 2) / 153;
    let day = day_of_year - (153 * month_from_march + 2) / 5 + 1;
    let month = if month_from_march < 10 { month_from_march + 3 } else { month_from_march - 9 };
    let year = year_of_era + era * 400 + u64::from(month <= 2);
    format!("{year:04}-{month:02}-{day:02}T{:02}:{:02}:{:02}Z", second / 3600, second / 60 % 60, second % 60)
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::time::Duration;

    #[test]
    fn moments_agree_with_the_system_calendar() {
        // Expected texts from GNU coreutils: date -u -d @SECONDS +%Y-%m-%dT%H:%M:%SZ
        for (seconds, text) in [
            (0, "1970-01-01T00:00:00Z"),
            (951_782_400, "2000-02-29T00:00:00Z"),
            (1_775_000_000, "2026-03-31T23:33:20Z"),
            (4_107_542_399, "2100-02-28T23:59:59Z"),
            (4_107_542_400, "2100-03-01T00:00:00Z"),
        ] {
            assert_eq!(rfc3339(UNIX_EPOCH + Duration::from_secs(seconds)), text);
        }
    }
}
