//! Lengths, rates and specs that can't be, and those that can and need a word.

use crate::support::{parsed, reduce, shipped};
use bandproof::design::design;
use bandproof::excite::{ExciteError, Plan};
use bandproof::spectrum::{SegmentPlan, segment_frames};

#[test]
fn a_length_must_be_a_number_above_0() {
    for seconds in [0.0, -0.0, -1.0, f64::NAN, f64::INFINITY] {
        let error = Plan::new(&shipped("notch-997.toml"), 48_000, seconds).unwrap_err();
        assert!(matches!(error, ExciteError::Seconds(_)), "{seconds}: {error}");
        assert!(error.is_refusal() && error.to_string().contains("--seconds"), "{error}");
    }
}

#[test]
fn a_length_in_which_no_band_can_be_judged_is_refused_with_the_lengths_that_can() {
    // No stages, so nothing to settle: 4 bins in 2 Hz take 2 s, 10 take 5 s, and eight segments
    // that overlap by half 4.5 times 41472 frames, the cheap length above 5 s.
    let spec = reduce(99.0, 101.0, 20.0);
    let error = Plan::new(&spec, 8000, 1.99).unwrap_err();
    let ExciteError::TooShort { least_s, every_band_s, device_noise_s, .. } = error else { panic!("{error}") };
    assert_eq!((least_s, every_band_s, device_noise_s), (2.0, 5.0, 23.4));
    assert!(error.is_refusal());
    let text = error.to_string();
    for part in ["1.99 s", "2.0 s", "5.0 s", "23.4 s", "--seconds"] {
        assert!(text.contains(part), "{part} is missing: {text}");
    }
    assert_eq!(Plan::new(&spec, 8000, 2.0).unwrap().notes.len(), 2, "too short for 10 bins, and for the noise");
    assert_eq!(Plan::new(&spec, 8000, 5.0).unwrap().notes.len(), 1, "too short for the noise");
    assert_eq!(Plan::new(&spec, 8000, 23.4).unwrap().notes, Vec::<String>::new());
}

#[test]
fn the_length_for_a_devices_noise_is_that_of_eight_independent_segments() {
    for (name, rate_hz) in [("reed-bed.toml", 48_000), ("notch-997.toml", 44_100), ("third-octave.toml", 96_000)] {
        let spec = shipped(name);
        let design = design(&spec, rate_hz).unwrap();
        let needed_s = Plan::new(&spec, rate_hz, 60.0).unwrap().needs.device_noise_s;
        let judged = design.bands.iter().filter(|band| band.check.is_some());
        let narrowest_hz = judged.map(|band| band.band.line.to_hz - band.band.line.from_hz).reduce(f64::min);
        let segments = |seconds: f64| {
            let settled = design.settling_frames..(seconds * f64::from(rate_hz)).ceil() as u64;
            let length = segment_frames(rate_hz, narrowest_hz, settled.end - settled.start).unwrap();
            SegmentPlan::spread(length, settled).independent_segments()
        };
        assert_eq!(segments(needed_s), 8, "{name}: {needed_s} s");
        assert!(segments(0.9 * needed_s) < 8, "{name}: {needed_s} s");
    }
}

#[test]
fn bands_that_a_length_is_too_short_for_are_named() {
    // 5.2 s are enough for the wide bands and not for 3 Hz of hum after 2.2 s of settling.
    let plan = Plan::new(&shipped("reed-bed.toml"), 48_000, 5.2).unwrap();
    let notes = plan.notes.join("\n");
    assert!(notes.contains("pump hum (8 of its bands): too short to judge, which takes 5.5 s"), "{notes}");
    assert!(notes.contains("--noise"), "{notes}");
    assert!(!notes.contains("wind rumble: too short"), "{notes}");
}

#[test]
fn a_reduction_that_rounding_hides_is_told() {
    // No stages, so an ideal stop: what is left is rounding.
    let plan = Plan::new(&reduce(15_500.0, 16_500.0, 78.0), 48_000, 60.0).unwrap();
    let (shown_16, shown_24) = (plan.bands[0].shown_16_bit_db.unwrap(), plan.bands[0].shown_24_bit_db.unwrap());
    assert!(shown_16 < 84.0 && shown_24 > 84.0, "{shown_16} {shown_24}");
    assert_eq!(plan.notes.len(), 1, "{:?}", plan.notes);
    assert!(plan.notes[0].contains("record the device with 24"), "{:?}", plan.notes);
    let plan = Plan::new(&reduce(15_500.0, 16_500.0, 150.0), 48_000, 60.0).unwrap();
    assert_eq!(plan.notes.len(), 1, "{:?}", plan.notes);
    assert!(plan.notes[0].contains("ask for less"), "{:?}", plan.notes);
}

#[test]
fn more_than_a_wav_file_holds_is_refused_with_what_it_holds() {
    let spec = shipped("reed-bed.toml");
    let error = Plan::new(&spec, 48_000, 30_000.0).unwrap_err();
    let ExciteError::TooLong { longest_s, .. } = error else { panic!("{error}") };
    // 2^32 bytes are 1431655765 frames.
    assert_eq!(longest_s, 1_431_655_722 / 48_000);
    assert!(error.is_refusal() && error.to_string().contains("29826 s"), "{error}");
    let plan = Plan::new(&spec, 48_000, longest_s as f64).unwrap();
    assert!(plan.frames * 3 + 128 < 1 << 32);
    assert!(matches!(Plan::new(&spec, 48_000, 1e300), Err(ExciteError::TooLong { .. })));
}

#[test]
fn a_rate_that_no_wav_file_can_tell_is_refused() {
    let error = Plan::new(&reduce(1e6, 2e6, 20.0), u32::MAX, 0.1).unwrap_err();
    assert!(matches!(error, ExciteError::Rate { .. }), "{error}");
    assert!(error.is_refusal() && error.to_string().contains("1431655765 Hz"), "{error}");
}

#[test]
fn a_spec_that_does_not_fit_the_rate_is_refused_as_in_filter() {
    let error = Plan::new(&shipped("reed-bed.toml"), 22_050, 60.0).unwrap_err();
    assert!(matches!(error, ExciteError::Design(_)) && error.is_refusal(), "{error}");
    assert!(error.to_string().contains("beyond_half_rate"), "{error}");
}

#[test]
fn what_may_be_left_out_is_left_out_and_listed() {
    let text = "beyond_half_rate = \"leave-out\"\n\
                [[band]]\nname = \"low\"\nfrom_hz = 50\nto_hz = 60\nreduce_db = 20\n\
                [[band]]\nname = \"high\"\nfrom_hz = 5000\nto_hz = 6000\nreduce_db = 20\n";
    let plan = Plan::new(&parsed(text), 8000, 10.0).unwrap();
    assert_eq!((plan.bands.len(), plan.left_out.len()), (1, 1));
    assert_eq!(plan.sweep.to_hz, 120.0, "only what is there is covered");
    let error = Plan::new(&parsed(text), 90, 10.0).unwrap_err();
    assert!(matches!(error, ExciteError::NoBands { .. }), "{error}");
    assert!(error.to_string().contains("[[band]]"), "{error}");
}

#[test]
fn a_spec_without_bands_has_nothing_to_measure() {
    let spec = parsed("[[stage]]\nkind = \"notch\"\ncenter_hz = 50\nq = 30\n");
    let error = Plan::new(&spec, 48_000, 60.0).unwrap_err();
    assert!(matches!(error, ExciteError::NoBands { .. }) && error.is_refusal(), "{error}");
}

#[test]
fn bands_that_are_only_observed_will_do() {
    let spec = parsed("[[band]]\nname = \"all\"\nfrom_hz = 20\nto_hz = 4000\n");
    let plan = Plan::new(&spec, 8000, 10.0).unwrap();
    assert_eq!((plan.bands[0].required_db, plan.bands[0].shown_16_bit_db), (None, None));
    assert!(plan.notes.is_empty(), "{:?}", plan.notes);
}
