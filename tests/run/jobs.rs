//! The number of threads changes nothing but the time.

use super::fixtures::{Bench, NOTCH_SPEC, hum_and_noise, wav, wav16};
use std::fs;

#[test]
fn one_and_many_jobs_give_the_same_outputs_and_the_same_report() {
    let bench = Bench::new(NOTCH_SPEC);
    for (index, rate_hz) in [8000, 8000, 16_000, 11_025, 44_100, 8000].into_iter().enumerate() {
        let seconds = 4.0 + index as f64;
        bench.input(&format!("{index}.wav"), &wav16(rate_hz, 1, &hum_and_noise(rate_hz, seconds, 0.3, index as u64)));
    }
    bench.input("stereo.wav", &wav(48_000, 2, 24, &hum_and_noise(96_000, 30.0, 0.2, 77)));
    bench.input("broken.wav", b"RIFF");
    let mut outcomes = Vec::new();
    for jobs in [1, 2, 5] {
        let ran = bench.filter(&format!("--jobs {jobs}"));
        assert_eq!(ran.status, 3, "{}", ran.stderr);
        let mut report = bench.report();
        assert_eq!(report["run"]["jobs"], jobs);
        report.as_object_mut().unwrap().remove("run");
        let outputs: Vec<_> =
            bench.tree("out").into_iter().filter(|(name, _)| name != "bandproof-report.json").collect();
        assert_eq!(outputs.len(), 7);
        fs::remove_dir_all(bench.path("out")).unwrap();
        outcomes.push((serde_json::to_string(&report).unwrap(), outputs));
    }
    assert_eq!(outcomes[0], outcomes[1]);
    assert_eq!(outcomes[0], outcomes[2]);
}

#[test]
fn the_report_itself_is_the_same_byte_for_byte_but_for_the_run() {
    let bench = Bench::new(NOTCH_SPEC);
    for index in 0..4 {
        bench.input(&format!("{index}.wav"), &wav16(8000, 1, &hum_and_noise(8000, 5.0, 0.3, index)));
    }
    let outside_run = |jobs: u32| -> Vec<String> {
        bench.filter(&format!("--jobs {jobs} --replace"));
        let text = fs::read_to_string(bench.path("out/bandproof-report.json")).unwrap();
        let (run, rest): (Vec<&str>, Vec<&str>) = text.lines().partition(|line| line.starts_with("  \"run\": {"));
        assert_eq!(run.len(), 1);
        rest.into_iter().map(String::from).collect()
    };
    let (one, four) = (outside_run(1), outside_run(4));
    assert!(one.len() > 50);
    assert_eq!(one, four);
}
