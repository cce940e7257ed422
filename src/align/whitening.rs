//! A short filter that flattens a signal's spectrum.
//!
//! Linear prediction (J. Makhoul, "Linear prediction: a tutorial review", Proc. IEEE 63,
//! 1975): the prediction error of a signal is as white as the order allows. Being a short
//! FIR filter it is exact within blocks, where a division by the spectrum would ring
//! through them; it takes the weight off a dominating line without lifting everything
//! that is only noise.

/// Order of the prediction: enough for a slope and a dozen lines.
pub(super) const ORDER: usize = 32;

/// Share of the power that is taken to be white noise: what lies more than 60 dB below the
/// whole is not lifted, so the rounding noise of a band-limited recording does not weigh
/// as much as its sound.
const WHITE_SHARE: f64 = 1e-6;

/// Outputs at a time.
const LANES: usize = 16;

/// The prediction error filter, `1, -a1, ..., -aORDER`.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Whitening {
    /// Steep spectra make them large and of alternating signs: f32 would not do.
    pub(super) taps: [f64; ORDER + 1],
}

impl Whitening {
    /// For a signal of which `pieces` are parts.
    pub(super) fn of<'a>(pieces: impl Iterator<Item = &'a [f32]>) -> Self {
        let mut autocorrelation = [0.0; ORDER + 1];
        for piece in pieces {
            add_autocorrelation(piece, &mut autocorrelation);
        }
        autocorrelation[0] *= 1.0 + WHITE_SHARE;
        Self { taps: levinson(&autocorrelation) }
    }

    /// The filter that changes nothing.
    pub(super) fn none() -> Self {
        Self { taps: std::array::from_fn(|tap| if tap == 0 { 1.0 } else { 0.0 }) }
    }

    /// The filtered samples, ORDER more than came in, starting from silence.
    pub(super) fn apply(&self, samples: &[f32]) -> Vec<f32> {
        // ORDER zeros before and after, so that every output is one scalar product.
        let mut padded = vec![0.0; ORDER];
        padded.extend(samples.iter().map(|x| f64::from(*x)));
        padded.resize(samples.len() + 2 * ORDER + LANES, 0.0);
        let mut out = Vec::with_capacity(samples.len() + ORDER + LANES);
        while out.len() < samples.len() + ORDER {
            let mut sums = [0.0; LANES];
            for (delay, tap) in self.taps.iter().enumerate() {
                let from = out.len() + ORDER - delay;
                let Some(samples) = padded[from..].first_chunk::<LANES>() else { break };
                for (sum, sample) in sums.iter_mut().zip(samples) {
                    *sum += tap * sample;
                }
            }
            out.extend(sums.map(|sum| sum as f32));
        }
        out.truncate(samples.len() + ORDER);
        out
    }
}

/// Adds the autocorrelation of a piece under a Hann window.
fn add_autocorrelation(piece: &[f32], sums: &mut [f64; ORDER + 1]) {
    let step = std::f64::consts::TAU / piece.len().max(1) as f64;
    let windowed: Vec<f64> =
        piece.iter().enumerate().map(|(n, x)| f64::from(*x) * (0.5 - 0.5 * ((n as f64 + 0.5) * step).cos())).collect();
    for (lag, sum) in sums.iter_mut().enumerate() {
        let mut lanes = [0.0; 8];
        let (here, there) = (windowed.as_chunks::<8>().0, windowed.get(lag..).unwrap_or_default().as_chunks::<8>().0);
        for (a, b) in here.iter().zip(there) {
            for ((lane, a), b) in lanes.iter_mut().zip(a).zip(b) {
                *lane += a * b;
            }
        }
        *sum += lanes.iter().sum::<f64>();
    }
}

/// Levinson's recursion; the identity where there is no power.
fn levinson(r: &[f64; ORDER + 1]) -> [f64; ORDER + 1] {
    let mut a = [0.0; ORDER + 1];
    a[0] = 1.0;
    let mut error = r[0];
    for order in 1..=ORDER {
        if error <= f64::MIN_POSITIVE {
            break;
        }
        let sum: f64 = (0..order).map(|i| a[i] * r[order - i]).sum();
        let reflection = -sum / error;
        let old = a;
        for i in 1..=order {
            a[i] = old[i] + reflection * old[order - i];
        }
        error *= 1.0 - reflection * reflection;
    }
    a
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_in_white_noise_is_taken_out() {
        let hash =
            |n: u32| f64::from((n.wrapping_mul(0x9E37_79B9) ^ (n >> 3)).wrapping_mul(0x85EB_CA6B) >> 8) / 16_777_216.0;
        let samples: Vec<f32> =
            (0..8192).map(|n| (100.0 * (0.3 * f64::from(n)).sin() + hash(n) - 0.5) as f32).collect();
        let whitened = Whitening::of([samples.as_slice()].into_iter()).apply(&samples);
        let power = whitened[ORDER..8192].iter().map(|x| f64::from(*x) * f64::from(*x)).sum::<f64>() / 8160.0;
        // The noise alone has 1/12; the line had 5000.
        assert!(power < 1.0, "{power}");
    }

    #[test]
    fn the_filter_is_its_taps() {
        let mut impulse = vec![0.0_f32; 50];
        impulse[0] = 1.0;
        let whitening = Whitening::of([[1.0_f32, 2.0, 3.0, 2.5].repeat(20).as_slice()].into_iter());
        let out = whitening.apply(&impulse);
        assert_eq!(out.len(), 82);
        assert_eq!(out[..=ORDER], whitening.taps.map(|tap| tap as f32));
    }

    #[test]
    fn silence_is_left_alone() {
        assert_eq!(Whitening::of([[0.0_f32; 100].as_slice()].into_iter()), Whitening::none());
    }
}
