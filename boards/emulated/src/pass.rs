//! The pass that the programs share: an arc from a file, and the table baked from it.

use crate::console;
use shiftkeel::pass::bake::{Request, bake_arc};
use shiftkeel::pass::{Arc, Direction, Geometry, MAX_ARC_WORDS, PassTable, Site, TaggedAt};

/// Words of the largest table that the programs make room for: 1 KiB.
pub const TABLE_WORDS: usize = 256;

/// Words of an arc, as many as there are in the file.
pub struct ArcFile {
    words: [u32; MAX_ARC_WORDS],
    length: usize,
}

impl ArcFile {
    /// Reads the file.
    pub fn read(name: &core::ffi::CStr) -> Self {
        let mut bytes = [0; 4 * MAX_ARC_WORDS];
        let bytes = console::read(name, &mut bytes);
        let mut words = [0; MAX_ARC_WORDS];
        for (word, bytes) in words.iter_mut().zip(bytes.chunks_exact(4)) {
            *word = u32::from_le_bytes([bytes[0], bytes[1], bytes[2], bytes[3]]);
        }
        Self { words, length: bytes.len() / 4 }
    }

    /// The arc, checked.
    pub fn arc(&self) -> Arc<'_> {
        console::must(Arc::new(&self.words[..self.length]), "the file")
    }
}

/// Bakes the table of the pass as an invented site sees it: within 1 mHz and 0.015 cycle at 437 MHz.
pub fn bake<'a>(buffer: &'a mut [u32], arc: &Arc<'_>, direction: Direction) -> PassTable<'a> {
    let site = console::must(Site::geodetic(45.0, 7.5, 300.0), "the site");
    let geometry = console::must(Geometry::new(arc, &site, direction, TaggedAt::Ground, 0.0), "the pass");
    let Some((start, end)) = geometry.above(0.0) else {
        console::fail("the spacecraft does not rise");
    };
    let request = Request {
        start,
        end,
        slope_tolerance: 1e-3 / 437e6,
        delay_tolerance: 0.015 / 437e6,
        lateness_partial: direction == Direction::Down,
    };
    console::must(bake_arc(buffer, arc, &geometry, &request), "the table")
}
