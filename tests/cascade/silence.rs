//! State is cleared where the documentation says, wherever blocks end.

use crate::helpers::{WIDTHS, noise, random_sections, run, run_one};
use bandproof::cascade::{CLEAR_BELOW, CLEAR_PERIOD, plain};
use bandproof::section::Section;

const POLE: Section = Section { b: [1.0, 0.0, 0.0], a: [1.0, -0.9, 0.0] };

#[test]
fn a_decay_ends_at_the_first_multiple_of_1024_below_1e_200() {
    assert_eq!((CLEAR_PERIOD, CLEAR_BELOW), (1024, 1e-200));
    // Impulse at frame 1: before frame n the state is 0.9^(n-1). It is below 1e-200
    // from n = 4371.9 on, so it is there at 4096 and cleared at 5120.
    let mut input = vec![0.0; 6000];
    input[1] = 1.0;
    for width in WIDTHS {
        for blocks in [vec![6000], vec![1], vec![1024], vec![1000, 24, 3]] {
            let found = &run(&[POLE], width, &[input.clone()], &blocks)[0];
            let expected = libm::log(0.9) * 5118.0;
            assert!((libm::log(found[5119]) / expected - 1.0).abs() < 1e-12, "still decaying: {:e}", found[5119]);
            assert!(found[5119] > f64::MIN_POSITIVE, "not subnormal");
            assert!(found[5120..].iter().all(|&y| y == 0.0), "silent from 5120 on");
        }
    }
}

#[test]
fn in_a_chain_each_section_is_cleared_at_its_own_frame() {
    // 20 equal poles: the n-th power of the decay delays the end of the later ones.
    let mut input = vec![0.0; 8000];
    input[1] = 1.0;
    let sections = [POLE; 20];
    let (expected, states) = plain::filter_with_states(&sections, &input);
    assert!(states.iter().all(|state| *state == [0.0; 2]), "{states:?}");
    let last_sound = expected.iter().rposition(|&y| y != 0.0).expect("a decay");
    assert_eq!((last_sound + 1) % 1024, 0, "ends at a multiple of 1024");
    for width in WIDTHS {
        for blocks in [vec![8000], vec![333], vec![1, 2, 3]] {
            assert_eq!(run(&sections, width, &[input.clone()], &blocks)[0], expected);
        }
    }
}

#[test]
fn after_a_tone_the_output_is_silent_and_hardly_a_sample_subnormal() {
    let sections = random_sections(2, 16);
    let tone = (0..4800).map(|i| libm::sin(0.3 * f64::from(i)));
    let input: Vec<f64> = tone.chain(std::iter::repeat_n(0.0, 2_000_000)).collect();
    let output = run_one(&sections, &input);
    let end = output.iter().rposition(|&y| y != 0.0).expect("a tone") + 1;
    assert!(end < input.len(), "silent at the end");
    assert_eq!(end % 1024, 0, "silent from a multiple of 1024 on");
    // Poles within radius 0.78 fall from 1e-200 through the subnormals within 1024
    // frames; it is the rest, which would linger there, that must not get there.
    let subnormal = output[4800..].iter().filter(|y| y.is_subnormal()).count();
    assert!(subnormal < 1024, "{subnormal} subnormal samples");
}

#[test]
fn a_state_that_matters_is_never_cleared() {
    // 600 dB below full scale and loud for f64 all the same.
    let scale = libm::ldexp(1.0, -600);
    assert!(scale > 1e-200);
    let sections = random_sections(4, 10);
    let input = noise(4, 5000);
    let quiet: Vec<f64> = input.iter().map(|x| x * scale).collect();
    let expected: Vec<f64> = run_one(&sections, &input).iter().map(|y| y * scale).collect();
    assert_eq!(run_one(&sections, &quiet), expected);
}
