//! Dates and times as records write them.

use crate::diagnostic::{Code, Problem};
use chrono::{DateTime, FixedOffset, NaiveDate};

/// Reads a time with its zone, `2041-03-12T09:10:00Z` or `2041-03-12T10:10:00.5+01:00`.
///
/// # Errors
/// `time_unreadable`, also where the zone is missing: a clock without a zone names no instant.
pub fn parse_instant(text: &str) -> Result<DateTime<FixedOffset>, Problem> {
    let unreadable = |_| {
        let without_zone = format!("{text}Z");
        if DateTime::parse_from_rfc3339(&without_zone).is_ok() {
            let message = format!("The time “{text}” has no zone.");
            let hint = format!("Write `{text}Z` for universal time, or its offset, as in `{text}+01:00`.");
            return Problem::new(Code::TimeUnreadable, message).hint(hint);
        }
        let message = format!("“{text}” is no time with a zone, such as 2041-03-12T09:10:00Z.");
        Problem::new(Code::TimeUnreadable, message)
    };
    let instant = DateTime::parse_from_rfc3339(text).map_err(unreadable)?;
    if instant.timestamp_subsec_nanos() >= 1_000_000_000 {
        let message = format!("The time “{text}” is a leap second, which no reading can be told apart in.");
        return Err(Problem::new(Code::TimeUnreadable, message).hint("Write second 59 or the following second 00."));
    }
    Ok(instant)
}

/// Reads a date, `2041-03-12`.
///
/// # Errors
/// `time_unreadable`.
pub fn parse_date(text: &str) -> Result<NaiveDate, Problem> {
    let shaped = text.len() == 10
        && text.bytes().enumerate().all(|(index, byte)| match index {
            4 | 7 => byte == b'-',
            _ => byte.is_ascii_digit(),
        });
    let date = if shaped { NaiveDate::parse_from_str(text, "%Y-%m-%d").ok() } else { None };
    date.ok_or_else(|| {
        let message =
            format!("“{text}” is no date of the calendar written as year, month and day, such as 2041-03-12.");
        Problem::new(Code::TimeUnreadable, message)
    })
}

/// Seconds from `epoch` to `instant`, rounded once to the nearest `f64`.
///
/// # Units
/// s
pub fn seconds_since(epoch: DateTime<FixedOffset>, instant: DateTime<FixedOffset>) -> f64 {
    let seconds = i128::from(instant.timestamp()) - i128::from(epoch.timestamp());
    let nanos = i128::from(instant.timestamp_subsec_nanos()) - i128::from(epoch.timestamp_subsec_nanos());
    let total = seconds * 1_000_000_000 + nanos;
    if total % 1_000_000_000 == 0 {
        return (total / 1_000_000_000) as f64;
    }
    // Below 2^53 ns (104 days) the count is exact in f64 and the quotient is rounded once; above, the decimal text is.
    if total.unsigned_abs() <= 1 << 53 {
        return total as f64 / 1e9;
    }
    let (sign, size) = (if total < 0 { "-" } else { "" }, total.unsigned_abs());
    format!("{sign}{}.{:09}", size / 1_000_000_000, size % 1_000_000_000).parse().unwrap_or(f64::NAN)
}

/// Seconds from `epoch` for a whole column of times, with the index of the first that is unreadable.
///
/// # Errors
/// The index in the column and the problem, of each cell that is no time with a zone.
pub fn parse_timestamps(epoch: DateTime<FixedOffset>, texts: &[String]) -> Result<Vec<f64>, Vec<(usize, Problem)>> {
    let mut problems = Vec::new();
    let mut seconds = Vec::with_capacity(texts.len());
    for (index, text) in texts.iter().enumerate() {
        match parse_instant(text) {
            Ok(instant) => seconds.push(seconds_since(epoch, instant)),
            Err(problem) => problems.push((index, problem)),
        }
    }
    if problems.is_empty() { Ok(seconds) } else { Err(problems) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reads_instants_with_a_zone() {
        let (a, b) =
            (parse_instant("2041-03-12T09:10:00Z").unwrap(), parse_instant("2041-03-12T10:10:00.5+01:00").unwrap());
        assert_eq!(seconds_since(a, b), 0.5);
        assert_eq!(seconds_since(b, a), -0.5);
    }

    #[test]
    fn counts_seconds_exactly() {
        let epoch = parse_instant("1900-01-01T00:00:00Z").unwrap();
        let later = parse_instant("2041-03-12T09:10:00.123456789Z").unwrap();
        assert_eq!(seconds_since(epoch, later), "4455681000.123456789".parse::<f64>().unwrap());
        assert_eq!(seconds_since(later, epoch), -"4455681000.123456789".parse::<f64>().unwrap());
    }

    #[test]
    fn refuses_times_without_zone_and_no_times() {
        let problem = parse_instant("2041-03-12T09:10:00").unwrap_err();
        assert_eq!(problem.code, Code::TimeUnreadable);
        assert!(problem.message.contains("no zone"));
        for text in ["", "now", "2041-03-12", "2041-13-12T09:10:00Z", "2041-03-12T24:00:00Z", "2041-06-30T23:59:60Z"] {
            assert!(parse_instant(text).is_err(), "{text}");
        }
    }

    #[test]
    fn reads_dates() {
        assert_eq!(parse_date("2040-02-29").unwrap(), NaiveDate::from_ymd_opt(2040, 2, 29).unwrap());
        for text in ["2041-02-29", "12.03.2041", "2041-3-12", "2041-03-12 ", "+2041-03-1"] {
            assert!(parse_date(text).is_err(), "{text}");
        }
    }
}
