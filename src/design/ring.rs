//! A cascade struck once: its impulse response frame by frame, or one side of that of two
//! passes, and the spectrum of what is still to come.
//!
//! This simulation is the design's own and shares nothing with the code that filters
//! recordings.

use crate::section::Section;

/// Sections that run side by side, each one frame behind the one before it; as many
/// angles are looked at together.
pub const WIDTH: usize = 4;

/// Frames between two looks for state too small to matter.
const FLUSH_FRAMES: u64 = 256;

/// State below this is cleared: subnormal numbers are slow, and at 1e-200 of the
/// impulse nothing is lost.
const FLUSH_BELOW: f64 = 1e-200;

/// [`WIDTH`] sections in transposed direct form II.
#[derive(Clone, Debug)]
struct Lanes {
    b: [[f64; WIDTH]; 3],
    a: [[f64; WIDTH]; 2],
    s: [[f64; WIDTH]; 2],
    /// What each section put out last: the next frame's input of its neighbor.
    y: [f64; WIDTH],
}

/// A cascade on its way through its impulse response.
#[derive(Clone, Debug)]
pub struct Ring {
    lanes: Vec<Lanes>,
    /// Number of the next frame to come out.
    frame: u64,
}

impl Ring {
    /// A cascade at rest that has just been struck by an impulse of height 1; the
    /// first frame to come out is `h[0]`. `sections` is not empty, or nothing comes out.
    pub fn strike(sections: &[Section]) -> Ring {
        let identity = Section { b: [1.0, 0.0, 0.0], a: [1.0, 0.0, 0.0] };
        let lanes = sections
            .chunks(WIDTH)
            .map(|chunk| {
                let at = |lane: usize| chunk.get(lane).unwrap_or(&identity);
                Lanes {
                    b: core::array::from_fn(|power| core::array::from_fn(|lane| at(lane).b[power])),
                    a: core::array::from_fn(|power| core::array::from_fn(|lane| at(lane).a[power + 1])),
                    s: [[0.0; WIDTH]; 2],
                    y: [0.0; WIDTH],
                }
            })
            .collect::<Vec<_>>();
        let latency = (lanes.len() * WIDTH).saturating_sub(1);
        let mut ring = Ring { lanes, frame: 0 };
        // The impulse reaches the last section `latency` steps after it is struck.
        for step in 0..latency {
            ring.step(if step == 0 { 1.0 } else { 0.0 });
        }
        ring
    }

    /// The two-sided response of the cascade run forward and backward, r\[m\] = sum of h\[k\]
    /// h\[k + m\] over k: the ring whose frames are r\[1\], r\[2\], ..., and r\[0\].
    ///
    /// A state in which the cascade puts out h\[k + 1\], h\[k + 2\], ... is there once h\[k\] has
    /// come out of it. What comes out is linear in the state, so that the sum of these states,
    /// each times h\[k\], puts out r\[1\], r\[2\], ... It runs over the first `frames` frames; what
    /// is then left of h is left out twice over.
    pub fn both_ways(sections: &[Section], frames: u64) -> (Ring, f64) {
        let mut ring = Ring::strike(sections);
        let mut sum = Ring { lanes: ring.lanes.clone(), frame: 1 };
        sum.scale(0.0);
        let mut center = 0.0;
        for _ in 0..frames {
            let h = ring.advance();
            center += h * h;
            sum.add(h, &ring);
        }
        (sum, center)
    }

    fn states(&mut self) -> impl Iterator<Item = &mut [f64; WIDTH]> {
        self.lanes.iter_mut().flat_map(|lanes| lanes.s.iter_mut().chain([&mut lanes.y]))
    }

    fn scale(&mut self, factor: f64) {
        self.states().flatten().for_each(|state| *state *= factor);
    }

    /// Adds `factor` times the state of another ring of the same sections.
    fn add(&mut self, factor: f64, other: &Ring) {
        for (sum, lanes) in self.lanes.iter_mut().zip(&other.lanes) {
            let sums = sum.s.iter_mut().chain([&mut sum.y]);
            for (sum, states) in sums.zip(lanes.s.iter().chain([&lanes.y])) {
                for (sum, state) in sum.iter_mut().zip(states) {
                    *sum += factor * state;
                }
            }
        }
    }

    /// Number of the next frame.
    pub fn frame(&self) -> u64 {
        self.frame
    }

    /// The next frame of the impulse response.
    pub fn advance(&mut self) -> f64 {
        self.frame += 1;
        if self.frame.is_multiple_of(FLUSH_FRAMES) {
            self.flush();
        }
        self.step(0.0)
    }

    /// [`Ring::advance`] for `frames` frames that nobody looks at.
    pub fn skip(&mut self, frames: u64) {
        for _ in 0..frames {
            self.advance();
        }
    }

    fn step(&mut self, input: f64) -> f64 {
        let mut carry = input;
        for lanes in &mut self.lanes {
            let mut x = [carry; WIDTH];
            x[1..].copy_from_slice(&lanes.y[..WIDTH - 1]);
            carry = lanes.y[WIDTH - 1];
            for (i, x) in x.into_iter().enumerate() {
                let y = lanes.b[0][i] * x + lanes.s[0][i];
                lanes.s[0][i] = lanes.b[1][i] * x - lanes.a[0][i] * y + lanes.s[1][i];
                lanes.s[1][i] = lanes.b[2][i] * x - lanes.a[1][i] * y;
                lanes.y[i] = y;
            }
        }
        self.lanes.last().map_or(input, |last| last.y[WIDTH - 1])
    }

    fn flush(&mut self) {
        for state in self.states().flatten() {
            if state.abs() < FLUSH_BELOW {
                *state = 0.0;
            }
        }
    }

    /// |sum of `h[m]` e^(-jwm) over all m still to come|, the magnitude that the
    /// remaining tail has at `angle` w, radians a frame.
    pub fn tail(&self, angle: f64) -> f64 {
        let [height, ..] = self.tails([angle; WIDTH]);
        height
    }

    /// [`Ring::tail`] at several angles, which costs hardly more than at one: section
    /// waits for section, angle not for angle.
    pub fn tails(&self, angles: [f64; WIDTH]) -> [f64; WIDTH] {
        self.transforms(angles).map(|(re, im)| libm::hypot(re, im))
    }

    /// Sum of `h[m]` e^(-jw(m - n)) over all m from the next frame n on: real and imaginary
    /// part.
    pub fn transform(&self, angle: f64) -> (f64, f64) {
        let [sum, ..] = self.transforms([angle; WIDTH]);
        sum
    }

    /// Exact for the state as it stands, however long the tail: with s1, s2 the state
    /// of a section and X the transform of what is still to enter it,
    ///
    /// ```text
    /// Y = (B X + s1 + s2 z^-1) / A        X of the next = y + z^-1 Y
    /// ```
    ///
    /// where y is what the section put out last and its neighbor has not yet taken.
    fn transforms(&self, angles: [f64; WIDTH]) -> [(f64, f64); WIDTH] {
        // z^-1 and z^-2 as real and imaginary parts.
        let back = angles.map(|angle| (libm::cos(angle), -libm::sin(angle)));
        let back2 = back.map(|(re, im)| (re * re - im * im, 2.0 * re * im));
        let (mut x, mut y) = ([(0.0, 0.0); WIDTH], [(0.0, 0.0); WIDTH]);
        for lanes in &self.lanes {
            for i in 0..WIDTH {
                let ([b0, b1, b2], [a1, a2]) = (lanes.b.map(|b| b[i]), lanes.a.map(|a| a[i]));
                let ([s1, s2], last) = (lanes.s.map(|s| s[i]), lanes.y[i]);
                for k in 0..WIDTH {
                    let ((z_re, z_im), (z2_re, z2_im), (x_re, x_im)) = (back[k], back2[k], x[k]);
                    let (b_re, b_im) = (b0 + b1 * z_re + b2 * z2_re, b1 * z_im + b2 * z2_im);
                    let (a_re, a_im) = (1.0 + a1 * z_re + a2 * z2_re, a1 * z_im + a2 * z2_im);
                    let up_re = b_re * x_re - b_im * x_im + s1 + s2 * z_re;
                    let up_im = b_re * x_im + b_im * x_re + s2 * z_im;
                    let scale = 1.0 / (a_re * a_re + a_im * a_im);
                    let y_re = (up_re * a_re + up_im * a_im) * scale;
                    let y_im = (up_im * a_re - up_re * a_im) * scale;
                    y[k] = (y_re, y_im);
                    x[k] = (y_re * z_re - y_im * z_im + last, y_re * z_im + y_im * z_re);
                }
            }
        }
        y
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::response;
    use num_complex::Complex64;

    fn pair(radius: f64, angle: f64, zero_angle: f64) -> Section {
        Section {
            b: [1.0, -2.0 * libm::cos(zero_angle), 1.0],
            a: [1.0, -2.0 * radius * libm::cos(angle), radius * radius],
        }
    }

    /// Section by section, the difference equation as it stands at `Section`.
    fn plain(sections: &[Section], frames: usize) -> Vec<f64> {
        let mut signal = vec![0.0; frames];
        signal[0] = 1.0;
        for section in sections {
            let (x, mut y) = (signal.clone(), vec![0.0; frames]);
            for n in 0..frames {
                y[n] = section.b[0] * x[n];
                if n >= 1 {
                    y[n] += section.b[1] * x[n - 1] - section.a[1] * y[n - 1];
                }
                if n >= 2 {
                    y[n] += section.b[2] * x[n - 2] - section.a[2] * y[n - 2];
                }
            }
            signal = y;
        }
        signal
    }

    #[test]
    fn the_frames_are_the_difference_equation_for_any_number_of_sections() {
        for count in 1..=9 {
            let sections: Vec<_> = (0..count).map(|k| pair(0.9, 0.2 * k as f64, 0.21 * k as f64)).collect();
            let mut ring = Ring::strike(&sections);
            for (n, want) in plain(&sections, 300).into_iter().enumerate() {
                let got = ring.advance();
                // 10 sections and 10 rounding errors each, of terms below 100.
                assert!((got - want).abs() < 1e-11, "{count} sections, frame {n}: {got} for {want}");
            }
        }
    }

    #[test]
    fn the_tail_of_a_fresh_strike_is_the_response_and_shrinks_by_what_came_out() {
        let sections =
            [pair(0.95, 0.4, 0.5), pair(0.8, 1.9, 1.8), pair(0.9, 0.4, 0.4), pair(0.9, 2.8, 0.1), pair(0.7, 1.0, 2.0)];
        let mut ring = Ring::strike(&sections);
        let angle = 0.47;
        let whole = response::at(&sections, angle, core::f64::consts::TAU);
        let mut left = whole;
        for n in 0..200 {
            let want = libm::hypot(left.re, left.im);
            assert!((ring.tail(angle) - want).abs() < 1e-11, "frame {n}");
            let turned = angle * f64::from(n);
            left -= ring.advance() * Complex64::new(libm::cos(turned), -libm::sin(turned));
        }
    }

    #[test]
    fn both_ways_the_frames_are_the_autocorrelation_of_the_response() {
        for count in 1..=6 {
            let sections: Vec<_> = (0..count).map(|k| pair(0.9, 0.2 + 0.4 * k as f64, 0.5 * k as f64)).collect();
            // 0.9^600 is 1e-27.
            let h = plain(&sections, 600);
            let lag = |m: usize| h.iter().zip(&h[m..]).map(|(a, b)| a * b).sum::<f64>();
            let (mut ring, center) = Ring::both_ways(&sections, 600);
            let scale = 1e-12 * lag(0);
            assert!((center - lag(0)).abs() < scale, "{count} sections: {center} for {}", lag(0));
            let (re, im) = ring.transform(0.7);
            let sum = (1..300).fold((0.0, 0.0), |(re, im), m: usize| {
                let angle = 0.7 * (m - 1) as f64;
                (re + lag(m) * libm::cos(angle), im - lag(m) * libm::sin(angle))
            });
            assert!((re - sum.0).abs() + (im - sum.1).abs() < 100.0 * scale, "{count}: {re} {im} for {sum:?}");
            for m in 1..200 {
                assert_eq!(ring.frame(), m);
                let (got, want) = (ring.advance(), lag(m as usize));
                assert!((got - want).abs() < scale, "{count} sections, lag {m}: {got} for {want}");
            }
        }
    }
}
