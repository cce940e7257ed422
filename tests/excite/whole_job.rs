//! Excitation, a device that is the spec's own cascade, and the verdicts.

use crate::support::{SCALE, samples, shipped};
use bandproof::cascade::{Cascade, Filter};
use bandproof::design::{Design, design};
use bandproof::evidence::{BandFigures, BandTask, Measured, Verdict, cross_ranges, judge_all};
use bandproof::excite::Plan;
use bandproof::output::triangular;
use bandproof::spec::{Extent, Requirement, Row, Spec, Width};
use bandproof::spectrum::{Accumulator, SegmentPlan, Transform, segment_frames};
use std::sync::Arc;

const RATE: u32 = 48_000;

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

/// Plays `plan` through the cascade, records it with `bits` and triangular dither, and
/// judges all bands.
fn played(plan: &Plan, design: &Design, bits: i32) -> Vec<BandFigures> {
    let before = samples(plan);
    let mut filter = Filter::new(Arc::new(Cascade::new(&design.sections)), 1);
    let mut out = vec![Vec::new()];
    filter.process(std::slice::from_ref(&before), &mut out);
    filter.finish(&mut out);
    let scale = libm::ldexp(1.0, bits - 1);
    let rounded = |(frame, x): (usize, &f64)| (x * scale + triangular(0, frame as u64)).round() / scale;
    let after: Vec<f64> = out[0].iter().enumerate().map(rounded).collect();

    let bands = tasks(design);
    let judged = bands.iter().filter(|band| band.requirement != Requirement::Observe);
    let narrowest_hz = judged.map(|band| band.to_hz - band.from_hz).reduce(f64::min);
    let settled = design.settling_frames..before.len() as u64;
    let length = segment_frames(RATE, narrowest_hz, settled.end - settled.start).unwrap();
    let segments = SegmentPlan::spread(length, settled);
    let mut sums = Accumulator::new(Transform::new(length), cross_ranges(RATE, length, &bands));
    for &start in &segments.starts {
        let segment = start as usize..start as usize + length;
        sums.add(&before[segment.clone()], &after[segment]);
    }
    let measured = Measured {
        pair: None,
        rate_hz: RATE,
        seconds: plan.seconds(),
        spectra: &sums.finish(),
        independent_segments: segments.independent_segments(),
        rounding_power_before: 1.0 / (SCALE * SCALE) / 12.0,
        rounding_power_after: 1.0 / (scale * scale) / 4.0,
        gain: 1.0,
    };
    assert!(measured.independent_segments >= 8, "enough for the device's own noise");
    judge_all(&measured, &bands)
}

/// The reed bed's spec with the hum's bands as narrow as its stops hold throughout, and a
/// reduction in place of the limit to what remains of the whine.
fn for_devices() -> Spec {
    let mut spec = shipped("reed-bed.toml");
    for band in &mut spec.bands {
        match band.name.as_str() {
            "pump hum" => {
                band.extent = Extent::Row(Row { center_hz: 50.0, width: Width::Hz(1.0), harmonics: 8 });
            }
            "converter whine" => {
                band.extent = Extent::Range { from_hz: 15_797.0, to_hz: 15_803.0 };
                band.requirement = Requirement::Reduce { reduce_db: 30.0 };
            }
            _ => {}
        }
    }
    spec
}

#[test]
fn a_device_that_is_the_spec_meets_it() {
    let spec = for_devices();
    let design = design(&spec, RATE).unwrap();
    let plan = Plan::new(&spec, RATE, 60.0).unwrap();
    assert_eq!(plan.notes, Vec::<String>::new());
    for bits in [16, 24] {
        let figures = played(&plan, &design, bits);
        assert_eq!(figures.len(), 14);
        for (band, figures) in plan.bands.iter().zip(&figures) {
            let wanted = (band.band.requirement != Requirement::Observe).then_some(Verdict::Met);
            assert_eq!(figures.verdict, wanted, "{} {figures:#?}", band.band.name);
            let shown_db = if bits == 16 { band.shown_16_bit_db } else { band.shown_24_bit_db };
            assert_eq!(shown_db.is_some(), band.required_db.is_some());
            let Some(shown_db) = shown_db else { continue };
            // What leaks comes from two bins at either end of the band in 17 segments: 25
            // independent values, a standard error of 0.9 dB, and one of 0.6 dB in the band.
            let seen_db = figures.demonstrable_attenuation_db.unwrap();
            assert!((seen_db - shown_db).abs() < 4.5, "{bits} bits: {shown_db} dB told, {figures:#?}");
            let (fell_db, own_db) = (figures.measured_attenuation_db.unwrap(), band.own_stages_db.unwrap());
            assert!(fell_db > own_db - 5.0, "{bits} bits: {own_db} dB told, {figures:#?}");
        }
    }
}

#[test]
fn that_a_band_is_wider_than_its_stop_is_told_beforehand() {
    let spec = shipped("reed-bed.toml");
    let design = design(&spec, RATE).unwrap();
    let plan = Plan::new(&spec, RATE, 60.0).unwrap();
    let figures = played(&plan, &design, 16);
    let mut short = 0;
    for (band, figures) in plan.bands.iter().zip(&figures) {
        let wanted = match band.band.requirement {
            Requirement::Observe => None,
            _ if band.own_stages_fall_short() => Some(Verdict::Missed),
            _ => Some(Verdict::Met),
        };
        assert_eq!(figures.verdict, wanted, "{} {figures:#?}", band.band.name);
        if let Requirement::Reduce { .. } = band.band.requirement {
            // What is left comes from the 0.3 Hz at either end of the band, which hold 35
            // independent values in 60 s: a standard error of 0.75 dB.
            let seen_db = figures.measured_attenuation_db.unwrap();
            assert!((seen_db - band.own_stages_db.unwrap()).abs() < 2.5, "{band:#?} {figures:#?}");
        }
        short += usize::from(band.own_stages_fall_short());
    }
    assert_eq!(short, 9);
    let notes = plan.notes.join("\n");
    assert!(notes.contains("pump hum (8 of its bands)") && notes.contains("converter whine"), "{notes}");
}
