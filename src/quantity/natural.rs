//! Natural numbers of any size: just what exact unit arithmetic needs.

use std::cmp::Ordering;

const BASE: u64 = 1_000_000_000;

/// A natural number in limbs of nine decimal digits, the least first, without leading zeros.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Natural {
    limbs: Vec<u32>,
}

impl Natural {
    pub fn new(mut value: u128) -> Self {
        let mut limbs = Vec::new();
        while value > 0 {
            limbs.push((value % u128::from(BASE)) as u32);
            value /= u128::from(BASE);
        }
        Self { limbs }
    }

    pub fn is_zero(&self) -> bool {
        self.limbs.is_empty()
    }

    pub fn plus(&self, other: &Natural) -> Natural {
        let mut limbs = Vec::with_capacity(self.limbs.len().max(other.limbs.len()) + 1);
        let mut carry = 0;
        for index in 0..self.limbs.len().max(other.limbs.len()) {
            let sum = self.limb(index) + other.limb(index) + carry;
            limbs.push((sum % BASE) as u32);
            carry = sum / BASE;
        }
        limbs.push(carry as u32);
        Self::trimmed(limbs)
    }

    /// How far the two lie apart.
    pub fn distance(&self, other: &Natural) -> Natural {
        let (large, small) = if self.compare(other) == Ordering::Less { (other, self) } else { (self, other) };
        let mut limbs = Vec::with_capacity(large.limbs.len());
        let mut borrow = 0;
        for index in 0..large.limbs.len() {
            let difference = BASE + large.limb(index) - small.limb(index) - borrow;
            limbs.push((difference % BASE) as u32);
            borrow = u64::from(difference < BASE);
        }
        Self::trimmed(limbs)
    }

    pub fn compare(&self, other: &Natural) -> Ordering {
        let by_length = self.limbs.len().cmp(&other.limbs.len());
        by_length.then_with(|| self.limbs.iter().rev().cmp(other.limbs.iter().rev()))
    }

    pub fn times(&self, other: &Natural) -> Natural {
        let mut product = vec![0u64; self.limbs.len() + other.limbs.len() + 1];
        for (i, &a) in self.limbs.iter().enumerate() {
            let mut carry = 0;
            for (j, place) in product.iter_mut().skip(i).enumerate() {
                let sum = *place + u64::from(a) * other.limb(j) + carry;
                *place = sum % BASE;
                carry = sum / BASE;
            }
        }
        Self::trimmed(product.into_iter().map(|limb| limb as u32).collect())
    }

    /// Times ten to the `power`.
    pub fn shifted(&self, power: u32) -> Natural {
        let mut limbs = vec![0; (power / 9) as usize];
        limbs.extend(&self.limbs);
        Self::trimmed(limbs).times(&Natural::new(10u128.pow(power % 9)))
    }

    /// Whole quotient, and whether nothing is left over; a divisor of zero gives zero.
    pub fn divided(&self, divisor: u64) -> (Natural, bool) {
        let mut limbs = vec![0; self.limbs.len()];
        let mut rest = 0u128;
        for (place, &limb) in limbs.iter_mut().rev().zip(self.limbs.iter().rev()) {
            rest = rest * u128::from(BASE) + u128::from(limb);
            *place = rest.checked_div(u128::from(divisor)).unwrap_or(0) as u32;
            rest = rest.checked_rem(u128::from(divisor)).unwrap_or(0);
        }
        (Self::trimmed(limbs), rest == 0)
    }

    /// Decimal digits; `0` for zero.
    pub fn digits(&self) -> String {
        let mut limbs = self.limbs.iter().rev();
        let mut digits = limbs.next().map_or("0".into(), u32::to_string);
        for limb in limbs {
            digits.push_str(&format!("{limb:09}"));
        }
        digits
    }

    fn limb(&self, index: usize) -> u64 {
        self.limbs.get(index).map_or(0, |&limb| u64::from(limb))
    }

    fn trimmed(mut limbs: Vec<u32>) -> Natural {
        while limbs.last() == Some(&0) {
            limbs.pop();
        }
        Self { limbs }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn agrees_with_128_bits(a in any::<u64>(), b in any::<u64>(), d in 1..u64::MAX) {
            let (long_a, long_b) = (Natural::new(a.into()), Natural::new(b.into()));
            let (wide_a, wide_b) = (u128::from(a), u128::from(b));
            prop_assert_eq!(long_a.times(&long_b), Natural::new(wide_a * wide_b));
            prop_assert_eq!(long_a.plus(&long_b), Natural::new(wide_a + wide_b));
            prop_assert_eq!(long_a.distance(&long_b), Natural::new(wide_a.abs_diff(wide_b)));
            prop_assert_eq!(long_a.compare(&long_b), a.cmp(&b));
            let product = wide_a * wide_b;
            let (quotient, whole) = Natural::new(product).divided(d);
            prop_assert_eq!(quotient, Natural::new(product / u128::from(d)));
            prop_assert_eq!(whole, product % u128::from(d) == 0);
            prop_assert_eq!(Natural::new(product).digits(), product.to_string());
            prop_assert_eq!(long_a.shifted(17), Natural::new(wide_a * 100_000_000_000_000_000));
        }
    }
}
