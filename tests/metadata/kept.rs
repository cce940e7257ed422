//! A whole run over a recording with everything that recorders and editors put beside the
//! samples.

use crate::build::{RawChunk, raw};
use crate::chunks::{all_chunks, bext, bodies, guan, markers, riff_size_fits, smpl, tone};
use crate::fixtures::{Bench, NOTCH_SPEC, entry};
use std::fs;

/// Before `data` and after it; odd sizes among them.
fn everything() -> (Vec<RawChunk>, Vec<RawChunk>) {
    let [cue, adtl] = markers();
    let before = vec![
        raw(b"bext", &bext(2, [-2300, 500, -100, -2000, -2100], b"A=PCM,F=8000,W=16,M=mono,T=recorder\r\n")),
        raw(b"JUNK", &[0; 27]),
        raw(b"PEAK", &[1; 16]),
        raw(b"inst", &[60, 0, 0, 0, 127, 0, 127]),
        raw(b"guan", b"GUANO|Version: 1.0\nTE: 1\nSamplerate: 8000\nNote: bittern\n"),
    ];
    let after = vec![
        cue,
        adtl,
        smpl(),
        raw(b"levl", &[3; 129]),
        raw(b"iXML", b"<BWFXML><LOUDNESS/></BWFXML>"),
        raw(b"MD5 ", &[5; 16]),
        raw(b"dbmd", &[6; 33]),
        raw(b"xyz ", b"who knows"),
    ];
    (before, after)
}

const STALE: [&str; 6] = ["bext", "PEAK", "levl", "iXML", "MD5 ", "dbmd"];

/// Chunks of the output that are not those of the input.
fn changed(input: &[u8], output: &[u8]) -> Vec<String> {
    let (then, now) = (all_chunks(input), all_chunks(output));
    let ids = |chunks: &[(&[u8], &[u8])]| chunks.iter().map(|(id, _)| id.to_vec()).collect::<Vec<_>>();
    assert_eq!(ids(&then), ids(&now));
    let differing = then.iter().zip(&now).filter(|(then, now)| then != now);
    differing.map(|((id, _), _)| String::from_utf8_lossy(id).into_owned()).collect()
}

#[test]
fn everything_but_the_samples_is_kept_and_what_went_stale_is_named() {
    let bench = Bench::new(NOTCH_SPEC);
    let (before, after) = everything();
    let input = tone(8000, 300.0, 24_000, &before, &after);
    bench.input("a.wav", &input);
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let output = fs::read(bench.path("out/a.wav")).unwrap();
    assert_eq!(output.len(), input.len());
    assert_eq!(changed(&input, &output), ["data"]);
    let report = bench.report();
    let recording = entry(&report, "a.wav");
    let kept = |chunk: &&serde_json::Value| chunk["kept"] == true;
    let chunks = recording["chunks"].as_array().unwrap();
    assert_eq!(chunks.iter().filter(kept).count(), chunks.len() - 1);
    let notes: Vec<_> = recording["notes"].as_array().unwrap().iter().map(|note| note.as_str().unwrap()).collect();
    for id in STALE {
        assert_eq!(notes.iter().filter(|note| note.starts_with(&format!("chunk `{id}` at byte"))).count(), 1, "{id}");
    }
    assert_eq!(notes.len(), STALE.len(), "{notes:?}");
    assert_eq!(recording["input"]["time_expansion"], 1.0);
}

#[test]
fn history_changes_bext_and_nothing_else() {
    let bench = Bench::new(&format!("output.history = true\n{NOTCH_SPEC}"));
    let (before, after) = everything();
    let input = tone(8000, 300.0, 24_000, &before, &after);
    bench.input("a.wav", &input);
    assert_eq!(bench.filter("").status, 0);
    let output = fs::read(bench.path("out/a.wav")).unwrap();
    assert!(riff_size_fits(&output));
    assert_eq!(changed(&input, &output), ["bext", "data"]);
    let report = bench.report();
    let sha256 = report["spec"]["file_sha256"].as_str().unwrap();
    let [then, now] = [&input, &output].map(|file| bodies(file, b"bext")[0]);
    let line = String::from_utf8_lossy(&now[then.len()..]);
    assert!(then == &now[..then.len()] && line.contains(sha256) && line.contains("T=filtered by bandproof "), "{line}");
    let recording = entry(&report, "a.wav");
    assert_eq!(recording["chunks"][1], serde_json::json!({"id": "bext", "bytes": then.len(), "kept": false}));
    let sizes = format!("{} bytes before, {} after", then.len(), now.len());
    assert!(recording["notes"].to_string().contains(&sizes), "{}", recording["notes"]);
    // Made again from the report, the same bytes come out.
    let ran = bench.run("recheck out/bandproof-report.json --input in --replay --remeasure");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    // The file of the spec is named by its hash: a report with another can't have made this output.
    let path = bench.path("out/bandproof-report.json");
    let text = fs::read_to_string(&path).unwrap().replace(sha256, &"ab".repeat(32));
    fs::write(&path, text).unwrap();
    assert_eq!(bench.run("recheck out/bandproof-report.json --input in --replay").status, 1);
}

#[test]
fn history_in_guano_and_nowhere_comes_out_again_too() {
    let bench = Bench::new(&format!("output.history = true\noutput.encoding = 'pcm24'\n{NOTCH_SPEC}"));
    bench.input("guano.wav", &tone(8000, 300.0, 24_000, &[], &[guan(&["GUANO|Version: 1.0", "TE: 1"])]));
    bench.input("bare.wav", &tone(8000, 300.0, 24_000, &[], &[]));
    assert_eq!(bench.filter("").status, 0);
    let report = bench.report();
    let notes = |path: &str| entry(&report, path)["notes"].to_string();
    assert!(notes("bare.wav").contains("neither a `bext` nor a `guan` chunk"), "{}", notes("bare.wav"));
    let output = fs::read(bench.path("out/guano.wav")).unwrap();
    assert!(String::from_utf8_lossy(bodies(&output, b"guan")[0]).contains("\nBandproof|History: filtered by "));
    let ran = bench.run("recheck out/bandproof-report.json --input in --replay");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
}

/// Of a recording that passes unchanged there is nothing to say; one that is only stored in
/// another encoding has that to say.
#[test]
fn the_identity_appends_nothing() {
    let band = "[[band]]\nname = 'all'\nfrom_hz = 100\nto_hz = 2000\n";
    let (before, after) = everything();
    let input = tone(8000, 300.0, 24_000, &before, &after);
    for (encoding, same) in [("same", true), ("pcm16", true), ("pcm24", false)] {
        let bench = Bench::new(&format!("output = {{ history = true, encoding = '{encoding}' }}\n{band}"));
        bench.input("a.wav", &input);
        assert_eq!(bench.filter("").status, 0);
        let output = fs::read(bench.path("out/a.wav")).unwrap();
        assert_eq!(output == input, same, "{encoding}");
        let lines = String::from_utf8_lossy(bodies(&output, b"bext")[0]).matches("T=filtered by").count();
        assert_eq!(lines, usize::from(!same), "{encoding}");
        assert_eq!(bench.run("recheck out/bandproof-report.json --input in --replay").status, 0);
    }
}

#[test]
fn without_the_key_nothing_is_ever_appended() {
    let bench = Bench::new(&format!("output.encoding = 'float32'\noutput.history = false\n{NOTCH_SPEC}"));
    let (before, after) = everything();
    let input = tone(8000, 300.0, 24_000, &before, &after);
    bench.input("a.wav", &input);
    assert_eq!(bench.filter("").status, 0);
    let output = fs::read(bench.path("out/a.wav")).unwrap();
    for id in [b"bext", b"guan", b"cue ", b"LIST", b"smpl", b"inst", b"iXML"] {
        assert_eq!(bodies(&output, id), bodies(&input, id));
    }
}
