//! Every band of every spec that comes with the project holds enough to be judged.

use crate::support::{db, file, samples, spectrum};
use bandproof::cascade::{Cascade, Filter};
use bandproof::design::design;
use bandproof::excite::Plan;
use bandproof::spec;
use bandproof::spectrum::{band_bins, segment_frames};
use std::fs;
use std::sync::Arc;

fn specs() -> Vec<(String, spec::Spec)> {
    let entries = fs::read_dir(file("filter-specs")).unwrap();
    let mut paths: Vec<_> = entries.map(|entry| entry.unwrap().path()).collect();
    paths.sort();
    assert!(paths.len() >= 5);
    paths.iter().map(|path| (path.display().to_string(), spec::load(path).unwrap().spec)).collect()
}

#[test]
fn each_band_stands_far_out_of_a_24_bit_floor_in_the_written_samples() {
    for (name, spec) in specs() {
        for rate_hz in [48_000, 96_000] {
            let plan = Plan::new(&spec, rate_hz, 40.0).unwrap();
            let narrowest_hz = plan.bands.iter().map(|band| band.band.line.to_hz - band.band.line.from_hz);
            let length = segment_frames(rate_hz, narrowest_hz.reduce(f64::min), plan.frames).unwrap();
            let spectra = spectrum(&samples(&plan), length);
            for band in &plan.bands {
                let line = band.band.line;
                let level: f64 = spectra.sxx[band_bins(rate_hz, length, line.from_hz, line.to_hz)].iter().sum();
                let step = 1.0 / 8_388_608.0;
                let floor = step * step / 4.0 * (line.to_hz - line.from_hz) / (f64::from(rate_hz) / 2.0);
                let over_db = db(level / floor);
                let needed_db = band.band.requirement.reduce_db().unwrap_or(0.0) + 20.0;
                assert!(over_db > needed_db, "{name} at {rate_hz} Hz, {}: {over_db} dB", band.band.name);
                // The figure that is told counts leakage as well, and less than all of the sound.
                assert!(
                    band.shown_24_bit_db.is_none_or(|shown_db| shown_db < over_db),
                    "{name}, {}: {over_db} dB {band:#?}",
                    band.band.name
                );
            }
        }
    }
}

#[test]
fn the_specs_that_come_along_ask_for_nothing_that_can_not_be_shown() {
    for (name, spec) in specs() {
        for rate_hz in [48_000, 96_000] {
            let plan = Plan::new(&spec, rate_hz, 60.0).unwrap();
            for band in &plan.bands {
                let (Some(required_db), Some(shown_db)) = (band.required_db, band.shown_16_bit_db) else { continue };
                // The bands that are wider than their stops, on purpose; stops that are found fit.
                let wide = spec.auto.is_none()
                    && (band.band.base_name == "pump hum" || band.band.base_name == "converter whine");
                assert_eq!(band.own_stages_fall_short(), wide, "{name} at {rate_hz} Hz: {band:#?}");
                assert!(wide || shown_db >= required_db + 6.0, "{name} at {rate_hz} Hz: {band:#?}");
            }
            assert!(!plan.notes.iter().any(|note| note.contains("can be shown")), "{name}: {:?}", plan.notes);
        }
    }
}

#[test]
fn what_the_specs_filters_make_of_it_does_not_clip() {
    // 6 dB are left above the peak. 1 to 4 dB are what filters add to recordings.
    for (name, spec) in specs() {
        for rate_hz in [48_000, 96_000] {
            let plan = Plan::new(&spec, rate_hz, 30.0).unwrap();
            let mut filter = Filter::new(Arc::new(Cascade::new(&design(&spec, rate_hz).unwrap().sections)), 1);
            let mut out = vec![Vec::new()];
            filter.process(&[samples(&plan)], &mut out);
            filter.finish(&mut out);
            let peak = out[0].iter().fold(0.0f64, |peak, x| peak.max(x.abs()));
            assert!(peak < 1.0, "{name} at {rate_hz} Hz: {peak}");
        }
    }
}
