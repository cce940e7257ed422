//! How long segments are, where they lie, and which bins a band owns.

use super::{FIRST_BAND_BIN, window};
use std::ops::Range;

/// Shortest segment, in frames. A recording with fewer settled frames is not measured:
/// bins below [`FIRST_BAND_BIN`] would hold most of it.
pub const MIN_SEGMENT_FRAMES: usize = 256;

/// Longest segment, in frames: 1.9 GB of working memory. At 384 kHz it resolves a
/// band of 0.12 Hz; narrower ones get fewer bins than they ask for.
pub const MAX_SEGMENT_FRAMES: usize = 1 << 25;

/// Bins are never wider than this, in Hz, unless the recording is too short.
///
/// A wide band alone would do with wide bins, but those below [`FIRST_BAND_BIN`] belong
/// to no band: ten bins in a band from 90 to 6000 Hz would be 591 Hz wide, and the
/// band's lower half would be lost. Narrow bins cost a wide band
/// nothing: how certain its figures are goes by bins times segments.
pub const WIDEST_BIN_HZ: f64 = 1.0;

/// Bins that the narrowest band should hold.
const BINS_IN_NARROWEST: f64 = 10.0;

/// Where the segments of a recording lie.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SegmentPlan {
    /// Length L of every segment, even, in frames.
    pub segment_frames: usize,
    /// First frame of each segment, rising; the last segment ends at the last
    /// settled frame. Empty where not one segment fits.
    pub starts: Vec<u64>,
}

impl SegmentPlan {
    /// Spreads segments evenly over `settled` (frames of the recording) with at least
    /// 50 % overlap: the first starts at its start, the last ends at its end. Integer
    /// arithmetic, so the plan is the same on every machine.
    ///
    /// As few segments as the overlap allows; one where `settled` is L frames long.
    pub fn spread(segment_frames: usize, settled: Range<u64>) -> Self {
        let frames = segment_frames as u64;
        let hop = frames / 2;
        let Some(slack) = settled.end.saturating_sub(settled.start).checked_sub(frames).filter(|_| hop > 0) else {
            return Self { segment_frames, starts: Vec::new() };
        };
        let gaps = slack.div_ceil(hop);
        // slack * i passes 2^64 only for recordings of many days; the rest costs nothing.
        let offset = |i: u64| (u128::from(slack) * u128::from(i) / u128::from(gaps.max(1))) as u64;
        Self { segment_frames, starts: (0..=gaps).map(|i| settled.start + offset(i)).collect() }
    }

    /// How many segments without overlap tell as much about noise: at least 1 where
    /// there is a segment, at most their number.
    ///
    /// Where the settled part is hardly longer than a segment, the two that cover it are
    /// nearly the same and count as one; at 50 % overlap each counts in full. From the
    /// variance of averaged spectra, with K segments a distance D apart,
    ///
    /// ```text
    /// K / (1 + 2 sum over j of (1 - j/K) r(j D)^2),   r(d) = sum w[n] w[n+d] / sum w[n]^2
    /// ```
    ///
    /// (P. D. Welch, IEEE Trans. Audio Electroacoust. 15, 1967), rounded down but for
    /// the 0.3 % that 50 % overlap costs.
    pub fn independent_segments(&self) -> usize {
        const HALF_OVERLAP: f64 = 0.005;
        let (Some(first), Some(last)) = (self.starts.first(), self.starts.last()) else { return 0 };
        let count = self.starts.len() as f64;
        let spacing = (last - first) as f64 / ((count - 1.0).max(1.0) * self.segment_frames.max(1) as f64);
        // At 50 % overlap or little more only neighbors and theirs share frames.
        let shared: f64 = (1..self.starts.len())
            .map(|apart| (apart as f64, apart as f64 * spacing))
            .take_while(|(_, shift)| *shift < 1.0)
            .map(|(apart, shift)| {
                let r = window::overlap_correlation(shift);
                (1.0 - apart / count) * r * r
            })
            .sum();
        (count * (1.0 + HALF_OVERLAP) / (1.0 + 2.0 * shared)).clamp(1.0, count) as usize
    }
}

/// Segment length, in frames, for bands whose narrowest is `narrowest_hz` wide.
///
/// At least 10 bins in that band and none wider than [`WIDEST_BIN_HZ`] (which alone
/// counts where `narrowest_hz` is `None`); then the even product of 2, 3 and 5 within
/// 10 % above that is cheapest to transform. Where `settled_frames` or
/// [`MAX_SEGMENT_FRAMES`] is the cap: the largest such product below it. `None` where
/// not even [`MIN_SEGMENT_FRAMES`] fit, or the rate is 0.
///
/// `narrowest_hz` is the narrowest band with a requirement, or, where no band has one,
/// the narrowest band observed.
pub fn segment_frames(rate_hz: u32, narrowest_hz: Option<f64>, settled_frames: u64) -> Option<usize> {
    let cap = settled_frames.min(MAX_SEGMENT_FRAMES as u64);
    if rate_hz == 0 || cap < MIN_SEGMENT_FRAMES as u64 {
        return None;
    }
    // A width that is no positive number asks for nothing.
    let asked = narrowest_hz.filter(|w| *w > 0.0).map_or(WIDEST_BIN_HZ, |w| w / BINS_IN_NARROWEST);
    let frames = libm::ceil(f64::from(rate_hz) / asked.min(WIDEST_BIN_HZ));
    // Out of range saturates, and the cap takes over.
    let wanted = (frames as u64).max(MIN_SEGMENT_FRAMES as u64);
    let within = even_products(wanted, cap.min(wanted.saturating_add(wanted / 10)));
    let cheapest = within.into_iter().min_by_key(|p| (p.cost_per_frame(), p.frames));
    let chosen = cheapest.or_else(|| {
        // Between some small numbers (324 and 360) lie more than 10 %.
        let nearest =
            if wanted <= cap { even_products(wanted, cap).into_iter().min_by_key(|p| p.frames) } else { None };
        nearest.or_else(|| even_products(1, cap).into_iter().max_by_key(|p| p.frames))
    });
    chosen.and_then(|p| usize::try_from(p.frames).ok())
}

/// An even product of 2, 3 and 5, with how often each divides it.
#[derive(Clone, Copy, Debug)]
struct Product {
    frames: u64,
    twos: u32,
    threes: u32,
    fives: u32,
}

impl Product {
    /// Cost of a transform of this length a frame, in hundredths of a nanosecond.
    ///
    /// A model, not a timing: the length must not depend on the machine's mood. At 50 %
    /// overlap every sample lies in two segments whatever their length, so the cost of
    /// a recording goes by the cost a frame. Fitted to rustfft 6.4 on an x86-64 machine
    /// with AVX2: of the even products within 10 % above 48000, 160000, 441000, 480000
    /// and 960000 frames, the one it picks takes at most 1 % longer a frame than the
    /// fastest (2.3 to 5 ns). Where only one 2 divides the length, the vectorized
    /// radices are left out.
    fn cost_per_frame(self) -> u32 {
        24 * self.twos + 38 * self.threes + 57 * self.fives + if self.twos == 1 { 100 } else { 0 }
    }
}

/// All even products of 2, 3 and 5 from `from` to `to`, both included.
fn even_products(from: u64, to: u64) -> Vec<Product> {
    let mut found = Vec::new();
    for (fives, five) in powers(5, to) {
        for (threes, three) in powers(3, to / five) {
            let rest = to / five / three;
            let twos = powers(2, rest).filter(|(_, two)| two % 2 == 0);
            let products = twos.map(|(twos, two)| Product { frames: five * three * two, twos, threes, fives });
            found.extend(products.filter(|p| p.frames >= from));
        }
    }
    found
}

/// The powers of `base` up to `to`, with their exponents.
fn powers(base: u64, to: u64) -> impl Iterator<Item = (u32, u64)> {
    (0u32..).map_while(move |e| base.checked_pow(e).filter(|p| *p <= to).map(|p| (e, p)))
}

/// The bins a band owns: `from_hz <= k * rate_hz / L < to_hz`, never below
/// [`FIRST_BAND_BIN`] (bins 0 to 4 hold the offset and its main lobe), never above L/2.
/// Empty where the band holds none.
///
/// The edges are compared with the bin's frequency rounded once, so an edge that is
/// written as a bin's frequency lies exactly on it.
pub fn band_bins(rate_hz: u32, segment_frames: usize, from_hz: f64, to_hz: f64) -> Range<usize> {
    let bins = segment_frames / 2 + 1;
    let start = first_bin_at(rate_hz, segment_frames, from_hz).clamp(FIRST_BAND_BIN.min(bins), bins);
    start..first_bin_at(rate_hz, segment_frames, to_hz).clamp(start, bins)
}

/// The first bin at or above `hz`.
fn first_bin_at(rate_hz: u32, segment_frames: usize, hz: f64) -> usize {
    let (rate, frames) = (f64::from(rate_hz), segment_frames as f64);
    // Product below 2^53, so exact; one rounding in the division.
    let bin_hz = |k: f64| k * rate / frames;
    let near = libm::ceil(hz / rate * frames);
    // The quotient above can be off by a bin; NaN and infinities saturate below.
    let exact = [near - 1.0, near, near + 1.0].into_iter().find(|k| bin_hz(*k) >= hz);
    exact.unwrap_or(near) as usize
}
