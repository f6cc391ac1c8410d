//! Digests: of input files, so that a run can tell that its data changed, and
//! of canonical texts, so that a template's id never moves.

use sha2::{Digest, Sha256};

/// The SHA-256 digest (FIPS 180-4) of some bytes, in hexadecimal.
pub fn digest_bytes(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}

/// A short name made from a text: `k` and eight characters that are hard to
/// confuse when read aloud (no `i`, `l`, `o`, `u`), 40 bits of its digest.
pub fn short_id(text: &str) -> String {
    const ALPHABET: &[u8; 32] = b"0123456789abcdefghjkmnpqrstvwxyz";
    let digest = Sha256::digest(text.as_bytes());
    let bits = digest[..5]
        .iter()
        .fold(0u64, |bits, byte| bits << 8 | u64::from(*byte));
    let mut id = String::from("k");
    for place in (0..8).rev() {
        id.push(char::from(ALPHABET[(bits >> (5 * place) & 31) as usize]));
    }
    id
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digest_of_the_standard_example() {
        // FIPS 180-4 example, message "abc".
        assert_eq!(
            digest_bytes(b"abc"),
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
        );
    }

    #[test]
    fn ids_are_short_and_stable() {
        let id = short_id("throughout [0, end] (x <= ?1)");
        assert_eq!(id.len(), 9);
        assert_eq!(id, short_id("throughout [0, end] (x <= ?1)"));
        assert_ne!(id, short_id("throughout [0, end] (x >= ?1)"));
    }
}
