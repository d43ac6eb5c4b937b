//! Evaluation of continued fractions.

/// More terms than any converging use needs.
const TERMS: u32 = 100_000;

/// b_0 + a_1 / (b_1 + a_2 / (b_2 + ...)), where `term(n)` is (a_n, b_n).
///
/// # Source
/// The product of successive quotients of W. J. Lentz, Applied Optics 15 (1976) 668-671, with the guard against
/// zero of I. J. Thompson and A. R. Barnett, J. Comput. Phys. 64 (1986) 490-509.
pub fn continued_fraction(b_0: f64, term: impl Fn(f64) -> (f64, f64)) -> f64 {
    let guarded = |x: f64| if x == 0.0 { 1e-300 } else { x };
    let mut value = guarded(b_0);
    let (mut numerator, mut denominator) = (value, 0.0);
    for n in 1..TERMS {
        let (a, b) = term(f64::from(n));
        denominator = 1.0 / guarded(b + a * denominator);
        numerator = guarded(b + a / numerator);
        let factor = numerator * denominator;
        value *= factor;
        if (factor - 1.0).abs() <= f64::EPSILON / 2.0 || factor.is_nan() {
            break;
        }
    }
    value
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_golden_section() {
        let golden = continued_fraction(1.0, |_| (1.0, 1.0));
        assert!((golden - (1.0 + 5f64.sqrt()) / 2.0).abs() < 4e-16);
    }
}
