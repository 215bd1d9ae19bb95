//! SHA-256 of what goes into a document and of what comes out.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

use super::error::RecordError;

/// Hexadecimal digits of the short form that stands on every page.
const SHORT_DIGITS: usize = 12;

/// The SHA-256 of some bytes.
///
/// Displays as 64 lower-case hexadecimal digits, the form that `sha256sum`
/// prints.
///
/// # Sources
///
/// FIPS 180-4 (2015), section 6.2.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(into = "String", try_from = "String")]
pub struct ContentHash([u8; 32]);

impl ContentHash {
    /// The hash of `bytes` as they are.
    pub fn of(bytes: &[u8]) -> Self {
        Self(Sha256::digest(bytes).into())
    }

    /// The first 12 digits: enough to tell documents apart by eye, too few to
    /// prove anything.
    pub fn short(&self) -> String {
        self.to_string().chars().take(SHORT_DIGITS).collect()
    }

    /// The 32 bytes.
    pub fn as_bytes(&self) -> &[u8; 32] {
        &self.0
    }
}

/// SHA-256 of `bytes` as 64 lower-case hexadecimal digits.
pub fn sha256_hex(bytes: &[u8]) -> String {
    ContentHash::of(bytes).to_string()
}

impl fmt::Display for ContentHash {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.iter().try_for_each(|byte| write!(f, "{byte:02x}"))
    }
}

impl From<ContentHash> for String {
    fn from(hash: ContentHash) -> Self {
        hash.to_string()
    }
}

impl TryFrom<String> for ContentHash {
    type Error = RecordError;

    fn try_from(text: String) -> Result<Self, Self::Error> {
        text.parse()
    }
}

impl FromStr for ContentHash {
    type Err = RecordError;

    /// Reads the 64 digits, lower case only: one hash has one spelling.
    fn from_str(text: &str) -> Result<Self, Self::Err> {
        let refuse = || RecordError::NotAHash { given: super::error::shown(text) };
        let digits = text.as_bytes();
        if digits.len() != 64 {
            return Err(refuse());
        }
        let mut bytes = [0_u8; 32];
        for (byte, pair) in bytes.iter_mut().zip(digits.chunks_exact(2)) {
            for &digit in pair {
                let value = match digit {
                    b'0'..=b'9' => digit - b'0',
                    b'a'..=b'f' => digit - b'a' + 10,
                    _ => return Err(refuse()),
                };
                *byte = (*byte << 4) | value;
            }
        }
        Ok(Self(bytes))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180 example values for the empty message and for "abc", as published
    /// by NIST (Cryptographic Standards and Guidelines, Examples with
    /// Intermediate Values; from memory, confirmed with `sha256sum`).
    #[test]
    fn known_values() {
        assert_eq!(
            sha256_hex(b"abc"),
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
        );
        assert_eq!(
            sha256_hex(b""),
            "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"
        );
        assert_eq!(ContentHash::of(b"abc").short(), "ba7816bf8f01");
    }

    #[test]
    fn text_form_is_read_back_and_nothing_else_is() {
        let hash = ContentHash::of(b"abc");
        assert_eq!(hash.to_string().parse(), Ok(hash));
        let upper = hash.to_string().to_uppercase();
        for wrong in [&upper, "", "ba78", &format!("{hash}0"), &"g".repeat(64)] {
            assert!(wrong.parse::<ContentHash>().is_err(), "{wrong}");
        }
    }
}
