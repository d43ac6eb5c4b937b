//! Leap seconds, and an instant in terrestrial and universal time.
//!
//! # Source    IERS Bulletin C (leap seconds from 1999 to 2017; none announced since); TT = TAI + 32.184 s (IAU 1991).

/// Seconds since 1970 (UTC, leap seconds not counted) of 2000-01-01 12 h.
pub const J2000: f64 = 946_728_000.0;

/// TAI − UTC in whole seconds, from the beginning of each span (seconds since 1970).
pub const LEAP_SECONDS: [(f64, f64); 6] = [
    (915_148_800.0, 32.0),   // 1999-01-01
    (1_136_073_600.0, 33.0), // 2006-01-01
    (1_230_768_000.0, 34.0), // 2009-01-01
    (1_341_100_800.0, 35.0), // 2012-07-01
    (1_435_708_800.0, 36.0), // 2015-07-01
    (1_483_228_800.0, 37.0), // 2017-01-01
];

/// TAI − UTC in s at a time in seconds since 1970; none before 1999, where the table begins.
pub fn tai_minus_utc(utc: f64) -> Option<f64> {
    LEAP_SECONDS.iter().rev().find(|(from, _)| utc >= *from).map(|(_, seconds)| *seconds)
}

/// One instant with what links its time scales.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Instant {
    /// Seconds since 1970, UTC, leap seconds not counted.
    pub utc: f64,
    /// s
    pub tai_minus_utc: f64,
    /// UT1 − UTC, s
    pub dut1: f64,
}

impl Instant {
    /// The instant with leap seconds from the table; before 1999 its first entry serves.
    ///
    /// A second too many or too few there displaces the Moon by half a second of arc: less than 0.001 µGal of tide.
    pub fn new(utc: f64, dut1: f64) -> Self {
        Self { utc, tai_minus_utc: tai_minus_utc(utc).unwrap_or(LEAP_SECONDS[0].1), dut1 }
    }

    /// TT − UTC, s.
    pub fn terrestrial_minus_utc(self) -> f64 {
        self.tai_minus_utc + 32.184
    }

    /// Julian centuries of terrestrial time since 2000-01-01 12 h.
    pub fn terrestrial_centuries(self) -> f64 {
        (self.utc - J2000 + self.terrestrial_minus_utc()) / (86_400.0 * 36_525.0)
    }

    /// Days of universal time UT1 since 2000-01-01 12 h.
    pub fn universal_days(self) -> f64 {
        (self.utc - J2000 + self.dut1) / 86_400.0
    }

    /// Hours of UT1 since midnight.
    pub fn universal_hours(self) -> f64 {
        (self.utc + self.dut1).rem_euclid(86_400.0) / 3600.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_leap_second_counts_from_its_midnight() {
        assert_eq!(tai_minus_utc(915_148_799.0), None);
        for pair in LEAP_SECONDS.windows(2) {
            let [(_, before), (from, after)] = pair else { panic!("pairs") };
            assert_eq!(tai_minus_utc(from - 0.5), Some(*before));
            assert_eq!(tai_minus_utc(*from), Some(*after));
        }
        assert_eq!(tai_minus_utc(2.25e9), Some(37.0));
    }

    #[test]
    fn the_reference_epoch_is_the_origin() {
        let instant = Instant { utc: J2000, tai_minus_utc: -32.184, dut1: 0.0 };
        assert_eq!(instant.terrestrial_centuries(), 0.0);
        assert_eq!(instant.universal_days(), 0.0);
        assert_eq!(instant.universal_hours(), 12.0);
    }
}
