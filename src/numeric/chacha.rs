//! The ChaCha key stream with 8 rounds, sixteen blocks at a time.
//!
//! The blocks of a batch differ in their counter alone, so that one loop over them computes all; the compiler turns
//! it into instructions on as many blocks as the processor's registers hold.
//!
//! # Source
//! D. J. Bernstein, ChaCha, a variant of Salsa20 (2008): 64-bit block counter in words 12 and 13, 64-bit stream number
//! in words 14 and 15.

/// Blocks in a batch.
const LANES: usize = 16;

/// Words of 64 bits in a batch.
pub(super) const BATCH: usize = 8 * LANES;

/// "expand 32-byte k", the first four words of every block.
const CONSTANTS: [u32; 4] = [0x6170_7865, 0x3320_646e, 0x7962_2d32, 0x6b20_6574];

/// What a key stream is made from.
#[derive(Debug, Clone, Copy)]
pub(super) struct Origin {
    pub key: [u32; 8],
    pub stream: u64,
}

/// Word by word of a block, each for all lanes.
type Words = [[u32; LANES]; 16];

/// Batch number `batch` of the key stream as uniform draws, one for each word of 64 bits, the low half first.
pub(super) fn uniform_draws(origin: &Origin, batch: u64, draws: &mut [f64; BATCH]) {
    super::wide::widest!(fill(origin: &Origin, batch: u64, draws: &mut [f64; BATCH]));
}

#[inline(always)]
fn fill(origin: &Origin, batch: u64, draws: &mut [f64; BATCH]) {
    let mut words = [[0; LANES]; 16];
    blocks(origin, batch, &mut words);
    let mut columns = [[0.0; LANES]; 8];
    for (column, pair) in columns.iter_mut().zip(words.chunks_exact(2)) {
        for lane in 0..LANES {
            column[lane] = uniform_of_word(u64::from(pair[1][lane]) << 32 | u64::from(pair[0][lane]));
        }
    }
    for (lane, block) in draws.chunks_exact_mut(8).enumerate() {
        for (draw, column) in block.iter_mut().zip(&columns) {
            *draw = column[lane];
        }
    }
}

/// The odd multiple of 2^-53 that the upper 52 bits of a word select.
#[inline(always)]
fn uniform_of_word(word: u64) -> f64 {
    // With the exponent of 1 these bits are 1 + k 2^-52, and what is taken off leaves (2 k + 1) 2^-53; both are exact.
    f64::from_bits(word >> 12 | 1.0f64.to_bits()) - (1.0 - f64::EPSILON / 2.0)
}

#[inline(always)]
fn blocks(origin: &Origin, batch: u64, words: &mut Words) {
    // A batch begins at a multiple of its length, so the low half of the counter carries nothing over within it.
    let first = batch.wrapping_mul(LANES as u64);
    let halves = |number: u64| [number as u32, (number >> 32) as u32];
    let ([low, high], [stream_low, stream_high]) = (halves(first), halves(origin.stream));
    let [c0, c1, c2, c3] = CONSTANTS;
    let [k0, k1, k2, k3, k4, k5, k6, k7] = origin.key;
    for lane in 0..LANES {
        let counter = low | lane as u32;
        let start = [c0, c1, c2, c3, k0, k1, k2, k3, k4, k5, k6, k7, counter, high, stream_low, stream_high];
        let mixed = double_round(double_round(double_round(double_round(start))));
        for (word, (mixed, start)) in words.iter_mut().zip(mixed.iter().zip(&start)) {
            word[lane] = mixed.wrapping_add(*start);
        }
    }
}

/// A round down the columns and one along the diagonals.
#[inline(always)]
fn double_round(mut state: [u32; 16]) -> [u32; 16] {
    quarter_round::<0, 4, 8, 12>(&mut state);
    quarter_round::<1, 5, 9, 13>(&mut state);
    quarter_round::<2, 6, 10, 14>(&mut state);
    quarter_round::<3, 7, 11, 15>(&mut state);
    quarter_round::<0, 5, 10, 15>(&mut state);
    quarter_round::<1, 6, 11, 12>(&mut state);
    quarter_round::<2, 7, 8, 13>(&mut state);
    quarter_round::<3, 4, 9, 14>(&mut state);
    state
}

#[inline(always)]
fn quarter_round<const A: usize, const B: usize, const C: usize, const D: usize>(state: &mut [u32; 16]) {
    state[A] = state[A].wrapping_add(state[B]);
    state[D] = (state[D] ^ state[A]).rotate_left(16);
    state[C] = state[C].wrapping_add(state[D]);
    state[B] = (state[B] ^ state[C]).rotate_left(12);
    state[A] = state[A].wrapping_add(state[B]);
    state[D] = (state[D] ^ state[A]).rotate_left(8);
    state[C] = state[C].wrapping_add(state[D]);
    state[B] = (state[B] ^ state[C]).rotate_left(7);
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use rand_chacha::ChaCha8Rng;
    use rand_chacha::rand_core::{RngCore, SeedableRng};

    proptest! {
        /// Against another implementation, also where the low half of the counter runs over.
        #[test]
        fn draws_are_those_of_the_published_cipher(
            key in any::<[u8; 32]>(),
            stream in any::<u64>(),
            batch in prop_oneof![0u64..4, (1u64 << 28) - 2..(1 << 28) + 2, any::<u32>().prop_map(u64::from)],
        ) {
            let mut theirs = ChaCha8Rng::from_seed(key);
            theirs.set_stream(stream);
            theirs.set_word_pos(u128::from(batch) * BATCH as u128 * 2);
            let words = key.as_chunks::<4>().0;
            let origin = Origin { key: std::array::from_fn(|index| u32::from_le_bytes(words[index])), stream };
            let mut ours = [0.0; BATCH];
            uniform_draws(&origin, batch, &mut ours);
            for draw in ours {
                let steps = theirs.next_u64() >> 12;
                prop_assert_eq!(draw, (steps as f64 + 0.5) / (1u64 << 52) as f64);
            }
        }
    }
}
