//! The sentence of a methods section: one on what was done, one on what it comes to.
//!
//! Promises are rounded to the side on which they still hold, everything else to the
//! nearest figure.

mod curves;
mod figures;
mod promises;

use super::{Methods, MethodsStage, MethodsTransition, phase, ways};
use crate::design::recipe::Recipe;
use crate::design::{Design, DesignedStage, limits};
use crate::spec::{
    AnalogStage, DigitalFilter, Family, FilterKind, FilterStage, Order, Placement, Row, Stage, StopEdges, Transfer,
    Width,
};
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
        let response = if phase::is_finite(&design.sections) { "FIR" } else { "IIR" };
        return format!(
            "Recordings sampled at {rate} were measured in pairs with {program}, which filtered none of them itself, \
             and held against the exact response of the filter that the spec describes, {}: {stages}.",
            if methods.causal {
                format!("a causal {response} filter of {order} with {} phase", methods.phase)
            } else {
                format!(
                    "a zero-phase {response} filter, not causal, that runs forward and backward ({order} in each pass; \
                     {BOTH_TOGETHER})"
                )
            }
        );
    }
    let passes = if methods.causal {
        format!("one forward pass (causal, with {} phase)", methods.phase)
    } else {
        format!("two passes, forward and backward (zero phase, not causal; {BOTH_TOGETHER}),")
    };
    format!(
        "Recordings sampled at {rate} were filtered with {program} in {passes} through {stages}. {}",
        whole(methods, design)
    )
}

/// What the figures of two passes mean.
const BOTH_TOGETHER: &str = "orders are those of one pass, all other figures those of both together";

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
    let (start, settled, order) = if methods.causal {
        ("from the steady state of the first sample", "", order(methods))
    } else {
        (
            "from the steady state of the first sample of each pass, with the recording continued at both ends by its own \
             samples turned about the first and the last one",
            " of either end",
            format!("{} in each pass", order(methods)),
        )
    };
    let mut done = ways::clauses(design);
    done.push(format!("ran in double precision in transposed direct form II {start}"));
    done.push(format!("settled within {} s{settled}", figures::up(methods.settling_s.get(), 3)));
    let promised = promises::promises(methods, design);
    let dither = if methods.dither == "none" {
        "no dither was added".to_owned()
    } else {
        format!("integer output was rounded with triangular dither of two steps peak to peak ({})", methods.dither)
    };
    format!("The filter ({order}) {}{promised}; {dither}.", listed(&done))
}

/// All stages; equal ones in succession are told once.
fn stages(methods: &Methods, design: &Design) -> String {
    let mut phrases: Vec<(String, u32)> = Vec::new();
    for stage in &methods.stages {
        // The lines of a stage share what it was written as.
        let mut of_design = design.stages.iter();
        let Some(own) = of_design.find(|own| own.placed.stage_index + 1 == stage.stage) else { continue };
        let phrase = phrase(stage, own, methods.rate_hz);
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

fn phrase(stage: &MethodsStage, own: &DesignedStage, rate_hz: u32) -> String {
    match &own.placed.stage {
        Stage::Notch(notch) => notch_phrase(stage, &notch.row),
        Stage::Filter(filter) => filter_phrase(stage, own, filter, rate_hz),
        Stage::Equalizer(equalizer) => curves::equalizer(equalizer),
        Stage::Weighting(weighting) => curves::weighting(weighting.curve),
        Stage::Digital(digital) => {
            format!("a digital transfer function given {}", digital_form(stage, &digital.filter))
        }
        Stage::Analog(analog) => analog_phrase(stage, analog),
    }
}

/// `by its numerator and denominator (order 4)`.
fn digital_form(stage: &MethodsStage, digital: &DigitalFilter) -> String {
    match digital {
        DigitalFilter::Transfer(transfer) => form(stage, transfer),
        DigitalFilter::Sections(sections) if sections.len() == 1 => {
            format!("as one section (order {})", stage.total_order)
        }
        DigitalFilter::Sections(sections) => format!("as {} sections (order {})", sections.len(), stage.total_order),
    }
}

fn form(stage: &MethodsStage, transfer: &Transfer) -> String {
    let form = match transfer {
        Transfer::Polynomials { .. } => "numerator and denominator",
        Transfer::Roots { .. } => "zeros, poles, and gain",
    };
    format!("by its {form} (order {})", stage.total_order)
}

fn analog_phrase(stage: &MethodsStage, analog: &AnalogStage) -> String {
    let matched = match analog.match_hz {
        Some(match_hz) => format!("matched at {} Hz", hertz(match_hz)),
        None => "without prewarping".to_owned(),
    };
    let form = form(stage, &analog.transfer);
    format!("an analog transfer function given {form}, brought to digital form by the bilinear transform {matched}")
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

fn filter_phrase(stage: &MethodsStage, own: &DesignedStage, filter: &FilterStage, rate_hz: u32) -> String {
    let (family, kind) = (family(filter.family), kind(filter.kind));
    let row = match &filter.placement {
        Placement::Row(row) => Some(row),
        Placement::Edge { .. } | Placement::Edges { .. } => None,
    };
    let two_edges = matches!(filter.kind, FilterKind::Bandpass | FilterKind::Bandstop);
    let many = row.and_then(|row| multiples(stage, row).map(|at| (row, at)));
    let own_order = stage.order.unwrap_or(0);
    let order = match (two_edges, many.is_some()) {
        (false, _) => format!("order {own_order}"),
        (true, false) => format!("prototype order {own_order} (total order {})", stage.total_order),
        (true, true) => format!("prototype order {own_order} (total order {} each)", stage.total_order),
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
    let stop_hz = match &filter.order {
        Order::Given(_) => None,
        Order::Limits(stop) => Some(stop),
    };
    let meaning = match (filter.family, two_edges) {
        _ if stop_hz.is_some() => limited_edges(own, filter, rate_hz),
        (Family::Butterworth | Family::Bessel, true) => "half-power points, -3.01 dB",
        (Family::Butterworth | Family::Bessel, false) => "half power, -3.01 dB",
        (Family::Chebyshev1 | Family::Elliptic, _) => "where the ripple ends",
        (Family::Chebyshev2, _) => "where the stop band begins",
    };
    let mut parts = vec![format!("{edges} ({meaning})")];
    parts.extend(filter.ripple_db.map(|db| format!("a pass-band ripple of {} dB", nearest(db, 3))));
    let from = stop_hz.map(|stop| stop_range(filter.kind, stop)).unwrap_or_default();
    parts.extend(filter.stop_db.map(|db| format!("a stop-band attenuation of {} dB{from}", nearest(db, 3))));
    let transition = transition(stage, filter.stop_db);
    if !transition.is_empty() {
        parts.push(transition);
    }
    let found = if stop_hz.is_some() { ", the lowest that holds its limits," } else { "" };
    format!("{subject}{found} with {}", listed(&parts))
}

/// What pass edges given as limits are. Of a band-stop one may have been moved toward the
/// stop, and the ripple then ends before the edge as written.
fn limited_edges(own: &DesignedStage, filter: &FilterStage, rate_hz: u32) -> &'static str {
    match &own.recipe {
        Recipe::Filter(recipe)
            if limits::moved_edge(filter, &own.placed.edges_hz, recipe, f64::from(rate_hz)).is_some() =>
        {
            "within the ripple up to the first and from the second on"
        }
        _ => "where the ripple ends",
    }
}

/// ` from 1500 Hz on`, ` up to 20 Hz`, ` up to 20 Hz and from 1500 Hz on`, ` from 48 to 52 Hz`.
fn stop_range(kind: FilterKind, stop: &StopEdges) -> String {
    match (kind, *stop) {
        (FilterKind::Highpass, StopEdges::One(hz)) => format!(" up to {} Hz", hertz(hz)),
        (_, StopEdges::One(hz)) => format!(" from {} Hz on", hertz(hz)),
        (FilterKind::Bandpass, StopEdges::Two([low, high])) => {
            format!(" up to {} Hz and from {} Hz on", hertz(low), hertz(high))
        }
        (_, StopEdges::Two([low, high])) => format!(" from {} to {} Hz", hertz(low), hertz(high)),
    }
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
