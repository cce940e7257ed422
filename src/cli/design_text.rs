//! What a spec becomes at a sample rate, for people.

use super::WIDTH;
use super::color::{Palette, Style};
use super::summary_text::required;
use super::table::{Table, wrapped};
use super::units::{seconds, small, trimmed};
use bandproof::design::check::CAP_DB;
use bandproof::design::roots::landmarks;
use bandproof::report::{CheckResult, Db, DesignEntry, Hz, LimitEdge, StageEntry};
use bandproof::section::Section;

/// What rounding may do to a response before a reader has to know, dB.
const WORTH_TELLING_DB: f64 = 1e-4;

/// One design.
pub fn text(design: &DesignEntry, palette: Palette) -> String {
    let parts = [
        left_out(design, palette),
        stages(design, palette),
        limits(design, palette),
        sections(design, palette),
        settling(design),
        bands(design, palette),
        times(design, palette),
    ];
    let title = palette.paint(Style::Heading, &format!("At {} Hz", design.rate_hz));
    let parts: String = parts.into_iter().filter(|part| !part.is_empty()).map(|part| part + "\n").collect();
    format!("{title}\n\n{parts}")
}

fn heading(text: &str, palette: Palette) -> String {
    format!("{}\n", palette.paint(Style::Heading, text))
}

fn left_out(design: &DesignEntry, palette: Palette) -> String {
    if design.left_out.is_empty() {
        return String::new();
    }
    let lines = design.left_out.iter().map(|one| wrapped(&format!("{}: {}", one.what, one.reason), 2, 6, WIDTH));
    heading("Left out at this rate", palette) + &lines.collect::<String>()
}

fn stages(design: &DesignEntry, palette: Palette) -> String {
    if design.stages.is_empty() {
        return wrapped("No stages: samples pass unchanged.", 0, 0, WIDTH);
    }
    let mut table = Table::new([
        ("Stage", false),
        ("line", true),
        ("family", false),
        ("order", true),
        ("total", true),
        ("sections", true),
        ("edges Hz", false),
        ("ripple dB", true),
        ("stop dB", true),
    ]);
    for stage in &design.stages {
        let StageEntry { stage: number, kind, total_order, sections, .. } = stage;
        let edges: Vec<_> = stage.edges_hz.iter().map(|&hz| hertz(hz)).collect();
        let cells = [
            format!("{number} {kind}"),
            or_dash(stage.line),
            or_dash(stage.family.as_ref()),
            or_dash(stage.order),
            total_order.to_string(),
            sections.to_string(),
            edges.join(" to "),
            or_dash(stage.ripple_db.map(|db| small(db.get()))),
            or_dash(stage.stop_db.map(|db| trimmed(db.get(), 3))),
        ];
        table.row(cells.map(plain));
    }
    let note = "Order is that of the low-pass prototype, total that of the finished filter.";
    let has_orders = design.stages.iter().any(|stage| stage.order.is_some());
    let note = if has_orders { wrapped(note, 0, 0, WIDTH) } else { String::new() };
    table.render(palette, 0, WIDTH) + &note + &remarks(design)
}

/// Remarks under the stage's number; lines of a row that share one have it once.
fn remarks(design: &DesignEntry) -> String {
    let mut told: Vec<(usize, &String)> = Vec::new();
    for stage in &design.stages {
        for remark in &stage.remarks {
            if !told.contains(&(stage.stage, remark)) {
                told.push((stage.stage, remark));
            }
        }
    }
    told.iter().map(|(number, remark)| wrapped(&format!("Stage {number}: {remark}."), 0, 2, WIDTH)).collect()
}

/// What is left of the limits of stages whose order was found from them.
fn limits(design: &DesignEntry, palette: Palette) -> String {
    let mut table =
        Table::new([("Limit", false), ("edge", false), ("Hz", true), ("attenuation dB", false), ("slack dB", true)]);
    let mut is_empty = true;
    for stage in &design.stages {
        for limit in &stage.limits {
            is_empty = false;
            let (edge, bound) = match limit.edge {
                LimitEdge::Pass => ("pass", "at most"),
                LimitEdge::Stop => ("stop", "at least"),
            };
            let cells = [
                format!("{} {}", stage.stage, stage.kind),
                edge.to_owned(),
                hertz(limit.at_hz),
                format!("{bound} {}", trimmed(limit.limit_db.get(), 3)),
                format!("{:.3}", limit.slack_db.get()),
            ];
            table.row(cells.map(plain));
        }
    }
    if is_empty {
        return String::new();
    }
    let note = "The order is the lowest that holds these limits. Slack: how far the response stays on the right side of \
                the limit, at its worst frequency from the edge on.";
    table.render(palette, 0, WIDTH) + &wrapped(note, 0, 0, WIDTH)
}

fn sections(design: &DesignEntry, palette: Palette) -> String {
    if design.sections.is_empty() {
        return String::new();
    }
    let mut text = heading("Sections, in the order they run", palette);
    text.push_str("  H(z) = (b0 + b1 z^-1 + b2 z^-2) / (1 + a1 z^-1 + a2 z^-2)\n");
    for (section, number) in design.sections.iter().zip(1..) {
        let [b0, b1, b2] = section.b.map(coefficient);
        let [_, a1, a2] = section.a.map(coefficient);
        text.push_str(&format!("{number:4}  b0 {b0:<24}  b1 {b1:<24}  b2 {b2}\n"));
        text.push_str(&format!("      {:27}  a1 {a1:<24}  a2 {a2}\n", ""));
        text.push_str(&format!("      {}\n", poles(section, design.rate_hz)));
    }
    text
}

/// In full: the shortest form that reads back as the same bits, at most 24 characters.
fn coefficient(value: f64) -> String {
    let tiny = value != 0.0 && value.abs() < 1e-3;
    if tiny { format!("{value:e}") } else { value.to_string() }
}

fn poles(section: &Section, rate_hz: u32) -> String {
    let poles = landmarks(section.a);
    let each = poles.iter().map(|pole| {
        let turns = pole.angle / (2.0 * std::f64::consts::PI);
        format!("radius {} at {} Hz", trimmed(1.0 - pole.depth, 9), trimmed(turns * f64::from(rate_hz), 3))
    });
    let each: Vec<_> = each.collect();
    let kind = match poles.as_slice() {
        [] => return "no poles".to_owned(),
        [pole] if pole.angle > 0.0 && pole.angle < std::f64::consts::PI => "pole pair",
        [_] => "real pole",
        _ => "real poles",
    };
    format!("{kind}: {}", each.join(" and "))
}

fn settling(design: &DesignEntry) -> String {
    if design.sections.is_empty() {
        return String::new();
    }
    let both_ways = design.passes > 1;
    let passes = "They run forward and then backward: zero phase. Orders and sections are those of one pass, everything \
                  else is that of both, twice the decibels of one.";
    let passes = if both_ways { wrapped(passes, 0, 0, WIDTH) } else { String::new() };
    let line = format!(
        "Settling takes {}; figures of recordings leave that out at {}. Largest pole radius {}.",
        seconds(design.settling_s.get()),
        if both_ways { "the start and at the end" } else { "the start" },
        trimmed(design.max_pole_radius.get(), 9),
    );
    passes + &wrapped(&line, 0, 0, WIDTH) + &rounding(design)
}

/// Only where it is more than nothing.
fn rounding(design: &DesignEntry) -> String {
    let (db, at_hz) = match design.rounding_at_hz {
        Some(at_hz) if design.rounding_db.get() > WORTH_TELLING_DB => (design.rounding_db.get(), at_hz),
        _ => return String::new(),
    };
    let line = format!(
        "Rounding: the exact coefficients have more digits than f64 holds, and with these the response is up to {} dB \
         off what the stages ask for (at {} Hz). A wider band, an edge farther from 0 Hz and half the rate, a lower \
         order or a lower sample rate bring it nearer.",
        trimmed(db, 5),
        hertz(at_hz),
    );
    wrapped(&line, 0, 0, WIDTH)
}

fn bands(design: &DesignEntry, palette: Palette) -> String {
    if design.bands.is_empty() {
        return wrapped("No bands: nothing is required or observed.", 0, 0, WIDTH);
    }
    let mut table = Table::new([
        ("Band", false),
        ("from Hz", true),
        ("to Hz", true),
        ("required", false),
        ("attenuation dB", true),
        ("up to dB", true),
        ("excepted Hz", true),
        ("check", false),
    ]);
    for band in &design.bands {
        let excepted_hz = if band.excepted_hz.get() > 0.0 { hertz(band.excepted_hz) } else { "-".to_owned() };
        let (check, style) = check(band.check);
        let cells = [band.name.clone(), hertz(band.from_hz), hertz(band.to_hz), required(band.require)];
        let mut row: Vec<_> = cells.map(plain).into();
        row.push(plain(attenuation(band.attenuation_min_db)));
        row.push(plain(attenuation(band.attenuation_max_db)));
        row.push(plain(excepted_hz));
        row.push((check.to_owned(), style));
        table.row(row);
    }
    table.render(palette, 0, WIDTH)
}

/// The report's figures stop at [`CAP_DB`].
fn attenuation(db: Db) -> String {
    if db.get() >= CAP_DB { format!("{CAP_DB} or more") } else { format!("{:.3}", db.get()) }
}

fn check(check: Option<CheckResult>) -> (&'static str, Style) {
    match check {
        Some(CheckResult::Guaranteed) => ("guaranteed", Style::Good),
        Some(CheckResult::Depends) => ("depends", Style::Open),
        Some(CheckResult::Impossible) => ("impossible", Style::Bad),
        None => ("-", Style::Plain),
    }
}

fn times(design: &DesignEntry, palette: Palette) -> String {
    if design.bands.is_empty() {
        return String::new();
    }
    let mut table = Table::new([
        ("Band", false),
        ("reached from Hz", true),
        ("to Hz", true),
        ("group delay ms", true),
        ("start-up s", true),
        ("shortest recording s", true),
    ]);
    for band in &design.bands {
        let cells = [
            band.name.clone(),
            or_dash(band.reaches_from_hz.map(hertz)),
            or_dash(band.reaches_to_hz.map(hertz)),
            or_dash(band.group_delay_s.map(|s| format!("{:.3}", s.get() * 1e3))),
            or_dash(band.startup_s.map(|s| format!("{:.3}", s.get()))),
            or_dash(band.shortest_s.map(|s| format!("{:.1}", (s.get() * 10.0).ceil() / 10.0))),
        ];
        table.row(cells.map(plain));
    }
    let at_end = if design.passes > 1 { ", at the start and at the end" } else { "" };
    let note = format!(
        "Reached: where the requirement is met. Start-up: how long a steady line at the center is still heard{at_end}. \
         Shortest recording: what it takes to judge the band."
    );
    table.render(palette, 0, WIDTH) + &wrapped(&note, 0, 0, WIDTH)
}

/// The sentence of its methods; it speaks of recordings as filtered, so it is not for a plan.
pub fn methods(design: &DesignEntry, palette: Palette) -> String {
    heading("For a methods section, once recordings are filtered with this", palette)
        + &wrapped(&design.methods.sentence, 0, 0, WIDTH)
}

fn hertz(hz: Hz) -> String {
    trimmed(hz.get(), 3)
}

fn plain(text: String) -> (String, Style) {
    (text, Style::Plain)
}

fn or_dash(value: Option<impl ToString>) -> String {
    value.map_or("-".to_owned(), |value| value.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::json;

    /// A design of made-up figures, so that this is about looks only.
    fn design() -> DesignEntry {
        let stage = json!({
            "stage": 2, "line": 1, "kind": "bandstop", "family": "elliptic", "order": 3, "total_order": 6,
            "sections": 3, "edges_hz": [58.0, 62.0], "ripple_db": 0.1, "stop_db": 40.0, "limits": [],
            "remarks": ["each of the two passes has made-up figures, told at such a length that it takes a second line"],
        });
        let found = json!({
            "stage": 3, "line": null, "kind": "lowpass", "family": "bessel", "order": 7, "total_order": 7,
            "sections": 4, "edges_hz": [1000.0], "ripple_db": 0.5, "stop_db": 60.0, "remarks": [],
            "limits": [
                {"edge": "pass", "at_hz": 1000.0, "limit_db": 0.5, "slack_db": 0.0},
                {"edge": "stop", "at_hz": 4000.5, "limit_db": 60.0, "slack_db": 3.214},
            ],
        });
        let band = json!({
            "name": "generator x1", "from_hz": 59.5, "to_hz": 60.5, "require": {"reduce_db": 30.0},
            "attenuation_min_db": 40.066, "attenuation_max_db": 180.0, "reaches_from_hz": 59.299,
            "reaches_to_hz": 60.641, "excepted_hz": 0.0, "group_delay_s": null, "startup_s": 0.91,
            "shortest_s": 11.72, "check": "guaranteed", "violation": null,
        });
        let kept = json!({
            "name": "whistles", "from_hz": 40.0, "to_hz": 9000.0, "require": {"keep_db": 0.5},
            "attenuation_min_db": -0.001, "attenuation_max_db": 10.932, "reaches_from_hz": null,
            "reaches_to_hz": null, "excepted_hz": 10.796, "group_delay_s": 0.000_012, "startup_s": null,
            "shortest_s": 1.8, "check": "impossible", "violation": {"at_hz": 40.0, "gain_db": -10.932},
        });
        serde_json::from_value(json!({
            "rate_hz": 48_000,
            "left_out": [{"what": "stage 3, line 2 (28000 Hz)", "reason": "its upper edge is at 28500 Hz"}],
            "stages": [stage, found],
            "sections": [
                {"b": [0.5, -1.0, 0.5], "a": [1.0, -1.2, 0.52]},
                {"b": [1.992_161_414_429_491_5, -1.992_161_414_429_491_5, 0.0], "a": [1.0, -0.75, 0.125]},
                {"b": [1.0, 0.0, 0.0], "a": [1.0, 0.5, 0.0]},
                {"b": [1.0, 0.0, 0.0], "a": [1.0, 0.0, 0.0]},
            ],
            "passes": 1, "settling_s": 1.73, "max_pole_radius": 0.999_930_801,
            "rounding_db": 9.99e-5, "rounding_at_hz": 60.1, "dither": "triangular-1",
            "bands": [band, kept], "witness": null,
            "methods": {
                "sentence": "Recordings were filtered with a filter of made-up figures, told at such a length that it \
                             takes a second line, and that is all.",
                "program": "bandproof 0.1.0", "applied": true, "rate_hz": 48_000, "design": null, "total_order": 6,
                "sections": 4, "passes": 1, "direction": "forward", "causal": true, "phase": "non-linear",
                "start_state": "", "settling_s": 1.73, "arithmetic": "", "dither": "triangular-1", "stages": [],
                "bands": [],
            },
        }))
        .unwrap()
    }

    #[test]
    fn a_design_looks_like_this() {
        let text = text(&design(), Palette::OFF) + &methods(&design(), Palette::OFF);
        assert_eq!(text, include_str!("../../tests/cli/snapshots/design.txt"), "\n{text}");
        assert!(text.lines().all(|line| line.chars().count() <= WIDTH));
    }

    #[test]
    fn what_rounding_does_is_told_where_it_matters() {
        assert!(!text(&design(), Palette::OFF).contains("Rounding"));
        let mut design = design();
        design.rounding_db = 2.51e-4.try_into().unwrap();
        let text = text(&design, Palette::OFF).replace('\n', " ");
        assert!(text.contains("the response is up to 0.00025 dB off what the stages ask for (at 60.1 Hz)."), "{text}");
    }

    #[test]
    fn coefficients_are_shown_in_full_and_in_little_room() {
        for value in [1.0 / 3.0, -1.999_999_999_999_999_8, -1.234_567_890_123_456_7e-9, 0.001, 9.999e-4, 0.0, 1e-300] {
            let text = coefficient(value);
            assert!(text.len() <= 24, "{text}");
            assert_eq!(text.parse::<f64>().unwrap().to_bits(), value.to_bits());
        }
    }

    #[test]
    fn a_long_name_gives_way_to_the_figures() {
        let mut design = design();
        design.bands[0].name = "the generator behind the third shed on the northern side of the quay".to_owned();
        let text = text(&design, Palette::OFF);
        assert!(text.lines().all(|line| line.chars().count() <= WIDTH), "{text}");
        assert!(text.contains("guaranteed") && text.contains(".."), "{text}");
    }

    #[test]
    fn orders_are_explained_where_there_are_any() {
        let mut design = design();
        assert!(text(&design, Palette::OFF).contains("Order is that of the low-pass prototype"));
        design.stages.iter_mut().for_each(|stage| stage.order = None);
        assert!(!text(&design, Palette::OFF).contains("prototype"));
    }

    #[test]
    fn an_identity_has_no_stages_to_show() {
        let identity = DesignEntry { stages: Vec::new(), sections: Vec::new(), bands: Vec::new(), ..design() };
        let text = text(&identity, Palette::OFF);
        assert!(text.contains("samples pass unchanged") && text.contains("No bands"), "{text}");
        assert!(!text.contains("Settling") && !text.contains("Sections"), "{text}");
    }
}
