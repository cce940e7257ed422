//! The summary of a run for people.

use super::color::{Palette, Style};
use super::table::{Table, wrapped};
use super::units::{bytes, counted, seconds, trimmed};
use super::{WIDTH, design_found, names, pairs_text};
use bandproof::job::Outcome;
use bandproof::report::{
    BandSummary, Db, DesignBand, DesignEntry, Highlights, MissedItem, NotFinite, ReasonCode, Require, Summary,
    UnprovenItem, Verdict,
};
use bandproof::spec::Spec;
use std::collections::HashMap;

/// Requirement of each band by name.
type Requirements = HashMap<String, Option<Require>>;

/// The whole summary.
pub fn text(spec: &Spec, outcome: &Outcome, palette: Palette) -> String {
    let requirements = requirements(spec).unwrap_or_default();
    let parts = [
        done(outcome),
        outcome.found.as_ref().map_or(String::new(), |found| wrapped(&design_found::brief(found), 0, 0, WIDTH)),
        outcome.summary.unpaired.as_ref().map_or(String::new(), |one_sided| pairs_text::unpaired(one_sided, palette)),
        outcome.highlights.pairs.as_ref().map_or(String::new(), |pairs| pairs_text::alignment(pairs, palette)),
        bands(&outcome.summary, &requirements, palette),
        missed(&outcome.highlights.missed, outcome.highlights.missed_more, palette),
        level_as_a_whole(spec, outcome),
        failed(outcome, palette),
        unproven(outcome, palette),
        // What something else filtered starts in its own way.
        if measured_pairs(outcome) { String::new() } else { startup(&outcome.designs, palette) },
        closing(outcome, palette),
    ];
    let parts: Vec<_> = parts.into_iter().filter(|part| !part.is_empty()).collect();
    parts.join("\n")
}

fn requirements(spec: &Spec) -> Result<Requirements, NotFinite> {
    spec.named_bands().map(|band| Ok((band.name, Require::new(&band.requirement)?))).collect()
}

/// `down by 30 dB`, `within 0.5 dB`, `at most -90 dBFS`, or a dash.
pub fn required(require: Option<Require>) -> String {
    match require {
        Some(Require::ReduceDb(limit)) => format!("down by {} dB", trimmed(limit.get(), 3)),
        Some(Require::KeepDb(limit)) => format!("within {} dB", trimmed(limit.get(), 3)),
        Some(Require::ResidualDbfs(limit)) => format!("at most {} dBFS", trimmed(limit.get(), 3)),
        None => "-".to_owned(),
    }
}

/// Whether the run was one of `measure`.
fn measured_pairs(outcome: &Outcome) -> bool {
    outcome.summary.unpaired.is_some()
}

fn done(outcome: &Outcome) -> String {
    let Summary { recordings, done, failed, skipped, .. } = &outcome.summary;
    let rate = if outcome.seconds > 0.0 && outcome.bytes_read > 0 {
        format!(", {} a second", bytes((outcome.bytes_read as f64 / outcome.seconds) as u64))
    } else {
        String::new()
    };
    let failed = if *failed > 0 { format!(", {failed} failed") } else { String::new() };
    let (what, treated, left_alone) = match measured_pairs(outcome) {
        true => ("pair", "measured", "passed over"),
        false => ("recording", "filtered and measured", "not copied"),
    };
    let read = match (outcome.kept, outcome.bytes_read) {
        (1.., 0) => "nothing left to do, found".to_owned(),
        (_, read) => format!("{} read", bytes(read)),
    };
    let kept = match outcome.kept {
        0 => String::new(),
        kept => format!(", {kept} by an earlier run (input and output unchanged)"),
    };
    let first = format!(
        "{done} of {} {treated}{kept}{failed}: {read} in {}{rate}.",
        counted(*recordings, what),
        seconds(outcome.seconds),
    );
    let mut text = wrapped(&first, 0, 0, WIDTH);
    if !outcome.complete {
        let others = counted(outcome.not_done, what);
        let go_on = if measured_pairs(outcome) { "" } else { " The same command again does the rest." };
        let line = format!("Interrupted with {others} not done: what follows leaves them out.{go_on}");
        text.push_str(&wrapped(&line, 0, 0, WIDTH));
    }
    let mut left = Vec::new();
    if skipped.other_files > 0 {
        left.push(format!("{} {left_alone}", counted(skipped.other_files, "other file")));
    }
    if skipped.dot_underscore > 0 {
        left.push(format!("{} with a name that begins with \"._\" skipped", counted(skipped.dot_underscore, "file")));
    }
    if !left.is_empty() {
        text.push_str(&wrapped(&format!("{}.", left.join(", ")), 0, 0, WIDTH));
    }
    let Highlights { noted, first_noted, .. } = &outcome.highlights;
    if let Some(first) = first_noted {
        let which = if *noted == 1 { first.clone() } else { format!("the first of them {first}") };
        let line = format!(
            "The report has notes on {} that {} done: {which}.",
            counted(*noted, what),
            if *noted == 1 { "is" } else { "are" }
        );
        text.push_str(&wrapped(&line, 0, 0, WIDTH));
    }
    text
}

fn bands(summary: &Summary, requirements: &Requirements, palette: Palette) -> String {
    if summary.bands.is_empty() {
        return wrapped("The spec names no bands, so nothing was judged.", 0, 0, WIDTH);
    }
    let mut table = Table::new([
        ("Band", false),
        ("required", false),
        ("figure", false),
        ("worst dB", true),
        ("median dB", true),
        ("met", true),
        ("missed", true),
        ("unproven", true),
    ]);
    for band in &summary.bands {
        let require = requirements.get(&band.name).copied().flatten();
        let mut row = figures(band, require);
        row.extend(counts(band, require));
        table.row(row);
    }
    table.render(palette, 0, WIDTH)
}

fn figures(band: &BandSummary, require: Option<Require>) -> Vec<(String, Style)> {
    let figure = match require {
        Some(Require::ReduceDb(_)) => "attenuation",
        Some(Require::ResidualDbfs(_)) => "level left",
        Some(Require::KeepDb(_)) | None => "gain",
    };
    let db = |figure: Option<Db>| figure.map_or("-".to_owned(), |db| format!("{:.3}", db.get()));
    let worst_style = if band.missed > 0 { Style::Bad } else { Style::Plain };
    let plain = |text: String| (text, Style::Plain);
    vec![
        plain(band.name.clone()),
        plain(required(require)),
        plain(figure.to_owned()),
        (db(band.worst_db), worst_style),
        plain(db(band.median_db)),
    ]
}

fn counts(band: &BandSummary, require: Option<Require>) -> [(String, Style); 3] {
    [(band.met, Verdict::Met), (band.missed, Verdict::Missed), (band.unproven, Verdict::Unproven)].map(
        |(count, verdict)| match (count, require) {
            (_, None) => ("-".to_owned(), Style::Plain),
            (0, _) => ("0".to_owned(), Style::Plain),
            _ => (count.to_string(), Style::from(verdict)),
        },
    )
}

fn heading(text: &str, style: Style, palette: Palette) -> String {
    format!("{}\n", palette.paint(style, text))
}

fn missed(items: &[MissedItem], more: u64, palette: Palette) -> String {
    if items.is_empty() {
        return String::new();
    }
    let mut text = heading("Missed", Style::Bad, palette);
    let alike = |one: &MissedItem, next: &MissedItem| {
        (&one.path, one.channel, one.require, &one.reason) == (&next.path, next.channel, next.require, &next.reason)
    };
    for row in names::rows(items, |item| &item.band, alike) {
        let (Some(first), Some(last)) = (row.first(), row.last()) else { continue };
        let MissedItem { path, channel, band, .. } = first;
        let (bands, reason) = (names::span(band, &last.band), in_brackets(first.reason.as_deref()));
        let line = format!("{path}, channel {channel}, {bands}: {}{reason}", shortfall(first.require, row));
        text.push_str(&wrapped(&line, 2, 6, WIDTH));
    }
    text.push_str(&and_more(more));
    text
}

/// How many are not named.
fn and_more(more: u64) -> String {
    if more == 0 { String::new() } else { wrapped(&format!("and {more} more: see the report"), 2, 6, WIDTH) }
}

/// A device that only changes the level misses every keep band: what to do about that.
fn level_as_a_whole(spec: &Spec, outcome: &Outcome) -> String {
    let gains = |item: &MissedItem| matches!(item.require, Some(Require::KeepDb(_)));
    if !measured_pairs(outcome) || spec.reference_band.is_some() || !outcome.highlights.missed.iter().any(gains) {
        return String::new();
    }
    let hint = "Where the device changes the level as a whole, reference_band in the spec names the band whose gain \
                counts as 0 dB.";
    wrapped(hint, 0, 0, WIDTH)
}

/// What was found and what had to be, with the report's own digits: 29.996 dB is
/// not 30.
fn shortfall(require: Option<Require>, row: &[MissedItem]) -> String {
    let figures = || row.iter().filter_map(|item| item.figure_db).map(Db::get);
    let (Some(low), Some(high)) = (figures().reduce(f64::min), figures().reduce(f64::max)) else {
        return "missed".to_owned();
    };
    let (low, high) = (trimmed(low, 3), trimmed(high, 3));
    let figure = if low == high { low } else { format!("{low} to {high}") };
    match require {
        Some(Require::ReduceDb(limit)) => format!("down by {figure} dB, {} dB required", trimmed(limit.get(), 3)),
        Some(Require::KeepDb(limit)) => {
            format!("gain {figure} dB, at most {} dB either way allowed", trimmed(limit.get(), 3))
        }
        Some(Require::ResidualDbfs(limit)) => {
            format!("{figure} dBFS left, at most {} dBFS allowed", trimmed(limit.get(), 3))
        }
        None => "missed".to_owned(),
    }
}

/// A sentence of the report within one of ours.
fn in_brackets(sentence: Option<&str>) -> String {
    sentence.map_or(String::new(), |sentence| format!(" ({})", sentence.trim_end_matches('.')))
}

fn failed(outcome: &Outcome, palette: Palette) -> String {
    let items = &outcome.highlights.failed;
    if items.is_empty() {
        return String::new();
    }
    let title = if measured_pairs(outcome) { "Failed" } else { "Failed, nothing written for these" };
    let mut text = heading(title, Style::Bad, palette);
    for item in items {
        text.push_str(&wrapped(&format!("{}: {}", item.path, item.error), 2, 6, WIDTH));
    }
    text.push_str(&and_more(outcome.highlights.failed_more));
    text
}

fn unproven(outcome: &Outcome, palette: Palette) -> String {
    let items = &outcome.highlights.unproven;
    if items.is_empty() {
        return String::new();
    }
    let mut text = heading("Unproven, and what it would take", Style::Open, palette);
    // By reason first: the lines of a row can then be told together although some of
    // them are unproven for another reason too.
    let mut items: Vec<&UnprovenItem> = items.iter().collect();
    items.sort_by_key(|item| item.reason_code);
    for row in names::rows(&items, |item| &item.band, |one, next| one.reason_code == next.reason_code) {
        if let (Some(first), Some(last)) = (row.first(), row.last()) {
            text.push_str(&unproven_line(first, last, row, &outcome.designs));
        }
    }
    text
}

fn unproven_line(first: &UnprovenItem, last: &UnprovenItem, row: &[&UnprovenItem], designs: &[DesignEntry]) -> String {
    let fewest = row.iter().map(|item| item.recordings).min().unwrap_or(0);
    let most = row.iter().map(|item| item.recordings).max().unwrap_or(0);
    let count = if fewest == most { counted(most, "recording") } else { format!("{fewest} to {most} recordings") };
    let shortest_s = row.iter().filter_map(|item| longest(designs, &item.band)).reduce(f64::max);
    // A length that some of them have already is not what they lack.
    let longest_s = row.iter().filter_map(|item| item.longest_s).map(|s| s.get()).reduce(f64::max);
    let shortest_s = shortest_s.filter(|&shortest_s| longest_s.is_none_or(|longest_s| longest_s < shortest_s));
    let reason = first.example_reason.as_ref().map_or(String::new(), |reason| {
        let UnprovenItem { example_path: path, example_channel: channel, band, .. } = first;
        format!(" The first, {path}, channel {channel}, {band}: {}.", reason.trim_end_matches('.'))
    });
    let line = format!(
        "{} in {count}. Needed: {}.{reason}",
        names::span(&first.band, &last.band),
        needed(first.reason_code, shortest_s),
    );
    wrapped(&line, 2, 6, WIDTH)
}

/// The length a recording must have at any of the rates for `band` to be judged.
fn longest(designs: &[DesignEntry], band: &str) -> Option<f64> {
    let bands = designs.iter().flat_map(|design| &design.bands).filter(|entry| entry.name == band);
    bands.filter_map(|entry| entry.shortest_s).map(|s| s.get()).reduce(f64::max)
}

fn needed(code: Option<ReasonCode>, shortest_s: Option<f64>) -> String {
    let length = || match shortest_s {
        // Rounded up: a recording as long as is said here must do.
        Some(s) => format!("longer recordings, of {} s at the least", trimmed((s * 10.0).ceil() / 10.0, 1)),
        None => "longer recordings".to_owned(),
    };
    match code {
        Some(ReasonCode::NothingThere) => {
            "recordings with something in this band that stands out from its floor; a limit on what remains \
             (residual_dbfs) needs none"
                .to_owned()
        }
        Some(ReasonCode::TooShort | ReasonCode::Unsettled) => length(),
        Some(ReasonCode::TooQuiet) => {
            "a louder signal in this band, or output in finer steps (encoding = \"pcm24\" or \"float32\")".to_owned()
        }
        Some(ReasonCode::LoudNeighbor) => "recordings with less sound just outside this band".to_owned(),
        Some(ReasonCode::DeviceNoise) => "a quieter or steadier device, or a louder or longer excitation".to_owned(),
        Some(ReasonCode::OutOfRange) => "a band inside the range that the sample rate can carry".to_owned(),
        None => "see the report".to_owned(),
    }
}

/// What a user must know although no verdict speaks of it: the filter needs time to
/// take hold of a line.
fn startup(designs: &[DesignEntry], palette: Palette) -> String {
    let mut told: Vec<(String, Vec<u32>)> = Vec::new();
    for design in designs {
        for line in startup_lines(design) {
            match told.iter_mut().find(|(known, _)| *known == line) {
                Some((_, rates)) => rates.push(design.rate_hz),
                None => told.push((line, vec![design.rate_hz])),
            }
        }
    }
    if told.is_empty() {
        return String::new();
    }
    let both_ways = designs.iter().any(|design| design.passes > 1);
    let ends = if both_ways { "At the start and the end of each recording" } else { "At the start of each recording" };
    let mut text = heading(ends, Style::Heading, palette);
    for (line, rates) in told {
        // Most often it is the same at every rate.
        let at = if rates.len() == designs.len() { String::new() } else { format!(" (at {} Hz)", listed(&rates)) };
        text.push_str(&wrapped(&format!("{line}{at}."), 2, 6, WIDTH));
    }
    text
}

fn startup_lines(design: &DesignEntry) -> Vec<String> {
    let reduce = design.bands.iter().filter(|band| matches!(band.require, Some(Require::ReduceDb(_))));
    let reduce: Vec<_> = reduce.collect();
    let alike = |one: &&DesignBand, next: &&DesignBand| one.startup_s.is_some() == next.startup_s.is_some();
    let rows = names::rows(&reduce, |band| &band.name, alike).into_iter();
    rows.filter_map(|row| {
        let name = names::span(&row.first()?.name, &row.last()?.name);
        Some(match row.iter().filter_map(|band| band.startup_s).map(|s| s.get()).reduce(f64::max) {
            // Gone within a frame: nothing to tell.
            Some(s) if s <= 0.0 => return None,
            Some(s) if design.passes > 1 => format!("{name}: the first and the last {} carry it", seconds(s)),
            Some(s) => format!("{name}: the first {} still carry it", seconds(s)),
            None => format!("{name}: a steady line at its center never comes down as far as required"),
        })
    })
    .collect()
}

/// `44100, 48000 and 96000`.
fn listed(rates: &[u32]) -> String {
    let rates: Vec<_> = rates.iter().map(u32::to_string).collect();
    match rates.split_last() {
        Some((last, [])) => last.clone(),
        Some((last, others)) => format!("{} and {last}", others.join(", ")),
        None => String::new(),
    }
}

fn closing(outcome: &Outcome, palette: Palette) -> String {
    let verdict = outcome.summary.verdict;
    let (word, meaning) = match verdict {
        Verdict::Met => ("met", "every band with a requirement held in some recording and was missed in none"),
        Verdict::Missed => ("missed", "a requirement does not hold"),
        Verdict::Unproven => ("unproven", "a requirement could be shown to hold in no recording, or there is none"),
    };
    let mut text = format!("Verdict: {} ({meaning})\n", palette.paint(Style::from(verdict), word));
    if let Some(path) = &outcome.report_path {
        text.push_str(&wrapped(&format!("Report: {}", path.display()), 0, 2, WIDTH));
    }
    if let Some(path) = &outcome.table_path {
        text.push_str(&wrapped(&format!("Table: {}", path.display()), 0, 2, WIDTH));
    }
    if !outcome.package.is_empty() {
        let files: Vec<_> = outcome.package.iter().map(|path| path.display().to_string()).collect();
        text.push_str(&wrapped(&format!("Package: {}", files.join(", ")), 0, 2, WIDTH));
    }
    let note = "Levels are relative to full scale, not sound pressure; where a calibrated measurement is required, \
                this report does not replace it.";
    text + &wrapped(note, 0, 0, WIDTH)
}

#[cfg(test)]
#[path = "summary_text_tests.rs"]
mod tests;
