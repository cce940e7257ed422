//! The rules of the summary, case by case.

use crate::samples::{band, db, done, finite, reduce, spec};
use bandproof::report::*;
use bandproof::spec::Requirement;

const MET: Verdict = Verdict::Met;
const MISSED: Verdict = Verdict::Missed;
const UNPROVEN: Verdict = Verdict::Unproven;

fn reduce_30() -> Requirement {
    Requirement::Reduce { reduce_db: 30.0 }
}

/// The summary of recordings of band "hum", given as the verdicts of their channels.
fn of_verdicts(recordings: &[&[Verdict]]) -> Summary {
    let mut builder = SummaryBuilder::new(&spec(&[("hum", reduce_30())])).unwrap();
    for (number, channels) in recordings.iter().enumerate() {
        let channels = channels.iter().map(|&verdict| vec![band("hum", reduce(30.0), Some(verdict))]).collect();
        builder.add(&done(&format!("{number}.wav"), channels));
    }
    builder.finish(Skipped::default()).0
}

#[test]
fn verdicts_add_up_by_recording() {
    // channels of each recording; met, missed, unproven; the whole run
    type Case<'a> = (&'a [&'a [Verdict]], (u64, u64, u64), Verdict);
    let table: &[Case<'_>] = &[
        (&[], (0, 0, 0), UNPROVEN),
        (&[&[MET]], (1, 0, 0), MET),
        (&[&[MET, MET]], (1, 0, 0), MET),
        (&[&[UNPROVEN]], (0, 0, 1), UNPROVEN),
        (&[&[MET, UNPROVEN]], (0, 0, 1), UNPROVEN),
        (&[&[MET], &[UNPROVEN]], (1, 0, 1), MET),
        (&[&[UNPROVEN, MISSED, MET]], (0, 1, 0), MISSED),
        (&[&[MET], &[MET, MISSED], &[UNPROVEN]], (1, 1, 1), MISSED),
    ];
    for (recordings, counts, verdict) in table {
        let summary = of_verdicts(recordings);
        let hum = &summary.bands[0];
        assert_eq!((hum.met, hum.missed, hum.unproven), *counts, "{recordings:?}");
        assert_eq!(summary.verdict, *verdict, "{recordings:?}");
    }
}

#[test]
fn a_run_that_requires_nothing_proves_nothing() {
    for bands in [&[][..], &[("calls", Requirement::Observe)][..]] {
        let mut builder = SummaryBuilder::new(&spec(bands)).unwrap();
        builder.add(&done("a.wav", vec![vec![band("calls", None, None)]]));
        let (summary, _) = builder.finish(Skipped::default());
        assert_eq!(summary.verdict, UNPROVEN);
        assert!(summary.bands.iter().all(|b| b.met + b.missed + b.unproven == 0));
    }
}

#[test]
fn a_band_that_fits_at_no_rate_keeps_the_run_unproven_and_an_observed_one_does_not() {
    let bands = [("hum", reduce_30()), ("whine", reduce_30()), ("calls", Requirement::Observe)];
    for (named, verdict) in [(&bands[..], UNPROVEN), (&[bands[0].clone(), bands[2].clone()][..], MET)] {
        let mut builder = SummaryBuilder::new(&spec(named)).unwrap();
        builder.add(&done("a.wav", vec![vec![band("hum", reduce(30.0), Some(MET))]]));
        assert_eq!(builder.finish(Skipped::default()).0.verdict, verdict);
    }
}

#[test]
fn failed_recordings_are_counted_and_leave_the_verdict_alone() {
    let mut builder = SummaryBuilder::new(&spec(&[("hum", reduce_30())])).unwrap();
    builder.add(&Recording::failed("b.wav", "empty"));
    builder.add(&done("c.wav", vec![vec![band("hum", reduce(30.0), Some(MET))]]));
    builder.add(&Recording::failed("a.wav", "damaged"));
    let skipped = Skipped { dot_underscore: 2, other_files: 41 };
    let (summary, highlights) = builder.finish(skipped);
    assert_eq!((summary.recordings, summary.done, summary.failed), (3, 1, 2));
    assert_eq!((summary.skipped, summary.verdict), (skipped, MET));
    let failed: Vec<_> = highlights.failed.iter().map(|item| (item.path.as_str(), item.error.as_str())).collect();
    assert_eq!(failed, [("a.wav", "damaged"), ("b.wav", "empty")]);
}

/// Worst and median of channels given as (verdict, figure's entry).
fn figures(requirement: Requirement, channels: Vec<BandEntry>) -> (Option<f64>, Option<f64>) {
    let mut builder = SummaryBuilder::new(&spec(&[("band", requirement)])).unwrap();
    for (number, entry) in channels.into_iter().enumerate() {
        builder.add(&done(&format!("{number}.wav"), vec![vec![entry]]));
    }
    let (summary, _) = builder.finish(Skipped::default());
    (summary.bands[0].worst_db.map(Db::get), summary.bands[0].median_db.map(Db::get))
}

#[test]
fn the_worst_of_a_reduce_band_is_its_smallest_attenuation() {
    let channel = |verdict, figure: f64| BandEntry {
        measured_attenuation_db: db(figure),
        ..band("band", reduce(30.0), Some(verdict))
    };
    let channels = vec![channel(MET, 60.0), channel(MISSED, 27.9), channel(UNPROVEN, 3.0), channel(MET, 48.2)];
    assert_eq!(figures(reduce_30(), channels), (Some(27.9), Some(48.2)));
    assert_eq!(figures(reduce_30(), vec![channel(MET, 40.0), channel(MET, 50.001)]), (Some(40.0), Some(45.001)));
    assert_eq!(figures(reduce_30(), vec![channel(UNPROVEN, 3.0)]), (None, None));
    let without = band("band", reduce(30.0), Some(MET));
    assert_eq!(figures(reduce_30(), vec![without, channel(MET, 50.0)]), (Some(50.0), Some(50.0)));
}

#[test]
fn the_worst_of_a_keep_band_is_its_gain_farthest_from_0() {
    let keep = Some(Require::KeepDb(finite(0.5)));
    let channel = |min, max| BandEntry { gain_min_db: db(min), gain_max_db: db(max), ..band("band", keep, Some(MET)) };
    let requirement = Requirement::Keep { keep_db: 0.5, except: Vec::new() };
    let channels = vec![channel(-0.1, 0.3), channel(-0.4, 0.2), channel(-0.05, 0.0)];
    assert_eq!(figures(requirement.clone(), channels), (Some(-0.4), Some(-0.05)));
    assert_eq!(figures(requirement.clone(), vec![channel(-0.3, 0.3)]), (Some(-0.3), Some(-0.3)));
    assert_eq!(figures(requirement, vec![channel(-0.3, 0.1), channel(0.0, 0.4)]), (Some(0.4), Some(0.05)));
}

#[test]
fn the_worst_of_a_residual_band_is_its_highest_level_after() {
    let residual = Some(Require::ResidualDbfs(finite(-90.0)));
    let channel = |verdict, level| BandEntry { after_dbfs: db(level), ..band("band", residual, Some(verdict)) };
    let channels = vec![channel(MET, -120.0), channel(MISSED, -80.5), channel(MET, -100.0), channel(UNPROVEN, -10.0)];
    assert_eq!(figures(Requirement::Residual { residual_dbfs: -90.0 }, channels), (Some(-80.5), Some(-100.0)));
}

#[test]
fn an_observed_band_shows_its_gains_without_a_verdict() {
    let channel = |min, max| BandEntry { gain_min_db: db(min), gain_max_db: db(max), ..band("band", None, None) };
    assert_eq!(figures(Requirement::Observe, vec![channel(-3.0, 0.1), channel(-2.0, 0.2)]), (Some(-3.0), Some(-2.5)));
    assert_eq!(figures(Requirement::Observe, vec![band("band", None, None)]), (None, None));
}

#[test]
fn what_was_missed_is_listed_by_path_channel_and_place_in_the_spec() {
    let mut builder = SummaryBuilder::new(&spec(&[("zz", reduce_30()), ("aa", reduce_30())])).unwrap();
    let missed = |name: &str, figure| BandEntry {
        measured_attenuation_db: db(figure),
        ..band(name, reduce(30.0), Some(MISSED))
    };
    builder.add(&done("b.wav", vec![vec![missed("aa", 1.0)], vec![missed("zz", 2.0), missed("aa", 3.0)]]));
    builder.add(&done("a.wav", vec![vec![missed("zz", 4.0)]]));
    let (_, highlights) = builder.finish(Skipped::default());
    let listed: Vec<_> = highlights
        .missed
        .iter()
        .map(|item| (item.path.as_str(), item.channel, item.band.as_str(), item.figure_db.unwrap().get()))
        .collect();
    assert_eq!(
        listed,
        [("a.wav", 1, "zz", 4.0), ("b.wav", 1, "aa", 1.0), ("b.wav", 2, "zz", 2.0), ("b.wav", 2, "aa", 3.0)]
    );
}

#[test]
fn of_many_missed_or_failed_the_first_are_named_in_any_order_of_coming() {
    let count = 2 * MOST_NAMED + 3;
    let missed = |place: usize| {
        let bands = ["zz", "aa"].map(|name| band(name, reduce(30.0), Some(MISSED)));
        done(&format!("{place:05}.wav"), vec![bands.to_vec()])
    };
    let finished = |places: &mut dyn Iterator<Item = usize>| {
        let mut builder = SummaryBuilder::new(&spec(&[("zz", reduce_30()), ("aa", reduce_30())])).unwrap();
        for place in places {
            builder.add(&missed(place));
            builder.add(&Recording::failed(format!("{place:05}.bwf"), "empty"));
        }
        builder.finish(Skipped::default())
    };
    let (summary, highlights) = finished(&mut (0..count));
    assert_eq!((summary.bands[0].missed, summary.failed), (count as u64, count as u64));
    assert_eq!((highlights.missed.len(), highlights.failed.len()), (MOST_NAMED, MOST_NAMED));
    assert_eq!(highlights.missed_more, (2 * count - MOST_NAMED) as u64);
    assert_eq!(highlights.failed_more, (count - MOST_NAMED) as u64);
    for (at, item) in highlights.missed.iter().enumerate() {
        assert_eq!((item.path.clone(), item.band.as_str()), (format!("{:05}.wav", at / 2), ["zz", "aa"][at % 2]));
    }
    assert!(highlights.failed.iter().enumerate().all(|(at, item)| item.path == format!("{at:05}.bwf")));
    assert_eq!(finished(&mut (0..count).rev()), (summary, highlights));
}

#[test]
fn what_is_unproven_is_grouped_by_band_and_reason_and_counts_a_recording_once() {
    let mut builder = SummaryBuilder::new(&spec(&[("hum", reduce_30()), ("whine", reduce_30())])).unwrap();
    let unproven = |name: &str, code, reason: &str| BandEntry {
        reason_code: Some(code),
        reason: Some(reason.to_owned()),
        ..band(name, reduce(30.0), Some(UNPROVEN))
    };
    let short = |reason: &str| unproven("hum", ReasonCode::TooShort, reason);
    builder.add(&done("b.wav", vec![vec![short("b1")], vec![short("b2")]]));
    builder.add(&done("a.wav", vec![vec![], vec![unproven("whine", ReasonCode::TooQuiet, "w"), short("a2")]]));
    builder.add(&done("c.wav", vec![vec![unproven("hum", ReasonCode::NothingThere, "n")]]));
    let (_, highlights) = builder.finish(Skipped::default());
    let listed: Vec<_> = highlights
        .unproven
        .iter()
        .map(|item| {
            let reason = item.example_reason.as_deref().unwrap();
            let example = format!("{} {}", item.example_path, item.example_channel);
            (item.band.as_str(), item.reason_code.unwrap(), item.recordings, example, reason)
        })
        .collect();
    assert_eq!(
        listed,
        [
            ("hum", ReasonCode::NothingThere, 1, "c.wav 1".to_owned(), "n"),
            ("hum", ReasonCode::TooShort, 2, "a.wav 2".to_owned(), "a2"),
            ("whine", ReasonCode::TooQuiet, 1, "a.wav 2".to_owned(), "w"),
        ]
    );
}
