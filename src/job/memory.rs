//! How many recordings may be in work at once, by memory.

use super::collector::OPEN_AT_ONCE;
use super::plan::Brief;
use super::recording::Treatment;
use crate::spectrum::Accumulator;
use std::sync::{Mutex, PoisonError};
use std::time::Duration;

/// Where the system does not say how much memory is free.
const ASSUMED_FREE_BYTES: u64 = 4 << 30;
/// Share of the free memory that recordings in work may take.
const SHARE: u64 = 2;

/// Memory that recordings in work at the same time may take together.
#[derive(Debug)]
pub struct MemoryBudget {
    limit_bytes: u64,
    taken_bytes: Mutex<u64>,
}

/// A recording's part of the budget; it goes back when this is dropped.
#[derive(Debug)]
pub struct Room<'a> {
    budget: &'a MemoryBudget,
    bytes: u64,
}

impl MemoryBudget {
    /// Half of what is free now.
    pub fn of_this_machine() -> Self {
        MemoryBudget { limit_bytes: free_bytes().unwrap_or(ASSUMED_FREE_BYTES) / SHARE, taken_bytes: Mutex::new(0) }
    }

    /// Waits until there is room for a recording; one that alone exceeds the budget
    /// goes when nothing else is in work. The waiting thread helps the others.
    pub fn enter(&self, brief: &Brief, treatment: &Treatment) -> Room<'_> {
        let bytes = estimated_bytes(brief, treatment);
        while !self.try_take(bytes) {
            if rayon::yield_now() != Some(rayon::Yield::Executed) {
                std::thread::sleep(Duration::from_millis(2));
            }
        }
        Room { budget: self, bytes }
    }

    fn try_take(&self, bytes: u64) -> bool {
        let mut taken = self.taken_bytes.lock().unwrap_or_else(PoisonError::into_inner);
        let fits = *taken == 0 || taken.saturating_add(bytes) <= self.limit_bytes;
        if fits {
            *taken += bytes;
        }
        fits
    }
}

impl Drop for Room<'_> {
    fn drop(&mut self) {
        *self.budget.taken_bytes.lock().unwrap_or_else(PoisonError::into_inner) -= self.bytes;
    }
}

/// Per channel the accumulator and, 16 bytes a frame, the segments open at once with
/// the one in the transform; the window and the transform's tables once (32). Where the filter
/// runs both ways, per channel what it holds and, 10 bytes a frame with room to grow, the
/// input that waits for what it holds back.
fn estimated_bytes(brief: &Brief, treatment: &Treatment) -> u64 {
    let length = treatment.segment_frames(brief.rate_hz, brief.frames).unwrap_or(0);
    let channel =
        (Accumulator::memory_bytes(length) as u64).saturating_add(16 * (OPEN_AT_ONCE as u64 + 1) * length as u64);
    let both_ways = treatment.both_ways.map_or(0, |reach| {
        reach.memory_bytes(brief.frames).saturating_add(10 * brief.frames.min(reach.lag_frames() as u64))
    });
    channel.saturating_add(both_ways).saturating_mul(u64::from(brief.channels)).saturating_add(32 * length as u64)
}

/// What Linux calls MemAvailable.
fn free_bytes() -> Option<u64> {
    let text = std::fs::read_to_string("/proc/meminfo").ok()?;
    let line = text.lines().find_map(|line| line.strip_prefix("MemAvailable:"))?;
    let kib: u64 = line.trim().strip_suffix("kB")?.trim().parse().ok()?;
    Some(kib * 1024)
}
