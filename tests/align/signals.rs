//! Signals whose value is known at any time, between frames too.

use bandproof::align::{AlignError, Alignment, Finder, Search, Side};

pub const RATE_HZ: u32 = 48_000;

/// splitmix64 by S. Vigna (public domain, from memory), to -1..1.
pub fn random(seed: u64, index: u64) -> f64 {
    let mut z = seed.wrapping_mul(0x9E37_79B9_7F4A_7C15).wrapping_add(index.wrapping_mul(0xD1B5_4A32_D192_ED03));
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^= z >> 31;
    (z >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
}

/// Approximately Gaussian noise of unit power: the sum of six uniform ones over sqrt 2.
pub fn noise(seed: u64, frames: usize) -> Vec<f64> {
    (0..frames as u64).map(|n| (0..6).map(|i| random(seed, 6 * n + i)).sum::<f64>() / 2.0_f64.sqrt()).collect()
}

/// Bells of random height at random times: `x(t) = sum a_k exp(-(t - t_k)^2 / (2 s^2))`,
/// s = 1.8 frames. Its spectrum at half the rate is exp(-(pi s)^2 / 2), 139 dB down, so
/// frames taken at any times hold it all. One bell every two frames, power about 1.
#[derive(Clone, Copy, Debug)]
pub struct Bells {
    pub seed: u64,
    /// Bells are this much of the time: 1 for steady noise, less for bursts with silence between.
    pub share: f64,
}

pub const WIDTH: f64 = 1.8;
const REACH: f64 = 16.0;
const SPACING: f64 = 2.0;
const BURST: f64 = 24_000.0;

impl Bells {
    pub fn steady(seed: u64) -> Self {
        Bells { seed, share: 1.0 }
    }

    /// The frames m of a recording whose frame m lies at time `(m - delay) / (1 + ppm 1e-6)`.
    pub fn record(self, frames: usize, delay: f64, ppm: f64) -> Vec<f64> {
        let stretch = 1.0 + ppm * 1e-6;
        let mut out = vec![0.0; frames];
        let first = ((-delay / stretch - REACH) / SPACING).floor() as i64 - 1;
        let last = (((frames as f64 - delay) / stretch + REACH) / SPACING).ceil() as i64 + 1;
        for k in first..=last {
            let time = SPACING * (k as f64 + 0.5 + 0.4 * random(self.seed ^ 0x55, k as u64));
            if (time / BURST).rem_euclid(1.0) > self.share {
                continue;
            }
            let height = 1.6 * random(self.seed, k as u64);
            // Times of frames relative to the bell's middle.
            let middle = delay + stretch * time;
            let start = (middle - REACH * stretch).ceil().max(0.0);
            let end = ((middle + REACH * stretch).floor() + 1.0).clamp(0.0, frames as f64) as usize;
            let offset = (start - middle) / stretch;
            let (s2, step) = (WIDTH * WIDTH, 1.0 / stretch);
            // exp(-(o + n d)^2 / 2 s^2) by its ratio from frame to frame.
            let mut value = height * (-offset * offset / (2.0 * s2)).exp();
            let mut ratio = (-(2.0 * offset * step + step * step) / (2.0 * s2)).exp();
            let change = (-step * step / s2).exp();
            for out in out.iter_mut().take(end).skip(start as usize) {
                *out += value;
                value *= ratio;
                ratio *= change;
            }
        }
        out
    }
}

/// Adds noise of this root mean square.
pub fn add_noise(samples: &mut [f64], seed: u64, amplitude: f64) {
    let noise = noise(seed, samples.len());
    samples.iter_mut().zip(noise).for_each(|(x, n)| *x += amplitude * n);
}

/// Rounds to 16 bits with triangular dither, full scale `full_scale`.
pub fn dithered(samples: &[f64], seed: u64, full_scale: f64) -> Vec<f64> {
    let step = full_scale / 32_768.0;
    let dither = |n: u64| 0.5 * (random(seed, 2 * n) + random(seed, 2 * n + 1));
    samples.iter().zip(0..).map(|(x, n)| (x / step + dither(n)).round() * step).collect()
}

pub fn search(before: &[Vec<f64>], after: &[Vec<f64>]) -> Search {
    Search {
        rate_hz: RATE_HZ,
        channels: before.len(),
        frames_before: before[0].len() as u64,
        frames_after: after[0].len() as u64,
        max_delay_s: 10.0,
        given_frames: None,
    }
}

/// Runs the finder as a caller does, blocks of the given lengths in turn.
pub fn find_with(
    search: Search,
    before: &[Vec<f64>],
    after: &[Vec<f64>],
    blocks: &[usize],
) -> Result<Alignment, AlignError> {
    let mut finder = Finder::new(search);
    let mut done = [0, 0];
    let mut lengths = blocks.iter().copied().cycle();
    while let Some(side) = finder.wants() {
        let planes = match side {
            Side::Before => before,
            Side::After => after,
        };
        let from = &mut done[side as usize];
        let to = (*from + lengths.next().unwrap_or(65_536)).min(planes[0].len());
        let block: Vec<Vec<f64>> = planes.iter().map(|plane| plane[*from..to].to_vec()).collect();
        *from = to;
        finder.take(side, &block);
    }
    finder.finish()
}

pub fn find(before: &[Vec<f64>], after: &[Vec<f64>]) -> Result<Alignment, AlignError> {
    find_with(search(before, after), before, after, &[65_536])
}

pub fn find_mono(before: &[f64], after: &[f64]) -> Result<Alignment, AlignError> {
    find(&[before.to_vec()], &[after.to_vec()])
}

/// The same with a change to what is looked for.
pub fn find_given(before: &[f64], after: &[f64], given: f64) -> Result<Alignment, AlignError> {
    let (before, after) = ([before.to_vec()], [after.to_vec()]);
    let search = Search { given_frames: Some(given), ..search(&before, &after) };
    find_with(search, &before, &after, &[65_536])
}

/// Frames of so many seconds.
pub fn seconds(seconds: f64) -> usize {
    (seconds * f64::from(RATE_HZ)) as usize
}

/// Mean square.
pub fn power(samples: &[f64]) -> f64 {
    samples.iter().map(|x| x * x).sum::<f64>() / samples.len() as f64
}

/// The least standard error of one chunk's lag, frames (Cramer-Rao bound of a delay in
/// white noise of mean square `noise`): `noise / (sum x'(t)^2)`, for bells x'^2 averages
/// `power / (2 s^2)`; a Hann window of 8192 frames tells as much as 8192/1.944 of them.
pub fn least_error(power: f64, noise: f64) -> f64 {
    (1.944 / 8192.0 * noise * 2.0 * WIDTH * WIDTH / power).sqrt()
}
