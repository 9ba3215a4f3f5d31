//! One number that changes when any bit of a trace does: FNV-1a, 64 bits.
//!
//! Source: the published offset basis and prime of FNV-1a (from memory); it guards against
//! difference, not against forgery.

/// A running FNV-1a.
#[derive(Clone, Copy)]
pub struct Digest(u64);

impl Digest {
    /// Of nothing yet.
    pub const fn new() -> Self {
        Self(0xcbf2_9ce4_8422_2325)
    }

    /// Takes in bytes.
    pub fn bytes(&mut self, bytes: &[u8]) {
        for byte in bytes {
            self.0 = (self.0 ^ u64::from(*byte)).wrapping_mul(0x0000_0100_0000_01b3);
        }
    }

    /// Takes in a word, low byte first.
    pub fn word(&mut self, word: u64) {
        self.bytes(&word.to_le_bytes());
    }

    /// The number.
    pub const fn value(self) -> u64 {
        self.0
    }
}

impl Default for Digest {
    fn default() -> Self {
        Self::new()
    }
}
