//! Whole runs with `phase = "zero"`.

use super::fixtures::{Bench, NOTCH_SPEC, Noise, entry, hum_and_noise, wav, wav_float, wav16};
use super::resume::lasting;
use bandproof::design::design;
use bandproof::job::Interrupted;
use bandproof::job::plan::treatment;
use bandproof::job::recording::{RecordingError, process};
use bandproof::spec::{self, Spec, SpecSyntax};
use bandproof::wave::Reader;
use std::fs;
use std::io::Cursor;
use std::sync::atomic::{AtomicU64, Ordering};

fn parse(spec: &str) -> Spec {
    spec::parse(spec.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap()
}

fn zero(spec: &str) -> String {
    format!("phase = \"zero\"\n{spec}")
}

const FLOAT64: &str = "[output]\nencoding = \"float64\"\n";

/// The samples of a float64 output.
fn float64(bench: &Bench, path: &str) -> Vec<f64> {
    let mut reader = Reader::open(Cursor::new(fs::read(bench.path(path)).unwrap())).unwrap();
    let mut planes = vec![Vec::new(); usize::from(reader.header().channels)];
    while reader.read(10_000, &mut planes).unwrap() > 0 {}
    planes.swap_remove(0)
}

fn outputs(bench: &Bench) -> Vec<(String, Vec<u8>)> {
    bench.tree("out").into_iter().filter(|(name, _)| name != "bandproof-report.json").collect()
}

/// Recordings of all sorts, some of them shorter than the filter rings.
fn mixed() -> Bench {
    let bench = Bench::new(&zero(NOTCH_SPEC));
    bench.input("a.wav", &wav16(8000, 1, &hum_and_noise(8000, 12.0, 0.3, 1)));
    bench.input("two/b.wav", &wav(11_025, 2, 24, &hum_and_noise(22_050, 14.0, 0.2, 2)));
    let floats: Vec<f32> = hum_and_noise(32_000, 8.0, 0.2, 3).iter().map(|&s| s as f32).collect();
    bench.input("two/c.wav", &wav_float(16_000, 2, &floats));
    for frames in [1, 2, 3, 50, 1200] {
        bench.input(&format!("short-{frames}.wav"), &wav16(8000, 1, &hum_and_noise(8000, 1.0, 0.3, 4)[..frames]));
    }
    bench
}

#[test]
fn outputs_are_the_same_for_any_number_of_jobs_and_hold_against_their_report() {
    let bench = mixed();
    let ran = bench.filter("--jobs 1");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let (one, report) = (outputs(&bench), lasting(&bench));
    assert_eq!(one.len(), 8);
    let rechecked = bench.run("recheck out/bandproof-report.json --input in --replay --remeasure --json");
    assert_eq!(rechecked.status, 0, "{}{}", rechecked.stdout, rechecked.stderr);
    fs::remove_dir_all(bench.path("out")).unwrap();
    assert_eq!(bench.filter("--jobs 2").status, 0);
    assert_eq!(outputs(&bench), one);
    assert_eq!(lasting(&bench), report);
    // An output that is gone comes again as it was.
    fs::remove_file(bench.path("out/two/b.wav")).unwrap();
    let again = bench.filter("");
    assert!(again.stdout.replace('\n', " ").contains("7 by an earlier run"), "{}{}", again.stdout, again.stderr);
    assert_eq!(outputs(&bench), one);
    assert_eq!(lasting(&bench), report);
}

#[test]
fn the_report_says_that_two_passes_ran_and_leaves_out_both_ends() {
    let bench = mixed();
    let ran = bench.filter("");
    assert!(ran.stdout.contains("At the start and the end of each recording"), "{}", ran.stdout);
    assert!(ran.stdout.contains("the first and the last"), "{}", ran.stdout);
    let report = bench.report();
    let design = &report["designs"][0];
    assert_eq!((&design["rate_hz"], &design["passes"]), (&8000.into(), &2.into()));
    let methods = &design["methods"];
    assert_eq!((&methods["passes"], &methods["causal"]), (&2.into(), &false.into()));
    assert_eq!((&methods["phase"], &methods["direction"]), (&"zero".into(), &"forward and backward".into()));
    assert_eq!(design["bands"][1]["group_delay_s"], 0.0);
    assert_eq!(design["witness"]["agrees"], true);
    let settling_s = design["settling_s"].as_f64().unwrap();
    let shortest_s = design["bands"][0]["shortest_s"].as_f64().unwrap();
    assert!((shortest_s - (2.0 * settling_s + 10.0 / 4.0)).abs() < 1e-9);
    let spectrum = &entry(&report, "a.wav")["spectrum"];
    assert!((spectrum["skipped_s"].as_f64().unwrap() - settling_s).abs() < 1e-4);
    for (path, hum, voice) in [("a.wav", "met", "met"), ("short-1.wav", "unproven", "unproven")] {
        let bands = &entry(&report, path)["channels"][0]["bands"];
        assert_eq!((&bands[0]["verdict"], &bands[1]["verdict"]), (&hum.into(), &voice.into()), "{path}: {bands}");
    }
    // Longer than it takes to settle at one end, shorter than at both.
    let path = "short-1200.wav";
    assert!((settling_s..2.0 * settling_s).contains(&(1200.0 / 8000.0)), "{settling_s}");
    assert_eq!(entry(&report, path)["spectrum"], serde_json::Value::Null);
    assert_eq!(entry(&report, path)["channels"][0]["bands"][1]["reason_code"], "unsettled");
    let told = bench.run("design spec.toml --rate 8000").stdout.replace('\n', " ");
    assert!(told.contains("forward and then backward: zero phase") && told.contains("at the start and at the end"));
}

const HIGHPASS: &str = "[[stage]]\nkind = \"highpass\"\nfamily = \"butterworth\"\norder = 4\nedge_hz = 30\n";
const NOTCH: &str = "[[stage]]\nkind = \"notch\"\ncenter_hz = 50\nwidth_hz = 4\n";

/// A notch keeps an offset and a high-pass takes it, from the first frame to the last.
#[test]
fn an_offset_makes_no_transient() {
    for (stage, left) in [(NOTCH, 0.375), (HIGHPASS, 0.0)] {
        let bench = Bench::new(&zero(&[FLOAT64, stage].concat()));
        for frames in [1, 2, 777, 40_000, 300_000] {
            bench.input(&format!("{frames}.wav"), &wav_float(8000, 1, &vec![0.375; frames]));
        }
        assert_eq!(bench.filter("").status, 0);
        for frames in [1, 2, 777, 40_000, 300_000] {
            let samples = float64(&bench, &format!("out/{frames}.wav"));
            let off = samples.iter().map(|y| (y - left).abs()).fold(0.0, f64::max);
            // Rounding of a 4 Hz notch and a 30 Hz high-pass in f64; a float32 step is 3e-8.
            assert!(samples.len() == frames && off < 1e-10, "{stage}, {frames} frames: {off:e}");
        }
    }
}

/// s[c + k] + s[c - 1 - k] is the height of the step: it overshoots alike before and after. The
/// backward pass makes it in several blocks of 65 536 frames.
#[test]
fn a_step_overshoots_alike_before_and_after() {
    let bench = Bench::new(&zero(&[FLOAT64, NOTCH].concat()));
    let (center, frames) = (150_000, 300_000);
    let step: Vec<f32> = (0..frames).map(|n| if n < center { 0.0 } else { 0.5 }).collect();
    bench.input("step.wav", &wav_float(8000, 1, &step));
    assert_eq!(bench.filter("").status, 0);
    let found = float64(&bench, "out/step.wav");
    assert!(found.iter().any(|y| *y > 0.501), "it does overshoot");
    for k in 0..center {
        let sum = found[center + k] + found[center - 1 - k];
        assert!((sum - 0.5).abs() < 1e-10, "{k} frames from the step: {sum}");
    }
}

#[test]
fn without_stages_every_byte_stays() {
    let bench = Bench::new(&zero("[[band]]\nname = \"all\"\nfrom_hz = 100\nto_hz = 3000\nkeep_db = 0.1\n"));
    bench.input("a.wav", &wav16(8000, 2, &hum_and_noise(8000, 8.0, 0.3, 1)));
    bench.input("one.wav", &wav16(8000, 1, &[0.3]));
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    assert_eq!(outputs(&bench), bench.tree("in"));
    let report = bench.report();
    assert_eq!(
        (&report["designs"][0]["passes"], &report["designs"][0]["methods"]["phase"]),
        (&1.into(), &"zero".into())
    );
}

/// A low-pass overshoots at a step.
const LOWPASS: &str = "[[stage]]\nkind = \"lowpass\"\nfamily = \"butterworth\"\norder = 6\nedge_hz = 500\n";

#[test]
fn what_exceeds_full_scale_is_refused_or_scaled() {
    let square: Vec<f64> = (0..40_000).map(|n| if (n / 400) % 2 == 0 { 0.95 } else { -0.95 }).collect();
    for (overload, status) in [("refuse", 3), ("scale", 0)] {
        let bench = Bench::new(&zero(&[&format!("[output]\noverload = \"{overload}\"\n"), LOWPASS].concat()));
        bench.input("a.wav", &wav16(8000, 1, &square));
        let ran = bench.filter("");
        assert_eq!(ran.status, status, "{overload}: {}{}", ran.stdout, ran.stderr);
        let report = bench.report();
        let recording = entry(&report, "a.wav");
        if overload == "scale" {
            assert_eq!(recording["output"]["clipped_samples"], 0);
            assert!(recording["output"]["gain_db"].as_f64().unwrap() < -0.5, "{recording}");
        } else {
            assert!(recording["error"].as_str().unwrap().contains("do not fit pcm16"), "{recording}");
        }
    }
}

/// White noise shows the gains that the design promises, and `measure` finds no delay.
#[test]
fn gains_seen_are_those_of_both_passes() {
    let bands = "[[band]]\nname = \"hum\"\ncenter_hz = 50\nspan_hz = 0.4\nreduce_db = 20\n\
                 [[band]]\nname = \"near\"\nfrom_hz = 20\nto_hz = 45\nkeep_db = 2\n\
                 [[band]]\nname = \"far\"\nfrom_hz = 200\nto_hz = 3000\nkeep_db = 0.1\n";
    let spec = zero(&["[output]\nencoding = \"float32\"\n", NOTCH, bands].concat());
    let bench = Bench::new(&spec);
    let mut noise = Noise(11);
    let samples: Vec<f32> = (0..480_000).map(|_| 0.3 * noise.next() as f32).collect();
    bench.input("a.wav", &wav_float(8000, 1, &samples));
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let report = bench.report();
    let (promised, seen) = (&report["designs"][0]["bands"], &entry(&report, "a.wav")["channels"][0]["bands"]);
    for band in 0..3 {
        assert_eq!((&promised[band]["check"], &seen[band]["verdict"]), (&"guaranteed".into(), &"met".into()));
    }
    // The notch takes most at the band's upper end, and a gain is the mean over the resolution.
    let design = design(&parse(&spec), 8000).unwrap();
    let gain_db = |hz: f64| 20.0 * design.response_at(hz).re.log10();
    let figure = |name: &str| seen[1][name].as_f64().unwrap();
    let (lowest_db, error_db) = (figure("gain_min_db"), 4.0 * figure("gain_error_db") + 0.001);
    let (end_db, inside_db) = (gain_db(45.0), gain_db(45.0 - figure("resolution_hz")));
    assert!(inside_db < -0.2 && error_db < 0.1);
    assert!((end_db - error_db..inside_db + error_db).contains(&lowest_db), "{end_db} {lowest_db} {inside_db}");

    let measured = bench.run("measure spec.toml in/a.wav out/a.wav");
    assert_eq!(measured.status, 0, "{}{}", measured.stdout, measured.stderr);
    let report = bench.report_at("bandproof-report.json");
    let pair = &report["recordings"][0]["pair"];
    assert_eq!((&pair["delay_frames"], &pair["inverted"]), (&0.0.into(), &false.into()), "{pair}");
    let deviation_db = pair["design_deviation_db"].as_f64().unwrap();
    let error_db = pair["design_deviation_error_db"].as_f64().unwrap();
    assert!(deviation_db.abs() <= 0.02 + 4.0 * error_db, "{pair}");
    assert!(report["designs"][0]["methods"]["sentence"].as_str().unwrap().contains("zero-phase IIR filter"));
    let rechecked = bench.run("recheck bandproof-report.json --input in/a.wav --output out/a.wav --remeasure");
    assert_eq!(rechecked.status, 0, "{}{}", rechecked.stdout, rechecked.stderr);
    // Held against one pass, which has the same half-power points, the slopes are off.
    bench.write("spec.toml", spec.replace("phase = \"zero\"", "").as_bytes());
    let measured = bench.run("measure spec.toml in/a.wav out/a.wav --replace");
    assert!(measured.status <= 1, "{}", measured.stderr);
    let report = bench.report_at("bandproof-report.json");
    let pair = &report["recordings"][0]["pair"];
    let off_db = pair["design_deviation_db"].as_f64().unwrap().abs();
    let off_error_db = pair["design_deviation_error_db"].as_f64().unwrap();
    assert!(off_db > 10.0 * off_error_db && off_db > 3.0 * deviation_db.abs(), "{pair} {deviation_db}");
}

/// What is left to do after the last frame is read can be stopped at every block.
#[test]
fn an_interruption_is_noticed_after_the_last_frame_too() {
    let spec = parse(&zero(NOTCH));
    let design = design(&spec, 8000).unwrap();
    let treatment = treatment(&spec, &design);
    let recording = || Reader::open(Cursor::new(wav16(8000, 1, &vec![0.1; 200_000]))).unwrap();
    let (passes, bytes) = (AtomicU64::new(0), AtomicU64::new(0));
    let counted = |more: u64| {
        passes.fetch_add(1, Ordering::Relaxed);
        bytes.fetch_add(more, Ordering::Relaxed);
        Ok(())
    };
    process(recording(), Cursor::new(Vec::new()), &treatment, &counted).unwrap();
    assert_eq!(bytes.load(Ordering::Relaxed), 400_000);
    let all = passes.load(Ordering::Relaxed);
    // 13 blocks are read, and what the filter then holds is 5 or more.
    assert!(all >= 13 + 5, "{all}");
    for last in 1..=all {
        let heard = AtomicU64::new(0);
        let stop = |_| if heard.fetch_add(1, Ordering::Relaxed) + 1 == last { Err(Interrupted) } else { Ok(()) };
        let ended = process(recording(), Cursor::new(Vec::new()), &treatment, &stop);
        assert!(matches!(ended, Err(RecordingError::Interrupted(_))), "{last} of {all}");
        assert_eq!(heard.load(Ordering::Relaxed), last);
    }
}
