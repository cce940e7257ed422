//! Rounding, saturation, gain, and what is counted on the way.

use std::io::Cursor;

use bandproof::output::{Output, OutputFigures, OutputPlan};
use bandproof::wave::{Changes, Encoding, Reader, SampleFormat, Writer};
use proptest::prelude::*;

const INTEGERS: [SampleFormat; 7] = [
    SampleFormat { encoding: Encoding::Pcm8, valid_bits: 8 },
    SampleFormat { encoding: Encoding::Pcm16, valid_bits: 16 },
    SampleFormat { encoding: Encoding::Pcm24, valid_bits: 24 },
    SampleFormat { encoding: Encoding::Pcm32, valid_bits: 32 },
    SampleFormat { encoding: Encoding::Pcm16, valid_bits: 12 },
    SampleFormat { encoding: Encoding::Pcm24, valid_bits: 20 },
    SampleFormat { encoding: Encoding::Pcm32, valid_bits: 24 },
];

fn plain(format: SampleFormat) -> OutputPlan {
    OutputPlan { format, dither: false, gain: 1.0, identity: false }
}

fn shape(plan: OutputPlan, values: &[f64]) -> (Vec<f64>, OutputFigures) {
    let mut output = Output::new(plan, 1);
    let mut planes = [values.to_vec()];
    output.shape(&mut planes);
    let [plane] = planes;
    (plane, output.figures())
}

/// In steps of the format, there and back.
fn in_steps(format: SampleFormat, steps: &[f64]) -> (Vec<f64>, OutputFigures) {
    let values: Vec<f64> = steps.iter().map(|x| x * format.step()).collect();
    let (shaped, figures) = shape(plain(format), &values);
    (shaped.iter().map(|y| y / format.step()).collect(), figures)
}

#[test]
fn rounding_is_to_nearest_and_half_to_even_over_the_whole_16_bit_range() {
    let format = SampleFormat::full(Encoding::Pcm16);
    for k in -32768..=32766i32 {
        let k = f64::from(k);
        let inputs = [k, k + 0.25, k + 0.5 - 1e-9, k + 0.5, k + 0.5 + 1e-9, k + 0.75];
        let half = if k % 2.0 == 0.0 { k } else { k + 1.0 };
        let (shaped, figures) = in_steps(format, &inputs);
        assert_eq!(shaped, [k, k, k, half, k + 1.0, k + 1.0]);
        assert_eq!(figures.clipped_samples, 0);
    }
}

#[test]
fn saturation_begins_where_rounding_leaves_the_range_and_is_counted() {
    for format in INTEGERS {
        let high = 1.0 / format.step() - 1.0;
        let low = -high - 1.0;
        // Half a step above the (odd) highest value rounds out; half a step below the
        // (even) lowest rounds in.
        let under = |x: f64| f64::from_bits(x.abs().to_bits() - 1).copysign(x);
        let over = |x: f64| f64::from_bits(x.abs().to_bits() + 1).copysign(x);
        let inside = [high, under(high + 0.5), low, low - 0.5];
        let (shaped, figures) = in_steps(format, &inside);
        assert_eq!((shaped, figures.clipped_samples), (vec![high, high, low, low], 0), "{format:?}");
        let outside = [high + 0.5, high + 1.0, over(low - 0.5), low - 1.0, 1e300, -1e300, f64::INFINITY];
        let (shaped, figures) = in_steps(format, &outside);
        assert_eq!((shaped, figures.clipped_samples), (vec![high, high, low, low, high, low, high], 7), "{format:?}");
        assert_eq!(figures.peak, f64::INFINITY);
        assert_eq!(figures.written_peak, 1.0);
    }
}

#[test]
fn dither_never_counts_as_a_clip() {
    let format = SampleFormat::full(Encoding::Pcm16);
    let high = 1.0 - format.step();
    let plan = OutputPlan { dither: true, ..plain(format) };
    for value in [high, -1.0] {
        let (shaped, figures) = shape(plan, &[value; 10_000]);
        assert_eq!(figures.clipped_samples, 0);
        assert_eq!(figures.peak, value.abs());
        assert!(shaped.iter().all(|y| (-1.0..=high).contains(y)));
        // It did push some beyond, which saturated.
        assert!(shaped.iter().any(|y| *y != value));
    }
    let (_, figures) = shape(plan, &[1.0; 100]);
    assert_eq!(figures.clipped_samples, 100);
}

#[test]
fn floats_keep_what_they_can_hold_and_never_become_infinite() {
    let single = SampleFormat::full(Encoding::Float32);
    let max = f64::from(f32::MAX);
    let values = [0.1, -0.0, 1e-42, 7.5, max, -max, max * (1.0 + 1e-9), 1e39, -1e300, f64::NEG_INFINITY];
    let (shaped, figures) = shape(plain(single), &values);
    let expected = [f64::from(0.1f32), -0.0, f64::from(1e-42f32), 7.5, max, -max, max, max, -max, -max];
    assert!(shaped.iter().zip(expected).all(|(y, e)| y.to_bits() == e.to_bits()), "{shaped:?}");
    assert_eq!(figures.clipped_samples, 3);
    assert_eq!(figures.written_peak, max);

    let double = SampleFormat::full(Encoding::Float64);
    let values = [0.1, -0.0, f64::from_bits(1), 1e300];
    let (shaped, figures) = shape(OutputPlan { dither: true, ..plain(double) }, &values);
    assert!(shaped.iter().zip(values).all(|(y, e)| y.to_bits() == e.to_bits()));
    assert_eq!(
        figures,
        OutputFigures { peak: 1e300, written_peak: 1e300, clipped_samples: 0, rounding_power: vec![0.0] }
    );
}

#[test]
fn a_value_that_is_no_number_stays_so_for_the_writer_to_refuse() {
    for format in INTEGERS.into_iter().chain([Encoding::Float32, Encoding::Float64].map(SampleFormat::full)) {
        for dither in [false, true] {
            let (shaped, figures) = shape(OutputPlan { dither, ..plain(format) }, &[0.25, f64::NAN, 0.5]);
            assert!(shaped[1].is_nan() && !shaped[0].is_nan() && !shaped[2].is_nan(), "{format:?}");
            assert_eq!(figures.peak, 0.5);
        }
    }
}

#[test]
fn gain_comes_first_and_peaks_are_taken_after_it() {
    let format = SampleFormat::full(Encoding::Pcm16);
    let (shaped, figures) = shape(OutputPlan { gain: 0.5, ..plain(format) }, &[1.5, -1.9, 0.25]);
    assert_eq!(shaped, [0.75, (-0.95f64 * 32768.0).round_ties_even() / 32768.0, 0.125]);
    assert_eq!(figures.peak, 0.95);
    assert_eq!(figures.written_peak, -shaped[1]);
    assert_eq!(figures.clipped_samples, 0);
    let (_, silent) = shape(plain(format), &[]);
    assert_eq!((silent.peak, silent.written_peak), (0.0, 0.0));
}

#[test]
fn the_identity_passes_bits_below_the_valid_ones_and_reports_the_input_s_rounding() {
    let format = SampleFormat { encoding: Encoding::Pcm24, valid_bits: 20 };
    let odd = 8_388_607.0 / 8_388_608.0;
    let plan = OutputPlan { format, dither: true, gain: 1.0, identity: true };
    let (shaped, figures) = shape(plan, &[odd, -0.3]);
    assert_eq!(shaped, [odd, -0.3]);
    let step = format.step();
    let rounding_power = vec![step * step / 12.0];
    assert_eq!(figures, OutputFigures { peak: odd, written_peak: odd, clipped_samples: 0, rounding_power });
    // Without the identity they are rounded away (here, beyond the range).
    assert_eq!(shape(plain(format), &[odd]).0, [1.0 - step]);
}

#[test]
fn rounding_power_of_float32_follows_the_samples_and_channels() {
    let format = SampleFormat::full(Encoding::Float32);
    let mut output = Output::new(plain(format), 2);
    output.shape(&mut [vec![0.7; 16], vec![0.3; 16]]);
    // Spacing 2^-24 in [0.5, 1), 2^-25 in [0.25, 0.5).
    let expected = [libm::ldexp(1.0, -48) / 12.0, libm::ldexp(1.0, -50) / 12.0];
    for (power, expected) in output.figures().rounding_power.iter().zip(expected) {
        assert!((power - expected).abs() <= 2.0 * f64::EPSILON * expected);
    }
}

fn any_format() -> impl Strategy<Value = SampleFormat> {
    let floats = [Encoding::Float32, Encoding::Float64].map(SampleFormat::full);
    prop::sample::select(INTEGERS.into_iter().chain(floats).collect::<Vec<_>>())
}

proptest! {
    #[test]
    fn blocks_do_not_matter(
        format in any_format(), dither: bool, identity: bool,
        values in prop::collection::vec(-1.5f64..1.5, 1..300), cuts in prop::collection::vec(1usize..40, 1..20),
    ) {
        let plan = OutputPlan { format, dither, gain: 0.9, identity };
        let channel = |gain: f64| values.iter().map(|v| v * gain).collect::<Vec<_>>();
        let mut whole = [channel(1.0), channel(-0.5)];
        let mut output = Output::new(plan, 2);
        output.shape(&mut whole);
        let mut cut = Output::new(plan, 2);
        let mut from = 0;
        for n in cuts.iter().cycle() {
            let to = values.len().min(from + n);
            let mut block = [channel(1.0)[from..to].to_vec(), channel(-0.5)[from..to].to_vec()];
            cut.shape(&mut block);
            prop_assert_eq!(&block[0][..], &whole[0][from..to]);
            prop_assert_eq!(&block[1][..], &whole[1][from..to]);
            from = to;
            if from == values.len() {
                break;
            }
        }
        prop_assert_eq!(output.figures(), cut.figures());
    }

    #[test]
    fn rounding_is_that_of_the_standard_library_in_every_integer_format(
        format in prop::sample::select(INTEGERS.to_vec()), value in -1.2f64..1.2,
    ) {
        let steps = value / format.step();
        let (high, low) = (1.0 / format.step() - 1.0, -1.0 / format.step());
        let expected = steps.round_ties_even().clamp(low, high) * format.step();
        let (shaped, figures) = shape(plain(format), &[value]);
        prop_assert_eq!(shaped[0], expected);
        let clipped = steps.round_ties_even() > high || steps.round_ties_even() < low;
        prop_assert_eq!(figures.clipped_samples, u64::from(clipped));
    }

    #[test]
    fn what_is_shaped_is_written_and_read_back_the_same(
        format in any_format(), dither: bool, values in prop::collection::vec(-3.0f64..3.0, 1..100),
    ) {
        let (shaped, _) = shape(OutputPlan { dither, ..plain(format) }, &values);
        let mut source = Cursor::new(Vec::new());
        let spec = hound::WavSpec {
            channels: 1, sample_rate: 48_000, bits_per_sample: 16, sample_format: hound::SampleFormat::Int,
        };
        let mut seed = hound::WavWriter::new(&mut source, spec).unwrap();
        values.iter().for_each(|_| seed.write_sample(0i16).unwrap());
        seed.finalize().unwrap();
        let mut input = Reader::open(source).unwrap();
        let mut writer = Writer::begin(Vec::new(), &mut input, &Changes::samples(format)).unwrap();
        writer.write(std::slice::from_ref(&shaped)).unwrap();
        let (file, _) = writer.finish(&mut input).unwrap();
        let mut reader = Reader::open(Cursor::new(file)).unwrap();
        prop_assert_eq!(reader.header().format, format);
        let mut planes = [Vec::new()];
        reader.read(usize::MAX, &mut planes).unwrap();
        prop_assert_eq!(&planes[0], &shaped);
    }
}
