//! Interpolation between samples with a windowed sinc.
//!
//! `y = sum over j of k(j - p) x[base + j]`, p the fraction of a frame, `k(t) = sinc(t)
//! w(t)` and w a Kaiser window over [`TAPS`] frames (J. F. Kaiser 1974; A. V. Oppenheim
//! and R. W. Schafer, Discrete-Time Signal Processing). With the design attenuation of
//! 120 dB the transition around half the rate is `(120 - 7.95) / (2.285 (TAPS - 1) 2 pi)`
//! wide; below it the ripple is at most 1e-6 and so are images.
//!
//! Kernels are tabulated at [`PHASES`] fractions; between two of them the result is taken
//! linearly, which at a frequency of f cycles a frame is wrong by at most
//! `(2 pi f / PHASES)^2 / 8`: 1.0e-6 at the top. Both together stay below -110 dB.

use multiversion::multiversion;
use std::f64::consts::PI;
use std::sync::OnceLock;

/// Samples that make one.
pub(super) const TAPS: usize = 96;

/// Samples before the base, which lies at or before the place.
pub(super) const BEHIND: usize = TAPS / 2 - 1;

/// Samples after the base.
pub(super) const AHEAD: usize = TAPS / 2;

/// Tabulated fractions of a frame.
const PHASES: usize = 1024;

/// Design attenuation of the window, dB.
const STOP_DB: f64 = 120.0;

/// Partial sums before the last additions: a third of a quarter of the taps.
const LANES: usize = TAPS / 12;

/// Share of the sample rate up to which levels stay within 1e-4 dB (1e-5 of the
/// amplitude; ripple and interpolation take 2e-6).
pub(super) fn reaches_share() -> f64 {
    0.5 - 0.5 * (STOP_DB - 7.95) / (2.285 * (TAPS - 1) as f64 * 2.0 * PI)
}

/// The kernels for all fractions.
#[derive(Debug)]
pub(super) struct Table {
    rows: Vec<[f64; TAPS]>,
}

impl Table {
    /// The table, made when first asked for.
    pub(super) fn get() -> &'static Table {
        static TABLE: OnceLock<Table> = OnceLock::new();
        TABLE.get_or_init(|| Table { rows: (0..=PHASES).map(|i| row(i as f64 / PHASES as f64)).collect() })
    }
}

/// The scalar product of `samples` with `low + share delta`. Products first, then sums of
/// halves: the one order of additions for every vector width, and a form that compilers
/// turn into vector instructions (always inlined, as only then into those of [`run`]'s
/// versions).
#[inline(always)]
fn product(low: &[f64; TAPS], delta: &[f64; TAPS], share: f64, samples: &[f64; TAPS]) -> f64 {
    let mut products = [0.0; TAPS];
    for tap in 0..TAPS {
        products[tap] = (low[tap] + share * delta[tap]) * samples[tap];
    }
    let mut halves = [0.0; TAPS / 2];
    for tap in 0..TAPS / 2 {
        halves[tap] = products[tap] + products[tap + TAPS / 2];
    }
    let mut quarters = [0.0; TAPS / 4];
    for tap in 0..TAPS / 4 {
        quarters[tap] = halves[tap] + halves[tap + TAPS / 4];
    }
    let mut s = [0.0; LANES];
    for (lane, sum) in s.iter_mut().enumerate() {
        *sum = (quarters[lane] + quarters[lane + LANES]) + quarters[lane + 2 * LANES];
    }
    ((s[0] + s[4]) + (s[2] + s[6])) + ((s[1] + s[5]) + (s[3] + s[7]))
}

/// Where a run of frames lies: frame n before at `n + delay + slope n` after.
#[derive(Clone, Copy, Debug)]
pub(super) struct Places {
    pub(super) delay: f64,
    pub(super) slope: f64,
}

impl Places {
    /// The frame at or before the place of frame n, and the fraction beyond it. From the
    /// number itself, so that nothing adds up over hours.
    #[inline(always)]
    pub(super) fn of(self, frame: u64) -> (i64, f64) {
        let shift = self.delay + self.slope * frame as f64;
        let mut whole = shift as i64;
        if whole as f64 > shift {
            whole -= 1;
        }
        (frame as i64 + whole, shift - whole as f64)
    }
}

/// Appends the frames from `frame` on, as long as `held`, whose first sample has the
/// index `start`, has all they need; at most up to `end`.
#[multiversion(targets("x86_64+avx512f", "x86_64+avx2"))]
pub(super) fn run(table: &Table, places: Places, frame: u64, end: u64, held: &[f64], start: u64, out: &mut Vec<f64>) {
    // Fractions move slowly: many frames in turn lie between the same two kernels.
    let (mut row, mut delta) = (usize::MAX, [0.0; TAPS]);
    for frame in frame..end {
        let (base, fraction) = places.of(frame);
        let first = base - BEHIND as i64 - start as i64;
        if first < 0 || first as usize + TAPS > held.len() {
            break;
        }
        let Some(samples) = held[first as usize..].first_chunk::<TAPS>() else { break };
        let place = fraction * PHASES as f64;
        let index = (place as usize).min(PHASES - 1);
        let (low, high) = (&table.rows[index], &table.rows[index + 1]);
        if index != row {
            row = index;
            delta = std::array::from_fn(|tap| high[tap] - low[tap]);
        }
        out.push(product(low, &delta, place - index as f64, samples));
    }
}

/// The kernel for one fraction; its sum is 1, so that an offset stays exactly.
fn row(fraction: f64) -> [f64; TAPS] {
    let beta = 0.1102 * (STOP_DB - 8.7);
    let scale = 1.0 / bessel_i0_of_square(beta * beta);
    // sin(pi (j - p)) changes its sign from tap to tap and nothing else.
    let sine = libm::sin(PI * fraction);
    let mut row: [f64; TAPS] = std::array::from_fn(|tap| {
        let distance = tap as f64 - BEHIND as f64 - fraction;
        let part = distance / AHEAD as f64;
        let window = bessel_i0_of_square(beta * beta * (1.0 - part * part).max(0.0)) * scale;
        let sinc = if distance.abs() < 1e-9 {
            1.0
        } else if tap % 2 == BEHIND % 2 {
            -sine / (PI * distance)
        } else {
            sine / (PI * distance)
        };
        sinc * window
    });
    let sum: f64 = row.iter().sum();
    row.iter_mut().for_each(|tap| *tap /= sum);
    row
}

/// Modified Bessel function of the first kind and order 0 of the root of `square`, by its
/// power series, all of whose terms are positive.
fn bessel_i0_of_square(square: f64) -> f64 {
    let (mut term, mut sum, mut k) = (1.0, 1.0, 1.0);
    while term > 1e-17 * sum {
        term *= 0.25 * square / (k * k);
        sum += term;
        k += 1.0;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_kernel_without_fraction_passes_samples_on() {
        for (fraction, place) in [(0.0, BEHIND), (1.0, BEHIND + 1)] {
            for (tap, value) in row(fraction).iter().enumerate() {
                let expected = if tap == place { 1.0 } else { 0.0 };
                assert!((value - expected).abs() < 1e-15, "{fraction}: tap {tap}: {value:e}");
            }
        }
    }

    /// Abramowitz and Stegun, table 9.8 (I0(1), I0(5)), from memory.
    #[test]
    fn bessel_function_has_its_tabulated_values() {
        assert!((bessel_i0_of_square(1.0) - 1.266_065_877_752_008).abs() < 1e-14);
        assert!((bessel_i0_of_square(25.0) - 27.239_871_823_604_44).abs() < 1e-12);
    }

    #[test]
    fn places_are_exact_over_hours() {
        // A slope of 2^-20 has exact products: 2^40 frames move by 2^20 and nothing else.
        let places = Places { delay: -7.25, slope: 1.0 / 1_048_576.0 };
        assert_eq!(places.of(1 << 40), ((1 << 40) + (1 << 20) - 8, 0.75));
        assert_eq!(places.of(0), (-8, 0.75));
    }
}
