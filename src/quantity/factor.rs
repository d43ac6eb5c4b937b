//! The exact factor of a unit: a ratio of whole numbers, a power of ten and a power of π.

/// `numerator / denominator × 10^ten × π^pi`; the ratio is in lowest terms and free of factors of ten.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Factor {
    pub numerator: u64,
    pub denominator: u64,
    pub ten: i32,
    pub pi: i32,
}

impl Factor {
    pub const ONE: Factor = Factor { numerator: 1, denominator: 1, ten: 0, pi: 0 };

    pub(super) const fn ten(power: i32) -> Factor {
        Factor { numerator: 1, denominator: 1, ten: power, pi: 0 }
    }

    pub(super) const fn whole(numerator: u64, ten: i32) -> Factor {
        Factor { numerator, denominator: 1, ten, pi: 0 }
    }

    /// Whether it is a power of ten alone.
    pub fn is_power_of_ten(&self) -> bool {
        self.numerator == 1 && self.denominator == 1 && self.pi == 0
    }

    pub fn inverse(self) -> Factor {
        Factor { numerator: self.denominator, denominator: self.numerator, ten: -self.ten, pi: -self.pi }
    }

    /// The product; `None` when it no longer fits.
    pub fn times(self, other: Factor) -> Option<Factor> {
        let first = greatest_common_divisor(self.numerator, other.denominator);
        let second = greatest_common_divisor(other.numerator, self.denominator);
        let numerator = (self.numerator / first).checked_mul(other.numerator / second)?;
        let denominator = (self.denominator / second).checked_mul(other.denominator / first)?;
        let factor = Factor { numerator, denominator, ten: self.ten + other.ten, pi: self.pi + other.pi };
        (factor.ten.abs() <= 600).then(|| factor.without_tens())
    }

    /// A whole power; `None` when it no longer fits.
    pub fn power(self, exponent: i32) -> Option<Factor> {
        let base = if exponent < 0 { self.inverse() } else { self };
        (0..exponent.abs()).try_fold(Factor::ONE, |product, _| product.times(base))
    }

    fn without_tens(mut self) -> Factor {
        while self.numerator.is_multiple_of(10) && self.numerator > 0 {
            self.numerator /= 10;
            self.ten += 1;
        }
        while self.denominator.is_multiple_of(10) && self.denominator > 0 {
            self.denominator /= 10;
            self.ten -= 1;
        }
        self
    }
}

/// At least 1, so that it can always divide.
fn greatest_common_divisor(mut a: u64, mut b: u64) -> u64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a.max(1)
}
