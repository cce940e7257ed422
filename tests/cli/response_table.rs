//! `design --csv`.

use crate::{bandproof, spec, stderr, stdout};
use serde_json::Value;
use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

fn rows(path: &Path) -> Vec<BTreeMap<String, String>> {
    csv::Reader::from_path(path).unwrap().deserialize().map(|row| row.unwrap()).collect()
}

fn number(row: &BTreeMap<String, String>, column: &str) -> f64 {
    row[column].parse().unwrap()
}

#[test]
fn the_table_has_each_rate_from_0_hz_to_half_of_it() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("quay.csv");
    let design = ["design", &spec("quay.toml"), "--rate", "48000", "--rate", "22050"];
    let text = stdout(bandproof().args(design).arg("--csv").arg(&path));
    assert_eq!(text, stdout(bandproof().args(design)), "what is printed stays the same");
    let written = fs::read_to_string(&path).unwrap();
    let header = "rate_hz,frequency_hz,gain_db,phase_deg,group_delay_s,limit_low_db,limit_high_db,bands\r\n";
    assert!(written.starts_with(header), "{}", &written[..200]);
    assert!(!written.contains("NaN") && !written.contains("inf") && !written.contains("-0.000000,"));
    let rows = rows(&path);
    let rates: Vec<&str> = rows.iter().map(|row| row["rate_hz"].as_str()).collect();
    assert!(rates.is_sorted_by(|a, b| a == b || (*a, *b) == ("48000", "22050")));
    for (rate, half) in [("48000", 24_000.0), ("22050", 11_025.0)] {
        let own: Vec<_> = rows.iter().filter(|row| row["rate_hz"] == rate).collect();
        let (first, last) = (own[0], own[own.len() - 1]);
        assert_eq!((number(first, "frequency_hz"), number(last, "frequency_hz")), (0.0, half));
        assert_eq!((first["gain_db"].as_str(), first["phase_deg"].as_str()), ("-180.000000", ""), "a zero");
    }
    let edge: Vec<_> = rows.iter().filter(|row| row["rate_hz"] == "48000" && row["frequency_hz"] == "300").collect();
    let cells = |column: &str| edge.iter().map(|row| row[column].as_str()).collect::<Vec<_>>();
    assert_eq!(cells("limit_low_db"), ["", "-0.5"]);
    assert_eq!(cells("limit_high_db"), ["", "0.5"]);
    assert_eq!(cells("bands"), ["", "whistles"]);
    let at = |hz: &str| rows.iter().find(|row| row["frequency_hz"] == hz).unwrap();
    assert_eq!(at("59.5")["limit_high_db"], "");
    assert!((number(at("30"), "gain_db") + 3.0103).abs() < 0.01, "the edge of the high-pass, and a little of the stop");
}

#[test]
fn an_existing_file_stays_and_the_command_is_refused() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("taken.csv");
    fs::write(&path, "kept").unwrap();
    let design = ["design", &spec("quay.toml"), "--csv", path.to_str().unwrap()];
    bandproof().args(design).assert().code(2).stdout("");
    assert!(stderr(bandproof().args(design)).contains("taken.csv exists already"));
    assert_eq!(fs::read_to_string(&path).unwrap(), "kept");
    // Not even through a link that leads nowhere.
    #[cfg(unix)]
    {
        let link = folder.path().join("link.csv");
        std::os::unix::fs::symlink(folder.path().join("nowhere"), &link).unwrap();
        bandproof().args(["design", &spec("quay.toml"), "--csv", link.to_str().unwrap()]).assert().code(2);
    }
}

#[test]
fn a_place_that_can_not_be_written_is_said() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("missing").join("quay.csv");
    let design = ["design", &spec("quay.toml"), "--csv", path.to_str().unwrap()];
    bandproof().args(design).assert().code(3);
    assert!(stderr(bandproof().args(design)).contains("the table can't be written: no such folder"));
}

#[test]
fn quiet_and_json_write_the_same_table() {
    let folder = tempfile::tempdir().unwrap();
    let paths = ["plain.csv", "quiet.csv", "json.csv"].map(|name| folder.path().join(name));
    let run = |path: &Path, more: &[&str]| {
        stdout(bandproof().args(["design", &spec("quay.toml"), "--csv", path.to_str().unwrap()]).args(more))
    };
    run(&paths[0], &[]);
    assert_eq!(run(&paths[1], &["--quiet"]), "");
    let json: Value = serde_json::from_str(&run(&paths[2], &["--json"])).unwrap();
    assert_eq!(json["designs"][0]["rate_hz"], 48_000);
    let [plain, quiet, json] = paths.map(|path| fs::read(path).unwrap());
    assert!(plain == quiet && plain == json);
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 3, "nothing temporary is left");
}

#[test]
fn a_requirement_out_of_reach_is_in_the_table_all_the_same() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.csv");
    bandproof().args(["design", &spec("out-of-reach.toml"), "--csv", path.to_str().unwrap()]).assert().code(2);
    assert!(rows(&path).iter().any(|row| row["bands"].contains("low voices") && !row["limit_low_db"].is_empty()));
    let path = folder.path().join("none.csv");
    let design = ["design", &spec("fixed-rate.toml"), "--rate", "22050", "--csv", path.to_str().unwrap()];
    bandproof().args(design).assert().code(2);
    assert!(!path.exists(), "no rate has a design");
    let path = folder.path().join("some.csv");
    let design = ["design", &spec("fixed-rate.toml"), "--rate", "22050", "--rate", "48000"];
    bandproof().args(design).arg("--csv").arg(&path).assert().code(2);
    assert!(rows(&path).iter().all(|row| row["rate_hz"] == "48000"));
    assert!(stdout(bandproof().arg("--help")).contains("nothing was written, but the table of `design --csv`"));
}

#[test]
fn names_with_commas_and_quotes_come_back() {
    let folder = tempfile::tempdir().unwrap();
    let (spec, path) = (folder.path().join("odd.toml"), folder.path().join("odd.csv"));
    let name = r#"gate, "left"; inner"#;
    fs::write(&spec, format!("[[band]]\nname = '{name}'\nfrom_hz = 100\nto_hz = 200\nkeep_db = 1\n")).unwrap();
    bandproof().arg("design").arg(&spec).arg("--csv").arg(&path).assert().code(0);
    assert!(rows(&path).iter().any(|row| row["bands"] == name));
}

/// What is in the table is what would run: the stages found, and both passes.
#[test]
fn the_table_is_of_the_stages_found_and_of_both_passes() {
    let folder = tempfile::tempdir().unwrap();
    let [spec, found, auto, explicit, once] =
        ["auto.toml", "found.toml", "auto.csv", "explicit.csv", "once.csv"].map(|name| folder.path().join(name));
    let bands = "[auto]\n[[band]]\nname = \"calls\"\nfrom_hz = 10\nto_hz = 2000\nkeep_db = 1\n\
                 [[band]]\nname = \"hiss\"\nfrom_hz = 6000\nto_hz = 24000\nreduce_db = 30\n";
    fs::write(&spec, format!("phase = \"zero\"\n{bands}")).unwrap();
    let run = |spec: &Path, table: &Path, more: &[&Path]| {
        let mut command = bandproof();
        command.arg("design").arg(spec).arg("--csv").arg(table);
        if let [path] = more {
            command.arg("--write").arg(path);
        }
        command.assert().code(0);
    };
    run(&spec, &auto, &[&found]);
    run(&found, &explicit, &[]);
    assert_eq!(fs::read(&auto).unwrap(), fs::read(&explicit).unwrap());
    let both = rows(&auto);
    assert!(both.iter().any(|row| number(row, "gain_db") < -30.0), "there is a filter");
    assert!(
        both.iter().all(|row| number(row, "group_delay_s") == 0.0 && ["", "0.000000"].contains(&&*row["phase_deg"]))
    );
    // In one pass the same stages delay.
    let passes = fs::read_to_string(&found).unwrap();
    assert!(passes.contains("phase = \"zero\"") && !passes.contains("[auto]"), "{passes}");
    fs::write(&found, passes.replace("phase = \"zero\"", "phase = \"causal\"")).unwrap();
    bandproof().arg("design").arg(&found).arg("--csv").arg(&once).output().unwrap();
    assert!(rows(&once).iter().any(|row| number(row, "group_delay_s") > 0.0));
}
