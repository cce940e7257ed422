//! What was done, appended to the recording's own metadata.

use crate::build::{FLOAT, FmtFields, PCM, RawChunk, raw, riff};
use crate::chunks::{BEXT_BYTES, all_chunks, bext, bodies, guan, plain_bext, riff_size_fits};
use bandproof::wave::{Changes, Encoding, History, Reader, SampleFormat, Writer, WrittenFigures};
use std::io::Cursor;

const SHA256: &str = "3d5f00000000000000000000000000000000000000000000000000000000abcd";

pub fn told() -> History {
    History { tool: "bandproof 0.1.0".to_owned(), both_ways: false, spec_sha256: SHA256.to_owned() }
}

/// What is written of a file, samples unchanged.
pub fn rewritten(file: &[u8], format: Option<SampleFormat>) -> (Vec<u8>, WrittenFigures) {
    let mut reader = Reader::open(Cursor::new(file)).unwrap();
    let format = format.unwrap_or(reader.header().format);
    let changes = Changes { history: Some(told()), ..Changes::samples(format) };
    let mut writer = Writer::begin(Vec::new(), &mut reader, &changes).unwrap();
    let mut planes = vec![Vec::new(); usize::from(reader.header().channels)];
    while reader.read(100, &mut planes).unwrap() > 0 {}
    writer.write(&planes).unwrap();
    reader.finish().unwrap();
    writer.finish(&mut reader).unwrap()
}

fn recording(fmt: FmtFields, before: &[RawChunk], after: &[RawChunk]) -> Vec<u8> {
    let frame = usize::from(fmt.channels * fmt.container);
    let mut chunks = vec![fmt.chunk()];
    chunks.extend_from_slice(before);
    chunks.push(raw(b"data", &vec![0; 50 * frame]));
    chunks.extend_from_slice(after);
    riff(&chunks)
}

fn mono16() -> FmtFields {
    FmtFields::plain(PCM, 1, 16)
}

/// The body of the only chunk with an id after the history was appended; everything else in
/// the file is held against what it was.
fn appended(id: &[u8; 4], body: &[u8]) -> (Vec<u8>, WrittenFigures) {
    let chunk = raw(id, body);
    let others = [raw(b"junk", b"odd"), raw(b"cue ", &[0; 4])];
    let before = [others[0].clone(), chunk.clone(), others[1].clone()];
    let (first, figures) = one_more(&recording(mono16(), &before, &[]), id);
    let (last, _) = one_more(&recording(mono16(), &others, &[chunk, raw(b"tail", b"xyz")]), id);
    assert_eq!(first, last, "before `data` and after it");
    (first, figures)
}

fn one_more(file: &[u8], id: &[u8; 4]) -> (Vec<u8>, WrittenFigures) {
    let (output, figures) = rewritten(file, None);
    assert!(riff_size_fits(&output));
    let (then, now) = (all_chunks(file), all_chunks(&output));
    assert_eq!(then.len(), now.len());
    for (((then_id, then), (now_id, now)), fate) in then.iter().zip(&now).zip(&figures.chunks) {
        assert_eq!(then_id, now_id);
        assert!(*then_id == id || then == now, "{}", then_id.escape_ascii());
        assert_eq!(fate.kept, then == now, "{}", then_id.escape_ascii());
    }
    (bodies(&output, id)[0].to_vec(), figures)
}

/// The line for 16-bit mono at 48 kHz. Its form is that of EBU R 98 (from memory).
fn line() -> String {
    format!("A=PCM,F=48000,W=16,M=mono,T=filtered by bandproof 0.1.0; spec SHA-256 {SHA256}\r\n")
}

fn field(key: &str) -> String {
    format!("{key}: filtered by bandproof 0.1.0; spec SHA-256 {SHA256}")
}

#[test]
fn a_line_goes_to_the_end_of_the_coding_history() {
    let old = "A=ANALOGUE,M=mono,T=microphone\r\n";
    for (history, expected) in [
        ("".to_owned(), line()),
        (old.to_owned(), format!("{old}{}", line())),
        // A last line without its end gets it.
        (old.trim_end().to_owned(), format!("{old}{}", line())),
        (old.trim_end_matches('\n').to_owned(), format!("{old}{}", line())),
        // One that ends otherwise keeps its end.
        ("A=PCM\n".to_owned(), format!("A=PCM\n{}", line())),
    ] {
        for version in 0..3 {
            let body = bext(version, [-2300, 500, -100, -2000, -2100], history.as_bytes());
            let (new, figures) = appended(b"bext", &body);
            assert_eq!(new[..BEXT_BYTES], body[..BEXT_BYTES]);
            assert_eq!(String::from_utf8_lossy(&new[BEXT_BYTES..]), expected);
            let (then, now) = (body.len(), new.len());
            assert!(
                figures.notes[0].starts_with("a line of coding history was appended to `bext` at byte ")
                    && figures.notes[0].ends_with(&format!(": {then} bytes before, {now} after")),
                "{:?}",
                figures.notes
            );
        }
    }
}

#[test]
fn padding_is_used_up_before_the_chunk_grows() {
    let old = "A=PCM,F=48000\r\n";
    let line = line();
    for pad in [0, 1, 2, line.len() - 1, line.len(), line.len() + 1, line.len() + 2, 1000] {
        let body = bext(1, [0; 5], &[old.as_bytes(), &vec![0; pad]].concat());
        let (new, _) = appended(b"bext", &body);
        // Where the text ended with a NUL byte it still does.
        let least = BEXT_BYTES + old.len() + line.len() + usize::from(pad > 0);
        assert_eq!(new.len(), least.max(body.len()), "{pad}");
        let text = [&body[..BEXT_BYTES + old.len()], line.as_bytes()].concat();
        assert_eq!(new[..text.len()], text, "{pad}");
        assert!(new[text.len()..].iter().all(|&byte| byte == 0), "{pad}");
    }
}

#[test]
fn the_line_says_how_the_output_is_stored() {
    let full = SampleFormat::full;
    for (fmt, format, expected) in [
        (FmtFields::plain(PCM, 2, 24), None, "A=PCM,F=48000,W=24,M=stereo,T=filtered"),
        (FmtFields::plain(PCM, 1, 16), Some(full(Encoding::Pcm24)), "A=PCM,F=48000,W=24,M=mono,T=filtered"),
        (FmtFields::plain(PCM, 1, 24).extensible(20, 4), None, "A=PCM,F=48000,W=20,M=mono,T=filtered"),
        (FmtFields::plain(PCM, 6, 16), None, "A=PCM,F=48000,W=16,T=6 channels; filtered"),
        (FmtFields::plain(FLOAT, 1, 32), None, "A=PCM,F=48000,W=32,M=mono,T=IEEE float; filtered"),
        (FmtFields { rate: 96_000, ..mono16() }, None, "A=PCM,F=96000,W=16,M=mono,T=filtered"),
    ] {
        let file = recording(fmt, &[plain_bext(b"")], &[]);
        let (output, _) = rewritten(&file, format);
        let history = String::from_utf8_lossy(&bodies(&output, b"bext")[0][BEXT_BYTES..]).into_owned();
        assert!(history.starts_with(expected), "{history}");
        // One text field, the last, so that no comma of ours begins another.
        assert_eq!(history.split("T=").nth(1).unwrap().matches(',').count(), 0);
        assert!(history.is_ascii() && history.ends_with("\r\n") && history.matches('\n').count() == 1);
    }
}

#[test]
fn without_bext_a_field_goes_to_guano() {
    let key = "Bandproof|History";
    let plain = "GUANO|Version: 1.0\nNote: caf\u{e9}";
    for (text, expected) in [
        (format!("{plain}\n"), format!("{plain}\n{}\n", field(key))),
        // The last line had no end and still has none but what was needed.
        (plain.to_owned(), format!("{plain}\n{}\n", field(key))),
        (plain.replace('\n', "\r\n"), format!("{}\r\n{}\r\n", plain.replace('\n', "\r\n"), field(key))),
        (format!("{plain}\r\n"), format!("{plain}\r\n{}\r\n", field(key))),
        ("A: 1\rB: 2\r".to_owned(), format!("A: 1\rB: 2\r{}\r", field(key))),
        // Of keys in one namespace no two are the same.
        (format!("{plain}\n{key}: x\n"), format!("{plain}\n{key}: x\n{}\n", field("Bandproof|History 2"))),
        (format!("{plain}\n{key} 7: x\n"), format!("{plain}\n{key} 7: x\n{}\n", field("Bandproof|History 8"))),
        (format!("{plain}\n{key}x: y\n"), format!("{plain}\n{key}x: y\n{}\n", field(key))),
    ] {
        let (new, figures) = appended(b"guan", text.as_bytes());
        assert_eq!(String::from_utf8_lossy(&new), expected);
        assert!(figures.notes[0].starts_with("a field with the history was appended to `guan`"), "{:?}", figures.notes);
        let added = expected.len() - text.len();
        let (padded, _) = appended(b"guan", &[text.as_bytes(), &vec![0; added + 3]].concat());
        assert_eq!(padded, [expected.as_bytes(), &[0; 3]].concat());
    }
}

#[test]
fn each_run_leaves_its_own_field_and_line() {
    for (chunk, id) in [(guan(&["GUANO|Version: 1.0"]), b"guan"), (plain_bext(b""), b"bext")] {
        let mut file = recording(mono16(), &[chunk], &[]);
        for _ in 0..3 {
            file = rewritten(&file, None).0;
        }
        let body = String::from_utf8_lossy(bodies(&file, id)[0]).into_owned();
        assert_eq!(body.matches(SHA256).count(), 3, "{body}");
        if id == b"guan" {
            let keys: Vec<_> = body.lines().map(|line| line.split(':').next().unwrap()).collect();
            assert_eq!(
                keys,
                ["GUANO|Version", "Bandproof|History", "Bandproof|History 2", "Bandproof|History 3"],
                "{body}"
            );
        }
    }
}

#[test]
fn of_two_places_bext_is_the_one() {
    for chunks in [[plain_bext(b""), guan(&["TE: 1"])], [guan(&["TE: 1"]), plain_bext(b"")]] {
        let file = recording(mono16(), &chunks, &[]);
        let (output, _) = rewritten(&file, None);
        assert_eq!(bodies(&output, b"guan"), bodies(&file, b"guan"));
        assert_eq!(bodies(&output, b"bext")[0].len(), BEXT_BYTES + line().len());
    }
}

/// Nothing is appended where it can't be, the file stays as it is, and the note says why.
#[test]
fn without_a_place_the_file_stays_and_a_note_says_so() {
    let short = raw(b"bext", &[b'x'; 601]);
    let huge = raw(b"bext", &bext(1, [0; 5], &vec![b'x'; 16 << 20]));
    for (before, after, why) in [
        (vec![], vec![], "neither a `bext` nor a `guan` chunk"),
        (vec![short, guan(&["TE: 1"])], vec![], "`bext` at byte 36 holds 601 bytes, expected at least 602"),
        (vec![huge], vec![], "more than the 16777216 that a history is appended to"),
        (vec![raw(b"guan", b"")], vec![], "holds no text"),
        (vec![raw(b"guan", &[0; 40])], vec![], "holds no text"),
    ] {
        let file = recording(mono16(), &before, &after);
        let (output, figures) = rewritten(&file, None);
        assert!(output == file, "{why}");
        assert_eq!(figures.notes.len(), 1, "{:?}", figures.notes);
        assert!(figures.notes[0].contains(why), "{:?}", figures.notes);
        assert!(figures.chunks.iter().all(|fate| fate.kept));
    }
}

/// Nobody knows what is missing of a chunk that the file's end cuts.
#[test]
fn a_chunk_of_a_wrong_size_is_left() {
    let body = b"GUANO|Version: 1.0\nNot";
    let file = recording(mono16(), &[], &[raw(b"guan", body).declaring(400).padded(b"")]);
    let (output, figures) = rewritten(&file, None);
    assert_eq!(bodies(&output[..output.len()], b"guan"), [body]);
    assert!(figures.notes.iter().any(|note| note.contains("has a wrong size: no history")), "{:?}", figures.notes);
}

/// What stands in a coding history has no comma, which would end it.
#[test]
fn two_passes_are_told_as_such() {
    let told = History { both_ways: true, ..told() };
    let done = "filtered forward and backward (two passes; zero phase) by bandproof 0.1.0; spec SHA-256";
    for (chunk, id, expected) in [
        (plain_bext(b""), b"bext", format!("A=PCM,F=48000,W=16,M=mono,T={done} {SHA256}\r\n")),
        (raw(b"guan", b"GUANO|Version: 1.0\n"), b"guan", format!("Bandproof|History: {done} {SHA256}\n")),
    ] {
        let mut reader = Reader::open(Cursor::new(recording(mono16(), &[chunk], &[]))).unwrap();
        let changes = Changes { history: Some(told.clone()), ..Changes::samples(reader.header().format) };
        let mut writer = Writer::begin(Vec::new(), &mut reader, &changes).unwrap();
        let mut planes = vec![Vec::new()];
        while reader.read(100, &mut planes).unwrap() > 0 {}
        writer.write(&planes).unwrap();
        reader.finish().unwrap();
        let (output, _) = writer.finish(&mut reader).unwrap();
        let body = String::from_utf8_lossy(bodies(&output, id)[0]).into_owned();
        assert!(body.trim_end_matches('\0').ends_with(&expected), "{body:?}");
    }
}

/// Text of a report that someone wrote can't begin a field or a line of its own.
#[test]
fn what_is_told_stays_on_its_line_and_in_its_field() {
    let mut reader = Reader::open(Cursor::new(recording(mono16(), &[plain_bext(b"")], &[]))).unwrap();
    let history = History { tool: "a,b\r\nA=PCM,\u{e9}".to_owned(), both_ways: false, spec_sha256: "c\0d".to_owned() };
    let changes = Changes { history: Some(history), ..Changes::samples(reader.header().format) };
    let mut writer = Writer::begin(Vec::new(), &mut reader, &changes).unwrap();
    let mut planes = vec![Vec::new()];
    while reader.read(100, &mut planes).unwrap() > 0 {}
    writer.write(&planes).unwrap();
    reader.finish().unwrap();
    let (output, _) = writer.finish(&mut reader).unwrap();
    let text = &bodies(&output, b"bext")[0][BEXT_BYTES..];
    assert_eq!(text, b"A=PCM,F=48000,W=16,M=mono,T=filtered by a b  A=PCM  ; spec SHA-256 c d\r\n");
}
