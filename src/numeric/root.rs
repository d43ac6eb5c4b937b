//! Roots of monotone functions.

use super::elementary::exp;

/// More steps than a correct start ever needs; reached only when the function is no number.
const STEPS: usize = 200;

/// Positive root of a function of ln x by Newton's method, from `start`.
///
/// `quotient(x)` is h / h', the derivative being taken with respect to ln x. Logarithms of distribution functions
/// of gamma and t variables are concave in ln x, so that from one side the steps approach the root without
/// passing it and from the other pass it once. A step is cut to a factor of e^4.
pub fn newton_in_logarithm(start: f64, quotient: impl Fn(f64) -> f64) -> f64 {
    let mut x = start;
    for _ in 0..STEPS {
        if !(x.is_finite() && x > 0.0) {
            return x;
        }
        let step = quotient(x).clamp(-4.0, 4.0);
        x *= exp(-step);
        // The error after a step is of the order of its square.
        if step.abs() < 1e-10 {
            return x;
        }
    }
    x
}

/// Root of an increasing function between `low` and `high` by halving, to the last bit; none without a sign change.
pub fn bisect(mut low: f64, mut high: f64, function: impl Fn(f64) -> f64) -> Option<f64> {
    if !(function(low) <= 0.0 && function(high) >= 0.0) {
        return None;
    }
    loop {
        let middle = low + (high - low) / 2.0;
        if middle <= low || middle >= high {
            return Some(middle);
        }
        if function(middle) <= 0.0 { low = middle } else { high = middle }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn newton_finds_a_power() {
        // h = 3 ln x - ln 10, h' = 3.
        let root = newton_in_logarithm(1.0, |x| (3.0 * libm::log(x) - libm::log(10.0)) / 3.0);
        assert!((root - 2.154434690031884).abs() < 1e-15);
        assert!(newton_in_logarithm(1.0, |_| f64::NAN).is_nan());
    }

    #[test]
    fn halving_ends_at_the_last_bit() {
        assert_eq!(bisect(0.0, 4.0, |x| x * x * x - 8.0), Some(2.0));
        assert_eq!(bisect(3.0, 4.0, |x| x - 2.0), None);
        assert_eq!(bisect(f64::NAN, 4.0, |x| x - 2.0), None);
    }
}
