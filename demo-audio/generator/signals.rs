//! Noise, lines, calls and the filters that shape them. Plain arithmetic and the libm
//! crate only, so that every machine makes the same bits.

use core::f64::consts::{PI, TAU};

/// Amplitude of a sine of this level, in units of full scale.
pub fn amplitude(level_dbfs: f64) -> f64 {
    libm::pow(10.0, level_dbfs / 20.0)
}

/// Random numbers: a counter through the splitmix64 finalizer (G. L. Steele, D. Lea,
/// C. H. Flood, "Fast Splittable Pseudorandom Number Generators", OOPSLA 2014).
pub struct Noise(u64);

impl Noise {
    /// A stream of its own for each seed.
    pub fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(0xd134_2543_de82_ef95))
    }

    /// Uniform in 0 to 1, 1 excluded.
    pub fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Nearly Gaussian, of unit variance: the sum of three uniform numbers.
    pub fn next(&mut self) -> f64 {
        2.0 * (self.uniform() + self.uniform() + self.uniform() - 1.5)
    }
}

/// A second-order filter with its state, transposed direct form II.
pub struct Biquad {
    b: [f64; 3],
    a: [f64; 2],
    state: [f64; 2],
}

impl Biquad {
    /// Low-pass with the corner at `hz`.
    pub fn lowpass(rate: f64, hz: f64, q: f64) -> Self {
        Self::new(rate, hz, q, |cosine| [(1.0 - cosine) / 2.0, 1.0 - cosine, (1.0 - cosine) / 2.0])
    }

    /// High-pass with the corner at `hz`.
    pub fn highpass(rate: f64, hz: f64, q: f64) -> Self {
        Self::new(rate, hz, q, |cosine| [(1.0 + cosine) / 2.0, -1.0 - cosine, (1.0 + cosine) / 2.0])
    }

    /// Bilinear transform of `1/(s^2 + s/q + 1)` and its high-pass twin, as in the W3C
    /// Audio EQ Cookbook (2021).
    fn new(rate: f64, hz: f64, q: f64, numerator: impl Fn(f64) -> [f64; 3]) -> Self {
        let w = TAU * hz / rate;
        let (cosine, alpha) = (libm::cos(w), libm::sin(w) / (2.0 * q));
        let scale = 1.0 / (1.0 + alpha);
        Self {
            b: numerator(cosine).map(|b| b * scale),
            a: [-2.0 * cosine * scale, (1.0 - alpha) * scale],
            state: [0.0; 2],
        }
    }

    fn next(&mut self, x: f64) -> f64 {
        let y = self.b[0] * x + self.state[0];
        self.state[0] = self.b[1] * x - self.a[0] * y + self.state[1];
        self.state[1] = self.b[2] * x - self.a[1] * y;
        y
    }
}

/// One sample through filters in a row.
pub fn run(filters: &mut [Biquad], x: f64) -> f64 {
    filters.iter_mut().fold(x, |x, filter| filter.next(x))
}

/// Adds a steady sine.
pub fn add_line(out: &mut [f64], rate: f64, hz: f64, amplitude: f64, phase: f64) {
    for (n, sample) in out.iter_mut().enumerate() {
        *sample += amplitude * libm::sin(TAU * hz * n as f64 / rate + phase);
    }
}

/// Adds a call from `start` for `length` seconds under a raised cosine; `hz` gives the
/// frequency for each share 0 to 1 of the way. What lies outside `out` is not heard.
pub fn add_call(out: &mut [f64], rate: f64, start: f64, length: f64, amplitude: f64, hz: impl Fn(f64) -> f64) {
    let (first, frames) = ((start * rate) as usize, (length * rate) as usize);
    let mut phase = 0.0;
    for (n, sample) in out.iter_mut().skip(first).take(frames).enumerate() {
        let way = n as f64 / frames as f64;
        let envelope = 0.5 - 0.5 * libm::cos(2.0 * PI * way);
        *sample += amplitude * envelope * libm::sin(phase);
        phase += TAU * hz(way) / rate;
    }
}
