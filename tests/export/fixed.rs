//! `fixed`, computed in integers as the document says.

use crate::support::{SHORT, noise, specs, text, written};
use bandproof::export::Form;
use bandproof::section::Section;
use serde_json::Value;

/// A section as the document has it.
struct Words {
    b: [i128; 3],
    a: [i128; 3],
    feedback: [i128; 2],
    q_b: i32,
    q_a: i32,
    shift: i32,
    x: [i128; 2],
    y: [i128; 2],
    e: [i128; 2],
}

struct Cascade {
    bits: u32,
    output_shift: i32,
    error_bound_steps: f64,
    sections: Vec<Words>,
}

fn integer(value: &Value) -> i128 {
    i128::from(value.as_i64().unwrap())
}

fn read(text: &str) -> Cascade {
    let document: Value = serde_json::from_str(text).unwrap();
    let bits = u32::try_from(document["bits"].as_u64().unwrap()).unwrap();
    let word = |value: &Value| {
        let value = integer(value);
        assert!((-(1 << (bits - 1))..1 << (bits - 1)).contains(&value), "{value} is no word");
        value
    };
    let sections = document["sections"].as_array().unwrap().iter().map(|section| Words {
        b: [0, 1, 2].map(|i| word(&section["b"][i])),
        a: [0, 1, 2].map(|i| word(&section["a"][i])),
        feedback: [0, 1].map(|i| word(&section["error_feedback"][i])),
        q_b: i32::try_from(integer(&section["q_bits"]["b"])).unwrap(),
        q_a: i32::try_from(integer(&section["q_bits"]["a"])).unwrap(),
        shift: i32::try_from(integer(&section["section_shift"])).unwrap(),
        x: [0; 2],
        y: [0; 2],
        e: [0; 2],
    });
    Cascade {
        bits,
        output_shift: i32::try_from(integer(&document["output_shift"])).unwrap(),
        error_bound_steps: document["error_bound_steps"].as_f64().unwrap(),
        sections: sections.collect(),
    }
}

/// `value` as it comes out of an accumulator of `bits` bits that wraps around.
fn wrapped(value: i128, bits: u32) -> i128 {
    (value << (128 - bits)) >> (128 - bits)
}

fn down(value: i128, places: i32) -> i128 {
    match places {
        0 => value,
        1.. => (value + (1 << (places - 1))) >> places,
        _ => value << -places,
    }
}

impl Words {
    fn advance(&mut self, x: i128, bits: u32) -> i128 {
        let wide = 2 * bits;
        let m = self.b[0] * x + self.b[1] * self.x[0] + self.b[2] * self.x[1];
        let d = self.a[1] * self.y[0] + self.a[2] * self.y[1];
        assert!(wrapped(m, wide) == m && wrapped(d, wide) == d, "products leave {wide} bits");
        let f = self.feedback[0] * self.e[0] + self.feedback[1] * self.e[1];
        let v = wrapped(wrapped(wrapped(down(m, self.q_b - self.q_a), wide) - d, wide) - f, wide);
        let y = down(v, self.q_a);
        assert_eq!(wrapped(y, bits), y, "an output leaves its word");
        self.x = [x, self.x[0]];
        self.y = [y, self.y[0]];
        self.e = [v - (y << self.q_a), self.e[0]];
        y
    }

    /// With its scaling: what an output is before rounding.
    fn scaled(&self) -> Section {
        let value = |integer: i128, q_bits: i32| libm::scalbn(integer as f64, -q_bits);
        Section { b: self.b.map(|b| value(b, self.q_b)), a: self.a.map(|a| value(a, self.q_a)) }
    }
}

impl Cascade {
    fn run(&mut self, input: &[i128]) -> Vec<i128> {
        let bits = self.bits;
        let through = |&x: &i128| self.sections.iter_mut().fold(x, |x, section| section.advance(x, bits));
        input.iter().map(through).collect()
    }

    fn scaled(&self) -> Vec<Section> {
        self.sections.iter().map(Words::scaled).collect()
    }

    fn full_scale(&self) -> i128 {
        1 << (self.bits - 1)
    }
}

/// The difference equation from rest.
fn from_rest(sections: &[Section], input: &[f64]) -> Vec<f64> {
    let mut signal = input.to_vec();
    for Section { b: [b0, b1, b2], a: [_, a1, a2] } in sections {
        let [mut s1, mut s2] = [0.0; 2];
        for sample in &mut signal {
            let x = *sample;
            let y = b0 * x + s1;
            s1 = (b1 * x + s2) - a1 * y;
            s2 = b2 * x - a2 * y;
            *sample = y;
        }
    }
    signal
}

fn cases() -> Vec<(String, String)> {
    let mut cases = vec![("short at 48000 Hz".to_owned(), text(&written(SHORT), 48_000, Form::Fixed))];
    for (name, spec, rates_hz) in specs().into_iter().take(4) {
        cases.push((format!("{name} at {} Hz", rates_hz[0]), text(&spec, rates_hz[0], Form::Fixed)));
    }
    cases
}

#[test]
fn the_worst_input_within_full_scale_overflows_nowhere() {
    for (name, text) in cases() {
        let count = read(&text).sections.len();
        for to in [0, count / 2, count - 1] {
            let mut cascade = read(&text);
            let mut impulse = vec![0.0; 40_000];
            impulse[0] = 1.0;
            let response = from_rest(&cascade.scaled()[..=to], &impulse);
            // Every sample of the input pushes the last output the same way.
            let full_scale = cascade.full_scale();
            let worst: Vec<i128> =
                response.iter().rev().map(|h| if *h < 0.0 { -full_scale } else { full_scale - 1 }).collect();
            let peak = {
                let bits = cascade.bits;
                let through = |&x: &i128| cascade.sections[..=to].iter_mut().fold(x, |x, one| one.advance(x, bits));
                worst.iter().map(through).map(i128::abs).max().unwrap()
            };
            // A shift of one bit less would overflow, unless the section's input has no headroom to give back.
            let lowered: i32 = cascade.sections[..=to].iter().map(|section| section.shift).sum();
            let is_needed = 2 * peak + 4 * cascade.error_bound_steps as i128 >= full_scale;
            assert!(lowered == 0 || is_needed, "{name}, section {to}: {peak} of {full_scale}");
        }
    }
}

#[test]
fn rounding_stays_within_its_bound() {
    for (name, text) in cases() {
        let mut cascade = read(&text);
        let full_scale = cascade.full_scale() as f64;
        let input: Vec<i128> = noise(9, 60_000).iter().map(|sample| (sample * 0.999 * full_scale) as i128).collect();
        let exact = from_rest(&cascade.scaled(), &input.iter().map(|x| *x as f64).collect::<Vec<_>>());
        let found = cascade.run(&input);
        let worst = found.iter().zip(&exact).map(|(y, exact)| (*y as f64 - exact).abs()).fold(0.0, f64::max);
        assert!(worst <= cascade.error_bound_steps, "{name}: {worst} steps, {} promised", cascade.error_bound_steps);
        // The bound is for the worst case; white errors stay far below, but not at nothing.
        assert!(worst >= 0.4, "{name}: {worst} steps");
    }
}

/// Call-times runs forward and backward and is two bits low after each pass.
#[test]
fn the_noise_of_two_passes_is_at_the_level_named() {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("filter-specs/call-times.toml");
    let text = text(&bandproof::spec::load(&path).unwrap(), 48_000, Form::Fixed);
    let document: Value = serde_json::from_str(&text).unwrap();
    let cascade = read(&text);
    assert!(cascade.output_shift > 0 && text.contains("2^(2 output_shift)"), "{text}");
    let full_scale = cascade.full_scale() as f64;
    let input: Vec<i128> = noise(13, 200_000).iter().map(|sample| (sample * 0.5 * full_scale) as i128).collect();
    let reversed = |mut signal: Vec<i128>| {
        signal.reverse();
        signal
    };
    let found = reversed(read(&text).run(&reversed(read(&text).run(&input))));
    let mut exact: Vec<f64> = input.iter().map(|x| *x as f64).collect();
    for _ in 0..2 {
        exact = from_rest(&cascade.scaled(), &exact);
        exact.reverse();
    }
    let power: f64 = found.iter().zip(&exact).map(|(y, exact)| (*y as f64 - exact) * (*y as f64 - exact)).sum();
    let scale = libm::scalbn(1.0, 2 * cascade.output_shift) / full_scale;
    let found_dbfs = 10.0 * libm::log10(2.0 * power / found.len() as f64 * scale * scale);
    let told_dbfs = document["noise_dbfs"].as_f64().unwrap();
    assert!((found_dbfs - told_dbfs).abs() < 1.0, "{found_dbfs} dBFS, {told_dbfs} dBFS told");
}

#[test]
fn the_noise_is_at_the_level_named() {
    for (name, text) in cases() {
        let document: Value = serde_json::from_str(&text).unwrap();
        let mut cascade = read(&text);
        let full_scale = cascade.full_scale() as f64;
        let input: Vec<i128> = noise(11, 200_000).iter().map(|sample| (sample * 0.5 * full_scale) as i128).collect();
        let exact = from_rest(&cascade.scaled(), &input.iter().map(|x| *x as f64).collect::<Vec<_>>());
        let found = cascade.run(&input);
        let errors = found.iter().zip(&exact).map(|(y, exact)| *y as f64 - exact);
        let power: f64 = errors.map(|error| error * error).sum();
        let scale = libm::scalbn(1.0, cascade.output_shift) / full_scale;
        let found_dbfs = 10.0 * libm::log10(2.0 * power / found.len() as f64 * scale * scale);
        let told_dbfs = document["noise_dbfs"].as_f64().unwrap();
        assert!((found_dbfs - told_dbfs).abs() < 1.0, "{name}: {found_dbfs} dBFS, {told_dbfs} dBFS told");
    }
}
