//! What only a run of `measure` has to tell: how pairs lie, and what found no partner.

use super::WIDTH;
use super::color::{Palette, Style};
use super::table::wrapped;
use super::units::{counted, trimmed};
use bandproof::report::{PairsItem, Unpaired};

/// Names listed of each side at most; the report has all.
const LISTED: usize = 12;

/// How the recordings after lie against those before; empty where none was measured.
pub fn alignment(pairs: &PairsItem, palette: Palette) -> String {
    if pairs.measured == 0 {
        return String::new();
    }
    let mut text = format!("{}\n", palette.paint(Style::Heading, "How the recordings after lie"));
    let mut line = |words: String| text.push_str(&wrapped(&words, 2, 6, WIDTH));
    if let Some((least, most)) = pairs.delay_frames {
        let doubt = match pairs.ambiguous {
            0 => String::new(),
            count => format!(
                ", ambiguous in {}: the sound is steady or repeats itself and fits elsewhere as well, perhaps with the \
                 other sign; --delay settles it",
                counted(count, "pair")
            ),
        };
        line(format!("delay: {} frames{doubt}", span(least, most)));
    }
    if let Some((least, most)) = pairs.clock_ppm {
        line(match (least, most) {
            (0.0, 0.0) => "clock: no difference found".to_owned(),
            _ => format!("clock: {} parts in a million more frames for the same time, taken out", span(least, most)),
        });
    }
    if pairs.inverted > 0 {
        line(format!("polarity: turned in {}", counted(pairs.inverted, "pair")));
    }
    if let Some((least, most)) = pairs.reference_gain_db {
        line(format!("gain in the reference band, which counts as 0 dB: {} dB", span(least, most)));
    }
    if let Some(first) = &pairs.first_at_full_scale {
        line(format!(
            "full scale: reached in {}, the first is {first}; if that is clipping, lower the level and record again",
            counted(pairs.at_full_scale, "pair"),
        ));
    }
    if let Some(farthest) = &pairs.farthest {
        line(format!(
            "gains in keep and observed bands, against what the spec's stages would show: at most {} dB off (standard \
             error {} dB), at {} Hz in {}",
            trimmed(farthest.deviation_db.get(), 3),
            trimmed(farthest.error_db.get(), 3),
            trimmed(farthest.at_hz.get(), 1),
            farthest.path,
        ));
    }
    text
}

fn span(least: f64, most: f64) -> String {
    let (least, most) = (trimmed(least, 3), trimmed(most, 3));
    if least == most { least } else { format!("{least} to {most}") }
}

/// Recordings on one side only; empty where there are none.
pub fn unpaired(unpaired: &Unpaired, palette: Palette) -> String {
    let mut text = String::new();
    for (side, paths) in [("before", &unpaired.before), ("after", &unpaired.after)] {
        if paths.is_empty() {
            continue;
        }
        let heading = format!("Only {side}: {}", counted(paths.len() as u64, "recording"));
        text.push_str(&format!("{}\n", palette.paint(Style::Open, &heading)));
        for path in paths.iter().take(LISTED) {
            text.push_str(&wrapped(path, 2, 6, WIDTH));
        }
        if paths.len() > LISTED {
            text.push_str(&wrapped(&format!("and {} more, all in the report", paths.len() - LISTED), 2, 6, WIDTH));
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_delay_in_doubt_says_so() {
        let pairs = PairsItem { measured: 2, delay_frames: Some((3.0, 3.5)), ..PairsItem::default() };
        assert!(alignment(&pairs, Palette::OFF).contains("  delay: 3 to 3.5 frames\n"));
        let text = alignment(&PairsItem { ambiguous: 1, ..pairs }, Palette::OFF);
        assert!(text.contains("  delay: 3 to 3.5 frames, ambiguous in 1 pair: "), "{text}");
    }

    #[test]
    fn a_recording_after_that_reached_full_scale_is_named() {
        let pairs = PairsItem { measured: 3, ..PairsItem::default() };
        assert!(!alignment(&pairs, Palette::OFF).contains("full scale"));
        let pairs = PairsItem { at_full_scale: 2, first_at_full_scale: Some("b.wav".into()), ..pairs };
        let text = alignment(&pairs, Palette::OFF);
        assert!(text.contains("  full scale: reached in 2 pairs, the first is b.wav;"), "{text}");
    }
}
