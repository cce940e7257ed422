//! The window and transform of one segment length, shared among channels and recordings.

use super::window;
use num_complex::Complex64;
use rustfft::{Fft, FftPlanner};
use std::sync::{Arc, Mutex, PoisonError};

/// Window and planned transform for segments of one length: one serves any number of
/// [`Accumulator`](super::Accumulator)s at once.
pub struct Transform {
    window: Vec<f64>,
    fft: Arc<dyn Fft<f64>>,
    /// Memory that is free, kept for the next recording: fresh pages cost time.
    spare_work: Mutex<Vec<Work>>,
    spare_packed: Mutex<Vec<Vec<Complex64>>>,
}

/// Working memory of one transform at a time. What it holds between two is undefined.
#[derive(Debug)]
pub(super) struct Work {
    /// The transform.
    pub(super) result: Vec<Complex64>,
    scratch: Vec<Complex64>,
}

/// Longest segment whose memory is kept between recordings: 16 MB a buffer.
const KEPT_FRAMES: usize = 1 << 20;

impl Transform {
    /// For segments of `segment_frames` frames; an odd length is raised to the next
    /// even one, 0 to 2.
    pub fn new(segment_frames: usize) -> Arc<Self> {
        let frames = segment_frames.max(2).next_multiple_of(2);
        let fft = FftPlanner::new().plan_fft_forward(frames);
        Arc::new(Self {
            window: window::blackman_harris(frames),
            fft,
            spare_work: Mutex::default(),
            spare_packed: Mutex::default(),
        })
    }

    /// L, in frames; even.
    pub fn segment_frames(&self) -> usize {
        self.window.len()
    }

    /// The window, L values.
    pub fn window(&self) -> &[f64] {
        &self.window
    }

    /// Working memory, given back with [`Self::take_back`].
    pub(super) fn work(&self) -> Work {
        let spare = self.spare_work.lock().unwrap_or_else(PoisonError::into_inner).pop();
        spare.unwrap_or_else(|| Work {
            result: zeros(self.window.len()),
            scratch: zeros(self.fft.get_outofplace_scratch_len()),
        })
    }

    /// Keeps working memory for the next one who needs some.
    pub(super) fn take_back(&self, work: Work) {
        if self.window.len() <= KEPT_FRAMES {
            self.spare_work.lock().unwrap_or_else(PoisonError::into_inner).push(work);
        }
    }

    /// Memory for one segment; what it holds is undefined.
    pub(super) fn spare_packed(&self) -> Vec<Complex64> {
        let spare = self.spare_packed.lock().unwrap_or_else(PoisonError::into_inner).pop();
        spare.unwrap_or_else(|| zeros(self.window.len()))
    }

    /// Forward transform of a segment into `work.result`. Out of place is 3 % faster
    /// than in place, with the same memory.
    pub(super) fn run(&self, mut packed: Vec<Complex64>, work: &mut Work) {
        self.fft.process_outofplace_with_scratch(&mut packed, &mut work.result, &mut work.scratch);
        if self.window.len() <= KEPT_FRAMES {
            self.spare_packed.lock().unwrap_or_else(PoisonError::into_inner).push(packed);
        }
    }
}

fn zeros(length: usize) -> Vec<Complex64> {
    vec![Complex64::new(0.0, 0.0); length]
}

impl std::fmt::Debug for Transform {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Transform").field("segment_frames", &self.segment_frames()).finish_non_exhaustive()
    }
}

/// The transforms used last. A dataset needs one length for each sample rate, and
/// others only for recordings too short for it; a handful covers them.
#[derive(Debug, Default)]
pub struct TransformCache {
    /// Most recently used last.
    kept: Mutex<Vec<Arc<Transform>>>,
}

impl TransformCache {
    /// Lengths kept at once. One that fell out lives on while someone uses it.
    const CAPACITY: usize = 4;

    /// An empty cache.
    pub fn new() -> Self {
        Self::default()
    }

    /// The transform for segments of `segment_frames` frames.
    ///
    /// Computing a new one holds the others up (12 ms for 480000 frames), so that
    /// recordings that start together compute it once.
    pub fn get(&self, segment_frames: usize) -> Arc<Transform> {
        // A panic elsewhere leaves the list whole: it changes by push and remove only.
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let found = kept.iter().position(|t| t.segment_frames() == segment_frames);
        let transform = match found {
            Some(at) => kept.remove(at),
            None => Transform::new(segment_frames),
        };
        if kept.len() >= Self::CAPACITY {
            kept.remove(0);
        }
        kept.push(Arc::clone(&transform));
        transform
    }
}
