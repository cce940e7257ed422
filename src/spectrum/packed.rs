//! A segment while it is filled.

use super::transform::Transform;
use num_complex::Complex64;
use std::sync::Arc;

/// One channel's segment on its way to the transform: samples before as the real parts,
/// samples after as the imaginary parts, windowed as they come in.
///
/// Each sample is touched while it is still in the processor's cache, once for every
/// segment it belongs to; nothing else of a recording is kept.
#[derive(Debug)]
pub struct Packed {
    transform: Arc<Transform>,
    frames: Vec<Complex64>,
    filled: usize,
}

impl Packed {
    /// An empty segment for `transform`.
    pub fn new(transform: &Arc<Transform>) -> Self {
        Packed { frames: transform.spare_packed(), transform: Arc::clone(transform), filled: 0 }
    }

    /// Takes the next frames, before and after, in units of full scale. What one slice
    /// has beyond the other, or both beyond the segment, is not looked at.
    pub fn take(&mut self, before: &[f64], after: &[f64]) {
        let window = &self.transform.window()[self.filled..];
        let slots = self.frames[self.filled..].iter_mut().zip(window);
        for (((z, w), before), after) in slots.zip(before).zip(after) {
            *z = Complex64::new(before * w, after * w);
        }
        self.filled = (self.filled + before.len().min(after.len())).min(self.frames.len());
    }

    /// Whether it has all its frames.
    pub fn is_full(&self) -> bool {
        self.filled == self.frames.len()
    }

    /// The windowed segment; frames that have not come count as zeros.
    pub(crate) fn into_frames(mut self) -> Vec<Complex64> {
        self.frames[self.filled..].fill(Complex64::new(0.0, 0.0));
        self.frames
    }
}
