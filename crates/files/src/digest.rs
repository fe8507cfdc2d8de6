//! SHA-256: the fingerprint that ties a number to the file it came from.

use sha2::{Digest, Sha256};
use std::fmt::Write as _;

/// SHA-256 of some bytes, lower-case hexadecimal (FIPS 180-4).
pub fn sha256(bytes: &[u8]) -> String {
    let mut text = String::with_capacity(64);
    for byte in Sha256::digest(bytes) {
        // Writing to a String cannot fail.
        let _ = write!(text, "{byte:02x}");
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180-4, example of the one-block message "abc".
    #[test]
    fn the_published_example_comes_out() {
        assert_eq!(sha256(b"abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    }
}
