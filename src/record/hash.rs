//! Hashes of files and texts.

use sha2::Digest;
use sha2::Sha256;

/// SHA-256 of some bytes, hexadecimal.
pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}
