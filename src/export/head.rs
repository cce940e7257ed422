//! What every form says about itself: where it is from, how exact it is, what it promises
//! and what it leaves out.

use super::precision::{MOST_BITS, Precision, Rounded, bits_text, digits_text};
use super::{Form, Request};
use crate::cascade::both_ways::RING_FALL_DB;
use crate::design::check::{BandDesign, CAP_DB, Check};
use crate::design::settling::settling_frames;
use crate::design::wording::{decibel, figure};
use crate::design::{Design, LeftOut};
use crate::spec::Requirement;

/// Columns that a line of a head fills at most, unless a single word is longer.
const WIDTH: usize = 100;

/// What a form says about itself.
#[derive(Clone, Debug)]
pub(super) struct Head<'a> {
    pub(super) form: Form,
    pub(super) title: Option<&'a str>,
    pub(super) file_name: &'a str,
    pub(super) file_sha256: &'a str,
    pub(super) rate_hz: u32,
    pub(super) passes: u32,
    /// Frames after which nothing of one pass' impulse response is left; 0 where there is one only.
    pub(super) ring_frames: u64,
    pub(super) precision: Precision,
    pub(super) section_count: usize,
    pub(super) gain_db: f64,
    pub(super) left_out: &'a [LeftOut],
    pub(super) bands: &'a [BandDesign],
}

impl<'a> Head<'a> {
    pub(super) fn new(
        request: &Request<'a>,
        design: &'a Design,
        precision: &Precision,
        rounded: &'a Rounded,
    ) -> Head<'a> {
        let spec = &request.spec.spec;
        Head {
            form: request.form,
            title: spec.title.as_deref(),
            file_name: request.file_name,
            file_sha256: &request.spec.file_sha256,
            rate_hz: request.rate_hz,
            passes: design.passes,
            ring_frames: if design.passes > 1 { settling_frames(&rounded.sections, RING_FALL_DB) } else { 0 },
            precision: *precision,
            section_count: rounded.sections.len(),
            gain_db: spec.output.gain_db,
            left_out: &design.left_out,
            bands: &rounded.bands,
        }
    }

    /// The head as lines of a comment, each with `prefix` (`// `, `# `). `notes` are what the
    /// form has to say about its own use. No line can end the comment, whatever title, file
    /// name and band names hold.
    pub(super) fn comment(&self, prefix: &str, notes: &[&str]) -> String {
        let title = self.title.map_or_else(String::new, |title| format!("{}, ", quoted(title)));
        let mut lines = vec![
            format!(
                "A cascade of second-order sections, exported by bandproof {} as {}.",
                env!("CARGO_PKG_VERSION"),
                self.form.name()
            ),
            format!("Spec: {title}file {}, SHA-256 {}.", quoted(self.file_name), self.file_sha256),
            format!("Sample rate: {} Hz. At any other rate this is another filter.", self.rate_hz),
            format!("Digits: {}.", self.precision_text()),
            format!("Passes: {}.", self.passes_text()),
            format!("Not in it: {}.", self.not_in_it()),
        ];
        lines.extend(
            self.left_out
                .iter()
                .map(|one| format!("Left out at this rate: {}: {}.", spoken(&one.what), spoken(&one.reason))),
        );
        lines.extend(notes.iter().map(|note| (*note).to_owned()));
        lines.push(self.check_title().to_owned());
        lines.extend(self.bands.iter().map(band_line));
        lines.iter().map(|line| wrapped(line, prefix)).collect()
    }

    /// How exact the coefficients are.
    pub(super) fn precision_text(&self) -> String {
        let none = "no band has a requirement that tells how few would do";
        match self.precision {
            Precision::Full { fewest: Some(fewest) } => format!(
                "every coefficient reads back as the same f64; with {} every requirement would still hold",
                digits_text(fewest)
            ),
            Precision::Full { fewest: None } => format!("every coefficient reads back as the same f64; {none}"),
            Precision::FewestDigits { digits } => {
                format!("{digits} significant, the fewest with which every requirement still holds")
            }
            Precision::Digits { digits, holding } => {
                let holding = holding.map_or_else(
                    || none.to_owned(),
                    |holding| format!("every requirement holds with {}", holding.text()),
                );
                format!("{digits} significant, as asked for; {holding}")
            }
            Precision::Bits { bits, is_asked: false, fewest: Some(_), .. } => {
                format!("words of {}, the shortest with which every requirement still holds", bits_text(bits))
            }
            Precision::Bits { bits, fewest: None, is_asked: false, .. } => {
                format!("words of {}; {none}", bits_text(bits))
            }
            Precision::Bits { bits, fewest, required, .. } => {
                let fewest = match (fewest, required) {
                    (Some(fewest), _) => format!("every requirement holds with {}", bits_text(fewest)),
                    (None, true) => format!("no word length up to {MOST_BITS} bits holds every requirement"),
                    (None, false) => none.to_owned(),
                };
                format!("words of {}, as asked for; {fewest}", bits_text(bits))
            }
        }
    }

    /// How often the cascade is to run.
    pub(super) fn passes_text(&self) -> String {
        match self.passes {
            1 => "1, forward".to_owned(),
            2 => format!(
                "2, forward and then backward over the result (zero phase); the sections are those of one pass, and only \
                 one pass is here: the second is the user's to run, over what the first made from its last sample to its \
                 first, and started like the first. Before both, bandproof continues a recording x of N samples at either \
                 end by its own samples turned about its first and its last, 2 x[0] - x[k] and 2 x[N-1] - x[N-1-k], k up to \
                 {} or N - 1 where that is less, and takes them off after both",
                self.ring_frames
            ),
            passes => format!("{passes}"),
        }
    }

    /// What of a run is not part of the cascade.
    pub(super) fn not_in_it(&self) -> String {
        if self.gain_db == 0.0 {
            "rounding and dither of an output file".to_owned()
        } else {
            format!("the spec's output gain of {} dB, rounding and dither of an output file", figure(self.gain_db))
        }
    }

    fn check_title(&self) -> &'static str {
        match (self.bands, self.passes) {
            ([], _) => "Design check: no bands.",
            (_, 1) => "Design check of exactly these sections:",
            _ => "Design check of exactly these sections, all passes together:",
        }
    }
}

fn band_line(design: &BandDesign) -> String {
    let band = &design.band;
    let attenuation =
        |db: f64| if db >= CAP_DB { format!("{CAP_DB} dB or more") } else { format!("{} dB", decibel(db)) };
    let (least, most) = (attenuation(design.attenuation_min_db), attenuation(design.attenuation_max_db));
    let required = match &band.requirement {
        Requirement::Reduce { reduce_db } => format!(", reduce_db = {}", figure(*reduce_db)),
        Requirement::Keep { keep_db, .. } => format!(", keep_db = {}", figure(*keep_db)),
        Requirement::Residual { residual_dbfs } => format!(", residual_dbfs = {}", figure(*residual_dbfs)),
        Requirement::Observe => String::new(),
    };
    let check = match design.check {
        Some(Check::Guaranteed) => "guaranteed, ",
        Some(Check::Depends) => "depends, ",
        Some(Check::Impossible) => "impossible, ",
        None => "",
    };
    let margin =
        margin_db(design).map_or_else(String::new, |margin_db| format!("holds by {} dB, ", decibel(margin_db)));
    let reached = design.reaches_hz.map_or_else(String::new, |(from_hz, to_hz)| {
        format!("; reached from {} to {} Hz", decibel(from_hz), decibel(to_hz))
    });
    let excepted_hz = design.excepted_width_hz();
    let excepted = if excepted_hz > 0.0 { format!("; {} Hz excepted", decibel(excepted_hz)) } else { String::new() };
    format!(
        "  {}, {} to {} Hz{required}: {check}{margin}attenuation {least} to {most}{reached}{excepted}",
        quoted(&band.name),
        figure(band.line.from_hz),
        figure(band.line.to_hz),
    )
}

/// By how much a guaranteed requirement holds, dB.
pub(super) fn margin_db(design: &BandDesign) -> Option<f64> {
    if design.check != Some(Check::Guaranteed) {
        return None;
    }
    match design.band.requirement {
        Requirement::Reduce { reduce_db } => Some((design.attenuation_min_db - reduce_db).max(0.0)),
        Requirement::Keep { keep_db, .. } => {
            let worst_db = design.attenuation_min_db.abs().max(design.attenuation_max_db.abs());
            Some((keep_db - worst_db).max(0.0))
        }
        Requirement::Residual { .. } | Requirement::Observe => None,
    }
}

/// A text of the user's within quotes, as [`spoken`].
fn quoted(text: &str) -> String {
    format!("\"{}\"", spoken(text).replace('"', "\\u{22}"))
}

/// A text of the user's that can't leave the line it stands on, end a comment, or look like
/// something else: control and format characters, backslashes, `*/`, and the second of two
/// question marks (`??/` is a backslash in C) are written as `\u{...}`.
fn spoken(text: &str) -> String {
    let mut clean = String::with_capacity(text.len());
    let mut before = ' ';
    for character in text.chars() {
        let is_pair = matches!((before, character), ('?', '?') | ('*', '/') | ('/', '*'));
        if character == '\\' || is_pair || is_unseen(character) {
            clean.extend(character.escape_unicode());
        } else {
            clean.push(character);
        }
        before = character;
    }
    clean
}

/// Control characters, line and paragraph separators, and characters of general category
/// Cf (format) that hide or reorder what stands beside them (Unicode 15, from memory).
fn is_unseen(character: char) -> bool {
    character.is_control()
        || matches!(
            character,
            '\u{ad}' | '\u{600}'..='\u{605}' | '\u{61c}' | '\u{6dd}' | '\u{70f}' | '\u{180e}' | '\u{200b}'..='\u{200f}'
                | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff9}'..='\u{fffb}'
                | '\u{1d173}'..='\u{1d17a}' | '\u{e0000}'..='\u{e007f}'
        )
}

/// `text` as lines with `prefix`, broken at spaces; later lines are two columns further in.
fn wrapped(text: &str, prefix: &str) -> String {
    let indent: String = text.chars().take_while(|&c| c == ' ').collect();
    let mut out = String::new();
    let mut line = format!("{prefix}{indent}");
    let mut is_empty = true;
    for word in text.split(' ').filter(|word| !word.is_empty()) {
        if !is_empty && line.chars().count() + 1 + word.chars().count() > WIDTH {
            out.push_str(line.trim_end());
            out.push('\n');
            line = format!("{prefix}{indent}    ");
            is_empty = true;
        }
        if !is_empty {
            line.push(' ');
        }
        line.push_str(word);
        is_empty = false;
    }
    out + line.trim_end() + "\n"
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_text_stays_within_its_quotes_and_its_line() {
        for (text, expected) in [
            ("Reed bed, station \u{e5}", "\"Reed bed, station \u{e5}\""),
            ("a \"b\"\nc", "\"a \\u{22}b\\u{22}\\u{a}c\""),
            ("end */ of\\", "\"end *\\u{2f} of\\u{5c}\""),
            ("why??/", "\"why?\\u{3f}/\""),
            ("\u{202e}\u{2028}\u{1}", "\"\\u{202e}\\u{2028}\\u{1}\""),
        ] {
            assert_eq!(quoted(text), expected);
        }
    }

    #[test]
    fn lines_are_broken_at_spaces() {
        let text = format!("  {}", ["word"; 30].join(" "));
        let lines = wrapped(&text, "// ");
        assert!(lines.lines().all(|line| line.starts_with("//   ") && line.chars().count() <= WIDTH), "{lines}");
        assert_eq!(lines.split_whitespace().filter(|word| *word == "word").count(), 30);
    }
}
