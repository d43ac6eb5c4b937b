//! Reproducible random streams: one per input and block of trials.
//!
//! The key of a stream is the SHA-256 of a constant and the input's path name; the block of trials selects one of its
//! sub-streams. A new input therefore leaves all other draws unchanged, and blocks may run in any order on any number
//! of threads.
//!
//! # Source
//! ChaCha with 8 rounds: D. J. Bernstein, ChaCha, a variant of Salsa20 (2008). SHA-256: FIPS 180-4.

use super::chacha::{BATCH, Origin, uniform_draws};
use super::normal::normal_quantile;
use sha2::{Digest, Sha256};

/// The constant in every key; reports list it among their assumptions.
pub const SEED: &str = "libripens Monte Carlo 1";

/// What selects the streams of one input, one for each block of trials.
#[derive(Debug, Clone, Copy)]
pub struct Key([u32; 8]);

impl Key {
    /// The key of the input with this path name.
    pub fn new(path: &str) -> Self {
        // The zero byte ends the constant, so that no path can lengthen it.
        let hash: [u8; 32] = Sha256::new().chain_update(SEED).chain_update([0]).chain_update(path).finalize().into();
        let word = |index: usize| std::array::from_fn(|byte| hash[4 * index + byte]);
        Self(std::array::from_fn(|index| u32::from_le_bytes(word(index))))
    }

    /// The stream of the input in this block of trials.
    pub fn stream(&self, block: u64) -> Stream {
        let origin = Origin { key: self.0, stream: block };
        Stream { origin, next: 0, waiting: [0.0; BATCH], taken: BATCH }
    }
}

/// The draws of one input in one block of trials.
#[derive(Debug, Clone)]
pub struct Stream {
    origin: Origin,
    /// The next batch of draws.
    next: u64,
    /// Draws made and not yet given out, from number `taken` on.
    waiting: [f64; BATCH],
    taken: usize,
}

impl Stream {
    /// The stream of the input with this path name, in this block of trials.
    pub fn new(path: &str, block: u64) -> Self {
        Key::new(path).stream(block)
    }

    /// A draw from the open interval (0, 1): an odd multiple of 2^-53.
    ///
    /// Neither end can occur, u and 1 - u are equally likely, and both are exact.
    pub fn uniform(&mut self) -> f64 {
        if self.taken == BATCH {
            uniform_draws(&self.origin, self.next, &mut self.waiting);
            (self.next, self.taken) = (self.next + 1, 0);
        }
        self.taken += 1;
        self.waiting[self.taken - 1]
    }

    /// A draw from the standard normal distribution, by its quantile.
    pub fn normal(&mut self) -> f64 {
        normal_quantile(self.uniform())
    }

    /// Fills the slice with uniform draws from (0, 1).
    pub fn fill_uniform(&mut self, draws: &mut [f64]) {
        let ready = (BATCH - self.taken).min(draws.len());
        let (first, others) = draws.split_at_mut(ready);
        first.fill_with(|| self.uniform());
        let (batches, last) = others.as_chunks_mut::<BATCH>();
        for batch in batches {
            uniform_draws(&self.origin, self.next, batch);
            self.next += 1;
        }
        last.fill_with(|| self.uniform());
    }

    /// Fills the slice with standard normal draws.
    pub fn fill_normal(&mut self, draws: &mut [f64]) {
        self.fill_uniform(draws);
        super::normal::quantiles_in_place(draws);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::sum::{experimental_variance, mean};

    /// Printed digits depend on these bits: a change of them is a change of results.
    #[test]
    fn draws_are_those_committed() {
        let mut stream = Stream::new("W1.air.density", 3);
        let draws = [stream.uniform(), stream.uniform(), stream.normal(), stream.normal()].map(f64::to_bits);
        assert_eq!(draws, DRAWS, "{draws:#018x?}");
    }

    const DRAWS: [u64; 4] =
        [0x3fd3_4ef3_d940_5bc2, 0x3fea_ba7c_5d10_f589, 0xbff8_0e2f_c80c_1f28, 0xbfeb_92cf_e991_579d];

    #[test]
    fn path_and_block_select_the_stream() {
        let first = |path, block| Stream::new(path, block).uniform();
        assert_eq!(first("a", 0), first("a", 0));
        assert_ne!(first("a", 0), first("a", 1));
        assert_ne!(first("a", 0), first("b", 0));
    }

    #[test]
    fn filling_draws_as_single_draws_do() {
        let (mut one, mut many) = (Stream::new("a", 7), Stream::new("a", 7));
        for length in [5, 1, 300, 122, 128, 1000, 3] {
            let mut draws = vec![0.0; length];
            many.fill_normal(&mut draws);
            let single: Vec<f64> = draws.iter().map(|_| one.normal()).collect();
            assert_eq!(draws, single);
        }
    }

    #[test]
    fn moments_are_those_of_the_distributions() {
        let mut draws = vec![0.0; 100_000];
        let mut stream = Stream::new("moments", 0);
        stream.fill_uniform(&mut draws);
        assert!(draws.iter().all(|u| 0.0 < *u && *u < 1.0));
        // Five standard deviations of mean and variance of 1e5 draws.
        assert!((mean(&draws).unwrap() - 0.5).abs() < 5.0 * 0.289 / 316.0);
        assert!((experimental_variance(&draws).unwrap() - 1.0 / 12.0).abs() < 5.0 * 0.0745 / 316.0);
        stream.fill_normal(&mut draws);
        assert!(mean(&draws).unwrap().abs() < 5.0 / 316.0);
        assert!((experimental_variance(&draws).unwrap() - 1.0).abs() < 5.0 * 1.414 / 316.0);
    }
}
