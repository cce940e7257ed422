//! The flat table: its header, its rows, and that other readers see the same.

use crate::samples::{self, band, db, done, hz, paired, reduce};
use bandproof::report::*;
use proptest::prelude::*;
use serde_json::Value;
use std::collections::BTreeMap;

/// The header as it is published; a new column goes to the end of its group.
const HEADER: &str = "path,status,error,notes,\
    input_sha256,input_bytes,input_encoding,rate_hz,channels,frames,seconds,full_scale_runs,time_expansion,\
    output_path,output_sha256,output_bytes,output_encoding,output_peak_dbfs,clipped_samples,gain_db,\
    after_path,after_sha256,after_bytes,after_encoding,after_frames,after_full_scale_runs,\
    delay_frames,delay_source,max_delay_s,clock_ppm,clock_error_ppm,delay_scatter_s,inverted,overlap_frames,\
    noise_sha256,\
    design_deviation_db,design_deviation_error_db,design_deviation_at_hz,\
    window,segment_frames,segments,bin_hz,skipped_s,\
    channel,reference_gain_db,band,from_hz,to_hz,reduce_db,keep_db,residual_dbfs,\
    before_dbfs,before_floor_dbfs,after_dbfs,after_floor_dbfs,\
    measured_attenuation_db,demonstrable_attenuation_db,line_hz,line_before_dbfs,line_after_dbfs,\
    gain_min_db,gain_max_db,gain_error_db,resolved,resolution_hz,verdict,reason_code,reason";

/// Columns of text; all others are numbers, but `inverted`.
const TEXT: [&str; 18] = [
    "path",
    "status",
    "error",
    "notes",
    "input_sha256",
    "input_encoding",
    "output_path",
    "output_sha256",
    "output_encoding",
    "after_path",
    "after_sha256",
    "after_encoding",
    "delay_source",
    "noise_sha256",
    "window",
    "band",
    "verdict",
    "reason_code",
];

fn written(recordings: &[Recording]) -> Vec<u8> {
    let mut table = TableWriter::new(Vec::new()).unwrap();
    recordings.iter().for_each(|recording| table.add(recording).unwrap());
    table.finish().unwrap()
}

type Row = BTreeMap<String, String>;

/// Rows by column name, read back with the csv crate.
fn rows(recordings: &[Recording]) -> Vec<Row> {
    let bytes = written(recordings);
    let mut reader = csv::Reader::from_reader(bytes.as_slice());
    reader.deserialize().map(Result::unwrap).collect()
}

/// A residual band with every figure that it can have.
fn whine() -> BandEntry {
    BandEntry {
        from_hz: hz(15_750.0),
        to_hz: hz(15_850.0),
        before_dbfs: db(-61.0),
        after_dbfs: db(-101.125),
        reason: Some("what remains is ambient, no line".to_owned()),
        ..band("whine", Some(Require::ResidualDbfs(samples::finite(-90.0))), Some(Verdict::Met))
    }
}

/// One recording of each sort.
fn sorts() -> Vec<Recording> {
    let stereo = vec![vec![samples::hum(), samples::calls(), whine()], vec![samples::calls(), band("x", None, None)]];
    vec![
        done("station-a/0512.wav", stereo.clone()),
        Recording {
            input: done("", Vec::new()).input,
            ..Recording::failed("station-b/0513.wav", "it is \"cut\", off")
        },
        Recording::failed("station-b/0514.wav", "it holds no frames (empty)"),
        paired("station-c/0514.wav", stereo),
        done("station-d/0515.wav", vec![Vec::new(), Vec::new()]),
        done("station-e/0516.wav", Vec::new()),
    ]
}

#[test]
fn the_header_stays_as_published() {
    let expected: Vec<_> = HEADER.split(',').collect();
    assert_eq!(TableWriter::<Vec<u8>>::columns().collect::<Vec<_>>(), expected);
    assert_eq!(String::from_utf8(written(&[])).unwrap(), format!("{HEADER}\r\n"));
    for text in TEXT {
        assert!(expected.contains(&text), "{text}");
    }
}

/// The table in the module's documentation is where people look columns up.
#[test]
fn every_column_is_documented_in_its_place() {
    let source = include_str!("../../src/report/table.rs");
    let documented = source.lines().filter_map(|line| line.strip_prefix("//! | `")?.split('`').next());
    assert_eq!(documented.collect::<Vec<_>>(), HEADER.split(',').collect::<Vec<_>>());
}

#[test]
fn no_recording_is_absent_and_each_band_has_its_row() {
    let rows = rows(&sorts());
    let told: Vec<_> = rows.iter().map(|r| [&r["path"], &r["status"], &r["channel"], &r["band"]]).collect();
    let expected = [
        ["station-a/0512.wav", "done", "1", "pump hum x1"],
        ["station-a/0512.wav", "done", "1", "bird calls"],
        ["station-a/0512.wav", "done", "1", "whine"],
        ["station-a/0512.wav", "done", "2", "bird calls"],
        ["station-a/0512.wav", "done", "2", "x"],
        ["station-b/0513.wav", "failed", "", ""],
        ["station-b/0514.wav", "failed", "", ""],
        ["station-c/0514.wav", "done", "1", "pump hum x1"],
        ["station-c/0514.wav", "done", "1", "bird calls"],
        ["station-c/0514.wav", "done", "1", "whine"],
        ["station-c/0514.wav", "done", "2", "bird calls"],
        ["station-c/0514.wav", "done", "2", "x"],
        ["station-d/0515.wav", "done", "", ""],
        ["station-e/0516.wav", "done", "", ""],
    ];
    assert_eq!(told, expected);
}

#[test]
fn a_failed_recording_tells_what_is_known_of_it() {
    let rows = rows(&sorts());
    let [cut, empty] = [&rows[5], &rows[6]];
    assert_eq!((cut["error"].as_str(), cut["rate_hz"].as_str()), ("it is \"cut\", off", "48000"));
    let filled = |row: &Row| row.iter().filter(|(_, cell)| !cell.is_empty()).map(|(name, _)| name.clone()).collect();
    let known: Vec<String> = filled(empty);
    assert_eq!(known, ["error", "path", "status"]);
    let known: Vec<String> = filled(cut);
    let mut expected: Vec<_> = HEADER.split(',').skip(4).take(9).chain(["error", "path", "status"]).collect();
    expected.sort_unstable();
    assert_eq!(known, expected);
}

/// What the report's JSON has at the places that the columns stand for.
fn expected(recording: &Recording, place: Option<(usize, usize)>) -> Row {
    let json = serde_json::to_value(recording).unwrap();
    let plain = |value: &Value| match value {
        Value::Null => String::new(),
        Value::String(text) => text.clone(),
        other => other.to_string(),
    };
    let mut row = Row::new();
    let mut put = |name: &str, value: &Value| {
        row.insert(name.to_owned(), plain(value));
    };
    for key in ["path", "status", "error"] {
        put(key, &json[key]);
    }
    for (object, prefix, prefixed, keys) in [
        ("input", "input_", "sha256 bytes encoding", "rate_hz channels frames seconds full_scale_runs time_expansion"),
        ("output", "output_", "path sha256 bytes encoding peak_dbfs", "clipped_samples gain_db"),
        (
            "pair",
            "after_",
            "path sha256 bytes encoding frames full_scale_runs",
            "delay_frames delay_source max_delay_s clock_ppm clock_error_ppm delay_scatter_s inverted overlap_frames \
             noise_sha256 design_deviation_db design_deviation_error_db design_deviation_at_hz",
        ),
        ("spectrum", "", "", "window segment_frames segments bin_hz skipped_s"),
    ] {
        prefixed.split_whitespace().for_each(|key| put(&format!("{prefix}{key}"), &json[object][key]));
        keys.split_whitespace().for_each(|key| put(key, &json[object][key]));
        // Nothing of the report gets lost on the way but the gains that have rows of their own.
        if let Some(map) = json[object].as_object() {
            let told = prefixed.split_whitespace().chain(keys.split_whitespace()).collect::<Vec<_>>();
            let lost: Vec<_> = map.keys().filter(|key| !told.contains(&key.as_str())).collect();
            assert!(lost.iter().all(|key| *key == "reference_gain_db"), "{object}: {lost:?}");
        }
    }
    let notes: Vec<_> = recording.notes.iter().map(String::as_str).collect();
    put("notes", &Value::from(notes.join("; ")));
    let channel = place.map_or(Value::Null, |(channel, _)| json["channels"][channel].clone());
    let band = place.map_or(Value::Null, |(_, band)| channel["bands"][band].clone());
    put("channel", &channel["channel"]);
    let gain = place.map_or(&Value::Null, |(channel, _)| &json["pair"]["reference_gain_db"][channel]);
    put("reference_gain_db", gain);
    put("band", &band["name"]);
    for limit in ["reduce_db", "keep_db", "residual_dbfs"] {
        put(limit, &band["require"][limit]);
    }
    let keys = "from_hz to_hz before_dbfs before_floor_dbfs after_dbfs after_floor_dbfs measured_attenuation_db \
                demonstrable_attenuation_db line_hz line_before_dbfs line_after_dbfs gain_min_db gain_max_db \
                gain_error_db resolved resolution_hz verdict reason_code reason";
    keys.split_whitespace().for_each(|key| put(key, &band[key]));
    if let Some(map) = band.as_object() {
        assert_eq!(map.len(), keys.split_whitespace().count() + 2, "name and require stand above");
    }
    row
}

#[test]
fn every_cell_is_the_report_s_figure_digit_by_digit() {
    for recording in sorts() {
        let bands = recording.channels.iter().map(|channel| channel.bands.len()).enumerate();
        let mut places: Vec<_> = bands.flat_map(|(c, count)| (0..count).map(move |b| Some((c, b)))).collect();
        if places.is_empty() {
            places.push(None);
        }
        let expected: Vec<_> = places.into_iter().map(|place| expected(&recording, place)).collect();
        assert_eq!(rows(std::slice::from_ref(&recording)), expected, "{}", recording.path);
    }
}

#[test]
fn a_channel_has_its_own_reference_gain() {
    let rows = rows(&sorts());
    let gains = rows[7..12].iter().map(|row| row["reference_gain_db"].as_str());
    assert_eq!(gains.collect::<Vec<_>>(), ["-6.02", "-6.02", "-6.02", "0.25", "0.25"]);
    let mut odd = paired("a.wav", vec![vec![whine()], vec![whine()]]);
    odd.pair.as_mut().unwrap().reference_gain_db = Some(vec![Db::new(1.0).unwrap()]);
    odd.channels[0].channel = 0;
    // Channels that the gains do not reach have none.
    assert!(self::rows(&[odd]).iter().all(|row| row["reference_gain_db"].is_empty()));
}

#[test]
fn columns_hold_numbers_or_nothing_as_readers_guess_types() {
    let rows = rows(&sorts());
    for name in HEADER.split(',').filter(|name| !TEXT.contains(name) && *name != "reason") {
        let cells: Vec<_> = rows.iter().map(|row| row[name].as_str()).filter(|cell| !cell.is_empty()).collect();
        assert!(!cells.is_empty(), "{name} is empty in every row and so not tried");
        for cell in cells {
            let number = cell.parse::<f64>().is_ok_and(f64::is_finite);
            assert_eq!(number, name != "inverted", "{name}: {cell}");
            assert!(name != "inverted" || ["true", "false"].contains(&cell), "{cell}");
        }
    }
    for cell in rows.iter().flat_map(BTreeMap::values) {
        assert!(!["null", "NaN", "inf", "-inf", "None"].contains(&cell.as_str()), "{cell}");
    }
}

#[test]
fn extreme_numbers_are_written_as_in_the_report() {
    let mut recording = done("a.wav", vec![vec![samples::hum()]]);
    for (gain_db, cell) in
        [(-0.1 - 0.2, "-0.30000000000000004"), (1e-7, "1e-7"), (0.0, "0.0"), (-200.0, "-200.0"), (1e17, "1e+17")]
    {
        recording.output.as_mut().unwrap().gain_db = samples::finite(gain_db);
        let row = &rows(std::slice::from_ref(&recording))[0];
        assert_eq!(row["gain_db"], cell);
        assert_eq!(row["gain_db"], serde_json::to_string(&gain_db).unwrap());
        assert_eq!(row["gain_db"].parse::<f64>().unwrap().to_bits(), gain_db.to_bits());
    }
    recording.input.as_mut().unwrap().bytes = u64::MAX;
    assert_eq!(rows(&[recording])[0]["input_bytes"], "18446744073709551615");
}

/// A reader written from the grammar of RFC 4180, section 2: it takes nothing but that.
fn strict(table: &str) -> Vec<Vec<String>> {
    let (mut records, mut record, mut cell) = (Vec::new(), Vec::new(), String::new());
    let mut rest = table.chars().peekable();
    while rest.peek().is_some() {
        if rest.next_if_eq(&'"').is_some() {
            loop {
                match rest.next().unwrap() {
                    '"' if rest.next_if_eq(&'"').is_some() => cell.push('"'),
                    '"' => break,
                    other => cell.push(other),
                }
            }
        } else {
            while let Some(plain) = rest.next_if(|c| !['"', ',', '\r', '\n'].contains(c)) {
                cell.push(plain);
            }
        }
        record.push(std::mem::take(&mut cell));
        match (rest.next(), rest.peek()) {
            (Some(','), _) => {}
            (Some('\r'), Some('\n')) => {
                rest.next();
                records.push(std::mem::take(&mut record));
            }
            other => panic!("after a cell: {other:?}"),
        }
    }
    assert!(record.is_empty(), "the last record has no end");
    records
}

const ODD_NAMES: [&str; 16] = [
    "plain.wav",
    "with space .wav",
    " leading.wav",
    "comma, comma.wav",
    "quote\"s.wav",
    "\"quoted\"",
    "line\nbreak.wav",
    "carriage\rreturn.wav",
    "both\r\n.wav",
    "M\u{f6}we \u{1f426} \u{9dcf}.wav",
    "=1+1.wav",
    "+49.wav",
    "-3.wav",
    "@home.wav",
    "\ttab.wav",
    "'apostrophe.wav",
];

#[test]
fn odd_names_come_back_unaltered() {
    for name in ODD_NAMES {
        let entry = BandEntry { reason: Some(name.to_owned()), ..band(name, reduce(30.0), Some(Verdict::Missed)) };
        let mut recording = done(name, vec![vec![entry]]);
        recording.notes = vec![name.to_owned(), "b".to_owned()];
        let bytes = written(&[recording]);
        let records = strict(std::str::from_utf8(&bytes).unwrap());
        let row: BTreeMap<_, _> = records[0].iter().zip(&records[1]).collect();
        for column in ["path", "output_path", "band", "reason"] {
            assert_eq!(row[&column.to_owned()], name, "{column}");
        }
        assert_eq!(*row[&"notes".to_owned()], format!("{name}; b"));
    }
}

#[test]
fn records_end_in_carriage_return_and_line_feed_and_have_one_length() {
    let table = String::from_utf8(written(&sorts())).unwrap();
    assert!(table.ends_with("\r\n") && !table.starts_with('\u{feff}'));
    let records = strict(&table);
    assert_eq!(records.len(), 15);
    let columns = HEADER.split(',').count();
    assert!(records.iter().all(|record| record.len() == columns));
    assert_eq!(table.matches("\r\n").count(), table.matches('\n').count());
}

/// What Python 3.11.7's csv module and pandas 3.1.1 read from `table_names.csv`, see
/// `tests/reference/read_table.py`: the same names, also those that spreadsheets would run.
#[test]
fn other_readers_see_the_same_names() {
    let recordings: Vec<_> = ODD_NAMES.iter().map(|name| done(name, vec![vec![samples::hum()]])).collect();
    let bytes = written(&recordings);
    let made = std::path::Path::new(env!("CARGO_TARGET_TMPDIR")).join("table_names.csv");
    std::fs::write(&made, &bytes).unwrap();
    let committed = include_bytes!("../reference/table_names.csv");
    assert!(bytes == committed, "{} is no longer tests/reference/table_names.csv", made.display());
    let read: Value = serde_json::from_str(include_str!("../reference/table_names.json")).unwrap();
    for reader in ["csv", "pandas"] {
        assert_eq!(read[reader]["path"], serde_json::json!(ODD_NAMES), "{reader}");
        assert_eq!(read[reader]["before_dbfs"], Value::from(vec![-31.2; ODD_NAMES.len()]), "{reader}");
    }
}

/// An output that can take so many bytes.
struct Full(usize);

impl std::io::Write for Full {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        let taken = bytes.len().min(self.0);
        self.0 -= taken;
        if taken == 0 { Err(std::io::Error::from(std::io::ErrorKind::StorageFull)) } else { Ok(taken) }
    }

    fn flush(&mut self) -> std::io::Result<()> {
        Ok(())
    }
}

#[test]
fn a_full_disk_is_told_at_the_latest_at_the_end() {
    let whole = written(&sorts()).len();
    for room in [0, 100, whole - 1] {
        let attempt = || {
            let mut table = TableWriter::new(Full(room))?;
            sorts().iter().try_for_each(|recording| table.add(recording))?;
            table.finish().map(drop)
        };
        assert_eq!(attempt().unwrap_err().kind(), std::io::ErrorKind::StorageFull, "{room} bytes");
    }
    let mut table = TableWriter::new(Full(whole)).unwrap();
    sorts().iter().for_each(|recording| table.add(recording).unwrap());
    assert_eq!(table.finish().map(|full| full.0).unwrap(), 0);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn any_text_comes_back_as_it_was(path in any::<String>(), error in any::<String>(), figure in -1e6..1e6f64) {
        let mut recording = done(&path, vec![vec![BandEntry { before_dbfs: db(figure), ..samples::hum() }]]);
        recording.error = Some(error.clone());
        let records = strict(&String::from_utf8(written(&[recording])).unwrap());
        prop_assert_eq!((&records[1][0], &records[1][2]), (&path, &error));
        let place = HEADER.split(',').position(|name| name == "before_dbfs").unwrap();
        prop_assert_eq!(records[1][place].parse::<f64>().ok(), db(figure).map(Db::get));
    }
}
