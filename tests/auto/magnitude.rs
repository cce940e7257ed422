//! The attenuation of a stage by the distances to its prototype's roots.

use bandproof::design::prototype::Prototype;
use std::f64::consts::PI;

/// What is asked for at one frequency of one rate: W = tan(pi f / rate).
#[derive(Clone, Copy)]
pub struct Point {
    pub at: f64,
    pub rate: usize,
    pub keep: bool,
    pub db: f64,
    pub place: usize,
}

/// What a stage is, and which line of its place it is for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Kind {
    Highpass(u32),
    Lowpass(u32),
    /// Order, first and last line.
    Stop(u32, usize, usize),
}

/// One stage: the square of its magnitude is a product over the prototype's roots.
pub struct Filter {
    kind: Kind,
    zeros: Vec<f64>,
    poles: Vec<(f64, f64)>,
    real: Option<f64>,
    gain: f64,
    /// Warped edges at each rate; none where it is left out.
    edges: Vec<Option<(f64, f64)>>,
}

impl Filter {
    pub fn new(kind: Kind, made: &Prototype<f64>, edges_hz: &[f64], rates_hz: &[f64]) -> Filter {
        let warp = |hz: f64, rate_hz: f64| (PI * hz / rate_hz).tan();
        let edges = rates_hz
            .iter()
            .map(|&rate_hz| {
                let last = edges_hz[edges_hz.len() - 1];
                (last < rate_hz / 2.0).then(|| (warp(edges_hz[0], rate_hz), warp(last, rate_hz)))
            })
            .collect();
        Filter {
            kind,
            zeros: made.zeros_rad.clone(),
            poles: made.poles.iter().map(|pole| (pole.re, pole.im)).collect(),
            real: made.real_pole,
            gain: made.gain(),
            edges,
        }
    }

    /// Attenuation of one pass, dB.
    pub fn attenuation_db(&self, point: &Point) -> f64 {
        let Some((low, high)) = self.edges[point.rate] else { return 0.0 };
        let w = match self.kind {
            Kind::Highpass(_) => low / point.at,
            Kind::Lowpass(_) => point.at / low,
            Kind::Stop(..) => (high - low) * point.at / (low * high - point.at * point.at),
        };
        let w = w.abs().min(1e8);
        // |jw - p| |jw - p*| by the distances themselves.
        let mut magnitude = self.gain;
        for (index, (re, im)) in self.poles.iter().enumerate() {
            if let Some(zero) = self.zeros.get(index) {
                magnitude *= (zero - w) * (zero + w);
            }
            magnitude /= ((re * re + (w - im) * (w - im)) * (re * re + (w + im) * (w + im))).sqrt();
        }
        if let Some(real) = self.real {
            magnitude /= (real * real + w * w).sqrt();
        }
        (-20.0 * magnitude.abs().log10()).min(400.0)
    }
}
