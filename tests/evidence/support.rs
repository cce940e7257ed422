//! Recordings whose truth is known: seeded noise, lines, small filters, rounding.

use bandproof::evidence::{BandFigures, BandTask, Measured, ReasonCode, Verdict, cross_ranges, judge};
use bandproof::spec::Requirement;
use bandproof::spectrum::{Accumulator, SegmentPlan, Spectra, Transform, segment_frames};
use std::f64::consts::{PI, TAU};

/// Sample rate of nearly all recordings here, Hz.
pub const RATE: u32 = 8000;

/// SplitMix64 (G. L. Steele, D. Lea, C. H. Flood, OOPSLA 2014), from memory.
pub struct Noise(u64);

impl Noise {
    pub fn new(seed: u64) -> Self {
        Noise(seed)
    }

    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Uniform in (0, 1).
    pub fn uniform(&mut self) -> f64 {
        ((self.next() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    /// Two independent values of unit variance (Box and Muller, 1958).
    fn pair(&mut self) -> (f64, f64) {
        let radius = (-2.0 * libm::log(self.uniform())).sqrt();
        let (sin, cos) = libm::sincos(TAU * self.uniform());
        (radius * cos, radius * sin)
    }

    /// White noise with a mean square of `dbfs` relative to a full-scale sine.
    pub fn white(&mut self, frames: usize, dbfs: f64) -> Vec<f64> {
        let amplitude = (0.5 * power(dbfs)).sqrt();
        let mut out = Vec::with_capacity(frames + 1);
        while out.len() < frames {
            let (a, b) = self.pair();
            out.extend([amplitude * a, amplitude * b]);
        }
        out.truncate(frames);
        out
    }
}

pub fn power(db: f64) -> f64 {
    libm::pow(10.0, db / 10.0)
}

pub fn db(power: f64) -> f64 {
    10.0 * libm::log10(power)
}

pub fn frames(seconds: f64) -> usize {
    (seconds * f64::from(RATE)).round() as usize
}

/// Adds a steady line.
pub fn add_line(to: &mut [f64], rate_hz: u32, hz: f64, dbfs: f64) {
    let amplitude = power(dbfs).sqrt();
    let step = hz / f64::from(rate_hz);
    for (n, sample) in to.iter_mut().enumerate() {
        let turns = step * n as f64;
        *sample += amplitude * libm::sin(TAU * (turns - turns.floor()) + 0.3);
    }
}

/// A second-order section, its own few lines: nothing here calls the tool's filters.
#[derive(Clone, Copy)]
pub struct Biquad {
    pub b: [f64; 3],
    pub a: [f64; 3],
}

impl Biquad {
    /// Notch whose -3 dB width is `width_hz`: the textbook second-order band-stop.
    pub fn notch(rate_hz: u32, center_hz: f64, width_hz: f64) -> Self {
        let rate = f64::from(rate_hz);
        let c = -2.0 * libm::cos(TAU * center_hz / rate);
        let t = libm::tan(PI * width_hz / rate);
        let g = 1.0 / (1.0 + t);
        Biquad { b: [g, g * c, g], a: [1.0, g * c, 2.0 * g - 1.0] }
    }

    /// First-order high-pass.
    pub fn highpass(rate_hz: u32, edge_hz: f64) -> Self {
        let t = libm::tan(PI * edge_hz / f64::from(rate_hz));
        let g = 1.0 / (1.0 + t);
        Biquad { b: [g, -g, 0.0], a: [1.0, (t - 1.0) * g, 0.0] }
    }

    pub fn scale(gain: f64) -> Self {
        Biquad { b: [gain, 0.0, 0.0], a: [1.0, 0.0, 0.0] }
    }

    pub fn run(&self, x: &[f64]) -> Vec<f64> {
        let (mut s1, mut s2) = (0.0, 0.0);
        x.iter()
            .map(|&x| {
                let y = self.b[0] * x + s1;
                s1 = self.b[1] * x - self.a[1] * y + s2;
                s2 = self.b[2] * x - self.a[2] * y;
                y
            })
            .collect()
    }

    /// Attenuation at `hz`, dB.
    pub fn attenuation_db(&self, rate_hz: u32, hz: f64) -> f64 {
        let w = TAU * hz / f64::from(rate_hz);
        let square = |c: &[f64; 3]| {
            let re = c[0] + c[1] * libm::cos(w) + c[2] * libm::cos(2.0 * w);
            let im = c[1] * libm::sin(w) + c[2] * libm::sin(2.0 * w);
            re * re + im * im
        };
        db(square(&self.a) / square(&self.b))
    }
}

pub fn filter(chain: &[Biquad], x: &[f64]) -> Vec<f64> {
    chain.iter().fold(x.to_vec(), |x, section| section.run(&x))
}

/// Rounds to `bits`, with triangular dither where `dither` is given.
pub fn rounded(x: &[f64], bits: i32, mut dither: Option<Noise>) -> Vec<f64> {
    let scale = libm::ldexp(1.0, bits - 1);
    x.iter()
        .map(|x| {
            let dither = dither.as_mut().map_or(0.0, |noise| noise.uniform() - noise.uniform());
            libm::rint(x * scale + dither).clamp(-scale, scale - 1.0) / scale
        })
        .collect()
}

/// step^2/12 at `bits`; with triangular dither three times as much.
pub fn rounding_power(bits: i32) -> f64 {
    let step = libm::ldexp(1.0, 1 - bits);
    step * step / 12.0
}

/// A recording before and after.
pub struct Take {
    pub rate_hz: u32,
    pub before: Vec<f64>,
    pub after: Vec<f64>,
    pub rounding_before: f64,
    pub rounding_after: f64,
    pub gain: f64,
    /// Settling time, frames.
    pub skipped: usize,
}

impl Take {
    /// 16-bit input, filtered by `chain`, 16-bit output with dither; 2 s are skipped.
    pub fn pcm16(x: &[f64], chain: &[Biquad], seed: u64) -> Self {
        Self::pcm(x, chain, seed, 16)
    }

    pub fn pcm(x: &[f64], chain: &[Biquad], seed: u64, bits: i32) -> Self {
        let before = rounded(x, bits, Some(Noise::new(seed ^ 0x5eed)));
        let after = rounded(&filter(chain, &before), bits, Some(Noise::new(seed ^ 0xd17e)));
        let step = rounding_power(bits);
        Take {
            rate_hz: RATE,
            before,
            after,
            rounding_before: step,
            rounding_after: 3.0 * step,
            gain: 1.0,
            skipped: frames(2.0),
        }
    }

    /// Digital silence; 16-bit output with dither.
    pub fn silence16(seconds: f64, seed: u64) -> Self {
        Self::output16(vec![0.0; frames(seconds)], &[], seed)
    }

    /// An input without any rounding; 16-bit output with dither.
    pub fn output16(before: Vec<f64>, chain: &[Biquad], seed: u64) -> Self {
        let mut take = Self::exact(before, chain);
        take.after = rounded(&take.after, 16, Some(Noise::new(seed ^ 0xd17e)));
        take.rounding_after = 3.0 * rounding_power(16);
        take
    }

    /// No rounding at all.
    pub fn exact(before: Vec<f64>, chain: &[Biquad]) -> Self {
        let after = filter(chain, &before);
        Take {
            rate_hz: RATE,
            before,
            after,
            rounding_before: 0.0,
            rounding_after: 0.0,
            gain: 1.0,
            skipped: frames(2.0),
        }
    }

    pub fn spectra(&self, bands: &[BandTask]) -> Spectra {
        let settled = self.skipped as u64..self.before.len() as u64;
        let judged = |band: &&BandTask| band.requirement != Requirement::Observe;
        let width = |band: &BandTask| band.to_hz - band.from_hz;
        let narrowest = bands.iter().filter(judged).map(width).min_by(f64::total_cmp);
        let length = segment_frames(self.rate_hz, narrowest, settled.end - settled.start).unwrap();
        self.spectra_of(bands, length)
    }

    pub fn spectra_of(&self, bands: &[BandTask], length: usize) -> Spectra {
        let settled = self.skipped as u64..self.before.len() as u64;
        let plan = SegmentPlan::spread(length, settled);
        let mut sums = Accumulator::new(Transform::new(length), cross_ranges(self.rate_hz, length, bands));
        for start in plan.starts {
            let segment = start as usize..start as usize + length;
            sums.add(&self.before[segment.clone()], &self.after[segment]);
        }
        sums.finish()
    }

    pub fn judge_with(&self, spectra: &Spectra, band: &BandTask) -> BandFigures {
        let settled = self.skipped as u64..self.before.len() as u64;
        let measured = Measured {
            pair: None,
            rate_hz: self.rate_hz,
            seconds: self.before.len() as f64 / f64::from(self.rate_hz),
            spectra,
            independent_segments: SegmentPlan::spread(spectra.segment_frames, settled).independent_segments(),
            rounding_power_before: self.rounding_before,
            rounding_power_after: self.rounding_after,
            gain: self.gain,
        };
        judge(&measured, band)
    }

    pub fn judge(&self, bands: &[BandTask]) -> Vec<BandFigures> {
        let spectra = self.spectra(bands);
        bands.iter().map(|band| self.judge_with(&spectra, band)).collect()
    }

    pub fn judge_one(&self, band: &BandTask) -> BandFigures {
        self.judge(std::slice::from_ref(band)).remove(0)
    }
}

pub fn band(from_hz: f64, to_hz: f64, requirement: Requirement) -> BandTask {
    let name = format!("{from_hz} to {to_hz}");
    // 2 s of settling and 10 bins.
    let shortest_s = (requirement != Requirement::Observe).then_some(2.0 + 10.0 / (to_hz - from_hz));
    BandTask { name, from_hz, to_hz, requirement, excepted_hz: Vec::new(), shortest_s }
}

pub fn reduce(from_hz: f64, to_hz: f64, reduce_db: f64) -> BandTask {
    band(from_hz, to_hz, Requirement::Reduce { reduce_db })
}

pub fn residual(from_hz: f64, to_hz: f64, residual_dbfs: f64) -> BandTask {
    band(from_hz, to_hz, Requirement::Residual { residual_dbfs })
}

pub fn keep(from_hz: f64, to_hz: f64, keep_db: f64) -> BandTask {
    band(from_hz, to_hz, Requirement::Keep { keep_db, except: Vec::new() })
}

/// Asserts verdict and code, and shows all figures where they differ.
#[track_caller]
pub fn expect(figures: &BandFigures, verdict: Verdict, code: Option<ReasonCode>) {
    assert_eq!((figures.verdict, figures.reason_code), (Some(verdict), code), "{figures:#?}");
    if verdict == Verdict::Unproven {
        assert!(figures.reason.is_some(), "{figures:#?}");
    }
}
