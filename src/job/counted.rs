//! How much of the recordings was read.

use super::Progress;
use std::path::Path;
use std::sync::atomic::{AtomicU64, Ordering};

/// Passes everything on and counts the bytes.
pub(super) struct Counted<'a> {
    inner: &'a dyn Progress,
    bytes: AtomicU64,
}

impl<'a> Counted<'a> {
    pub(super) fn new(inner: &'a dyn Progress) -> Self {
        Counted { inner, bytes: AtomicU64::new(0) }
    }

    /// Bytes of samples that went through so far.
    pub(super) fn bytes(&self) -> u64 {
        self.bytes.load(Ordering::Relaxed)
    }
}

impl Progress for Counted<'_> {
    fn finding(&self) {
        self.inner.finding();
    }

    fn planned(&self, recordings: u64, bytes: u64) {
        self.inner.planned(recordings, bytes);
    }

    fn advanced(&self, bytes: u64) {
        self.bytes.fetch_add(bytes, Ordering::Relaxed);
        self.inner.advanced(bytes);
    }

    fn checking(&self, bytes: u64) {
        self.inner.checking(bytes);
    }

    fn finished(&self, path: &str, failed: Option<&str>) {
        self.inner.finished(path, failed);
    }

    fn interrupted(&self) -> bool {
        self.inner.interrupted()
    }

    fn temporary(&self, path: &Path) {
        self.inner.temporary(path);
    }
}
