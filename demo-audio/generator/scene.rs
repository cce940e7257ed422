//! What one microphone hears.

use super::signals::{self, Biquad, Noise};
use core::f64::consts::{FRAC_1_SQRT_2, TAU};

/// Quality factors of the three sections of a sixth-order Butterworth filter:
/// 1/(2 sin((2k - 1) pi/12)).
const SIXTH_ORDER: [f64; 3] = [0.517_638_090_205_041_5, FRAC_1_SQRT_2, 1.931_851_652_578_136_6];

/// One channel of a recording.
#[derive(Clone, Copy)]
pub struct Scene {
    /// Seed of everything random in it.
    pub seed: u64,
    /// Sample rate, in Hz.
    pub rate_hz: u32,
    /// Length, in seconds.
    pub seconds: f64,
    /// The mains frequency that the pumps' hum and its harmonics follow, in Hz; `None`
    /// while they are off.
    pub hum_hz: Option<f64>,
    /// Where the fundamental is instead, in Hz, when a pump has left the mains and only
    /// the switchgear still hums along with it.
    pub drifted_hz: Option<f64>,
    /// Level of the fundamental, in dBFS; each harmonic is 3 dB below the one before.
    pub hum_db: f64,
    /// Level of the wind rumble, in dBFS; `None` in shelter.
    pub rumble_db: Option<f64>,
    /// The booming bird calls.
    pub boom: bool,
    /// The recorder's low-cut takes out the ambient noise below 1 kHz.
    pub low_cut: bool,
    /// Something knocks on the housing, beyond full scale.
    pub knock: bool,
}

impl Scene {
    /// A calm scene: ambient noise, warblers, the converter and some wind.
    pub fn new(rate_hz: u32, seconds: f64) -> Self {
        let (hum_db, rumble_db) = (-31.0, Some(-30.0));
        Self {
            seed: 0,
            rate_hz,
            seconds,
            hum_hz: None,
            drifted_hz: None,
            hum_db,
            rumble_db,
            boom: false,
            low_cut: false,
            knock: false,
        }
    }

    /// Length, in frames.
    pub fn frames(&self) -> usize {
        libm::round(self.seconds * f64::from(self.rate_hz)) as usize
    }

    /// The channel's samples, in units of full scale.
    pub fn render(&self) -> Vec<f64> {
        let rate = f64::from(self.rate_hz);
        let mut out = self.ambient(rate);
        // The converter: exactly as steady as the mains supply's clock.
        signals::add_line(&mut out, rate, 15_800.1, signals::amplitude(-52.0), 0.7);
        if let Some(db) = self.rumble_db {
            self.add_rumble(&mut out, rate, db);
        }
        if let Some(hz) = self.hum_hz {
            for harmonic in 1..=8u32 {
                let order = f64::from(harmonic);
                let level = signals::amplitude(self.hum_db - 3.0 * (order - 1.0));
                // Phases apart, or the harmonics add up to one tall pulse a period.
                let hz = if harmonic == 1 { self.drifted_hz.unwrap_or(hz) } else { order * hz };
                signals::add_line(&mut out, rate, hz, level, order * order);
            }
        }
        if self.boom {
            self.add_booms(&mut out, rate);
        }
        self.add_warblers(&mut out, rate);
        if self.knock {
            let hz = |_: f64| 640.0;
            signals::add_call(&mut out, rate, 1.9, 0.03, 1.3, hz);
        }
        out
    }

    /// Broadband noise: -114 dBFS in 1 Hz up high, rising by 12 dB below 500 Hz.
    fn ambient(&self, rate: f64) -> Vec<f64> {
        let mut noise = Noise::new(self.seed);
        // White noise of this standard deviation is -114 dBFS in each Hz at any rate.
        let deviation = signals::amplitude(-114.0) * libm::sqrt(rate / 4.0);
        let mut low = [Biquad::lowpass(rate, 500.0, 0.5)];
        let mut cut = SIXTH_ORDER.map(|q| Biquad::highpass(rate, 1300.0, q));
        let filtered = |_| {
            let white = deviation * noise.next();
            let sample = white + 3.0 * signals::run(&mut low, white);
            if self.low_cut { signals::run(&mut cut, sample) } else { sample }
        };
        (0..self.frames()).map(filtered).collect()
    }

    /// Noise below 22 Hz that comes in gusts.
    fn add_rumble(&self, out: &mut [f64], rate: f64, db: f64) {
        let mut noise = Noise::new(self.seed ^ 0x5749_4e44);
        let mut low = SIXTH_ORDER.map(|q| Biquad::lowpass(rate, 22.0, q));
        let deviation = signals::amplitude(db) / libm::sqrt(4.0 * 22.0 / rate);
        for (n, sample) in out.iter_mut().enumerate() {
            let gust = 0.7 + 0.3 * libm::sin(TAU * n as f64 / rate / 4.7 + self.seed as f64);
            *sample += gust * signals::run(&mut low, deviation * noise.next());
        }
    }

    /// Three booms in a row, every 4 s, gliding from 158 to 167 Hz.
    fn add_booms(&self, out: &mut [f64], rate: f64) {
        let level = signals::amplitude(-24.0);
        for call in 0..(self.seconds / 4.0) as u32 + 1 {
            for boom in 0..3u32 {
                let start = 0.6 + 4.0 * f64::from(call) + 0.9 * f64::from(boom);
                signals::add_call(out, rate, start, 0.7, level, |t| 158.0 + 9.0 * t);
            }
        }
    }

    /// Phrases of short gliding syllables between 2.2 and 5.8 kHz.
    fn add_warblers(&self, out: &mut [f64], rate: f64) {
        let mut noise = Noise::new(self.seed ^ 0x0042_4952_4453);
        let mut at = 0.15;
        while at < self.seconds {
            let (from, to) = (2200.0 + 3600.0 * noise.uniform(), 2200.0 + 3600.0 * noise.uniform());
            let length = 0.06 + 0.12 * noise.uniform();
            let level = signals::amplitude(-34.0 + 10.0 * noise.uniform());
            for repeat in 0..3 + (4.0 * noise.uniform()) as u32 {
                let start = at + 1.25 * length * f64::from(repeat);
                signals::add_call(out, rate, start, length, level, |t| from + (to - from) * t);
            }
            at += 0.5 + 0.8 * noise.uniform();
        }
    }
}
