//! Heads of the register: one hash over its first n entries, and proofs that a later head only adds to an earlier one.
//!
//! # Source    RFC 6962, 2.1 (the tree) and 2.1.2 (consistency proofs); RFC 9162, 2.1.4.2 (their verification)
//! # Formula   leaf = SHA-256(0x00 || data), node = SHA-256(0x01 || left || right), split at the largest power of two
//!             smaller than n; the head of nothing is SHA-256 of nothing

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use std::fmt;
use std::str::FromStr;

/// A SHA-256 digest.
pub type Hash = [u8; 32];

/// The hash over the first `size` entries.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Head {
    pub size: u64,
    /// In hexadecimal digits.
    pub head: String,
}

impl fmt::Display for Head {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}:{}", self.size, self.head)
    }
}

impl FromStr for Head {
    type Err = String;

    /// Reads `13:` followed by 64 hexadecimal digits.
    fn from_str(text: &str) -> Result<Head, String> {
        let parts = text.trim().split_once(':');
        let read = parts.and_then(|(size, head)| Some((size.parse().ok()?, from_hex(head.trim())?)));
        let (size, hash) = read.ok_or_else(|| {
            format!(
                "“{text}” is no head of a register: a head is the number of entries, a colon and 64 hexadecimal digits"
            )
        })?;
        Ok(Head { size, head: hex(&hash) })
    }
}

/// A digest as hexadecimal digits.
pub fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// A digest from 64 hexadecimal digits.
pub fn from_hex(text: &str) -> Option<Hash> {
    let digits = text.as_bytes();
    if digits.len() != 64 || !digits.iter().all(u8::is_ascii_hexdigit) {
        return None;
    }
    let mut hash = [0; 32];
    for (index, byte) in hash.iter_mut().enumerate() {
        *byte = u8::from_str_radix(text.get(2 * index..2 * index + 2)?, 16).ok()?;
    }
    Some(hash)
}

/// The hash of one entry in the tree.
pub fn leaf_hash(data: &[u8]) -> Hash {
    Sha256::new().chain_update([0]).chain_update(data).finalize().into()
}

fn node_hash(left: &Hash, right: &Hash) -> Hash {
    Sha256::new().chain_update([1]).chain_update(left).chain_update(right).finalize().into()
}

/// The head over leaves in their order.
pub fn tree_head(leaves: &[Hash]) -> Hash {
    match leaves {
        [] => Sha256::digest([]).into(),
        [leaf] => *leaf,
        _ => {
            let (left, right) = leaves.split_at(split(leaves.len()));
            node_hash(&tree_head(left), &tree_head(right))
        }
    }
}

/// The largest power of two smaller than `size`; `size` is at least 2.
fn split(size: usize) -> usize {
    size.next_power_of_two() / 2
}

/// The proof that the head over all leaves only adds to the head over the first `earlier`.
///
/// Nothing when `earlier` is zero or all of them: there is nothing to prove by hashes.
pub fn consistency_proof(leaves: &[Hash], earlier: usize) -> Vec<Hash> {
    if earlier == 0 || earlier >= leaves.len() {
        return Vec::new();
    }
    sub_proof(leaves, earlier, true)
}

/// SUBPROOF of RFC 6962; `whole` says that the earlier tree is still known as a whole.
fn sub_proof(leaves: &[Hash], earlier: usize, whole: bool) -> Vec<Hash> {
    if earlier == leaves.len() {
        return if whole { Vec::new() } else { vec![tree_head(leaves)] };
    }
    let at = split(leaves.len());
    let (left, right) = leaves.split_at(at);
    let (mut proof, beside) = match earlier <= at {
        true => (sub_proof(left, earlier, whole), tree_head(right)),
        false => (sub_proof(right, earlier - at, false), tree_head(left)),
    };
    proof.push(beside);
    proof
}

/// Whether a proof shows that the later head only adds to the earlier one; the verifier needs no entries.
pub fn is_consistent(earlier: &Head, later: &Head, proof: &[Hash]) -> bool {
    let (Some(old), Some(new)) = (from_hex(&earlier.head), from_hex(&later.head)) else { return false };
    if earlier.size == 0 {
        return proof.is_empty() && old == tree_head(&[]);
    }
    if earlier.size >= later.size {
        return earlier.size == later.size && proof.is_empty() && old == new;
    }
    // An earlier tree of full size is its own first hash.
    let first = if earlier.size.is_power_of_two() { Some(old) } else { None };
    let mut path = first.into_iter().chain(proof.iter().copied());
    let Some(start) = path.next() else { return false };
    let (mut from, mut to) = (earlier.size - 1, later.size - 1);
    while from & 1 == 1 {
        (from, to) = (from >> 1, to >> 1);
    }
    let (mut old_found, mut new_found) = (start, start);
    for beside in path {
        if to == 0 {
            return false;
        }
        if from & 1 == 1 || from == to {
            old_found = node_hash(&beside, &old_found);
            new_found = node_hash(&beside, &new_found);
            while from & 1 == 0 && from != 0 {
                (from, to) = (from >> 1, to >> 1);
            }
        } else {
            new_found = node_hash(&new_found, &beside);
        }
        (from, to) = (from >> 1, to >> 1);
    }
    to == 0 && old_found == old && new_found == new
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The leaves of the test vectors of RFC 6962 in use since its first implementations: bytes, then their heads.
    fn leaves() -> Vec<Hash> {
        let data: [&[u8]; 8] = [
            b"",
            b"\x00",
            b"\x10",
            b"\x20\x21",
            b"\x30\x31",
            b"\x40\x41\x42\x43",
            b"\x50\x51\x52\x53\x54\x55\x56\x57",
            b"\x60\x61\x62\x63\x64\x65\x66\x67\x68\x69\x6a\x6b\x6c\x6d\x6e\x6f",
        ];
        data.iter().map(|data| leaf_hash(data)).collect()
    }

    #[test]
    fn heads_are_those_of_the_vectors() {
        let expected = [
            (0, "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"),
            (1, "6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d"),
            (2, "fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125"),
            (3, "aeb6bcfe274b70a14fb067a5e5578264db0fa9b51af5e0ba159158f329e06e77"),
            (8, "5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328"),
        ];
        for (size, head) in expected {
            assert_eq!(hex(&tree_head(&leaves()[..size])), head, "{size} leaves");
        }
    }

    fn head(leaves: &[Hash]) -> Head {
        Head { size: leaves.len() as u64, head: hex(&tree_head(leaves)) }
    }

    #[test]
    fn every_proof_holds_and_no_other_does() {
        let leaves: Vec<Hash> = (0..40u8).map(|number| leaf_hash(&[number])).collect();
        for later in 0..=leaves.len() {
            for earlier in 0..=later {
                let (old, new) = (head(&leaves[..earlier]), head(&leaves[..later]));
                let proof = consistency_proof(&leaves[..later], earlier);
                assert!(is_consistent(&old, &new, &proof), "{earlier} of {later}");
                for at in 0..proof.len() {
                    let mut wrong = proof.clone();
                    wrong[at][7] ^= 1;
                    assert!(!is_consistent(&old, &new, &wrong), "{earlier} of {later}, hash {at}");
                }
                let mut other = old.clone();
                other.head = hex(&leaf_hash(b"another"));
                assert!(!is_consistent(&other, &new, &proof), "{earlier} of {later}, another head");
                let longer: Vec<Hash> = proof.iter().copied().chain([[0; 32]]).collect();
                assert!(!is_consistent(&old, &new, &longer), "{earlier} of {later}, one hash more");
            }
        }
    }

    #[test]
    fn a_head_is_read_as_it_is_printed() {
        let head = head(&leaves());
        assert_eq!(head.to_string().parse(), Ok(head));
        assert!("12".parse::<Head>().is_err() && "x:00".parse::<Head>().is_err() && "1:zz".parse::<Head>().is_err());
    }
}
