//! What a recheck found, for people.

use super::WIDTH;
use super::color::{Palette, Style};
use super::table::{Table, wrapped};
use super::units::{bytes, counted, trimmed};
use bandproof::recheck::{AgainCounts, Command, Disagreement, FileCounts, Findings, Recordings, Side};
use bandproof::report::Verdict;

/// Digits of a hash that tell two apart at a glance; all of them stand in the JSON.
const HASH_DIGITS: usize = 12;

/// The whole text.
pub fn text(findings: &Findings, palette: Palette) -> String {
    let mut parts = vec![head(findings), counts(findings, palette)];
    parts.extend(lists(findings, palette));
    parts.push(closing(findings, palette));
    parts.retain(|part| !part.is_empty());
    parts.join("\n")
}

fn head(findings: &Findings) -> String {
    let Recordings { listed, done, failed } = findings.recordings;
    let failed = if failed > 0 { format!(", {failed} failed") } else { String::new() };
    let read = findings.outputs.bytes_read + findings.inputs.map_or(0, |inputs| inputs.bytes_read);
    let line = format!(
        "{} lists {}: {done} done{failed}. {} read to hold the files against it.",
        findings.report,
        counted(listed, "recording"),
        bytes(read),
    );
    let mut text = wrapped(&line, 0, 0, WIDTH);
    if !findings.finished {
        text.push_str(&wrapped("Interrupted: what follows leaves recordings out.", 0, 0, WIDTH));
    }
    if findings.inputs.is_none() {
        text.push_str(&wrapped("Inputs were not looked at: --input says where they are.", 0, 0, WIDTH));
    }
    text
}

fn counts(findings: &Findings, palette: Palette) -> String {
    let mut table = Table::new([
        ("Files", false),
        ("unchanged", true),
        ("changed", true),
        ("missing", true),
        ("new", true),
        ("without hash", true),
        ("unreadable", true),
    ]);
    table.row(row("outputs", &findings.outputs));
    if let Some(inputs) = &findings.inputs {
        table.row(row("inputs", inputs));
    }
    let mut text = table.render(palette, 0, WIDTH);
    let again = [("Filtered again", findings.replay), ("Measured again", findings.remeasure)];
    let mut asked = Table::new([("", false), ("same", true), ("different", true), ("not done", true)]);
    for (what, counts) in again {
        if let Some(AgainCounts { same, different, not_done }) = counts {
            asked.row([
                (what.to_owned(), Style::Heading),
                (same.to_string(), Style::Plain),
                (different.to_string(), if different > 0 { Style::Bad } else { Style::Plain }),
                (not_done.to_string(), if not_done > 0 { Style::Open } else { Style::Plain }),
            ]);
        }
    }
    if again.iter().any(|(_, counts)| counts.is_some()) {
        text.push('\n');
        text.push_str(&asked.render(palette, 0, WIDTH));
    }
    text
}

fn row(name: &str, counts: &FileCounts) -> Vec<(String, Style)> {
    let cell = |count: u64, style: Style| (count.to_string(), if count > 0 { style } else { Style::Plain });
    vec![
        (name.to_owned(), Style::Plain),
        cell(counts.unchanged, Style::Good),
        cell(counts.changed, Style::Bad),
        cell(counts.missing, Style::Bad),
        cell(counts.new, Style::Bad),
        cell(counts.without_hash, Style::Open),
        cell(counts.unreadable, Style::Bad),
    ]
}

/// Every disagreement by name, kind by kind.
fn lists(findings: &Findings, palette: Palette) -> Vec<String> {
    const HEADINGS: [&str; 6] = [
        "The report itself",
        "Changed",
        "Missing",
        "New: recordings that the report does not list",
        "Filtered again, with another result",
        "Measured again, with another result",
    ];
    let mut lists: Vec<String> = HEADINGS.iter().map(|_| String::new()).collect();
    for disagreement in &findings.disagreements {
        let (place, line) = told(disagreement, findings.command);
        lists[place].push_str(&wrapped(&line, 2, 6, WIDTH));
    }
    let headed = HEADINGS.iter().zip(lists).filter(|(_, list)| !list.is_empty());
    let mut parts: Vec<String> =
        headed.map(|(heading, list)| format!("{}\n{list}", palette.paint(Style::Bad, heading))).collect();
    if !findings.unreadable.is_empty() {
        let mut list = format!("{}\n", palette.paint(Style::Bad, "Could not be read"));
        for item in &findings.unreadable {
            list.push_str(&wrapped(&format!("{} ({}): {}", item.path, word(item.side), item.error), 2, 6, WIDTH));
        }
        parts.push(list);
    }
    parts
}

/// The list a disagreement belongs to, and its line there.
fn told(disagreement: &Disagreement, command: Command) -> (usize, String) {
    match disagreement {
        Disagreement::Incomplete { inputs_not_listed, outputs_not_listed } => {
            (0, incomplete(*inputs_not_listed, *outputs_not_listed, command))
        }
        Disagreement::Report { what } => (0, what.clone()),
        Disagreement::Design { rate_hz, what } => (0, format!("at {rate_hz} Hz: {what}")),
        Disagreement::Changed { path, side, bytes_then, bytes_now, sha256_then, sha256_now } => {
            let what = match (sha256_then, sha256_now) {
                _ if bytes_then != bytes_now => {
                    format!("{} then, {} now", exact_bytes(*bytes_then), exact_bytes(*bytes_now))
                }
                (Some(then), Some(now)) => {
                    format!("the same length, other bytes: SHA-256 {}.. then, {}.. now", digits(then), digits(now))
                }
                _ => "other bytes".to_owned(),
            };
            (1, format!("{path} ({}): {what}", word(*side)))
        }
        Disagreement::Missing { path, side } => (2, format!("{path} ({})", word(*side))),
        Disagreement::New { path, side } => (3, format!("{path} ({})", word(*side))),
        Disagreement::Replay { path, sha256_then, sha256_now, error_then, error_now } => {
            let what = match (error_then, error_now) {
                (Some(then), None) => format!("failed then ({}), goes through now", trimmed_sentence(then)),
                (_, Some(now)) => format!("was done then, fails now: {now}"),
                (None, None) => format!(
                    "other bytes come out: SHA-256 {}.. then, {}.. now",
                    digits(sha256_then.as_deref().unwrap_or_default()),
                    digits(sha256_now.as_deref().unwrap_or_default())
                ),
            };
            (4, format!("{path}: {what}"))
        }
        Disagreement::Figure { path, channel: Some(channel), band: Some(band), figure, then, now } => {
            (5, format!("{path}, channel {channel}, {band}: {figure} {} then, {} now", number(*then), number(*now)))
        }
        Disagreement::Figure { path, figure, then, now, .. } => {
            (4, format!("{path}: {figure} {} then, {} now", number(*then), number(*now)))
        }
        Disagreement::Verdict { path, channel, band, then, now } => {
            (5, format!("{path}, channel {channel}, {band}: {} then, {} now", verdict(*then), verdict(*now)))
        }
        Disagreement::Entry { path, what } => (5, format!("{path}: {what}")),
    }
}

fn incomplete(inputs: Option<u64>, outputs: u64, command: Command) -> String {
    let inputs = inputs.map_or(String::new(), |count| format!("{} and ", counted(count, "input")));
    let repair = match command {
        Command::Filter => "run the same command again, and it goes on from there",
        Command::Measure => "measure again, with --replace",
    };
    format!("it is of an interrupted run, and {inputs}{} are not in it yet: {repair}", counted(outputs, "output"))
}

fn word(side: Side) -> &'static str {
    match side {
        Side::Input => "input",
        Side::Output => "output",
    }
}

/// Every digit: lengths that differ by a byte must not look alike.
fn exact_bytes(count: u64) -> String {
    counted(count, "byte")
}

fn digits(hash: &str) -> &str {
    hash.get(..HASH_DIGITS).unwrap_or(hash)
}

fn trimmed_sentence(sentence: &str) -> &str {
    sentence.trim_end_matches('.')
}

fn number(figure: Option<f64>) -> String {
    figure.map_or("none".to_owned(), |figure| trimmed(figure, 6))
}

fn verdict(verdict: Option<Verdict>) -> &'static str {
    match verdict {
        Some(Verdict::Met) => "met",
        Some(Verdict::Missed) => "missed",
        Some(Verdict::Unproven) => "unproven",
        None => "no verdict",
    }
}

fn closing(findings: &Findings, palette: Palette) -> String {
    let (word, style) = match (findings.agrees, findings.finished) {
        (true, _) => ("agrees", Style::Good),
        (false, true) if findings.disagreements.is_empty() => ("undecided", Style::Open),
        (false, true) => ("does not agree", Style::Bad),
        (false, false) => ("not finished", Style::Open),
    };
    let mut parts = vec![counted(findings.disagreements.len() as u64, "disagreement")];
    if !findings.unreadable.is_empty() {
        parts.push(format!("{} that could not be read", counted(findings.unreadable.len() as u64, "file")));
    }
    let mut text = format!("Result: {} ({})\n", palette.paint(style, word), parts.join(", "));
    let gone = |counts: &FileCounts| counts.missing > 0 && counts.unchanged + counts.changed == 0;
    if gone(&findings.outputs) {
        let line = format!("None of the outputs is below {}: --output says where they are.", findings.output_root);
        text.push_str(&wrapped(&line, 0, 2, WIDTH));
    }
    if let (Some(counts), Some(root)) = (&findings.inputs, &findings.input_root)
        && gone(counts)
    {
        text.push_str(&wrapped(&format!("None of the inputs is below {root}: is --input right?"), 0, 2, WIDTH));
    }
    text
}
