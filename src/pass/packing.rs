//! Words, bits and checksums that arcs and tables share.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: widths from 1 to 32 and positions inside the words"
)]
#![allow(clippy::cast_possible_truncation, reason = "words are cut out on purpose")]

use crc::{CRC_32_ISO_HDLC, Crc, NoTable};

/// CRC-32 (ISO-HDLC) over words as little-endian bytes. Bitwise: no table in flash, used once per upload.
pub(super) fn checksum(words: &[u32]) -> u32 {
    const CRC: Crc<u32, NoTable> = Crc::<u32, NoTable>::new(&CRC_32_ISO_HDLC);
    let mut digest = CRC.digest();
    for word in words {
        digest.update(&word.to_le_bytes());
    }
    digest.finalize()
}

/// Appends fields of 1 to 32 bits to words, least significant bit first.
pub(super) struct BitWriter<'a> {
    words: &'a mut [u32],
    position: usize,
}

impl<'a> BitWriter<'a> {
    pub(super) fn new(words: &'a mut [u32]) -> Self {
        words.fill(0);
        Self { words, position: 0 }
    }

    /// `None` when the words are full.
    pub(super) fn push(&mut self, value: u32, width: u32) -> Option<()> {
        let value = u64::from(value) & ((1 << width) - 1);
        let shifted = value << (self.position % 32);
        let word = self.position / 32;
        *self.words.get_mut(word)? |= shifted as u32;
        if shifted >> 32 != 0 {
            *self.words.get_mut(word + 1)? |= (shifted >> 32) as u32;
        }
        self.position += width as usize;
        (self.position <= self.words.len() * 32).then_some(())
    }

    /// Words written so far, the last one perhaps in part.
    pub(super) fn words_used(&self) -> usize {
        self.position.div_ceil(32)
    }
}

/// Reads what [`BitWriter`] wrote.
pub(super) struct BitReader<'a> {
    words: &'a [u32],
    position: usize,
}

impl<'a> BitReader<'a> {
    pub(super) fn new(words: &'a [u32]) -> Self {
        Self { words, position: 0 }
    }

    /// `None` past the end.
    pub(super) fn pull(&mut self, width: u32) -> Option<u32> {
        let word = self.position / 32;
        let low = u64::from(*self.words.get(word)?);
        let high = u64::from(self.words.get(word + 1).copied().unwrap_or(0));
        let value = ((low | high << 32) >> (self.position % 32)) & ((1 << width) - 1);
        self.position += width as usize;
        (self.position <= self.words.len() * 32).then_some(value as u32)
    }

    /// A two's complement field, widened.
    pub(super) fn pull_signed(&mut self, width: u32) -> Option<i32> {
        let spare = 32 - width;
        Some(((self.pull(width)? << spare) as i32) >> spare)
    }

    /// Words read so far, the last one perhaps in part.
    pub(super) fn words_used(&self) -> usize {
        self.position.div_ceil(32)
    }
}
