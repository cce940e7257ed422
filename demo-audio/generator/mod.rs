//! An invented place: a reed bed with recorders, next to a pumping station at a tidal inlet.
//!
//! To remove: the pumps' hum at 50 Hz with seven harmonics above it, wind rumble below
//! 40 Hz, and the 15.8 kHz whine of a power converter. To keep: a bird that booms at
//! 155 to 170 Hz, and warblers between 2 and 6 kHz.
//!
//! | recording | format | what is special |
//! |---|---|---|
//! | `station-a/0512.wav` | 16 bit, mono, 48 kHz | cue points and text fields after the samples, an odd-sized chunk |
//! | `station-a/0542.wav` | 16 bit, mono, 48 kHz | text fields only |
//! | `station-a/0612.wav` | 16 bit, mono, 48 kHz | a pump's own hum has drifted to 51.2 Hz, off the stop |
//! | `station-b/0512.wav` | 24 bit, stereo, 44.1 kHz | padding, broadcast and production metadata |
//! | `station-b/0542.wav` | 24 bit, mono, 44.1 kHz | 3 s, too short for the hum bands; an odd number of data bytes |
//! | `station-c/0512.wav` | 16 bit, mono, 44.1 kHz | pumps off, behind a low-cut: nothing to remove below 1 kHz |
//! | `station-d/0512.wav` | 16 bit, mono, 44.1 kHz | cut off by a flat battery: sizes in the header are still 0, half a frame at the end |
//! | `hydrophone/0512.wav` | 32-bit float, mono, 96 kHz, RF64 | short; a knock beyond full scale |
//!
//! Levels below are in dBFS: 0 dBFS is the level of a full-scale sine.

mod chunks;
mod scene;
mod signals;
mod text;

use chunks::Chunk;
use hound::{SampleFormat, WavSpec, WavWriter};
use scene::Scene;
use std::io::Cursor;

/// One file of the demo.
pub struct DemoFile {
    /// Path below the demo folder, with `/`.
    pub path: &'static str,
    /// What it holds.
    pub bytes: Vec<u8>,
}

/// All files of the demo, in the order of their paths.
pub fn files() -> Result<Vec<DemoFile>, hound::Error> {
    let ordinary = Scene { hum_hz: Some(50.02), boom: true, ..Scene::new(48_000, 10.0) };
    let hydrophone = Scene { seed: 70, hum_hz: Some(50.01), hum_db: -38.0, knock: true, ..Scene::new(96_000, 2.5) };
    let recording = |path, bits, channels: &[Scene], before: &[Chunk], after: &[Chunk]| {
        wav(bits, channels).map(|plain| DemoFile { path, bytes: chunks::insert(&plain, before, after) })
    };
    Ok(vec![
        DemoFile { path: "hydrophone/0512.wav", bytes: chunks::rf64(&wav(32, &[hydrophone])?, hydrophone.frames()) },
        DemoFile { path: "notes.txt", bytes: text::NOTES.into() },
        DemoFile { path: "station-a/._0512.wav", bytes: text::dot_underscore() },
        recording(
            "station-a/0512.wav",
            16,
            &[Scene { seed: 10, ..ordinary }],
            &[text::weather()],
            &[text::info("Reed bed, station a, 05:12"), text::cue(48_000), text::labels()],
        )?,
        recording(
            "station-a/0542.wav",
            16,
            &[Scene { seed: 20, hum_hz: Some(49.97), hum_db: -34.0, ..ordinary }],
            &[],
            &[text::info("Reed bed, station a, 05:42")],
        )?,
        recording(
            "station-a/0612.wav",
            16,
            &[Scene { seed: 30, drifted_hz: Some(51.2), seconds: 8.0, ..ordinary }],
            &[],
            &[text::info("Reed bed, station a, 06:12")],
        )?,
        recording(
            "station-b/0512.wav",
            24,
            &[
                Scene { seed: 40, rate_hz: 44_100, seconds: 9.0, ..ordinary },
                Scene { seed: 41, hum_db: -40.0, rate_hz: 44_100, seconds: 9.0, ..ordinary },
            ],
            &[text::padding(), text::broadcast("05-12-00", 18_720, "stereo")],
            &[text::production()],
        )?,
        recording(
            "station-b/0542.wav",
            24,
            // 132301 frames of 3 bytes: a pad byte follows the samples.
            &[Scene { seed: 50, rate_hz: 44_100, seconds: 3.00002, ..ordinary }],
            &[text::padding(), text::broadcast("05-42-00", 20_520, "mono")],
            &[],
        )?,
        recording(
            "station-c/0512.wav",
            16,
            &[Scene { seed: 60, low_cut: true, rumble_db: None, ..Scene::new(44_100, 8.0) }],
            &[],
            &[text::info("Reed bed, station c, 05:12, pumps off")],
        )?,
        DemoFile {
            path: "station-d/0512.wav",
            bytes: chunks::unfinished(&wav(
                16,
                &[Scene { seed: 90, hum_hz: Some(49.99), rate_hz: 44_100, seconds: 8.0, ..ordinary }],
            )?),
        },
    ])
}

/// The scenes as channels of one recording without metadata.
fn wav(bits: u16, channels: &[Scene]) -> Result<Vec<u8>, hound::Error> {
    let [first, ..] = channels else { return Ok(Vec::new()) };
    let sample_format = if bits == 32 { SampleFormat::Float } else { SampleFormat::Int };
    let format =
        WavSpec { channels: channels.len() as u16, sample_rate: first.rate_hz, bits_per_sample: bits, sample_format };
    let signals: Vec<Vec<f64>> = channels.iter().map(Scene::render).collect();
    let mut bytes = Cursor::new(Vec::new());
    let mut writer = WavWriter::new(&mut bytes, format)?;
    for frame in 0..first.frames() {
        for signal in &signals {
            match sample_format {
                SampleFormat::Float => writer.write_sample(signal[frame] as f32)?,
                // Not dithered: the ambient noise is far above one step.
                SampleFormat::Int => writer.write_sample(quantize(signal[frame], bits))?,
            }
        }
    }
    writer.finalize()?;
    Ok(bytes.into_inner())
}

/// To the nearest step of 2^(1 - bits), saturating.
fn quantize(value: f64, bits: u16) -> i32 {
    let full_scale = f64::from(1 << (bits - 1));
    libm::rint(value * full_scale).clamp(-full_scale, full_scale - 1.0) as i32
}
