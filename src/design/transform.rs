//! Band transforms: from a low-pass prototype to the quadratics in s of a low-pass,
//! high-pass, band-pass or band-stop whose edges are prewarped.
//!
//! Frequencies here are W = tan(pi f / rate), where the bilinear transform
//! s = (z - 1) / (z + 1) puts the digital frequency f exactly at jW.
//!
//! ```text
//! low-pass   s -> s / W           band-pass  s -> (s^2 + W0^2) / (B s)
//! high-pass  s -> W / s           band-stop  s -> B s / (s^2 + W0^2)
//! W0^2 = W1 W2,  B = W2 - W1
//! ```

use super::double::{ComplexDouble, Double, Number};
use super::prototype::Prototype;
use crate::spec::FilterKind;
use core::f64::consts::PI;

/// One or two poles: s^2 - 2 `half_sum` s + `product`, or s - `pole`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Poles {
    /// Two, complex or real. Both figures keep their digits, which a difference of
    /// polynomial coefficients would not.
    Two {
        /// Half the sum of the two, negative.
        half_sum: Double,
        /// Their product, positive.
        product: Double,
    },
    /// One real pole.
    One {
        /// Negative.
        pole: Double,
    },
}

/// Where the zeros that go with [`Poles`] are; as many as there are poles.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Zeros {
    /// All at infinity (z = -1).
    AtInfinity,
    /// All at s = 0 (z = 1).
    AtZero,
    /// One at 0 and one at infinity.
    AtBoth,
    /// A pair at +-jW.
    Pair {
        /// W^2.
        square: Double,
    },
}

/// An analog filter with prewarped edges.
#[derive(Clone, Debug, PartialEq)]
pub struct Analog {
    /// Poles, as they go into sections.
    pub poles: Vec<Poles>,
    /// Zeros, as many entries as `poles`; not yet paired with them, but for an entry
    /// of one pole the zero is single as well.
    pub zeros: Vec<Zeros>,
    /// Where the gain is known.
    pub reference: Reference,
    /// |H| there.
    pub reference_gain: Double,
}

/// A frequency at which the gain of the whole is known: the image of the prototype's DC.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Reference {
    /// z = 1.
    Dc,
    /// z = -1.
    HalfRate,
    /// W = tan(w/2).
    At(Double),
}

impl Reference {
    /// For a stop around W0: both ends are images of the prototype's DC. The rounding
    /// of coefficients is felt most at the nearer one, and a gain that is set there
    /// would be wrong everywhere else.
    pub fn far_from(center_square: Double) -> Reference {
        if center_square.hi < 1.0 { Reference::HalfRate } else { Reference::Dc }
    }
}

/// Prewarped edges.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Edges<N = Double> {
    /// Low-pass, high-pass.
    One(N),
    /// Band-pass, band-stop: W1 W2 and W2 - W1.
    Two {
        /// W0^2.
        center_square: N,
        /// B.
        width: N,
    },
}

impl<N: Number> Edges<N> {
    /// One edge in Hz, above 0 and below half of `rate_hz`.
    pub fn one(edge_hz: f64, rate_hz: f64) -> Edges<N> {
        Edges::One(warped(edge_hz, rate_hz))
    }

    /// Two edges in Hz, 0 < low < high < rate/2.
    pub fn two(low_hz: f64, high_hz: f64, rate_hz: f64) -> Edges<N> {
        let (low, high): (HalfAngle<N>, HalfAngle<N>) = (half_angle(low_hz, rate_hz), half_angle(high_hz, rate_hz));
        // tan b - tan a = sin(b - a) / (cos a cos b): the width in Hz is the only
        // difference that is formed.
        let (sin, _) = (N::PI * (N::difference(high_hz, low_hz) / rate_hz)).circular();
        let width = sin / (low.cos * high.cos);
        Edges::Two { center_square: (low.sin / low.cos) * (high.sin / high.cos), width }
    }
}

/// tan(pi f / rate), accurate up to half the rate.
pub fn warped<N: Number>(frequency_hz: f64, rate_hz: f64) -> N {
    let half: HalfAngle<N> = half_angle(frequency_hz, rate_hz);
    half.sin / half.cos
}

/// [`warped`] in f64.
pub fn prewarp(frequency_hz: f64, rate_hz: f64) -> f64 {
    warped(frequency_hz, rate_hz)
}

/// The frequency, Hz, that [`prewarp`] puts at `warped` (0 or above).
pub fn unwarp(warped: f64, rate_hz: f64) -> f64 {
    if warped <= 1.0 {
        rate_hz * (libm::atan(warped) / PI)
    } else {
        // From the end that is nearer, as there.
        rate_hz / 2.0 - rate_hz * (libm::atan(1.0 / warped) / PI)
    }
}

struct HalfAngle<N> {
    sin: N,
    cos: N,
}

fn half_angle<N: Number>(frequency_hz: f64, rate_hz: f64) -> HalfAngle<N> {
    if frequency_hz <= rate_hz / 4.0 {
        let (sin, cos) = (N::PI * (N::from(frequency_hz) / rate_hz)).circular();
        HalfAngle { sin, cos }
    } else {
        let from_half_rate = N::difference(rate_hz / 2.0, frequency_hz);
        let (cos, sin) = (N::PI * (from_half_rate / rate_hz)).circular();
        HalfAngle { sin, cos }
    }
}

/// Applies the band transform of `kind`. Low-pass and high-pass take one edge, the
/// others two; `None` for the wrong number.
pub fn transform(prototype: &Prototype, kind: FilterKind, edges: Edges) -> Option<Analog> {
    let (poles, zeros, reference) = match (kind, edges) {
        (FilterKind::Lowpass, Edges::One(edge)) => {
            let (poles, zeros) = moved(prototype, |p| p.times(edge), |z| z * edge, Zeros::AtInfinity);
            (poles, zeros, Reference::Dc)
        }
        (FilterKind::Highpass, Edges::One(edge)) => {
            let (poles, zeros) = moved(prototype, |p| p.reciprocal().times(edge), |z| edge / z, Zeros::AtZero);
            (poles, zeros, Reference::HalfRate)
        }
        (FilterKind::Bandpass, Edges::Two { center_square, width }) => {
            let (poles, zeros) = split(prototype, |p| p.times(width), |z| z * width, center_square, Zeros::AtBoth);
            (poles, zeros, Reference::At(center_square.sqrt()))
        }
        (FilterKind::Bandstop, Edges::Two { center_square, width }) => {
            let stop = Zeros::Pair { square: center_square };
            let (poles, zeros) = split(prototype, |p| p.reciprocal().times(width), |z| width / z, center_square, stop);
            (poles, zeros, Reference::far_from(center_square))
        }
        _ => return None,
    };
    Some(Analog { poles, zeros, reference, reference_gain: prototype.dc_gain })
}

/// Low-pass and high-pass: every pole and zero is moved by itself.
fn moved(
    prototype: &Prototype,
    pole: impl Fn(ComplexDouble) -> ComplexDouble,
    zero: impl Fn(Double) -> Double,
    rest: Zeros,
) -> (Vec<Poles>, Vec<Zeros>) {
    let mut poles: Vec<Poles> = prototype.poles.iter().map(|&p| conjugate_pair(pole(p))).collect();
    let mut zeros: Vec<Zeros> = prototype.zeros_rad.iter().map(|&z| pair(zero(z))).collect();
    zeros.resize(poles.len(), rest);
    if let Some(real) = prototype.real_pole {
        poles.push(Poles::One { pole: pole(ComplexDouble::real(real)).re });
        zeros.push(rest);
    }
    (poles, zeros)
}

/// Band-pass and band-stop: every pole P (already scaled by the width) becomes the two
/// roots of s^2 - P s + W0^2.
fn split(
    prototype: &Prototype,
    pole: impl Fn(ComplexDouble) -> ComplexDouble,
    zero: impl Fn(Double) -> Double,
    center_square: Double,
    rest: Zeros,
) -> (Vec<Poles>, Vec<Zeros>) {
    let mut poles = Vec::with_capacity(prototype.order());
    for p in prototype.poles.iter().map(|&p| pole(p)) {
        let root = p.discriminant_root(center_square);
        let far = ComplexDouble { re: (p.re + root.re) * 0.5, im: (p.im + root.im) * 0.5 };
        // The other root is W0^2 / far: nothing cancels.
        poles.push(conjugate_pair(far));
        poles.push(conjugate_pair(far.reciprocal().times(center_square)));
    }
    let mut zeros = Vec::with_capacity(prototype.order());
    for z in prototype.zeros_rad.iter().map(|&z| zero(z)) {
        let far = (z + (z.square() + center_square * 4.0).sqrt()) * 0.5;
        zeros.push(pair(far));
        zeros.push(pair(center_square / far));
    }
    if let Some(real) = prototype.real_pole {
        // The two roots may be complex or real and, in between, equal: as roots they
        // would lose half their digits there, as a quadratic they lose none.
        let sum = pole(ComplexDouble::real(real)).re;
        poles.push(Poles::Two { half_sum: sum * 0.5, product: center_square });
    }
    zeros.resize(poles.len(), rest);
    (poles, zeros)
}

fn conjugate_pair(p: ComplexDouble) -> Poles {
    Poles::Two { half_sum: p.re, product: p.squared_magnitude() }
}

fn pair(z: Double) -> Zeros {
    Zeros::Pair { square: z.square() }
}
