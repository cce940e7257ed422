//! The fields for a methods section, each held against the design it speaks of.

use bandproof::design::{self, Design, response};
use bandproof::report::{DesignEntry, EdgeDefinition, Methods, MethodsStage, MethodsTransition, Require};
use bandproof::section::Section;
use bandproof::spec::{self, SpecSyntax};
use std::f64::consts::PI;
use std::path::Path;

/// The design of a spec in TOML.
pub fn designed(toml: &str, rate_hz: u32) -> Design {
    let spec = spec::parse(toml.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
    design::design(&spec, rate_hz).unwrap()
}

/// The design of a file below the project's folder.
pub fn of_file(path: &str, rate_hz: u32) -> Design {
    let spec = spec::load(&Path::new(env!("CARGO_MANIFEST_DIR")).join(path)).unwrap();
    design::design(&spec.spec, rate_hz).unwrap()
}

/// One stage, and one band that asks for a reduction.
fn one_stage(stage: &str, band: &str) -> String {
    format!("[[stage]]\n{stage}\n[[band]]\nname = \"b\"\n{band}\n")
}

fn methods(design: &Design) -> Methods {
    Methods::new(design, Some("triangular-1")).unwrap()
}

const SPECS: [&str; 5] = [
    "filter-specs/reed-bed.toml",
    "filter-specs/converter-whine.toml",
    "filter-specs/notch-997.toml",
    "filter-specs/third-octave.toml",
    "tests/cli/specs/quay.toml",
];

/// Attenuation by the definition of H(z), term by term: no code of the design.
fn attenuation_db(sections: &[Section], hz: f64, rate_hz: f64) -> f64 {
    let w = 2.0 * PI * hz / rate_hz;
    let squared = |p: [f64; 3]| {
        let (re, im) = (0..3).fold((0.0, 0.0), |(re, im), k| {
            let angle = w * f64::from(k);
            (re + p[k as usize] * libm::cos(angle), im - p[k as usize] * libm::sin(angle))
        });
        re * re + im * im
    };
    let power: f64 = sections.iter().map(|section| squared(section.b) / squared(section.a)).product();
    -10.0 * libm::log10(power)
}

/// Each line of each stage with its sections: those of all lines in the order they run.
fn lines<'a>(
    methods: &'a Methods,
    design: &'a Design,
) -> Vec<(&'a MethodsStage, &'a [MethodsTransition], &'a [Section])> {
    let mut rest = design.sections.as_slice();
    let mut lines = Vec::new();
    for stage in &methods.stages {
        for line in &stage.lines {
            let (own, after) = rest.split_at(stage.sections as usize);
            rest = after;
            lines.push((stage, line.transitions.as_slice(), own));
        }
    }
    assert!(rest.is_empty(), "sections that belong to no stage");
    lines
}

#[test]
fn orders_and_sections_add_up_to_the_cascade() {
    for path in SPECS {
        for rate_hz in [44_100, 48_000, 384_000] {
            let design = of_file(path, rate_hz);
            let methods = methods(&design);
            let all = lines(&methods, &design);
            assert_eq!(all.len(), design.stages.len(), "{path}");
            assert_eq!(methods.sections, design.sections.len());
            assert_eq!(methods.sections, all.iter().map(|(stage, ..)| stage.sections as usize).sum::<usize>());
            // A pole for each non-zero coefficient of z^-1, z^-2 in a denominator.
            let poles = |section: &Section| if section.a[2] != 0.0 { 2 } else { u32::from(section.a[1] != 0.0) };
            assert_eq!(methods.total_order, design.sections.iter().map(poles).sum::<u32>(), "{path} at {rate_hz} Hz");
            for (stage, _, own) in all {
                assert_eq!(stage.total_order, own.iter().map(poles).sum::<u32>());
            }
        }
    }
}

#[test]
fn transitions_end_where_the_response_says() {
    let mut tried = 0;
    for path in SPECS {
        for rate_hz in [44_100, 48_000, 96_000] {
            let design = of_file(path, rate_hz);
            let methods = methods(&design);
            for (stage, transitions, own) in lines(&methods, &design) {
                for transition in transitions {
                    // A frequency is rounded to 5e-7 Hz; the steepest slope here is 200 dB
                    // a hertz, and the plain sum above has lost 1e-4 dB at 50 Hz.
                    let holds = |hz: f64, db: f64| {
                        let found = attenuation_db(own, hz, f64::from(rate_hz));
                        assert!((found - db).abs() < 3e-4, "{path}, stage {}: {found} dB at {hz} Hz", stage.stage);
                    };
                    holds(transition.pass_hz.unwrap().get(), transition.pass_db.get());
                    let Some(stop_hz) = transition.stop_hz else { continue };
                    let stop_db = transition.stop_db.unwrap().get();
                    holds(stop_hz.get(), stop_db);
                    let width_hz = transition.width_hz.unwrap().get();
                    let distance_hz = (stop_hz.get() - transition.pass_hz.unwrap().get()).abs();
                    assert!((width_hz - distance_hz).abs() <= 1.5e-6, "three figures rounded to a millionth");
                    // In between, the attenuation lies in between: the stop edge is the first.
                    for step in 1..50 {
                        let part = f64::from(step) / 50.0;
                        let hz = transition.pass_hz.unwrap().get() * (1.0 - part) + stop_hz.get() * part;
                        let db = -response::gain_db(own, hz, f64::from(rate_hz));
                        assert!(transition.pass_db.get() - 1e-6 < db && db < stop_db, "{db} dB at {hz} Hz");
                    }
                    tried += 1;
                }
            }
        }
    }
    // Edges with a stop attenuation: reed-bed 1 + 16, whine 2, two notches 4, third octave 2,
    // quay 6, at three rates each.
    assert_eq!(tried, 3 * (17 + 2 + 4 + 2 + 6));
}

/// Edges of a stage by its family, and what the response does there.
#[test]
fn each_family_says_what_its_edges_are() {
    for (family, figures, definition, edge_db) in [
        ("butterworth", "", EdgeDefinition::HalfPower, 10.0 * libm::log10(2.0)),
        ("bessel", "", EdgeDefinition::HalfPower, 10.0 * libm::log10(2.0)),
        ("chebyshev1", "ripple_db = 0.5", EdgeDefinition::RippleEnds, 0.5),
        ("chebyshev2", "stop_db = 45", EdgeDefinition::StopBegins, 45.0),
        ("elliptic", "ripple_db = 0.5\nstop_db = 45", EdgeDefinition::RippleEnds, 0.5),
    ] {
        for (kind, edges) in [
            ("lowpass", "edge_hz = 1000"),
            ("highpass", "edge_hz = 1000"),
            ("bandpass", "edges_hz = [900, 1200]"),
            ("bandstop", "edges_hz = [900, 1200]"),
        ] {
            for order in [1, 4, 5] {
                let stage = format!("kind = \"{kind}\"\nfamily = \"{family}\"\norder = {order}\n{edges}\n{figures}");
                let design = designed(&one_stage(&stage, "from_hz = 1\nto_hz = 2"), 48_000);
                let methods = methods(&design);
                let [stage] = methods.stages.as_slice() else { panic!("one stage") };
                assert_eq!(stage.edge_definition, Some(definition));
                assert_eq!((stage.family.as_deref(), stage.order), (Some(family), Some(order)));
                let [line] = stage.lines.as_slice() else { panic!("one line") };
                assert_eq!(line.edges_hz.len(), line.transitions.len());
                for (edge_hz, transition) in line.edges_hz.iter().zip(&line.transitions) {
                    // 12 dB a hertz at the steepest, edges written in whole hertz.
                    let found = attenuation_db(&design.sections, edge_hz.get(), 48_000.0);
                    assert!((found - edge_db).abs() < 1e-6, "{family} {kind} {order}: {found} dB at {edge_hz:?}");
                    let own = [transition.pass_hz, transition.stop_hz];
                    assert_eq!(own[usize::from(family == "chebyshev2")], Some(*edge_hz), "{family} {kind} {order}");
                }
                // Two stop bands lie outside of a band-pass, one inside of a band-stop.
                let below = |t: &MethodsTransition| Some(t.stop_hz?.get() < t.pass_hz?.get());
                let directions: Vec<_> = line.transitions.iter().filter_map(below).collect();
                if family == "elliptic" || family == "chebyshev2" {
                    let expected: &[bool] = match kind {
                        "lowpass" => &[false],
                        "highpass" => &[true],
                        "bandpass" => &[true, false],
                        _ => &[false, true],
                    };
                    assert_eq!(directions, expected, "{family} {kind} {order}");
                } else {
                    assert!(directions.is_empty(), "no stop attenuation is stated or required");
                }
            }
        }
    }
}

/// |H|^2 = 1 / (1 + v^2n) with v the ratio of the prewarped frequencies (handbook).
#[test]
fn a_butterworth_transition_is_that_of_the_closed_form() {
    for (order, edge_hz, reduce_db) in [(2, 300.0, 12.0), (4, 40.0, 30.0), (7, 1000.0, 60.0)] {
        for rate_hz in [22_050, 48_000, 192_000] {
            let stage = format!("kind = \"highpass\"\nfamily = \"butterworth\"\norder = {order}\nedge_hz = {edge_hz}");
            let band = format!("from_hz = 1\nto_hz = {}\nreduce_db = {reduce_db}", edge_hz * 0.6);
            let methods = methods(&designed(&one_stage(&stage, &band), rate_hz));
            let transition = methods.stages[0].lines[0].transitions[0];
            let v = libm::pow(libm::pow(10.0, reduce_db / 10.0) - 1.0, 1.0 / (2.0 * f64::from(order)));
            let turn = PI / f64::from(rate_hz);
            let stop_hz = libm::atan(libm::tan(edge_hz * turn) / v) / turn;
            assert!((transition.stop_hz.unwrap().get() - stop_hz).abs() < 1e-6, "{transition:?}, {stop_hz} Hz");
            assert!((transition.width_hz.unwrap().get() - (edge_hz - stop_hz)).abs() < 1e-6);
            assert_eq!((transition.pass_hz.unwrap().get(), transition.stop_db.unwrap().get()), (edge_hz, reduce_db));
        }
    }
}

/// |H|^2 = 1 / (1 + 1 / (e^2 T_n(1/v)^2)): half power where e T_n(1/v) = 1, e = 1/sqrt(10^(stop/10) - 1)
/// (handbook), so 1/v = cosh(acosh(1/e) / n).
#[test]
fn a_chebyshev2_transition_is_that_of_the_closed_form() {
    for (order, edge_hz, stop_db) in [(3, 2000.0, 40.0), (6, 500.0, 70.0), (1, 4000.0, 20.0)] {
        let family = "family = \"chebyshev2\"";
        let stage = format!("kind = \"lowpass\"\n{family}\norder = {order}\nedge_hz = {edge_hz}\nstop_db = {stop_db}");
        let methods = methods(&designed(&one_stage(&stage, "from_hz = 1\nto_hz = 2"), 48_000));
        let transition = methods.stages[0].lines[0].transitions[0];
        let inverse_v = libm::cosh(libm::acosh(libm::sqrt(libm::pow(10.0, stop_db / 10.0) - 1.0)) / f64::from(order));
        let turn = PI / 48_000.0;
        let pass_hz = libm::atan(libm::tan(edge_hz * turn) / inverse_v) / turn;
        assert!((transition.pass_hz.unwrap().get() - pass_hz).abs() < 1e-6, "{transition:?}, {pass_hz} Hz");
        assert_eq!((transition.stop_hz.unwrap().get(), transition.stop_db.unwrap().get()), (edge_hz, stop_db));
        assert!((transition.pass_db.get() - 10.0 * libm::log10(2.0)).abs() < 1e-15);
    }
}

#[test]
fn a_notch_has_its_width_between_its_real_half_power_points() {
    for (center_hz, width_hz, rate_hz) in [(997.0, 20.0, 48_000), (50.0, 1.0, 384_000), (7000.0, 900.0, 22_050)] {
        let stage = format!("kind = \"notch\"\ncenter_hz = {center_hz}\nwidth_hz = {width_hz}");
        let band = format!("center_hz = {center_hz}\nspan_hz = {}\nreduce_db = 20", width_hz / 50.0);
        let methods = methods(&designed(&one_stage(&stage, &band), rate_hz));
        let [stage] = methods.stages.as_slice() else { panic!("one stage") };
        assert_eq!(
            (stage.edge_definition, stage.family.as_deref(), stage.order),
            (Some(EdgeDefinition::HalfPower), None, None)
        );
        let [low, high] = stage.lines[0].transitions.as_slice() else { panic!("two edges") };
        let found_hz = high.pass_hz.unwrap().get() - low.pass_hz.unwrap().get();
        assert!((found_hz - width_hz).abs() <= 1e-6, "{found_hz} Hz, two figures rounded to a millionth");
        assert!(low.pass_hz < low.stop_hz && low.stop_hz < high.stop_hz && high.stop_hz < high.pass_hz);
        assert_eq!((low.stop_db, high.stop_db), (Some(20.0.try_into().unwrap()), Some(20.0.try_into().unwrap())));
    }
}

/// The depth of a transition comes from bands that the stage serves, and from no others.
#[test]
fn the_stop_attenuation_of_a_family_without_one_is_what_it_serves() {
    let highpass = "kind = \"highpass\"\nfamily = \"butterworth\"\norder = 4\nedge_hz = 100";
    for (bands, expected) in [
        // Reached at 10 Hz; the deeper of two; on the stop side.
        (vec![(10.0, 40.0, 24.0)], Some(24.0)),
        (vec![(10.0, 40.0, 24.0), (5.0, 20.0, 48.0)], Some(48.0)),
        // On the pass side, whatever takes care of it.
        (vec![(200.0, 220.0, 24.0)], None),
        // 24 dB an octave reach 24 dB at 50 Hz, nothing above.
        (vec![(60.0, 80.0, 24.0)], None),
        // Less than at the edge itself.
        (vec![(10.0, 40.0, 2.0)], None),
        (Vec::new(), None),
    ] {
        let bands: String = bands
            .iter()
            .enumerate()
            .map(|(n, (from_hz, to_hz, reduce_db))| {
                format!("[[band]]\nname = \"b{n}\"\nfrom_hz = {from_hz}\nto_hz = {to_hz}\nreduce_db = {reduce_db}\n")
            })
            .collect();
        let spec = format!("[[stage]]\n{highpass}\n[[band]]\nname = \"seen\"\nfrom_hz = 300\nto_hz = 400\n{bands}");
        let transition = methods(&designed(&spec, 48_000)).stages[0].lines[0].transitions[0];
        assert_eq!(transition.stop_db.map(f64::from), expected, "{bands}");
        assert_eq!(transition.width_hz.is_some(), expected.is_some());
    }
}

/// The two sides of a band-pass can serve different bands.
#[test]
fn each_side_of_a_band_pass_has_its_own_stop_attenuation() {
    let bandpass = "kind = \"bandpass\"\nfamily = \"bessel\"\norder = 3\nedges_hz = [900, 1100]";
    let spec = format!(
        "{}[[band]]\nname = \"above\"\nfrom_hz = 4000\nto_hz = 8000\nreduce_db = 60\n",
        one_stage(bandpass, "from_hz = 100\nto_hz = 400\nreduce_db = 40")
    );
    let design = designed(&spec, 48_000);
    let methods = methods(&design);
    let [low, high] = methods.stages[0].lines[0].transitions.as_slice() else { panic!("two edges") };
    assert_eq!((low.stop_db.map(f64::from), high.stop_db.map(f64::from)), (Some(40.0), Some(60.0)));
    for transition in [low, high] {
        let found = attenuation_db(&design.sections, transition.stop_hz.unwrap().get(), 48_000.0);
        assert!((found - f64::from(transition.stop_db.unwrap())).abs() < 1e-6, "{found}");
    }
}

#[test]
fn bands_promise_what_the_design_found() {
    for path in SPECS {
        let design = of_file(path, 48_000);
        let entry = DesignEntry::new(&design, "none", None).unwrap();
        assert_eq!(entry.methods.bands.len(), entry.bands.len());
        for (told, band) in entry.methods.bands.iter().zip(&entry.bands) {
            assert_eq!((&told.name, told.from_hz, told.to_hz), (&band.name, band.from_hz, band.to_hz));
            assert_eq!((told.require, told.group_delay_s), (band.require, band.group_delay_s));
            let extremes = [band.attenuation_min_db.get(), band.attenuation_max_db.get()];
            match band.require {
                Some(Require::ReduceDb(_) | Require::ResidualDbfs(_)) => {
                    assert_eq!((told.attenuation_db, told.deviation_db), (Some(band.attenuation_min_db), None));
                }
                Some(Require::KeepDb(_)) | None => {
                    let deviation_db = extremes.map(f64::abs).into_iter().fold(0.0, f64::max);
                    assert_eq!((told.attenuation_db, told.deviation_db.map(f64::from)), (None, Some(deviation_db)));
                }
            }
        }
    }
}

#[test]
fn the_rest_is_what_the_entry_says() {
    let design = of_file("filter-specs/reed-bed.toml", 48_000);
    let entry = DesignEntry::new(&design, "triangular-1", None).unwrap();
    let methods = &entry.methods;
    assert_eq!(methods.program, format!("bandproof {}", env!("CARGO_PKG_VERSION")));
    assert_eq!((methods.rate_hz, methods.passes), (entry.rate_hz, entry.passes));
    assert_eq!((methods.settling_s, &methods.dither), (entry.settling_s, &entry.dither));
    assert_eq!((methods.direction.as_str(), methods.causal, methods.phase.as_str()), ("forward", true, "non-linear"));
    assert!(methods.applied && methods.arithmetic.as_ref().unwrap().contains("transposed direct form II"));
    assert!(methods.start_state.as_ref().unwrap().starts_with("steady state of the first sample"));
    // Stages of the entry, line by line, are those of the methods, row by row.
    let told = methods.stages.iter().flat_map(|stage| stage.lines.iter().map(move |line| (stage, line)));
    let told: Vec<_> = told.map(|(stage, line)| (stage.stage, line.line, stage.total_order, &line.edges_hz)).collect();
    let entries: Vec<_> = entry.stages.iter().map(|s| (s.stage, s.line, s.total_order, &s.edges_hz)).collect();
    assert_eq!(told, entries);
}

#[test]
fn where_the_program_filters_nothing_the_methods_say_so() {
    let design = of_file("filter-specs/reed-bed.toml", 48_000);
    let entry = DesignEntry::not_applied(&design).unwrap();
    assert_eq!((entry.dither.as_str(), entry.witness.is_none(), entry.methods.applied), ("none", true, false));
    let applied = DesignEntry::new(&design, "none", None).unwrap();
    assert_eq!((&entry.methods.start_state, &entry.methods.arithmetic), (&None, &None));
    assert_eq!((entry.methods.stages, entry.bands), (applied.methods.stages, applied.bands));
}

#[test]
fn the_identity_has_no_phase_and_no_design() {
    let design = designed("[[band]]\nname = \"b\"\nfrom_hz = 100\nto_hz = 200\nkeep_db = 1\n", 48_000);
    let methods = methods(&design);
    assert_eq!((methods.phase.as_str(), &methods.design, methods.total_order), ("zero", &None, 0));
    assert_eq!((methods.sections, methods.stages.len(), methods.settling_s.get()), (0, 0, 0.0));
    assert_eq!((&methods.start_state, &methods.arithmetic), (&None, &None));
    assert_eq!(methods.bands[0].deviation_db.map(f64::from), Some(0.0));
}

#[test]
fn figures_that_are_not_finite_are_refused() {
    let design = of_file("filter-specs/notch-997.toml", 48_000);
    assert!(Methods::new(&Design { settling_s: f64::NAN, ..design.clone() }, None).is_err());
    let mut spoilt = design;
    spoilt.bands[0].attenuation_min_db = f64::INFINITY;
    assert!(Methods::new(&spoilt, None).is_err());
}

#[test]
fn methods_read_back_as_they_were_written_and_take_no_other_key() {
    for path in SPECS {
        let methods = methods(&of_file(path, 48_000));
        let text = serde_json::to_string(&methods).unwrap();
        assert_eq!(serde_json::from_str::<Methods>(&text).unwrap(), methods);
        for key in ["sentence", "edge_definition", "pass_hz", "attenuation_db", "edges_hz"] {
            let more = text.replacen(&format!("\"{key}\""), &format!("\"colour\":1,\"{key}\""), 1);
            let error = serde_json::from_str::<Methods>(&more).unwrap_err().to_string();
            assert!(error.contains("colour"), "{key}: {error}");
        }
    }
}

/// The figures of the sentence, read out of it, against those of the fields.
#[test]
fn promises_of_the_sentence_hold_by_the_fields() {
    let mut tried = 0;
    for path in SPECS {
        for rate_hz in [44_100, 48_000, 384_000] {
            let methods = methods(&of_file(path, rate_hz));
            let (_, promised) = methods.sentence.split_once("by its exact response it ").unwrap();
            for band in &methods.bands {
                // Lines of a row are told by the row's name, their least figure for all.
                let base = band.name.split(" x").next().unwrap();
                let (before, after) = promised.split_once(&format!("\"{base}\"")).unwrap();
                let number = |text: &str| text.split(' ').find_map(|word| word.parse::<f64>().ok());
                if let Some(db) = band.attenuation_db {
                    let (_, told) =
                        before.rsplit_once(" dB off").map(|(told, _)| told.rsplit_once(' ').unwrap()).unwrap();
                    let told: f64 = told.parse().unwrap();
                    assert!(told <= db.get(), "{path}: {told} dB told of {db:?} in {}", band.name);
                    let least = methods.bands.iter().filter(|other| other.name.split(" x").next() == Some(base));
                    let least =
                        least.filter_map(|other| other.attenuation_db).map(f64::from).fold(f64::INFINITY, f64::min);
                    assert!(least - told <= 0.01 * least.abs() + 1e-3, "{told} dB told of {least} dB");
                } else if band.require.is_some() {
                    let (_, within) = after.split_once("within ").unwrap();
                    let (told, db) = (number(within).unwrap(), band.deviation_db.unwrap().get());
                    assert!(told >= db && told - db <= 0.1 * db + 1e-3, "{told} dB told of {db} dB in {}", band.name);
                }
                tried += 1;
            }
        }
    }
    assert_eq!(tried, 3 * (14 + 2 + 3 + 5 + 6), "bands of the specs at three rates");
}
