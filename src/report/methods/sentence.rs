//! The sentence of a methods section: one on what was done, one on what it comes to.
//!
//! Promises are rounded to the side on which they still hold, everything else to the
//! nearest figure.

mod figures;
mod promises;

use super::{Methods, MethodsStage, MethodsTransition};
use crate::design::{Design, PlacedStage};
use crate::spec::{Family, FilterKind, FilterStage, Placement, Row, Stage, Width};
use figures::{hertz, listed, nearest, rate, span};

/// The sentence for `design`, whose fields `methods` holds already.
pub fn sentence(methods: &Methods, design: &Design) -> String {
    let (program, rate) = (&methods.program, rate(methods.rate_hz));
    if methods.stages.is_empty() {
        return if methods.applied {
            format!(
                "Recordings sampled at {rate} passed through {program} without a filter, since the spec left no stage \
                 in force at this rate."
            )
        } else {
            format!("Recordings sampled at {rate} were measured in pairs with {program}, without a filter to compare.")
        };
    }
    let stages = stages(methods, design);
    if !methods.applied {
        let order = order(methods);
        return format!(
            "Recordings sampled at {rate} were measured in pairs with {program}, which filtered none of them itself, \
             and held against the exact response of the filter that the spec describes, a causal IIR filter of {order} \
             with non-linear phase: {stages}."
        );
    }
    format!(
        "Recordings sampled at {rate} were filtered with {program} in one forward pass (causal, with non-linear phase) \
         through {stages}. {}",
        whole(methods, design)
    )
}

/// `total order 8 in 4 second-order sections`.
fn order(methods: &Methods) -> String {
    let order = methods.total_order;
    // Every odd line has one section of first order.
    let first = methods.stages.iter().any(|stage| stage.total_order % 2 == 1);
    let sections = match (methods.sections, first) {
        (1, true) => "one first-order section".to_owned(),
        (count, true) => format!("{count} sections of first and second order"),
        (1, false) => "one second-order section".to_owned(),
        (count, false) => format!("{count} second-order sections"),
    };
    format!("total order {order} in {sections}")
}

/// The second sentence: design, structure, start, delay, promises, dither.
fn whole(methods: &Methods, design: &Design) -> String {
    let prewarped = prewarped(design);
    let done = [
        format!("was designed from analog prototypes by the bilinear transform with {prewarped}"),
        "ran in double precision in transposed direct form II from the steady state of the first sample".to_owned(),
        format!("settled within {} s", figures::up(methods.settling_s.get(), 3)),
    ];
    let promised = promises::promises(methods, design);
    let dither = if methods.dither == "none" {
        "no dither was added".to_owned()
    } else {
        format!("integer output was rounded with triangular dither of two steps peak to peak ({})", methods.dither)
    };
    format!("The filter ({}) {}{promised}; {dither}.", order(methods), listed(&done))
}

/// What of the stages keeps its place under the bilinear transform.
fn prewarped(design: &Design) -> &'static str {
    let is_notch = |placed: &PlacedStage| matches!(placed.stage, Stage::Notch(_));
    let notches = design.stages.iter().filter(|placed| is_notch(placed)).count();
    let edges = design.stages.iter().filter(|placed| !is_notch(placed)).map(|placed| placed.edges_hz.len()).sum();
    match (edges, notches) {
        (0, ..=1) => "prewarped center and width",
        (0, _) => "prewarped centers and widths",
        (1, 0) => "a prewarped edge",
        (_, 0) => "prewarped edges",
        _ => "prewarped edges, centers, and widths",
    }
}

/// All stages; equal ones in succession are told once.
fn stages(methods: &Methods, design: &Design) -> String {
    let mut phrases: Vec<(String, u32)> = Vec::new();
    for stage in &methods.stages {
        // The lines of a stage share what it was written as.
        let Some(placed) = design.stages.iter().find(|placed| placed.stage_index + 1 == stage.stage) else { continue };
        let phrase = phrase(stage, &placed.stage);
        match phrases.last_mut() {
            Some((last, times)) if *last == phrase => *times += 1,
            _ => phrases.push((phrase, 1)),
        }
    }
    let phrases = phrases.into_iter().map(|(phrase, times)| match times {
        1 => phrase,
        2 => format!("{phrase}, twice in succession"),
        _ => format!("{phrase}, {times} times in succession"),
    });
    let phrases: Vec<_> = phrases.collect();
    match phrases.as_slice() {
        [only] => only.clone(),
        [first, second] => format!("{first}; and {second}"),
        [most @ .., last] => format!("{}; and {last}", most.join("; ")),
        [] => String::new(),
    }
}

fn phrase(stage: &MethodsStage, written: &Stage) -> String {
    match written {
        Stage::Notch(notch) => notch_phrase(stage, &notch.row),
        Stage::Filter(filter) => filter_phrase(stage, filter),
    }
}

fn notch_phrase(stage: &MethodsStage, row: &Row) -> String {
    let transition = transition(stage, None);
    let with = if transition.is_empty() { String::new() } else { format!(", with {transition}") };
    let between = "between half-power points";
    match (multiples(stage, row), row.width) {
        (Some(at), Width::Hz(hz)) => {
            format!("second-order notches at {at}, each {} Hz wide {between}{with}", hertz(hz))
        }
        (Some(at), Width::Q(q)) => format!("second-order notches at {at}, each of Q {} {between}{with}", nearest(q, 6)),
        (None, width) => {
            let width = match width {
                Width::Hz(hz) => format!("{} Hz wide", hertz(hz)),
                Width::Q(q) => format!("{} Hz wide (Q {})", nearest(row.center_hz / q, 4), nearest(q, 6)),
            };
            format!("a second-order notch at {} Hz, {width} {between}{with}", hertz(row.center_hz))
        }
    }
}

fn filter_phrase(stage: &MethodsStage, filter: &FilterStage) -> String {
    let (family, kind) = (family(filter.family), kind(filter.kind));
    let row = match &filter.placement {
        Placement::Row(row) => Some(row),
        Placement::Edge { .. } | Placement::Edges { .. } => None,
    };
    let two_edges = matches!(filter.kind, FilterKind::Bandpass | FilterKind::Bandstop);
    let many = row.and_then(|row| multiples(stage, row).map(|at| (row, at)));
    let order = match (two_edges, many.is_some()) {
        (false, _) => format!("order {}", filter.order),
        (true, false) => format!("prototype order {} (total order {})", filter.order, stage.total_order),
        (true, true) => format!("prototype order {} (total order {} each)", filter.order, stage.total_order),
    };
    let (subject, edges) = match &many {
        Some((row, at)) => {
            let edges = match row.width {
                Width::Hz(hz) => format!("edges {} Hz apart", hertz(hz)),
                Width::Q(q) => format!("edges at a Q of {}", nearest(q, 6)),
            };
            (format!("{family} {kind}s of {order} at {at}"), edges)
        }
        None => {
            let hz = stage.lines.iter().flat_map(|line| &line.edges_hz).map(|&hz| hertz(hz.get()));
            let noun = if two_edges { "edges" } else { "an edge" };
            let article = if filter.family == Family::Elliptic { "an" } else { "a" };
            let edges = format!("{noun} at {} Hz", listed(&hz.collect::<Vec<_>>()));
            (format!("{article} {family} {kind} of {order}"), edges)
        }
    };
    let meaning = match (filter.family, two_edges) {
        (Family::Butterworth | Family::Bessel, true) => "half-power points, -3.01 dB",
        (Family::Butterworth | Family::Bessel, false) => "half power, -3.01 dB",
        (Family::Chebyshev1 | Family::Elliptic, _) => "where the ripple ends",
        (Family::Chebyshev2, _) => "where the stop band begins",
    };
    let mut parts = vec![format!("{edges} ({meaning})")];
    parts.extend(filter.ripple_db.map(|db| format!("a pass-band ripple of {} dB", nearest(db, 3))));
    parts.extend(filter.stop_db.map(|db| format!("a stop-band attenuation of {} dB", nearest(db, 3))));
    let transition = transition(stage, filter.stop_db);
    if !transition.is_empty() {
        parts.push(transition);
    }
    format!("{subject} with {}", listed(&parts))
}

/// `the first 8 multiples of 50 Hz (50 to 400 Hz)`; `None` where there is one line only.
fn multiples(stage: &MethodsStage, row: &Row) -> Option<String> {
    let count = stage.lines.len();
    let last = row.lines().take(count).last().filter(|_| count > 1)?;
    let (first_hz, last_hz) = (hertz(row.center_hz), hertz(last.center_hz));
    Some(format!("the first {count} multiples of {first_hz} Hz (up to {last_hz} Hz)"))
}

/// `a transition width of 11.6 Hz (to 12 dB)`; empty where no transition has both ends.
/// `stated_db` is a stop attenuation that stands in the sentence already.
fn transition(stage: &MethodsStage, stated_db: Option<f64>) -> String {
    let all: Vec<&MethodsTransition> = stage.lines.iter().flat_map(|line| &line.transitions).collect();
    let widths: Option<Vec<f64>> = all.iter().map(|one| one.width_hz.map(super::Hz::get)).collect();
    let Some(widths) = widths.filter(|widths| !widths.is_empty()) else { return String::new() };
    let depths = || all.iter().filter_map(|one| one.stop_db.map(super::Finite::get));
    let to = if stated_db.is_some() { String::new() } else { format!(" (to {} dB)", span(depths(), 3)) };
    let (noun, figures) = match widths.as_slice() {
        [one] => ("a transition width of", nearest(*one, 3)),
        [low, high] if nearest(*low, 3) != nearest(*high, 3) => {
            ("transition widths of", format!("{} and {}", nearest(*low, 3), nearest(*high, 3)))
        }
        _ => ("transition widths of", span(widths.iter().copied(), 3)),
    };
    format!("{noun} {figures} Hz{to}")
}

fn family(family: Family) -> &'static str {
    match family {
        Family::Butterworth => "Butterworth",
        Family::Chebyshev1 => "Chebyshev type I",
        Family::Chebyshev2 => "Chebyshev type II",
        Family::Elliptic => "elliptic",
        Family::Bessel => "Bessel",
    }
}

fn kind(kind: FilterKind) -> &'static str {
    match kind {
        FilterKind::Lowpass => "low-pass",
        FilterKind::Highpass => "high-pass",
        FilterKind::Bandpass => "band-pass",
        FilterKind::Bandstop => "band-stop",
    }
}
