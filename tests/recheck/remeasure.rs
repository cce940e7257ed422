//! Recordings measured a second time.

use crate::dataset::{Dataset, entry_mut, told};
use crate::fixtures::Bench;
use serde_json::{Value, json};

/// The channel's band of a report, to be changed.
fn band<'a>(report: &'a mut Value, path: &str, channel: usize, band: usize) -> &'a mut Value {
    &mut entry_mut(report, path)["channels"][channel]["bands"][band]
}

#[test]
fn every_figure_comes_out_again() {
    let dataset = Dataset::new();
    assert_eq!(dataset.found("--input in --remeasure"), [""; 0]);
    assert_eq!(dataset.found("--input in --remeasure --replay --jobs 1"), [""; 0]);
    let (_, document) = dataset.json("--input in --remeasure");
    assert_eq!(document["remeasure"], json!({"same": 3, "different": 0, "not_done": 0}));
}

/// Every kind of recording, band and verdict that the demo has.
#[test]
fn the_demo_comes_out_again_filtered_and_measured() {
    let folder = |name: &str| format!("{}/{name}", env!("CARGO_MANIFEST_DIR"));
    let bench = Bench::new("");
    for spec in ["reed-bed.toml", "converter-whine.toml"] {
        let (spec, demo) = (folder(&format!("filter-specs/{spec}")), folder("demo-audio"));
        let ran = bench.run_with(&["filter", &spec, &demo, "out", "--quiet", "--replace"]);
        assert!(ran.status <= 1, "{}", ran.stderr);
        let report = "out/bandproof-report.json";
        let ran = bench.run_with(&["recheck", report, "--input", &demo, "--replay", "--remeasure", "--json"]);
        let document: Value = serde_json::from_str(&ran.stdout).unwrap();
        assert_eq!((ran.status, &document["disagreements"]), (0, &json!([])), "{spec}");
        for again in ["replay", "remeasure"] {
            assert_eq!(document[again], json!({"same": 8, "different": 0, "not_done": 0}), "{spec}");
        }
    }
}

#[test]
fn a_figure_changed_by_more_than_the_tolerance_is_found_by_name() {
    let dataset = Dataset::new();
    let figures =
        ["before_dbfs", "after_dbfs", "after_floor_dbfs", "measured_attenuation_db", "line_hz", "line_after_dbfs"];
    for figure in figures {
        let original = dataset.bench.report();
        let then = band(&mut original.clone(), "station/two.WAV", 1, 0)[figure].as_f64().unwrap();
        // Reports of another machine may differ so much.
        dataset.edit(|report| band(report, "station/two.WAV", 1, 0)[figure] = (then + 0.00002).into());
        assert_eq!(dataset.found("--input in --remeasure"), [""; 0], "{figure}");
        dataset.edit(|report| band(report, "station/two.WAV", 1, 0)[figure] = (then + 0.25).into());
        let (status, document) = dataset.json("--input in --remeasure");
        let one =
            &document["disagreements"].as_array().unwrap()[document["disagreements"].as_array().unwrap().len() - 1];
        assert_eq!(status, 1);
        assert_eq!(
            (&one["kind"], &one["path"], &one["channel"], &one["band"], &one["figure"]),
            (&json!("figure"), &json!("station/two.WAV"), &json!(2), &json!("hum"), &json!(figure))
        );
        assert_eq!(one["now"].as_f64(), Some(then));
        dataset.edit(|report| *report = original);
    }
    assert_eq!(dataset.found("--input in --remeasure"), [""; 0]);
}

#[test]
fn null_must_stay_null() {
    let dataset = Dataset::new();
    dataset.edit(|report| {
        band(report, "a.wav", 0, 0)["line_before_dbfs"] = Value::Null;
        band(report, "a.wav", 0, 0)["gain_min_db"] = (-3.0).into();
    });
    let (_, document) = dataset.json("--input in --remeasure");
    let found: Vec<_> = document["disagreements"].as_array().unwrap().iter().map(|one| &one["figure"]).collect();
    assert_eq!(found, ["line_before_dbfs", "gain_min_db"]);
    assert!(document["disagreements"][0]["then"].is_null() && document["disagreements"][1]["now"].is_null());
}

#[test]
fn a_verdict_changed_is_found_with_what_the_summary_says_of_it() {
    let dataset = Dataset::new();
    let then = band(&mut dataset.bench.report(), "a.wav", 0, 0)["verdict"].clone();
    assert_eq!(then, "met");
    dataset.edit(|report| band(report, "a.wav", 0, 0)["verdict"] = "missed".into());
    let (status, document) = dataset.json("--input in --remeasure");
    assert_eq!(status, 1);
    let found = told(&document);
    assert_eq!(found.last().unwrap(), "verdict - a.wav");
    assert_eq!(found.iter().filter(|line| line.starts_with("report")).count(), 2, "{document}");
    let verdict = document["disagreements"].as_array().unwrap().last().unwrap();
    assert_eq!((&verdict["then"], &verdict["now"]), (&json!("missed"), &json!("met")));
    let ran = dataset.recheck("--input in --remeasure");
    assert!(ran.stdout.contains("  a.wav, channel 1, hum: missed then, met now\n"), "{}", ran.stdout);
    assert_eq!(dataset.found("--input in"), [""; 0], "hashes alone say nothing of it");
}

#[test]
fn what_is_harmed_is_measured_as_it_is() {
    let dataset = Dataset::new();
    // As loud as it gets for a tenth of a second.
    dataset.harm("out/a.wav", |bytes| bytes[30_000..31_600].fill(0x7f));
    let found = dataset.found("--input in --remeasure");
    assert_eq!(found[0], "changed output a.wav");
    assert!(found.iter().any(|line| line == "figure - a.wav"), "{found:?}");
    dataset.harm("out/a.wav", |bytes| bytes.truncate(20_000));
    let (_, document) = dataset.json("--input in --remeasure");
    assert_eq!(told(&document), ["changed output a.wav", "entry - a.wav"]);
    assert!(document["disagreements"][1]["what"].as_str().unwrap().contains("must agree in length"), "{document}");
    std::fs::remove_file(dataset.path("out/a.wav")).unwrap();
    let (_, document) = dataset.json("--input in --remeasure");
    assert_eq!(document["remeasure"], json!({"same": 2, "different": 0, "not_done": 1}));
}

/// Cells of a table.
fn cells(path: &std::path::Path) -> Vec<Vec<String>> {
    let mut reader = csv::ReaderBuilder::new().has_headers(false).from_path(path).unwrap();
    reader.records().map(|row| row.unwrap().iter().map(str::to_owned).collect()).collect()
}

#[test]
fn the_table_of_fresh_figures_is_that_of_the_run() {
    let dataset = Dataset::new();
    let ran = dataset.bench.run("filter spec.toml in again --csv run.csv --quiet");
    assert!(ran.stderr.lines().count() == 1, "{}", ran.stderr);
    // What the report says of a figure is not what the table says.
    dataset.edit(|report| band(report, "a.wav", 0, 0)["after_dbfs"] = (-1.0).into());
    for jobs in [1, 3] {
        let more = format!("--input in --remeasure --csv fresh.csv --replace --jobs {jobs}");
        assert_eq!(dataset.found(&more), ["figure - a.wav"]);
        let (run, fresh) = (cells(&dataset.path("run.csv")), cells(&dataset.path("fresh.csv")));
        assert_eq!(run.len(), fresh.len());
        for (run, fresh) in run.iter().zip(&fresh) {
            for (run, fresh) in run.iter().zip(fresh) {
                let near = match (run.parse::<f64>(), fresh.parse::<f64>()) {
                    (Ok(run), Ok(fresh)) => (run - fresh).abs() <= 0.002 + 1e-9,
                    _ => run == fresh,
                };
                assert!(near, "{run} in the run, {fresh} now");
            }
        }
    }
}

#[test]
fn the_table_goes_where_it_hurts_nothing() {
    let dataset = Dataset::new();
    dataset.bench.write("there.csv", b"kept");
    for (csv, part) in [
        ("there.csv", "exists already"),
        ("out/bandproof-report.json --replace", "which this run reads"),
        ("out/a.wav --replace", "which this run reads"),
        ("in/a.wav --replace", "which this run reads"),
        ("in/figures.csv", "inside the input"),
        ("nowhere/figures.csv", "can't be written"),
    ] {
        let before = (dataset.bench.tree("in"), dataset.bench.tree("out"));
        let ran = dataset.recheck(&format!("--input in --remeasure --csv {csv}"));
        assert_eq!((ran.status, ran.stdout.as_str()), (2, ""), "{csv}: {}", ran.stderr);
        assert!(ran.stderr.contains(part), "{}", ran.stderr);
        assert_eq!((dataset.bench.tree("in"), dataset.bench.tree("out")), before);
    }
    assert_eq!(std::fs::read(dataset.path("there.csv")).unwrap(), b"kept");
    // A listed recording that is missing leaves a name that is not free.
    std::fs::remove_file(dataset.path("out/a.wav")).unwrap();
    assert_eq!(dataset.recheck("--input in --remeasure --csv out/a.wav").status, 2);
}
