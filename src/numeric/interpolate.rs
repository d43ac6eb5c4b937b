//! Weights of piecewise linear interpolation.

/// The neighbours of `x` among the increasing `xs`: (index of the first, index of the second, weight of the second).
///
/// The value at `x` is (1 - weight) y_first + weight y_second. At a knot the weight is exactly 0 or 1, and the two
/// indices are equal only when there is a single knot. None outside the span, of an empty list and of no number.
pub fn bracket(xs: &[f64], x: f64) -> Option<(usize, usize, f64)> {
    let (first, last) = (*xs.first()?, *xs.last()?);
    if !(first <= x && x <= last) {
        return None;
    }
    let second = xs.partition_point(|knot| *knot < x).clamp(1, xs.len().saturating_sub(1).max(1));
    let below = second - 1;
    let (Some(low), Some(high)) = (xs.get(below), xs.get(second)) else {
        return Some((0, 0, 0.0));
    };
    let weight = if high > low { (x - low) / (high - low) } else { 0.0 };
    Some((below, second, weight))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn knots_and_middles() {
        let xs = [0.0, 1.0, 3.0];
        assert_eq!(bracket(&xs, 0.0), Some((0, 1, 0.0)));
        assert_eq!(bracket(&xs, 0.25), Some((0, 1, 0.25)));
        assert_eq!(bracket(&xs, 1.0), Some((0, 1, 1.0)));
        assert_eq!(bracket(&xs, 2.0), Some((1, 2, 0.5)));
        assert_eq!(bracket(&xs, 3.0), Some((1, 2, 1.0)));
    }

    #[test]
    fn outside_there_is_nothing() {
        let xs = [0.0, 1.0];
        assert_eq!(bracket(&xs, -1e-9), None);
        assert_eq!(bracket(&xs, 1.0 + 1e-9), None);
        assert_eq!(bracket(&xs, f64::NAN), None);
        assert_eq!(bracket(&[], 0.0), None);
    }

    #[test]
    fn a_single_knot_serves_itself() {
        assert_eq!(bracket(&[2.0], 2.0), Some((0, 0, 0.0)));
        assert_eq!(bracket(&[2.0], 2.1), None);
    }

    #[test]
    fn equal_knots_do_not_divide_by_zero() {
        assert_eq!(bracket(&[1.0, 1.0], 1.0), Some((0, 1, 0.0)));
    }

    proptest! {
        #[test]
        fn a_line_is_reproduced(mut xs in prop::collection::vec(-1e3f64..1e3, 2..20), part in 0.0f64..1.0) {
            xs.sort_by(f64::total_cmp);
            let x = xs[0] + part * (xs[xs.len() - 1] - xs[0]);
            if let Some((low, high, weight)) = bracket(&xs, x) {
                prop_assert!((0.0..=1.0).contains(&weight));
                prop_assert!(((1.0 - weight) * xs[low] + weight * xs[high] - x).abs() < 1e-9);
            }
        }
    }
}
