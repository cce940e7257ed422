//! What holds for every cascade that is found.

use crate::tasks::{Ask, TASKS, Task};
use bandproof::design::auto::margin::{keep_limit_db, reduce_need_db};
use bandproof::design::auto::{self, AutoError, Found, MOST_EXTENTS};
use bandproof::design::{self, Check};
use bandproof::spec::{Auto, Band, Extent, Family, Requirement, Spec, Stage};

fn find(spec: &Spec, rates_hz: &[u32]) -> Found {
    auto::find(spec, spec.auto.unwrap(), rates_hz).unwrap()
}

fn found(task: &Task) -> Found {
    let spec = task.spec();
    auto::find(&spec, spec.auto.unwrap(), task.rates_hz).unwrap_or_else(|error| panic!("{}: {error}", task.name))
}

fn task(name: &str) -> &'static Task {
    TASKS.iter().find(|task| task.name == name).unwrap()
}

#[test]
fn every_requirement_is_guaranteed_with_the_margin_at_every_rate() {
    for task in TASKS {
        let found = found(task);
        assert_eq!(found.spec.auto, None);
        assert_eq!(found.spec.bands, task.spec().bands);
        let mut most_sections = 0;
        for &rate_hz in task.rates_hz {
            let design = design::design(&found.spec, rate_hz).unwrap();
            most_sections = most_sections.max(design.sections.len());
            for band in &design.bands {
                assert_eq!(band.check, Some(Check::Guaranteed), "{}, {} at {rate_hz}", task.name, band.band.name);
                match &band.band.requirement {
                    Requirement::Reduce { reduce_db } => {
                        assert!(band.attenuation_min_db >= reduce_need_db(*reduce_db), "{}", task.name);
                    }
                    // Beside an exception the loss is keep_db by definition.
                    Requirement::Keep { keep_db, except } if except.is_empty() => {
                        let limit_db = keep_limit_db(*keep_db);
                        assert!(band.attenuation_max_db <= limit_db && band.attenuation_min_db >= -limit_db);
                    }
                    _ => {}
                }
            }
        }
        assert_eq!(most_sections, found.sections as usize, "{}", task.name);
    }
}

#[test]
fn what_has_to_spare_is_what_the_designs_have() {
    for task in TASKS {
        let found = found(task);
        for spare in &found.spares {
            let design = design::design(&found.spec, spare.rate_hz).unwrap();
            let band = design.bands.iter().find(|band| band.band.name == spare.name).unwrap();
            if let Requirement::Reduce { reduce_db } = band.band.requirement {
                let spare_db = band.attenuation_min_db - reduce_db;
                // Both look for the same extreme, to within what its search leaves.
                assert!((spare.spare_db - spare_db).abs() < 1e-6, "{}: {} {spare_db}", task.name, spare.spare_db);
            }
        }
    }
}

#[test]
fn no_exception_takes_more_than_ten_times_its_line() {
    let mut seen = 0;
    for task in TASKS {
        let found = found(task);
        let extents: Vec<f64> = found
            .spec
            .named_bands()
            .filter(|band| matches!(band.requirement, Requirement::Reduce { .. }))
            .map(|band| band.line.to_hz - band.line.from_hz)
            .collect();
        let widest_hz = extents.iter().copied().fold(0.0, f64::max);
        for &rate_hz in task.rates_hz {
            for band in design::design(&found.spec, rate_hz).unwrap().bands {
                for (from_hz, to_hz) in band.excepted_hz {
                    assert!(to_hz - from_hz <= MOST_EXTENTS * widest_hz, "{}", task.name);
                    seen += 1;
                }
            }
        }
    }
    assert!(seen > 10);
}

#[test]
fn the_same_spec_gives_the_same_bits() {
    for name in ["reed bed: rumble, hum and whine", "two kept bands and noise all around"] {
        assert_eq!(found(task(name)), found(task(name)));
    }
}

#[test]
fn another_rate_never_takes_fewer_sections() {
    for task in TASKS.iter().filter(|task| !task.rates_hz.contains(&384_000)) {
        let mut rates_hz = task.rates_hz.to_vec();
        rates_hz.push(2 * rates_hz[rates_hz.len() - 1]);
        let more = find(&task.spec(), &rates_hz);
        assert!(more.sections >= found(task).sections, "{}", task.name);
    }
}

#[test]
fn asking_for_less_never_takes_more_sections() {
    for task in TASKS {
        let sections = found(task).sections;
        for (keep, reduce) in [(1.5, 1.0), (1.0, 0.75)] {
            let mut spec = task.spec();
            for band in &mut spec.bands {
                match &mut band.requirement {
                    Requirement::Keep { keep_db, .. } => *keep_db *= keep,
                    Requirement::Reduce { reduce_db } => *reduce_db *= reduce,
                    _ => {}
                }
            }
            let less = find(&spec, task.rates_hz).sections;
            assert!(less <= sections, "{}: {less} after {sections} with {keep}, {reduce}", task.name);
        }
    }
}

#[test]
fn a_band_that_is_only_observed_changes_nothing() {
    let mut spec = task("a band between two noises").spec();
    let before = find(&spec, &[48_000]);
    spec.bands.push(Band {
        name: "creek".to_owned(),
        extent: Extent::Range { from_hz: 310.0, to_hz: 520.0 },
        requirement: Requirement::Observe,
    });
    let after = find(&spec, &[48_000]);
    assert_eq!(before.spec.stages, after.spec.stages);
    assert_eq!(before.spares, after.spares);
}

#[test]
fn a_spec_with_stages_is_left_as_it_is() {
    let explicit = found(task("rumble below calls")).spec;
    assert_eq!(auto::resolve(&explicit, &[48_000]).unwrap(), explicit);
    let none = auto::resolve(&task("rumble below calls").spec(), &[]);
    assert_eq!(none, Err(AutoError::NoRate));
}

#[test]
fn with_nothing_to_cut_there_are_no_stages() {
    let mut spec = task("rumble below calls").spec();
    spec.bands.retain(|band| !matches!(band.requirement, Requirement::Reduce { .. }));
    let found = find(&spec, &[48_000]);
    assert!(found.spec.stages.is_empty() && found.sections == 0);
}

#[test]
fn a_family_asked_for_is_the_only_one() {
    for family in [Family::Butterworth, Family::Chebyshev1, Family::Chebyshev2, Family::Elliptic, Family::Bessel] {
        let mut spec = task("a band between two noises").spec();
        for band in &mut spec.bands {
            // A Bessel filter of high order falls as a Gaussian, by 3 dB times the square of the ratio of
            // frequencies: 8.3 dB from 500 to 300 Hz.
            match &mut band.requirement {
                Requirement::Keep { keep_db, .. } => *keep_db = 3.0,
                Requirement::Reduce { reduce_db } => *reduce_db = 8.0,
                _ => {}
            }
        }
        spec.auto = Some(Auto { family: Some(family), max_sections: None });
        let found = find(&spec, &[48_000]);
        assert!(!found.spec.stages.is_empty());
        for stage in &found.spec.stages {
            assert!(!matches!(stage, Stage::Filter(filter) if filter.family != family), "{stage:?}");
        }
        let free = Auto { family: None, max_sections: None };
        assert!(auto::find(&spec, free, &[48_000]).unwrap().sections <= found.sections);
    }
}

#[test]
fn gentler_families_go_first_where_they_take_no_more_sections() {
    // Order 2 holds with every family: by hand a Butterworth.
    let found = found(task("rough keep, little reduction"));
    assert!(matches!(&found.spec.stages[..], [Stage::Filter(filter)] if filter.family == Family::Butterworth));
}

#[test]
fn as_many_sections_as_it_takes_are_enough() {
    let mut spec = task("reed bed: rumble, hum and whine").spec();
    let needed = find(&spec, &[48_000]).sections;
    spec.auto = Some(Auto { family: None, max_sections: Some(needed) });
    assert_eq!(find(&spec, &[48_000]).sections, needed);
    spec.auto = Some(Auto { family: None, max_sections: Some(needed - 1) });
    assert_eq!(auto::resolve(&spec, &[48_000]), Err(AutoError::TooFew { needed, allowed: needed - 1 }));
}

#[test]
fn without_a_band_to_keep_only_the_surroundings_of_the_lines_are_touched() {
    let mut spec = task("rumble below calls").spec();
    spec.bands = vec![Band {
        name: "tone".to_owned(),
        extent: Extent::Range { from_hz: 990.0, to_hz: 1010.0 },
        requirement: Requirement::Reduce { reduce_db: 15.0 },
    }];
    let found = find(&spec, &[48_000]);
    let design = design::design(&found.spec, 48_000).unwrap();
    for hz in [100.0, 880.0, 1120.0, 10_000.0] {
        assert!(design::response::gain_db(&design.sections, hz, 48_000.0) > -3.0, "{:?}", found.spec.stages);
    }
}

/// Where no band is to be kept, the net loss at no frequency farther from `lines_hz` than
/// four and a half times their width is more than 3 dB, at any rate.
fn nothing_else_is_lost(lines_hz: &[(f64, f64)], reduce_db: f64, rates_hz: &[u32]) {
    let mut spec = task("rumble below calls").spec();
    spec.bands = lines_hz
        .iter()
        .enumerate()
        .map(|(index, &(from_hz, to_hz))| Band {
            name: format!("line {index}"),
            extent: Extent::Range { from_hz, to_hz },
            requirement: Requirement::Reduce { reduce_db },
        })
        .collect();
    let found = find(&spec, rates_hz);
    assert_eq!(found.spares.len(), lines_hz.len());
    for &rate_hz in rates_hz {
        let design = design::design(&found.spec, rate_hz).unwrap();
        let net = design.net_sections();
        let half_hz = f64::from(rate_hz) / 2.0;
        let mut seen = 0;
        // Thirtieths of the narrowest line, then coarser.
        for step in 0..200_000 {
            let hz = if step < 100_000 { f64::from(step) * 0.02 } else { half_hz * f64::from(step - 100_000) / 1e5 };
            let far = |&(from_hz, to_hz): &(f64, f64)| {
                let side_hz = 0.5 * (MOST_EXTENTS - 1.0) * (to_hz - from_hz);
                hz <= from_hz - side_hz || hz >= to_hz + side_hz
            };
            if hz > half_hz || !lines_hz.iter().all(far) {
                continue;
            }
            seen += 1;
            let gain_db = design::response::gain_db(&net, hz, f64::from(rate_hz));
            assert!(gain_db.abs() <= 3.0, "{gain_db} dB at {hz} of {rate_hz} Hz: {:?}", found.spec.stages);
        }
        assert!(seen > 50_000);
    }
}

#[test]
fn without_a_band_to_keep_the_rest_of_every_rate_loses_three_decibels_at_most() {
    nothing_else_is_lost(&[(49.5, 50.5)], 40.0, &[48_000]);
    nothing_else_is_lost(&[(49.5, 50.5), (990.0, 1010.0)], 40.0, &[8000, 48_000]);
    // The wide line reaches below what the narrow one before it may take.
    nothing_else_is_lost(&[(400.0, 400.6), (410.0, 450.0)], 30.0, &[16_000]);
}

/// Where a keep band allows hardly more than rounding, stages came out that did nothing.
#[test]
fn no_stage_that_is_found_can_be_left_out() {
    let band = |name: &str, from_hz: f64, to_hz: f64, requirement: Requirement| Band {
        name: name.to_owned(),
        extent: Extent::Range { from_hz, to_hz },
        requirement,
    };
    let mut spec = task("a band between two noises").spec();
    spec.bands = vec![
        band("rumble", 20.0, 30.0, Requirement::Reduce { reduce_db: 40.0 }),
        band("calls", 100.0, 1000.0, Requirement::Keep { keep_db: 1e-5, except: Vec::new() }),
    ];
    let found = find(&spec, &[48_000]);
    for left_out in 0..found.spec.stages.len() {
        let mut fewer = found.spec.clone();
        fewer.stages.remove(left_out);
        let design = design::design(&fewer, 48_000).unwrap();
        let holds = design.bands.iter().all(|band| match band.band.requirement {
            Requirement::Reduce { reduce_db } => band.attenuation_min_db >= reduce_need_db(reduce_db),
            _ => band.check != Some(Check::Impossible),
        });
        assert!(!holds, "{:?} without stage {}", found.spec.stages, left_out + 1);
    }
    assert!(found.sections <= 6, "{found:?}");
}

#[test]
fn the_lines_of_a_row_become_one_stage() {
    let found = found(task("hum row with exceptions"));
    assert_eq!(found.spec.stages.len(), 1, "{:?}", found.spec.stages);
    let Requirement::Keep { .. } = found.spec.bands[0].requirement else { panic!() };
    assert!(matches!(task("hum row with exceptions").bands[0].3, Ask::KeepExcept(..)));
}
