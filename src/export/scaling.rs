//! How far the signal of each section has to come down so that nothing overflows.
//!
//! A section's output is at most the sum of |h\[n\]| (the L1 norm) of all sections up to it
//! times the largest input, and some input reaches that: signs of h, turned round. So with
//! these scalings no input within full scale overflows, and with one bit less some would.
//! (Peak gains bound steady tones alone.)
//!
//! Every section rounds its output to a word and feeds the error back (see [`Integers`]). What
//! that adds to the outputs from there on is at most half a step times the L1 norm of
//! (1 + e1 z^-1 + e2 z^-2)/A(z) of that section and all of the sections behind it; bringing
//! the numerator's products down to the denominator's adds half of their much finer step
//! times the norm with 1/A(z). Both are counted in.

use super::integers::Integers;
use crate::design::roots;
use crate::section::Section;
use rayon::prelude::*;

/// What the sums leave out at their ends, and more: they stop where a whole time constant
/// of the slowest pole adds 1e-6 of what was there, and what follows falls on.
const MARGIN: f64 = 1.0 + 1e-4;

/// A block of one time constant that adds less than this part ends a sum.
const ENOUGH: f64 = 1e-6;

/// Section steps of all sums together; more would take tens of seconds.
const MOST_STEPS: f64 = 5e9;

/// Time constants that a sum takes, about: 14 for one pole to fall by 10^6, more where
/// several ring together.
const USUAL_TIME_CONSTANTS: f64 = 20.0;

/// Frames that pass through one section after the other at a time.
const BLOCK_FRAMES: usize = 256;

/// Most bits between numerator and denominator: beyond, a word's products are shifted out.
const MOST_ALIGNMENT: i32 = 62;

/// The scaling of a cascade of integers.
#[derive(Clone, Debug, PartialEq)]
pub struct Scaling {
    /// For each section, the bits by which its output is lower than H(z) has it; negative
    /// where the output may be raised again.
    pub section_shifts: Vec<i32>,
    /// Their sum, at least 0: the cascade's output is so many bits low.
    pub output_shift: i32,
    /// The most that rounding adds to the cascade's output, in steps of its words.
    pub error_bound_steps: f64,
    /// Level of what rounding adds to the signal that all passes make if each section's
    /// errors are white and evenly spread over a step (common practice, no source), dB
    /// relative to a full-scale sine; `None` without sections.
    pub noise_dbfs: Option<f64>,
}

/// Why a cascade of integers can't be scaled.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ScalingError {
    /// Rounding alone may fill a word.
    #[error("rounding in section {section} may add {steps:.0} steps, more than the words hold")]
    Rounding {
        /// 1 for the first.
        section: usize,
        /// The bound of what it adds to its own output.
        steps: f64,
    },
    /// A gain beyond what a word's products carry.
    #[error("the gain of section {section} is too small or too large for the words")]
    Gain {
        /// 1 for the first.
        section: usize,
    },
    /// The impulse response is too long to be summed.
    #[error("{sections} sections with a time constant of {frames:.0} frames take too long to bound what overflows")]
    TooLong {
        /// Number of sections.
        sections: usize,
        /// Time constant of the slowest pole.
        frames: f64,
    },
}

/// Norms of the responses from one place in a cascade to the outputs behind it.
#[derive(Clone, Debug)]
struct Norms {
    /// Sums of |h|, one a section from that place on, the margin counted in.
    absolute: Vec<f64>,
    /// Sum of h^2 at the cascade's output.
    square: f64,
}

/// The smallest scaling at which words of `bits` bits can't overflow.
///
/// Of two `passes` the second takes the words that the first one makes as they are, so that
/// nothing overflows in it either.
///
/// # Errors
/// See [`ScalingError`].
pub fn scale(words: &[Integers], bits: u32, passes: u32) -> Result<Scaling, ScalingError> {
    let sections: Vec<Section> = words.iter().map(Integers::section).collect();
    let time_constant = roots::poles(&sections).map(|pole| 1.0 / pole.depth).fold(1.0, f64::max);
    let once = 2.0 * USUAL_TIME_CONSTANTS * time_constant * (sections.len() * (sections.len() + 1)) as f64;
    // From each section to the end of the second pass are three times as many.
    let steps = if passes > 1 { 4.0 * once } else { once };
    if steps.is_nan() || steps > MOST_STEPS {
        return Err(ScalingError::TooLong { sections: sections.len(), frames: time_constant });
    }
    let full_scale = libm::scalbn(1.0, bits.cast_signed() - 1);
    let count = words.len().max(1);
    // Behind the last section of the first pass comes the first.
    let beyond = |from: usize, to: usize| ScalingError::Gain { section: (from + to) % count + 1 };
    let [Norms { absolute: signal, .. }] =
        norms(&sections, [sections.first().map_or([1.0, 0.0, 0.0], |first| first.b)], time_constant)
            .map_err(|to| beyond(0, to))?;
    let noise_through = |sections: &[Section]| -> Result<Vec<Noise>, ScalingError> {
        let of = |from| Noise::new(words, from, sections, time_constant).map_err(|to| beyond(from, to));
        let noise: Vec<Result<Noise, ScalingError>> = (0..words.len()).into_par_iter().map(of).collect();
        // One by one, so that it is always the first that is named.
        noise.into_iter().collect()
    };
    let noise = noise_through(&sections)?;
    let mut scaled = Scaling { section_shifts: Vec::new(), output_shift: 0, error_bound_steps: 0.0, noise_dbfs: None };
    // Bits by which each section's output is low, the sections before it counted in.
    let mut lowered: Vec<i32> = Vec::new();
    for (to, word) in words.iter().enumerate() {
        let error_steps = |own: i32| {
            let earlier = lowered.iter().chain([&own]).zip(&noise).enumerate();
            let errors = earlier.map(|(from, (at, noise))| noise.steps[to - from] * libm::scalbn(1.0, at - own));
            errors.fold(0.0, |sum, error| sum + error)
        };
        let fits =
            |own: &i32| signal[to] * full_scale * libm::scalbn(1.0, -own) + error_steps(*own) <= full_scale - 1.0;
        let own = (0..=MOST_ALIGNMENT)
            .find(fits)
            .ok_or_else(|| ScalingError::Rounding { section: to + 1, steps: noise[to].steps[0] })?;
        scaled.error_bound_steps = error_steps(own);
        let shift = own - scaled.output_shift;
        let alignment = word.b_q_bits + shift - word.a_q_bits;
        if alignment.abs() > MOST_ALIGNMENT {
            return Err(ScalingError::Gain { section: to + 1 });
        }
        scaled.section_shifts.push(shift);
        scaled.output_shift = own;
        lowered.push(own);
    }
    // A step of section k's words is 2^lowered of the signal's; 0 dBFS has a mean square of 1/2.
    let total = |noise: &[Noise]| {
        let power = lowered.iter().zip(noise).map(|(&at, noise)| noise.power * libm::scalbn(1.0, 2 * at));
        power.fold(0.0, |sum, power| sum + power)
    };
    let mut power = total(&noise);
    if passes > 1 {
        // The first pass' noise goes through the second, whose gain is that of running it forward;
        // the second's own is as much higher as its words are low.
        let twice = sections.repeat(2);
        power = total(&noise_through(&twice)?) + power * libm::scalbn(1.0, 2 * scaled.output_shift);
    }
    scaled.noise_dbfs = (power > 0.0).then(|| 10.0 * libm::log10(2.0 * power / (full_scale * full_scale)));
    Ok(scaled)
}

/// What a section's rounding adds to the outputs from its own on.
#[derive(Clone, Debug)]
struct Noise {
    /// The most, steps of the section's own words.
    steps: Vec<f64>,
    /// Mean square at the cascade's output if errors are white, in steps squared.
    power: f64,
}

impl Noise {
    /// As [`norms`] fails.
    fn new(words: &[Integers], from: usize, sections: &[Section], time_constant: f64) -> Result<Noise, usize> {
        let [e1, e2] = words[from].error_feedback.map(|e| e as f64);
        let [output, products] = norms(&sections[from..], [[1.0, e1, e2], [1.0, 0.0, 0.0]], time_constant)?;
        let fine = libm::scalbn(1.0, -words[from].a_q_bits);
        let steps = output.absolute.iter().zip(&products.absolute);
        Ok(Noise {
            steps: steps.map(|(output, products)| 0.5 * output + 0.5 * fine * products).collect(),
            power: (output.square + fine * fine * products.square) / 12.0,
        })
    }
}

/// The norms of the impulse responses at the output of each of `sections`, whose first has
/// each of `numerators` in turn.
///
/// They run side by side: one alone would wait for its own outputs. `Err` with the index of the
/// first section whose response f64 does not hold.
fn norms<const N: usize>(
    sections: &[Section],
    numerators: [[f64; 3]; N],
    time_constant: f64,
) -> Result<[Norms; N], usize> {
    let mut absolute = vec![[0.0; N]; sections.len()];
    let mut square = [0.0; N];
    let mut states = vec![[[0.0; 2]; N]; sections.len()];
    // At least as many frames as the longest delay that sections without poles make.
    let blocks = (libm::ceil(time_constant) as usize).max(4 * sections.len()).div_ceil(BLOCK_FRAMES);
    let mut impulse = 1.0;
    loop {
        let before = absolute.clone();
        for _ in 0..blocks {
            let mut block = [[0.0; N]; BLOCK_FRAMES];
            block[0] = [std::mem::take(&mut impulse); N];
            for (number, section) in sections.iter().enumerate() {
                let b = if number == 0 { numerators } else { [section.b; N] };
                let sums = run(b, section.a, &mut states[number], &mut block);
                absolute[number] = core::array::from_fn(|k| absolute[number][k] + sums[k]);
            }
            for frame in &block {
                square = core::array::from_fn(|k| square[k] + frame[k] * frame[k]);
            }
        }
        // Such a sum never ends: nothing is a small part of it.
        if let Some(beyond) = absolute.iter().position(|sums| sums.iter().any(|sum| !sum.is_finite())) {
            return Err(beyond);
        }
        if square.iter().any(|sum| !sum.is_finite()) {
            return Err(sections.len() - 1);
        }
        let pairs = before.as_flattened().iter().zip(absolute.as_flattened());
        if pairs.into_iter().all(|(before, now)| now - before <= ENOUGH * now) {
            return Ok(core::array::from_fn(|k| Norms {
                absolute: absolute.iter().map(|sums| sums[k] * MARGIN).collect(),
                square: square[k],
            }));
        }
    }
}

/// Runs one section in place, and returns the sums of the magnitudes of its outputs.
fn run<const N: usize>(b: [[f64; 3]; N], a: [f64; 3], state: &mut [[f64; 2]; N], block: &mut [[f64; N]]) -> [f64; N] {
    let ([_, a1, a2], mut sums) = (a, [0.0; N]);
    for frame in block {
        for k in 0..N {
            let x = frame[k];
            let y = b[k][0] * x + state[k][0];
            state[k][0] = (b[k][1] * x + state[k][1]) - a1 * y;
            state[k][1] = b[k][2] * x - a2 * y;
            frame[k] = y;
            sums[k] += y.abs();
        }
    }
    sums
}

#[cfg(test)]
mod tests {
    use super::super::integers::to_integers;
    use super::*;

    fn scaled(sections: &[Section], bits: u32) -> Result<Scaling, ScalingError> {
        scale(&sections.iter().map(|section| to_integers(section, bits)).collect::<Vec<_>>(), bits, 1)
    }

    #[test]
    fn norms_of_one_pole_are_those_of_a_geometric_series() {
        // 1/(1 - 0.5 z^-1): sum of |h| = 2, of h^2 = 4/3; behind it a gain of -3.
        let sections =
            [Section { b: [1.0, 0.0, 0.0], a: [1.0, -0.5, 0.0] }, Section { b: [-3.0, 0.0, 0.0], a: [1.0, 0.0, 0.0] }];
        let [found, half] = norms(&sections, [[1.0, 0.0, 0.0], [0.5, 0.0, 0.0]], 2.0).unwrap();
        assert_eq!(half.absolute, found.absolute.iter().map(|sum| 0.5 * sum).collect::<Vec<_>>());
        let expected = [2.0, 6.0].map(|sum| sum * MARGIN);
        for (found, expected) in found.absolute.iter().zip(expected) {
            assert!((found / expected - 1.0).abs() < ENOUGH, "{found}, expected {expected}");
        }
        assert!((found.square - 12.0).abs() < 1e-9);
    }

    #[test]
    fn sums_that_overflow_end_and_name_the_section() {
        let difference = Section { b: [1e200, -1e200, 0.0], a: [1.0, 0.0, 0.0] };
        assert_eq!(norms(&[difference; 3], [[1.0, 0.0, 0.0]], 1.0).err(), Some(2));
        assert_eq!(scaled(&[difference; 2], 32), Err(ScalingError::Gain { section: 2 }));
    }

    #[test]
    fn two_passes_count_among_the_steps() {
        // 2 x 20 x 6e7 x 2 = 4.8e9 steps of one pass, four times as many of two.
        let slow = Section { b: [1e-8, 0.0, 0.0], a: [1.0, -(1.0 - 1.0 / 6e7), 0.0] };
        let words = Integers { a: [1 << 40, -((1 << 40) - 18_325), 0], a_q_bits: 40, ..to_integers(&slow, 32) };
        let refused = scale(&[words], 32, 2);
        assert!(matches!(refused, Err(ScalingError::TooLong { sections: 1, .. })), "{refused:?}");
    }

    #[test]
    fn a_gain_of_five_comes_down_by_three_bits() {
        let scaling = scaled(&[Section { b: [5.0, 0.0, 0.0], a: [1.0, 0.0, 0.0] }], 16).unwrap();
        assert_eq!((scaling.section_shifts, scaling.output_shift), (vec![3], 3));
    }

    #[test]
    fn what_came_down_goes_up_again_but_not_above_the_input() {
        let gain = |b0: f64| Section { b: [b0, 0.0, 0.0], a: [1.0, 0.0, 0.0] };
        let scaling = scaled(&[gain(5.0), gain(0.1), gain(0.01)], 24).unwrap();
        assert_eq!((scaling.section_shifts, scaling.output_shift), (vec![3, -3, 0], 0));
    }

    #[test]
    fn rounding_that_fills_a_word_is_refused() {
        // A quarter of the rate's half, where error feedback can't help much: about
        // 0.6/((1 - r) sin w) half steps.
        let r = 0.9995;
        let section = Section { b: [1e-4, 0.0, 0.0], a: [1.0, -core::f64::consts::SQRT_2 * r, r * r] };
        assert!(scaled(&[section], 20).is_ok());
        let refused = scale(&[to_integers(&section, 16)], 8, 1);
        assert!(matches!(refused, Err(ScalingError::Rounding { section: 1, .. })), "{refused:?}");
    }

    #[test]
    fn error_feedback_takes_the_noise_of_low_poles_away() {
        // A 50 Hz resonance at 48 kHz, 3 Hz wide.
        let (r, w) = (1.0 - core::f64::consts::PI * 3.0 / 48_000.0, core::f64::consts::TAU * 50.0 / 48_000.0);
        let section = Section { b: [1.0, -2.0 * libm::cos(w), 1.0], a: [1.0, -2.0 * r * libm::cos(w), r * r] };
        let with = to_integers(&section, 24);
        assert_eq!(with.error_feedback, [-2, 1]);
        let without = Integers { error_feedback: [0, 0], ..with };
        let noise_dbfs = |words| scale(&[words], 24, 1).unwrap().noise_dbfs.unwrap();
        assert!(noise_dbfs(with) < noise_dbfs(without) - 60.0);
    }

    #[test]
    fn white_noise_of_a_word_is_a_twelfth_of_a_step_squared() {
        // 16 bits: 10 log10(2/12 2^-30) = -98.1 dBFS (the figure of a sine in rounding noise).
        let scaling = scaled(&[Section { b: [0.5, 0.0, 0.0], a: [1.0, 0.0, 0.0] }], 16).unwrap();
        assert!((scaling.noise_dbfs.unwrap() + 98.1).abs() < 0.01, "{scaling:?}");
    }
}
