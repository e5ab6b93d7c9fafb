//! Today's date, by which waivers run out. Must not know what a waiver is.

use std::time::{SystemTime, UNIX_EPOCH};

/// The date in UTC as `2030-01-01`.
#[must_use]
pub fn today() -> String {
    let since = SystemTime::now()
        .duration_since(UNIX_EPOCH)
        .unwrap_or_default();
    date(since.as_secs() / 86_400)
}

/// The date so many days after 1970-01-01, counted in 400-year eras that begin on 1 March, so that
/// the leap day is the last day of its year.
fn date(days: u64) -> String {
    let shifted = days + 719_468; // days from 0000-03-01 to 1970-01-01
    let (era, day_of_era) = (shifted / 146_097, shifted % 146_097);
    let year_of_era =
        (day_of_era - day_of_era / 1_460 + day_of_era / 36_524 - day_of_era / 146_096) / 365;
    let day_of_year = day_of_era - (365 * year_of_era + year_of_era / 4 - year_of_era / 100);
    let from_march = (5 * day_of_year + 2) / 153;
    let day = day_of_year - (153 * from_march + 2) / 5 + 1;
    let month = if from_march < 10 {
        from_march + 3
    } else {
        from_march - 9
    };
    let year = era * 400 + year_of_era + u64::from(month <= 2);
    format!("{year:04}-{month:02}-{day:02}")
}

#[cfg(test)]
mod tests {
    use super::date;

    /// `date -u -d @SECONDS` of GNU coreutils says the same.
    #[test]
    fn dates_are_right() {
        assert_eq!(date(0), "1970-01-01");
        assert_eq!(date(951_782_400 / 86_400), "2000-02-29");
        assert_eq!(date(1_893_456_000 / 86_400), "2030-01-01");
        assert_eq!(date(4_107_542_399 / 86_400), "2100-02-28");
    }
}
