//! Laws a linear, time-invariant cascade obeys, exactly where arithmetic allows.

use crate::helpers::{assert_same_bits, noise, random_sections, run_one};
use crate::rounding::{Errors, bound};
use bandproof::cascade::Filter;

fn at_rest_first(mut samples: Vec<f64>) -> Vec<f64> {
    samples[0] = 0.0;
    samples
}

#[test]
fn scaling_the_input_by_a_power_of_two_scales_the_output_exactly() {
    for (seed, count) in [(1, 1), (2, 6), (3, 16), (4, 23)] {
        let sections = random_sections(seed, count);
        let input = noise(seed, 4000);
        let output = run_one(&sections, &input);
        for exponent in [-40, -1, 1, 30] {
            let scale = libm::ldexp(1.0, exponent);
            let scaled: Vec<f64> = input.iter().map(|x| x * scale).collect();
            let expected: Vec<f64> = output.iter().map(|y| y * scale).collect();
            assert_same_bits(&run_one(&sections, &scaled), &expected, &format!("{count} sections, 2^{exponent}"));
        }
    }
}

#[test]
fn negating_the_input_negates_the_output_exactly() {
    let sections = random_sections(7, 12);
    let input = noise(7, 4000);
    let negated: Vec<f64> = input.iter().map(|x| -x).collect();
    let expected: Vec<f64> = run_one(&sections, &input).iter().map(|y| -y).collect();
    assert_same_bits(&run_one(&sections, &negated), &expected, "negated");
}

#[test]
fn delaying_the_input_delays_the_output_exactly() {
    for count in [1, 10, 16, 35] {
        let sections = random_sections(count as u64, count);
        let input = at_rest_first(noise(11, 3000));
        let output = run_one(&sections, &input);
        for delay in [1, 17, 1000, 1024, 1500] {
            let delayed: Vec<f64> = std::iter::repeat_n(0.0, delay).chain(input.iter().copied()).collect();
            // Equal, not the same bits: the silence before may have turned a -0 into a 0.
            assert_eq!(run_one(&sections, &delayed)[delay..], output, "{count} sections, {delay}");
        }
    }
}

#[test]
fn what_comes_later_never_changes_what_came_before() {
    let sections = random_sections(6, 20);
    let input = noise(6, 3000);
    let whole = run_one(&sections, &input);
    for frames in [1, 5, 19, 20, 1023, 1024, 1030, 2999] {
        assert_same_bits(&run_one(&sections, &input[..frames]), &whole[..frames], &format!("{frames} frames"));
    }
}

#[test]
fn a_cascade_equals_its_sections_one_after_the_other() {
    // From rest: otherwise each section alone would start from the first sample as
    // rounded, the cascade from the exact constant.
    let sections = random_sections(13, 37);
    let input = at_rest_first(noise(13, 3000));
    let one_by_one =
        sections.iter().fold(input.clone(), |samples, section| run_one(std::slice::from_ref(section), &samples));
    assert_same_bits(&run_one(&sections, &input), &one_by_one, "37 sections");
}

#[test]
fn the_output_of_a_sum_is_the_sum_of_the_outputs_to_rounding() {
    for (seed, count) in [(21, 1), (22, 5), (23, 12)] {
        let sections = random_sections(seed, count);
        let [a, b] = [noise(seed, 4000), noise(seed + 100, 4000)];
        let sum: Vec<f64> = a.iter().zip(&b).map(|(a, b)| a + b).collect();
        // The rounding of the sum passes through the cascade like one more section's error.
        let tolerance = [&a, &b, &sum].iter().map(|input| bound(&sections, input, Errors::Independent)).sum::<f64>();
        let [a, b, both] = [a, b, sum].map(|input| run_one(&sections, &input));
        for (frame, both) in both.iter().enumerate() {
            let expected = a[frame] + b[frame];
            assert!((both - expected).abs() <= tolerance, "frame {frame}: {both:e}, {expected:e} +- {tolerance:e}");
        }
    }
}

#[test]
fn samples_that_are_not_finite_end_in_no_panic_and_stay_in_their_channel() {
    for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        let mut filter = Filter::new(std::sync::Arc::new(bandproof::cascade::Cascade::new(&random_sections(3, 9))), 2);
        let mut spoiled = noise(1, 2000);
        spoiled[300] = bad;
        let mut out = [Vec::new(), Vec::new()];
        filter.process(&[spoiled, noise(2, 2000)], &mut out);
        filter.finish(&mut out);
        assert!(out[0][..300].iter().all(|y| y.is_finite()) && !out[0][300].is_finite());
        assert_same_bits(&out[1], &run_one(&random_sections(3, 9), &noise(2, 2000)), "the other channel");
    }
}

#[test]
fn a_filter_can_move_between_threads() {
    fn movable<T: Send + Sync>() {}
    movable::<Filter>();
    movable::<bandproof::cascade::Cascade>();
}
