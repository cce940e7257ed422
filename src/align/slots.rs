//! Chunks of the recording before, spread over it, each the liveliest of its stretch.

use std::mem;

/// A run of frames.
#[derive(Clone, Debug)]
pub(super) struct Chunk {
    /// Index of its first frame.
    pub(super) start: u64,
    /// Energy of the differences between neighboring frames: what rumbles slowly tells
    /// little about a lag.
    pub(super) energy: f64,
    /// Its frames.
    pub(super) samples: Vec<f32>,
}

/// Picks one chunk from each of a number of equal stretches.
///
/// Chunks begin at multiples of half their length; of the stretch only the best so far
/// is kept, so memory does not grow with its length.
#[derive(Debug)]
pub(super) struct Slots {
    hop: usize,
    width: u64,
    frames: u64,
    // The last one to two hops, and the energy of the first of them.
    recent: Vec<f32>,
    recent_start: u64,
    last_energy: f64,
    best: Option<Chunk>,
    slot: u64,
    /// Chunks never share frames: they are held against each other.
    free_from: u64,
}

impl Slots {
    /// `count` stretches over `frames` frames, chunks of `chunk` (even) frames.
    pub(super) fn new(frames: u64, chunk: usize, count: u64) -> Self {
        Self {
            hop: (chunk / 2).max(1),
            width: frames.div_ceil(count.max(1)).max(1),
            frames: 0,
            recent: Vec::with_capacity(2 * chunk),
            recent_start: 0,
            last_energy: 0.0,
            best: None,
            slot: 0,
            free_from: 0,
        }
    }

    /// Takes the next frames and returns the chunks of all stretches that they end.
    pub(super) fn push(&mut self, mut samples: &[f32]) -> Vec<Chunk> {
        let mut done = Vec::new();
        while !samples.is_empty() {
            let room = self.hop - self.recent.len() % self.hop;
            let (now, later) = samples.split_at(samples.len().min(room));
            self.recent.extend_from_slice(now);
            self.frames += now.len() as u64;
            samples = later;
            if now.len() == room {
                done.extend(self.hop_ended());
            }
        }
        done
    }

    /// The chunk of the last stretch.
    pub(super) fn finish(&mut self) -> Option<Chunk> {
        self.best.take()
    }

    fn hop_ended(&mut self) -> Option<Chunk> {
        let newest = self.recent.len() - self.hop;
        let energy = difference_energy(&self.recent[newest..]);
        if newest == 0 {
            self.last_energy = energy;
            return None;
        }
        let chunk_energy = self.last_energy + energy;
        let start = self.recent_start;
        let slot = start / self.width;
        let ended = if slot == self.slot { None } else { self.best.take() };
        self.slot = slot;
        if let Some(ended) = &ended {
            self.free_from = ended.start + ended.samples.len() as u64;
        }
        if start >= self.free_from && chunk_energy > self.best.as_ref().map_or(0.0, |best| best.energy) {
            let mut samples = self.best.take().map(|mut best| mem::take(&mut best.samples)).unwrap_or_default();
            samples.clear();
            samples.extend_from_slice(&self.recent);
            self.best = Some(Chunk { start, energy: chunk_energy, samples });
        }
        self.recent.copy_within(newest.., 0);
        self.recent.truncate(self.hop);
        self.recent_start += self.hop as u64;
        self.last_energy = energy;
        ended
    }
}

/// Sum of squared differences of neighbors, in eight lanes for speed.
pub(super) fn difference_energy(samples: &[f32]) -> f64 {
    let mut lanes = [0.0_f32; 8];
    let mut total = 0.0;
    let shifted = samples.get(1..).unwrap_or_default();
    for (here, next) in samples.chunks(512).zip(shifted.chunks(512)) {
        for (here, next) in here.as_chunks::<8>().0.iter().zip(next.as_chunks::<8>().0) {
            for ((lane, a), b) in lanes.iter_mut().zip(here).zip(next) {
                *lane += (b - a) * (b - a);
            }
        }
        total += lanes.iter().map(|lane| f64::from(*lane)).sum::<f64>();
        lanes = [0.0; 8];
    }
    total
}
