//! Pairs whose truth is known: what a device with noise makes of an excitation.

use crate::support::{Noise, RATE, Take, power};
use bandproof::evidence::{BandFigures, BandTask, Idle, Measured, Pairing, judge, judge_all, pair_ranges};
use bandproof::spectrum::{Accumulator, SegmentPlan, Spectra, Transform};
use std::f64::consts::TAU;

/// A pair and what is known of it.
pub struct Pair {
    pub before: Vec<f64>,
    pub after: Vec<f64>,
    /// A recording of the idle device.
    pub idle: Option<Vec<f64>>,
    pub rounding: f64,
    pub gain: f64,
    pub scatter_s: f64,
    pub certain: bool,
    pub reaches_hz: f64,
    /// Segment length, frames.
    pub length: usize,
}

impl Pair {
    pub fn new(before: Vec<f64>, after: Vec<f64>, length: usize) -> Self {
        let reaches_hz = f64::from(RATE) / 2.0;
        Pair { before, after, idle: None, rounding: 0.0, gain: 1.0, scatter_s: 0.0, certain: true, reaches_hz, length }
    }

    /// `after` with `noise` on top.
    pub fn noisy(before: Vec<f64>, after: &[f64], noise: &[f64], length: usize) -> Self {
        let after = after.iter().zip(noise).map(|(y, n)| y + n).collect();
        Self::new(before, after, length)
    }

    pub fn plan(&self) -> SegmentPlan {
        SegmentPlan::spread(self.length, 0..self.before.len() as u64)
    }

    pub fn spectra(&self, bands: &[BandTask]) -> Spectra {
        spectra_of(&self.before, &self.after, self.length, bands)
    }

    /// Does `with` with what was measured.
    pub fn measured<T>(&self, bands: &[BandTask], with: impl FnOnce(&Measured<'_>) -> T) -> T {
        let spectra = self.spectra(bands);
        let idle = self.idle.as_ref().map(|idle| {
            let plan = SegmentPlan::spread(self.length, 0..idle.len() as u64);
            (spectra_of(idle, idle, self.length, &[]), plan.independent_segments())
        });
        let noise = idle.as_ref().map(|(spectra, segments)| Idle {
            spectrum: &spectra.syy,
            independent_segments: *segments,
            rounding_power: self.rounding,
        });
        with(&Measured {
            rate_hz: RATE,
            seconds: self.before.len() as f64 / f64::from(RATE),
            spectra: &spectra,
            independent_segments: self.plan().independent_segments(),
            rounding_power_before: self.rounding,
            rounding_power_after: self.rounding,
            gain: self.gain,
            pair: Some(Pairing {
                noise,
                delay_scatter_s: self.scatter_s,
                delay_certain: self.certain,
                reaches_hz: self.reaches_hz,
            }),
        })
    }

    pub fn judge(&self, bands: &[BandTask]) -> Vec<BandFigures> {
        self.measured(bands, |measured| judge_all(measured, bands))
    }

    pub fn judge_one(&self, band: &BandTask) -> BandFigures {
        self.measured(std::slice::from_ref(band), |measured| judge(measured, band))
    }

    /// The same recordings as though the program had filtered them itself.
    pub fn as_filtered(&self) -> Take {
        Take {
            rate_hz: RATE,
            before: self.before.clone(),
            after: self.after.clone(),
            rounding_before: self.rounding,
            rounding_after: self.rounding,
            gain: self.gain,
            skipped: 0,
        }
    }
}

fn spectra_of(before: &[f64], after: &[f64], length: usize, bands: &[BandTask]) -> Spectra {
    let mut sums = Accumulator::new(Transform::new(length), pair_ranges(RATE, length, bands));
    for start in SegmentPlan::spread(length, 0..before.len() as u64).starts {
        let segment = start as usize..start as usize + length;
        sums.add(&before[segment.clone()], &after[segment]);
    }
    sums.finish()
}

/// Level of white noise in a band `width_hz` wide if all of it has `dbfs`.
pub fn in_band_dbfs(dbfs: f64, width_hz: f64) -> f64 {
    crate::support::db(power(dbfs) * width_hz / (f64::from(RATE) / 2.0))
}

/// Steady lines 1 Hz apart, `each_dbfs` each in a phase of its own, at the frequencies of
/// `hz`: sound with edges as steep as can be.
pub fn lines(hz: impl Iterator<Item = u32>, each_dbfs: f64, seconds: usize) -> Vec<f64> {
    let amplitude = power(each_dbfs).sqrt();
    let mut second = vec![0.0; RATE as usize];
    for hz in hz {
        let phase = TAU * Noise::new(u64::from(hz)).uniform();
        for (n, sample) in second.iter_mut().enumerate() {
            let turns = f64::from(hz) * n as f64 / f64::from(RATE);
            *sample += amplitude * libm::sin(TAU * (turns - turns.floor()) + phase);
        }
    }
    second.repeat(seconds)
}
