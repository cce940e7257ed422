//! A spec without stages does nothing to the samples.

use super::fixtures::{Bench, Noise, hum_and_noise, wav, wav_float, wav16};

const OBSERVE: &str = "[[band]]\nname = \"all\"\nfrom_hz = 100\nto_hz = 3000\nkeep_db = 0.1\n";

#[test]
fn an_identity_run_is_byte_identical_for_every_format_and_reads_0_db() {
    let bench = Bench::new(OBSERVE);
    let mut noise = Noise(5);
    let samples: Vec<f64> = (0..40_000).map(|_| 0.4 * noise.next()).collect();
    for bits in [8, 16, 24, 32] {
        bench.input(&format!("mono-{bits}.wav"), &wav(8000, 1, bits, &samples));
        bench.input(&format!("two-{bits}.wav"), &wav(8000, 2, bits, &samples));
    }
    let floats: Vec<f32> = samples.iter().map(|&sample| 3.0 * sample as f32).collect();
    bench.input("float.wav", &wav_float(8000, 1, &floats));
    let ran = bench.filter("--quiet");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let outputs: Vec<_> = bench.tree("out").into_iter().filter(|(name, _)| name != "bandproof-report.json").collect();
    assert_eq!(outputs, bench.tree("in"));
    for recording in bench.report()["recordings"].as_array().unwrap() {
        for channel in recording["channels"].as_array().unwrap() {
            let band = &channel["bands"][0];
            assert_eq!(band["verdict"], "met", "{recording}");
            assert_eq!((&band["gain_min_db"], &band["gain_max_db"]), (&0.0.into(), &0.0.into()));
        }
        assert_eq!(recording["input"]["sha256"], recording["output"]["sha256"]);
    }
}

#[test]
fn metadata_and_trailing_bytes_survive_filtering() {
    let bench = Bench::new(super::fixtures::NOTCH_SPEC);
    let mut bytes = wav16(8000, 1, &hum_and_noise(8000, 8.0, 0.3, 1));
    // An odd chunk with its pad byte before `data`, and two after it.
    let data_at = bytes.windows(4).position(|window| window == b"data").unwrap();
    let odd = [b"note".as_slice(), &5u32.to_le_bytes(), b"reeds", &[0]].concat();
    bytes.splice(data_at..data_at, odd.iter().copied());
    let after =
        [b"LIST".as_slice(), &8u32.to_le_bytes(), b"INFOabcd", b"zzzz", &3u32.to_le_bytes(), b"end", &[7]].concat();
    bytes.extend(&after);
    let riff = u32::try_from(bytes.len() - 8).unwrap();
    bytes[4..8].copy_from_slice(&riff.to_le_bytes());
    bench.input("a.wav", &bytes);
    let ran = bench.filter("");
    assert_eq!(ran.status, 0, "{}{}", ran.stdout, ran.stderr);
    let output = std::fs::read(bench.path("out/a.wav")).unwrap();
    let data_at = data_at + odd.len() + 8;
    assert_eq!(output[..data_at], bytes[..data_at]);
    assert_eq!(output[output.len() - after.len()..], after[..]);
    assert_eq!(output.len(), bytes.len());
    assert_ne!(output[data_at..], bytes[data_at..]);
    let kept: Vec<(String, bool)> = bench.report()["recordings"][0]["chunks"]
        .as_array()
        .unwrap()
        .iter()
        .map(|chunk| (chunk["id"].as_str().unwrap().into(), chunk["kept"].as_bool().unwrap()))
        .collect();
    let expected = [("fmt ", true), ("note", true), ("data", false), ("LIST", true), ("zzzz", true)];
    assert_eq!(kept, expected.map(|(id, kept)| (id.to_string(), kept)));
}
