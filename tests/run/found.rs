//! Runs whose cascade is found from the bands.

use super::fixtures::{Bench, hum_and_noise, wav16};
use bandproof::spec::{self, SpecSyntax, Stage};

const SPEC: &str = r#"
design = "auto"

[[band]]
name = "hum"
center_hz = 50
span_hz = 4
reduce_db = 20

[[band]]
name = "voice"
from_hz = 20
to_hz = 2000
keep_db = 0.5
except = ["hum"]
"#;

fn bench() -> Bench {
    let bench = Bench::new(SPEC);
    bench.input("a.wav", &wav16(8000, 1, &hum_and_noise(8000, 20.0, 0.3, 1)));
    bench.input("b.wav", &wav16(16_000, 1, &hum_and_noise(16_000, 20.0, 0.3, 2)));
    bench
}

/// The stages of the spec that a report says was in force, which must be a spec.
fn stages(normalized: &serde_json::Value) -> Vec<Stage> {
    let text = serde_json::to_vec(normalized).unwrap();
    let spec = spec::parse(&text, SpecSyntax::Json, "normalized.json").unwrap();
    assert_eq!(spec.auto, None, "{normalized}");
    spec.stages
}

#[test]
fn the_report_holds_the_stages_that_ran_and_the_summary_says_that_they_were_found() {
    let bench = bench();
    let planned = bench.filter("--dry-run");
    assert_eq!(planned.status, 0, "{}", planned.stderr);
    assert!(planned.stdout.starts_with("Found from the bands\n\n1 stage of "), "{}", planned.stdout);
    assert!(planned.stdout.contains(" every requirement at 8000 and 16000 Hz, "), "{}", planned.stdout);
    assert!(planned.stdout.contains("at rate Hz"), "{}", planned.stdout);

    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}", ran.stderr);
    let told = ran.stdout.replace('\n', " ");
    assert!(
        told.contains("Filters found from the bands: 1 stage of ")
            && told.contains(" every requirement at 8000 and 16000 Hz."),
        "{}",
        ran.stdout
    );
    let report = bench.report();
    assert_eq!(stages(&report["spec"]["normalized"]).len(), 1);
    for (design, rate_hz) in report["designs"].as_array().unwrap().iter().zip([8000, 16_000]) {
        assert_eq!((&design["rate_hz"], design["stages"].as_array().unwrap().len()), (&rate_hz.into(), 1));
        assert!(design["bands"].as_array().unwrap().iter().all(|band| band["check"] == "guaranteed"), "{design}");
    }

    let plan = serde_json::from_str::<serde_json::Value>(&bench.filter("--dry-run --json").stdout).unwrap();
    assert_eq!(plan["spec"]["normalized"], report["spec"]["normalized"]);
    assert_eq!(plan["found"]["rates_hz"], serde_json::json!([8000, 16_000]));
    assert_eq!(plan["found"]["spec"]["stage"], report["spec"]["normalized"]["stage"]);
}

#[test]
fn a_run_that_found_its_stages_goes_on_and_is_rechecked() {
    let bench = bench();
    assert_eq!(bench.filter("").status, 0);
    let again = bench.filter("");
    assert_eq!(again.status, 0, "{}", again.stderr);
    assert!(again.stdout.contains("2 by an earlier run"), "{}", again.stdout);
    let checked = bench.run("recheck out/bandproof-report.json --input in --replay --remeasure");
    assert_eq!(checked.status, 0, "{}{}", checked.stdout, checked.stderr);
}

#[test]
fn measure_judges_by_the_stages_that_filter_would_find() {
    let bench = bench();
    assert_eq!(bench.filter("").status, 0);
    let filtered = bench.report();
    let measured = bench.run("measure spec.toml in out --delay 0 --report m.json --json");
    assert_eq!(measured.status, 0, "{}{}", measured.stdout, measured.stderr);
    let measured: serde_json::Value = serde_json::from_str(&measured.stdout).unwrap();
    // Else nothing would be excepted from the band that is kept, and it would be missed at the hum.
    assert_eq!(measured["spec"], filtered["spec"]);
    for (one, other) in measured["designs"].as_array().unwrap().iter().zip(filtered["designs"].as_array().unwrap()) {
        assert_eq!((&one["sections"], &one["bands"]), (&other["sections"], &other["bands"]));
    }
    let checked = bench.run("recheck m.json --input in --output out --remeasure");
    assert_eq!(checked.status, 0, "{}{}", checked.stdout, checked.stderr);
}

#[test]
fn recordings_of_which_none_can_be_read_fail_one_by_one_as_with_stages() {
    let bench = Bench::new(SPEC);
    bench.input("a.wav", b"no wave file");
    let ran = bench.filter("");
    assert_eq!(ran.status, 3, "{}", ran.stderr);
    assert!(ran.stderr.contains("a.wav: "), "{}", ran.stderr);
    let report = bench.report();
    assert_eq!(report["summary"]["failed"], 1, "{report}");
    assert_eq!(report["designs"], serde_json::json!([]));
}
