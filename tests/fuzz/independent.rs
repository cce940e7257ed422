//! Samples as others read them.

use std::io::Cursor;

use bandproof::wave::{Encoding, Form, Header};

/// Decodes samples one by one, most significant byte first.
pub fn decode(bytes: &[u8], header: &Header) -> Vec<Vec<f64>> {
    let width = usize::from(header.format.encoding.bytes());
    let channels = usize::from(header.channels);
    let mut planes = vec![Vec::with_capacity(bytes.len() / width / channels); channels];
    for (index, sample) in bytes.chunks_exact(width).enumerate() {
        // As a number of 64 bits whose upper bytes are the sample's.
        let mut number = 0u64;
        for place in 0..width {
            let from_top = if header.form == Form::Rifx { place } else { width - 1 - place };
            number |= u64::from(sample[from_top]) << (56 - 8 * place);
        }
        let value = match header.format.encoding {
            Encoding::Pcm8 => (number >> 56) as f64 / 128.0 - 1.0,
            Encoding::Float32 => f64::from(f32::from_bits((number >> 32) as u32)),
            Encoding::Float64 => f64::from_bits(number),
            // At most 32 bits: exact.
            _ => number as i64 as f64 / 9_223_372_036_854_775_808.0,
        };
        planes[index % channels].push(value);
    }
    planes
}

/// What hound 3.5 makes of a file. It passes over no pad byte, takes 4 bytes for any
/// `fact`, ends every `fmt ` where it stops to understand it, and knows no 64-bit floats
/// and no valid bits below the container's: such files it may refuse or misread.
/// Everything else it must read as this program does.
pub fn hound(file: &[u8], header: &Header, planes: &[Vec<f64>]) -> bool {
    if header.form != Form::Riff || header.format.encoding == Encoding::Float64 {
        return false;
    }
    let width = header.format.encoding.bytes();
    let before = header.chunks.iter().take_while(|chunk| chunk.id != *b"data");
    let understood = before.clone().zip(header.chunks.iter().skip(1)).all(|(chunk, next)| {
        let sizes: &[u64] = match &chunk.id {
            b"fmt " => &[16, 18, 40],
            b"fact" => &[4],
            _ => &[chunk.bytes],
        };
        next.offset == chunk.offset + 8 + chunk.bytes && sizes.contains(&chunk.bytes)
    });
    let doubtful = header.notes.iter().any(|note| note.contains("valid bits"));
    if !understood || doubtful || header.format.valid_bits != width * 8 {
        return false;
    }
    let mut reader = match hound::WavReader::new(Cursor::new(file)) {
        Ok(reader) => reader,
        // Fields that hound holds against each other and this program does not use.
        Err(_) => return false,
    };
    let spec = reader.spec();
    assert_eq!(
        (spec.channels, spec.sample_rate, spec.bits_per_sample, u64::from(reader.duration())),
        (header.channels, header.rate_hz, width * 8, header.frames),
        "hound reads another header"
    );
    let channels = planes.len();
    assert_eq!(spec.sample_format == hound::SampleFormat::Float, header.format.encoding.is_float());
    if header.format.encoding.is_float() {
        for (index, sample) in reader.samples::<f32>().enumerate() {
            let sample = f64::from(sample.unwrap_or_else(|error| panic!("hound refuses sample {index}: {error}")));
            assert!(sample == planes[index % channels][index / channels], "hound reads another sample {index}");
        }
    } else {
        let scale = 1.0 / (1u64 << (8 * width - 1)) as f64;
        for (index, sample) in reader.samples::<i32>().enumerate() {
            let sample =
                f64::from(sample.unwrap_or_else(|error| panic!("hound refuses sample {index}: {error}"))) * scale;
            assert!(sample == planes[index % channels][index / channels], "hound reads another sample {index}");
        }
    }
    true
}
