//! A cascade that was found from the bands, for people and programs.

use super::WIDTH;
use super::color::{Palette, Style};
use super::names;
use super::table::{Table, wrapped};
use super::units::{counted, trimmed};
use bandproof::design::auto::margin::{KEEP_SPARE, REDUCE_SPARE};
use bandproof::design::auto::{Found, Spare};
use bandproof::spec::document::Comments;
use serde_json::{Value, json};

/// What "to spare" leaves out of a band with exceptions.
const SLOPES: &str = "To spare is counted outside what stops may take for excepted lines; on their slopes a band goes \
                      to the very end of its keep_db, and what lies beyond that is excepted.";

/// What was found, with what each band has to spare.
pub fn text(found: &Found, palette: Palette) -> String {
    let title = palette.paint(Style::Heading, "Found from the bands");
    let rows = rows(&found.spares);
    // Which rate it is goes without saying where there is one.
    let several = found.rates_hz.len() > 1;
    let mut columns = vec![("Band", false), ("required", false), ("to spare dB", true)];
    columns.extend(several.then_some(("at rate Hz", true)));
    columns.push(("excepted Hz", true));
    let mut table = Table::new(columns);
    for row in &rows {
        let excepted = if row.excepted_hz > 0.0 { trimmed(row.excepted_hz, 3) } else { "-".to_owned() };
        let mut cells = vec![row.name.clone(), row.asked.clone(), format!("{:.3}", row.spare_db)];
        cells.extend(several.then(|| row.rate_hz.to_string()));
        cells.push(excepted);
        table.row(cells.into_iter().map(|text| (text, Style::Plain)));
    }
    let (table, sentence) = (table.render(palette, 0, WIDTH), wrapped(&sentence(found), 0, 0, WIDTH));
    let note = if rows.iter().any(|row| row.excepted_hz > 0.0) { wrapped(SLOPES, 0, 0, WIDTH) } else { String::new() };
    format!("{title}\n\n{sentence}\n{table}{note}")
}

/// One sentence for the summary of a run.
pub fn brief(found: &Found) -> String {
    format!("Filters found from the bands: {} every requirement at {} Hz.", promise(found), rates(found))
}

/// `9 stages of 17 second-order sections in all guarantee`.
fn promise(found: &Found) -> String {
    let stages = found.spec.stages.len() as u64;
    let sections = counted(u64::from(found.sections), "second-order section");
    let verb = if stages == 1 { "guarantees" } else { "guarantee" };
    format!("{} of {sections} in all {verb}", counted(stages, "stage"))
}

fn sentence(found: &Found) -> String {
    let promise = promise(found);
    format!(
        "{promise} every requirement at {} Hz, and none with fewer sections was found. \
         A margin is kept in hand: at least {} % of each keep_db and {} % of each reduce_db.",
        rates(found),
        trimmed(100.0 * KEEP_SPARE, 3),
        trimmed(100.0 * REDUCE_SPARE, 3)
    )
}

fn rates(found: &Found) -> String {
    let rates: Vec<_> = found.rates_hz.iter().map(u32::to_string).collect();
    match rates.split_last() {
        Some((last, [])) => last.clone(),
        Some((last, first)) => format!("{} and {last}", first.join(", ")),
        None => String::new(),
    }
}

/// Lines of a row told together: the least of them.
fn rows(spares: &[Spare]) -> Vec<Spare> {
    names::rows(spares, |spare| &spare.name, |a, b| a.asked == b.asked)
        .into_iter()
        .filter_map(|row| {
            let least = row.iter().min_by(|a, b| a.spare_db.total_cmp(&b.spare_db))?;
            let name = names::span(&row.first()?.name, &row.last()?.name);
            Some(Spare { name, excepted_hz: row.iter().map(|one| one.excepted_hz).sum(), ..least.clone() })
        })
        .collect()
}

/// The same for programs.
///
/// # Errors
/// The spec does not go into JSON, which no spec that was read does.
pub fn document(found: &Found) -> serde_json::Result<Value> {
    let bands: Vec<Value> = found
        .spares
        .iter()
        .map(|spare| {
            json!({
                "name": spare.name, "spare_db": thousandths(spare.spare_db), "rate_hz": spare.rate_hz,
                "excepted_hz": thousandths(spare.excepted_hz),
            })
        })
        .collect();
    Ok(json!({
        "spec": serde_json::to_value(&found.spec)?, "section_count": found.sections, "rates_hz": found.rates_hz,
        "bands": bands,
    }))
}

fn thousandths(value: f64) -> f64 {
    (value * 1000.0).round() / 1000.0
}

/// What a written spec says of its stages and bands.
pub fn comments(found: &Found, spec_name: &str) -> Comments {
    let mut bands: Vec<(String, String)> = Vec::new();
    for row in rows(&found.spares) {
        let excepted = if row.excepted_hz > 0.0 {
            format!(", and exceptions take {} Hz out of it", trimmed(row.excepted_hz, 3))
        } else {
            String::new()
        };
        // Above the table of the row.
        bands.push((row.base_name, format!("At least {:.3} dB to spare{excepted}.", row.spare_db)));
    }
    let head = vec![
        format!("Stages found from the bands of {spec_name}."),
        sentence(found),
        "Edit what you like: `bandproof design` shows what still holds.".to_owned(),
    ];
    Comments { head, bands }
}
