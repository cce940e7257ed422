//! What a report's summary says against what its own entries come to.

use super::listing::Listing;
use crate::report::{Db, Summary};

/// Counts in the summary that the entries belie, each a sentence.
pub(super) fn counts(listing: &Listing) -> impl Iterator<Item = String> {
    let all = listing.entries.len() as u64;
    let done = listing.entries.iter().filter(|entry| entry.done()).count() as u64;
    let summary = &listing.summary;
    let counts =
        [("recordings", summary.recordings, all), ("done", summary.done, done), ("failed", summary.failed, all - done)];
    let belied = counts.into_iter().filter(|(_, says, has)| says != has);
    belied.map(|(key, says, has)| {
        format!("summary.{key} is {says}, and the report's entries come to {has}: it was changed after it was written")
    })
}

/// Verdicts and figures of the summary that are not what the entries add up to.
pub(super) fn verdicts<'s>(summary: &'s Summary, counted: &'s Summary) -> impl Iterator<Item = String> + 's {
    let bands = (summary.bands != counted.bands).then(|| {
        let differing = summary.bands.iter().zip(&counted.bands).find(|(says, has)| says != has);
        match differing {
            Some((says, has)) => format!(
                "summary.bands has `{}` met {}, missed {}, unproven {}, worst {}, median {}, and the entries come to \
                 met {}, missed {}, unproven {}, worst {}, median {}",
                says.name,
                says.met,
                says.missed,
                says.unproven,
                db(says.worst_db),
                db(says.median_db),
                has.met,
                has.missed,
                has.unproven,
                db(has.worst_db),
                db(has.median_db),
            ),
            None => "summary.bands does not have the bands of the spec".to_owned(),
        }
    });
    let verdict = (summary.verdict != counted.verdict).then(|| {
        let word = |summary: &Summary| serde_json::to_value(summary.verdict).unwrap_or_default();
        format!("summary.verdict is {}, and the entries come to {}", word(summary), word(counted))
    });
    bands.into_iter().chain(verdict)
}

fn db(figure: Option<Db>) -> String {
    figure.map_or("none".to_owned(), |db| format!("{} dB", db.get()))
}
