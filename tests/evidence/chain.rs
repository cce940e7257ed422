//! A designed cascade from end to end: sections of the design, run by the few lines of
//! these tests, and verdicts held against what the design promises.

use crate::support::{Biquad, Noise, Take, add_line, expect, filter, rounded, rounding_power};
use bandproof::design::{Design, design};
use bandproof::evidence::{BandFigures, BandTask, Measured, ReasonCode, Verdict, cross_ranges, judge, unsettled};
use bandproof::spec::{
    Band, BeyondHalfRate, Extent, Family, FilterKind, FilterStage, Order, OutputSpec, Phase, Placement, Requirement,
    Row, Spec, Stage, Width,
};
use bandproof::spectrum::{Accumulator, SegmentPlan, Transform, segment_frames};

const RATE: u32 = 24_000;
const KEEP_DB: f64 = 0.5;

/// A high-pass, eight flat-bottomed stops of 40 dB, hum to reduce by 30 dB around each
/// and the range above to keep.
fn spec() -> Spec {
    let stop = Row { center_hz: 50.0, width: Width::Hz(3.2), harmonics: 8 };
    let hum = Row { width: Width::Hz(1.0), ..stop };
    Spec {
        phase: Phase::Causal,
        auto: None,
        reference_band: None,
        rate: None,
        title: None,
        beyond_half_rate: BeyondHalfRate::Error,
        output: OutputSpec::default(),
        stages: vec![
            Stage::Filter(FilterStage {
                kind: FilterKind::Highpass,
                family: Family::Butterworth,
                order: Order::Given(4),
                placement: Placement::Edge { edge_hz: 30.0 },
                ripple_db: None,
                stop_db: None,
            }),
            Stage::Filter(FilterStage {
                kind: FilterKind::Bandstop,
                family: Family::Elliptic,
                order: Order::Given(3),
                placement: Placement::Row(stop),
                ripple_db: Some(0.1),
                stop_db: Some(40.0),
            }),
        ],
        bands: vec![
            Band {
                name: "pump hum".to_owned(),
                extent: Extent::Row(hum),
                requirement: Requirement::Reduce { reduce_db: 30.0 },
            },
            Band {
                name: "calls".to_owned(),
                extent: Extent::Range { from_hz: 90.0, to_hz: 6000.0 },
                requirement: Requirement::Keep { keep_db: KEEP_DB, except: vec!["pump hum".to_owned()] },
            },
        ],
    }
}

fn tasks(design: &Design) -> Vec<BandTask> {
    let task = |band: &bandproof::design::BandDesign| BandTask {
        name: band.band.name.clone(),
        from_hz: band.band.line.from_hz,
        to_hz: band.band.line.to_hz,
        requirement: band.band.requirement.clone(),
        excepted_hz: band.excepted_hz.clone(),
        shortest_s: band.shortest_s,
    };
    design.bands.iter().map(task).collect()
}

/// 16-bit in and out with dither; the figures of all bands.
fn run(design: &Design, x: &[f64], seed: u64) -> Vec<BandFigures> {
    let chain: Vec<Biquad> = design.sections.iter().map(|s| Biquad { b: s.b, a: s.a }).collect();
    let before = rounded(x, 16, Some(Noise::new(seed ^ 0x5eed)));
    let after = rounded(&filter(&chain, &before), 16, Some(Noise::new(seed ^ 0xd17e)));
    let take = Take {
        rate_hz: RATE,
        before,
        after,
        rounding_before: rounding_power(16),
        rounding_after: 3.0 * rounding_power(16),
        gain: 1.0,
        skipped: design.settling_frames as usize,
    };
    take.judge(&tasks(design))
}

fn hum(seconds: f64, ambient_dbfs: f64, fundamental_hz: f64, seed: u64) -> Vec<f64> {
    let mut x = Noise::new(seed).white((seconds * f64::from(RATE)) as usize, ambient_dbfs);
    for harmonic in 1..=8 {
        let harmonic = f64::from(harmonic);
        add_line(&mut x, RATE, fundamental_hz * harmonic, -20.0 - 3.0 * harmonic);
    }
    x
}

#[test]
fn hum_is_shown_to_be_gone_and_the_calls_to_be_kept() {
    let design = design(&spec(), RATE).unwrap();
    for seed in 0..2 {
        let figures = run(&design, &hum(40.0, -50.0, 50.02, seed), seed);
        assert_eq!(figures.len(), 9);
        for (figures, band) in figures.iter().zip(&design.bands).take(8) {
            expect(figures, Verdict::Met, None);
            let line_hz = 50.02 * f64::from(band.band.line.harmonic);
            assert!((figures.line_hz.unwrap() - line_hz).abs() < 0.005, "{figures:#?}");
            // A steady line stands in for the band: it falls by what the design has at
            // its place, at least the band's least.
            let fell_db = figures.line_before_dbfs.unwrap() - figures.line_after_dbfs.unwrap();
            assert!(fell_db > band.attenuation_min_db - 0.3, "{} {figures:#?}", band.attenuation_min_db);
        }
        let calls = figures.last().unwrap();
        expect(calls, Verdict::Met, None);
        let promised = design.bands.last().unwrap();
        assert!(calls.resolved.unwrap() > 0.99, "{calls:#?}");
        // The design's extremes are those of single points; a sub-band averages.
        assert!(calls.gain_min_db.unwrap() >= -promised.attenuation_max_db - 0.01, "{calls:#?} {promised:#?}");
        assert!(calls.gain_max_db.unwrap() <= -promised.attenuation_min_db + 0.01, "{calls:#?} {promised:#?}");
    }
}

#[test]
fn hum_beside_its_bands_proves_nothing_in_them() {
    // 0.375 Hz too high at the first harmonic, still in its band; 0.75 Hz at the second,
    // 3 Hz at the eighth: beside their bands, inside or outside the stops. Those bands
    // hold nothing but what the lines leak into them and the dither of the input, which
    // stands 4.8 dB and its scatter above the rounding that is granted.
    let design = design(&spec(), RATE).unwrap();
    let figures = run(&design, &hum(40.0, -95.0, 50.375, 5), 5);
    let chain = design.sections.iter().map(|s| Biquad { b: s.b, a: s.a });
    let truth_db: f64 = chain.map(|section| section.attenuation_db(RATE, 50.375)).sum();
    assert!((figures[0].measured_attenuation_db.unwrap() - truth_db).abs() < 0.05, "{truth_db} {figures:#?}");
    let expected = if truth_db >= 30.0 { Verdict::Met } else { Verdict::Missed };
    expect(&figures[0], expected, None);
    for figures in &figures[1..8] {
        assert_eq!(figures.verdict, Some(Verdict::Unproven), "{figures:#?}");
        assert!(matches!(figures.reason_code, Some(ReasonCode::NothingThere | ReasonCode::TooQuiet)), "{figures:#?}");
    }
    // The nearest: the line's skirt is all there is.
    expect(&figures[1], Verdict::Unproven, Some(ReasonCode::NothingThere));
}

#[test]
fn identity_shows_0_db_in_the_same_bands() {
    let mut spec = spec();
    let filtered = design(&spec, RATE).unwrap();
    spec.stages.clear();
    spec.bands.retain(|band| matches!(band.requirement, Requirement::Keep { .. }));
    spec.bands[0].requirement = Requirement::Keep { keep_db: KEEP_DB, except: Vec::new() };
    let identity = design(&spec, RATE).unwrap();
    let before = rounded(&hum(20.0, -50.0, 50.02, 6), 16, None);
    let mut take = Take::exact(before, &[]);
    take.rate_hz = RATE;
    take.rounding_before = rounding_power(16);
    take.rounding_after = rounding_power(16);
    let mut bands = tasks(&identity);
    bands.extend(tasks(&filtered).pop());
    for figures in take.judge(&bands) {
        expect(&figures, Verdict::Met, None);
        assert_eq!((figures.gain_min_db, figures.gain_max_db), (Some(0.0), Some(0.0)));
    }
}

#[test]
fn a_recording_shorter_than_the_band_needs_is_told_how_long_it_needs_to_be() {
    let design = design(&spec(), RATE).unwrap();
    let x = hum(5.0, -50.0, 50.02, 7);
    for figures in &run(&design, &x, 7)[..8] {
        assert_ne!(figures.verdict, Some(Verdict::Missed), "{figures:#?}");
        if figures.verdict == Some(Verdict::Unproven) {
            assert_eq!(figures.reason_code, Some(ReasonCode::TooShort), "{figures:#?}");
            assert!(figures.reason.as_deref().unwrap().contains("this one has 5.0 s"), "{figures:#?}");
        }
    }
    // Shorter than the settling time: nothing to look at.
    let settling_s = design.settling_s;
    for task in tasks(&design) {
        expect(&unsettled(settling_s / 2.0, &task), Verdict::Unproven, Some(ReasonCode::Unsettled));
    }
}

#[test]
fn a_loud_hum_far_below_hides_no_quiet_ultrasonic_band() {
    // Bins of 0.1 Hz at 250 kHz: 2.5 million bins a segment. The flat bound on far
    // leakage would put a floor of -86 dBFS under the uppermost sub-band (49000 bins); it
    // holds -102 dBFS.
    const FAST: u32 = 250_000;
    let mut x = Noise::new(8).white(12 * FAST as usize, -88.0);
    add_line(&mut x, FAST, 50.0, -12.0);
    let notch = Biquad::notch(FAST, 50.0, 1.0);
    let after = notch.run(&x);
    let keep = BandTask {
        name: "calls".to_owned(),
        from_hz: 20_000.0,
        to_hz: 100_000.0,
        requirement: Requirement::Keep { keep_db: 0.1, except: Vec::new() },
        excepted_hz: Vec::new(),
        shortest_s: None,
    };
    let bands = std::slice::from_ref(&keep);
    let length = segment_frames(FAST, Some(1.0), 10 * u64::from(FAST)).unwrap();
    let mut sums = Accumulator::new(Transform::new(length), cross_ranges(FAST, length, bands));
    let plan = SegmentPlan::spread(length, 2 * u64::from(FAST)..x.len() as u64);
    for &start in &plan.starts {
        let segment = start as usize..start as usize + length;
        sums.add(&x[segment.clone()], &after[segment]);
    }
    let measured = Measured {
        pair: None,
        rate_hz: FAST,
        seconds: 12.0,
        spectra: &sums.finish(),
        independent_segments: plan.independent_segments(),
        rounding_power_before: 0.0,
        rounding_power_after: 0.0,
        gain: 1.0,
    };
    let figures = judge(&measured, &keep);
    expect(&figures, Verdict::Met, None);
    assert_eq!(figures.resolved, Some(1.0));
}
