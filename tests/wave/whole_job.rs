//! The 64-bit forms through the job itself: filtered, dithered, measured.

use std::io::Cursor;

use bandproof::design::design;
use bandproof::job::plan::treatment;
use bandproof::job::recording::{Processed, Treatment, process};
use bandproof::spec::{self, SpecSyntax};
use bandproof::wave::{Form, Reader};

use crate::build::{Ds64, FmtFields, PCM, RawChunk, raw, riff, rifx, wide};
use crate::run::{copy, samples, sha256};

const SPEC: &str = r#"
[output]
encoding = "ENCODING"
overload = "scale"

[[stage]]
kind = "highpass"
family = "butterworth"
order = 2
edge_hz = 200
"#;

fn treated(encoding: &str) -> Treatment {
    let text = SPEC.replace("ENCODING", encoding);
    let spec = spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap();
    treatment(&spec, &design(&spec, 48_000).unwrap())
}

fn filter(file: &[u8], treatment: &Treatment) -> (Vec<u8>, Processed) {
    let reader = Reader::open(Cursor::new(file.to_vec())).unwrap();
    let (sink, processed) = process(reader, Cursor::new(Vec::new()), treatment, &|_| Ok(())).unwrap();
    let output = sink.into_inner();
    assert_eq!(processed.written.sha256, sha256(&output));
    assert_eq!(processed.input.sha256, sha256(file));
    (output, processed)
}

/// A square wave that a high-pass takes beyond full scale; big-endian if `big`.
fn chunks(big: bool) -> Vec<RawChunk> {
    let fmt = FmtFields::plain(PCM, 1, 16);
    let square = (0..48_000).map(|k| if k / 240 % 2 == 0 { 30_000i16 } else { -30_000 });
    let data: Vec<u8> = square.flat_map(|x| if big { x.to_be_bytes() } else { x.to_le_bytes() }).collect();
    let body = if big { fmt.big_endian(true) } else { fmt.body() };
    vec![raw(b"JUNK", &[0; 28]), raw(b"fmt ", &body), raw(b"data", &data), raw(b"cue ", &[0; 4])]
}

#[test]
fn every_form_is_filtered_alike_and_comes_back_in_its_form() {
    let plain = riff(&chunks(false));
    for encoding in ["same", "float32"] {
        let treatment = treated(encoding);
        let (expected, first) = filter(&plain, &treatment);
        let expected = samples(&expected).unwrap();
        // Scaling filters twice over one sink: what the first pass wrote must be gone.
        assert_eq!(first.scaled, encoding == "same");
        let ds64 = Ds64::frames(48_000);
        for (file, form) in [
            (rifx(&chunks(true)), Form::Rifx),
            (wide(b"RF64", &ds64, &chunks(false)), Form::Rf64),
            (wide(b"BW64", &ds64, &chunks(false)), Form::Bw64),
        ] {
            let (output, processed) = filter(&file, &treatment);
            let header = copy(&output).unwrap().header;
            assert_eq!((header.form, header.notes), (form, Vec::<String>::new()));
            assert!(samples(&output).unwrap() == expected, "{form:?}");
            assert_eq!(processed.output, first.output);
        }
    }
}

#[test]
fn a_lowered_limit_makes_rf64_of_what_passes_it() {
    let file = riff(&chunks(false));
    for encoding in ["same", "float32"] {
        let mut treatment = treated(encoding);
        let (expected, plain) = filter(&file, &treatment);
        treatment.riff_limit_bytes = expected.len() as u64;
        assert!(filter(&file, &treatment).0 == expected);
        treatment.riff_limit_bytes -= 1;
        let (output, processed) = filter(&file, &treatment);
        let header = copy(&output).unwrap().header;
        assert_eq!((header.form, header.notes), (Form::Rf64, Vec::<String>::new()));
        assert!(output[header.data_offset as usize..] == expected[header.data_offset as usize..]);
        assert_eq!(output.len(), expected.len());
        let turned = processed.written.notes.iter().filter(|n| n.contains("became RF64: `JUNK` at byte 12")).count();
        assert_eq!((turned, processed.written.notes.len()), (1, plain.written.notes.len() + 1));
    }
}
