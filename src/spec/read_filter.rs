//! `[[stage]]` of the designed filters: low-pass, high-pass, band-pass and band-stop.

use super::fields::{Fields, Got};
use super::problems::Problems;
use super::quantity::{Low, Quantity};
use super::read::{FREQUENCY, MAX_DB, row};
use super::read_stage::disjoint;
use super::stages::{Family, FilterKind, FilterStage, Order, Placement, Row, StopEdges};
use super::tree::{show_hz, show_number};

/// Pass band ripple. The handbook tables end at 3 dB; 12 dB is four times as much, and
/// nobody means more.
pub(super) const RIPPLE: Quantity = Quantity { noun: "a ripple", unit: "dB", low: Low::Above(0.0), high: 12.0 };

/// Stop band attenuation. At 10 log10(2) dB (half power, here rounded up) and less, the
/// edge of the stop band would lie inside what counts as the pass band.
pub(super) const STOP: Quantity =
    Quantity { noun: "a stop band attenuation", unit: "dB", low: Low::Above(3.0103), high: MAX_DB };

/// The four keys of a row.
const ROW_KEYS: [&str; 4] = ["center_hz", "width_hz", "q", "harmonics"];

/// What says how steep a filter is.
#[derive(Clone, Copy, PartialEq)]
enum Steepness {
    /// `order`.
    Order,
    /// Where the stop band begins.
    Limits,
    /// Neither or both.
    Unclear,
}

/// The key that says where the stop band of a filter begins.
fn stop_key(kind: FilterKind) -> &'static str {
    match kind {
        FilterKind::Lowpass | FilterKind::Highpass => "stop_edge_hz",
        FilterKind::Bandpass | FilterKind::Bandstop => "stop_edges_hz",
    }
}

/// Reads a filter of this kind; nothing where something is wrong with it.
pub(super) fn filter(fields: &Fields<'_>, kind: FilterKind, problems: &mut Problems) -> Option<FilterStage> {
    let family = fields.word::<Family>("family", problems);
    if !family.is_there() {
        let repair = "choose one of butterworth, chebyshev1, chebyshev2, elliptic, bessel";
        fields.missing("family", repair, problems);
    }
    let family = family.value();
    let order = fields.whole("order", &order_range(family), problems);
    let stop = stop_edges(fields, kind, problems);
    let steepness = steepness(fields, kind, problems);
    let placement = match kind {
        FilterKind::Lowpass | FilterKind::Highpass => edge(fields, problems),
        FilterKind::Bandpass | FilterKind::Bandstop => edges_or_row(fields, kind, steepness, problems),
    };
    let (ripple_db, stop_db) = match (steepness, family) {
        (Steepness::Limits, _) => limits(fields, kind, problems),
        (Steepness::Order, Some(family)) => ripples(fields, family, problems),
        // The values are looked at, their presence is not.
        (Steepness::Order, None) | (Steepness::Unclear, _) => {
            fields.number("ripple_db", &RIPPLE, problems);
            fields.number("stop_db", &STOP, problems);
            None
        }
    }?;
    let (family, placement) = (family?, placement?);
    let order = match steepness {
        Steepness::Order => Order::Given(order.value()?),
        Steepness::Limits => Order::Limits(stop.value()?),
        Steepness::Unclear => return None,
    };
    if let Order::Limits(stop) = order
        && !stops_beyond(kind, &placement, stop, fields, problems)
    {
        return None;
    }
    Some(FilterStage { kind, family, order, placement, ripple_db, stop_db })
}

/// Whether the filter has an order or limits; anything else is a problem.
fn steepness(fields: &Fields<'_>, kind: FilterKind, problems: &mut Problems) -> Steepness {
    let stop_key = stop_key(kind);
    let is_there = |key| fields.has(key) || fields.is_meant(key);
    match (is_there("order"), is_there(stop_key)) {
        (true, false) => Steepness::Order,
        (false, true) => Steepness::Limits,
        (true, true) => {
            let message = format!("{} has both order and {stop_key}, and each says how steep it is", fields.what);
            let repair = format!("keep order, or {stop_key} with ripple_db and stop_db");
            problems.add(fields.key_place(stop_key), message, repair);
            Steepness::Unclear
        }
        // The stop edge of another kind has been refused already.
        (false, false) if fields.has("stop_edge_hz") || fields.has("stop_edges_hz") => Steepness::Unclear,
        (false, false) => {
            let message = format!("{} has neither order nor {stop_key}", fields.what);
            let repair = format!("add the order of the low-pass prototype, or {stop_key} with ripple_db and stop_db");
            problems.add(fields.place, message, repair);
            Steepness::Unclear
        }
    }
}

/// From 1 on; without a family as far as any goes.
pub(super) fn order_range(family: Option<Family>) -> Quantity {
    let noun = if family == Some(Family::Elliptic) { "an order for elliptic" } else { "an order" };
    let high = family.unwrap_or(Family::Butterworth).highest_order();
    Quantity { noun, unit: "", low: Low::From(1.0), high: f64::from(high) }
}

/// Ripple and stop band attenuation of a filter with an order, each there exactly where the
/// family takes it; nothing where one of them is wrong.
fn ripples(fields: &Fields<'_>, family: Family, problems: &mut Problems) -> Option<(Option<f64>, Option<f64>)> {
    let mut one = |key: &'static str, takes: bool, quantity: &Quantity, what: &str, takers: &str| {
        if !takes {
            if fields.has(key) {
                let why = format!("{} has no {what} to choose", family.name());
                fields.refuse(key, &why, &format!("remove it, or choose {takers}"), problems);
                return None;
            }
            return Some(None);
        }
        let got = fields.number(key, quantity, problems);
        if !got.is_there() {
            fields.missing(key, &format!("{} needs its {what} in decibels", family.name()), problems);
        }
        got.value().map(Some)
    };
    let ripple_db = one("ripple_db", family.takes_ripple(), &RIPPLE, "pass band ripple", "chebyshev1 or elliptic");
    let stop_db = one("stop_db", family.takes_stop(), &STOP, "stop band attenuation", "chebyshev2 or elliptic");
    let (ripple_db, stop_db) = (ripple_db?, stop_db?);
    is_deeper(ripple_db, stop_db, fields, problems).then_some((ripple_db, stop_db))
}

/// Ripple and stop band attenuation of a filter with limits, both there whatever the family.
fn limits(fields: &Fields<'_>, kind: FilterKind, problems: &mut Problems) -> Option<(Option<f64>, Option<f64>)> {
    let stop_key = stop_key(kind);
    let mut one = |key: &'static str, quantity: &Quantity, what: &str| {
        let got = fields.number(key, quantity, problems);
        if !got.is_there() {
            let repair = format!("with {stop_key} every family needs {what} in decibels");
            fields.missing(key, &repair, problems);
        }
        got.value()
    };
    let ripple_db = one("ripple_db", &RIPPLE, "the most its pass band may lose,");
    let stop_db = one("stop_db", &STOP, "the least its stop band must lose,");
    let (ripple_db, stop_db) = (Some(ripple_db?), Some(stop_db?));
    is_deeper(ripple_db, stop_db, fields, problems).then_some((ripple_db, stop_db))
}

/// Whether the stop band lies deeper than the ripple, where there are both.
fn is_deeper(ripple_db: Option<f64>, stop_db: Option<f64>, fields: &Fields<'_>, problems: &mut Problems) -> bool {
    let (Some(ripple), Some(stop)) = (ripple_db, stop_db) else { return true };
    if stop > ripple {
        return true;
    }
    problems.add(
        fields.value_place("stop_db"),
        format!("stop_db = {} is not above ripple_db = {}", show_number(stop), show_number(ripple)),
        "the stop band must lie deeper than the ripple: raise stop_db",
    );
    false
}

/// `stop_edge_hz` or `stop_edges_hz`.
fn stop_edges(fields: &Fields<'_>, kind: FilterKind, problems: &mut Problems) -> Got<StopEdges> {
    let key = stop_key(kind);
    match kind {
        FilterKind::Lowpass | FilterKind::Highpass => fields.number(key, &FREQUENCY, problems).map(StopEdges::One),
        FilterKind::Bandpass | FilterKind::Bandstop => rising(fields, key, problems).map(StopEdges::Two),
    }
}

/// Whether the stop edges lie on the stop side of the edges.
fn stops_beyond(
    kind: FilterKind,
    placement: &Placement,
    stop: StopEdges,
    fields: &Fields<'_>,
    problems: &mut Problems,
) -> bool {
    let side = |is_above: bool| if is_above { "above" } else { "below" };
    let is_beyond = |stop_hz: f64, edge_hz: f64, is_above: bool| {
        if is_above { stop_hz > edge_hz } else { stop_hz < edge_hz }
    };
    match (placement, stop) {
        (Placement::Edge { edge_hz }, StopEdges::One(stop_hz)) => {
            let is_above = kind == FilterKind::Lowpass;
            if is_beyond(stop_hz, *edge_hz, is_above) {
                return true;
            }
            let (side, edge, stop) = (side(is_above), show_number(*edge_hz), show_number(stop_hz));
            let message = format!("stop_edge_hz = {stop} is not {side} edge_hz = {edge}");
            let repair = format!("a {} stops {side} its edge: give a stop_edge_hz {side} {edge}", kind.name());
            problems.add(fields.value_place("stop_edge_hz"), message, repair);
            false
        }
        (Placement::Edges { edges_hz }, StopEdges::Two(stops_hz)) => {
            let is_pass = kind == FilterKind::Bandpass;
            let place = if is_pass { "around" } else { "between" };
            let mut holds = true;
            for (which, index, is_above) in [("lower", 0, !is_pass), ("upper", 1, is_pass)] {
                let (edge_hz, stop_hz) = (edges_hz[index], stops_hz[index]);
                if is_beyond(stop_hz, edge_hz, is_above) {
                    continue;
                }
                holds = false;
                let (side, edge, stop) = (side(is_above), show_number(edge_hz), show_number(stop_hz));
                let message =
                    format!("the {which} of stop_edges_hz, {stop}, is not {side} the {which} of edges_hz, {edge}");
                let repair =
                    format!("the stop edges of a {} lie {place} its edges: give one {side} {edge}", kind.name());
                problems.add(fields.value_place("stop_edges_hz"), message, repair);
            }
            holds
        }
        // One edge goes with one stop edge, and rows have been refused.
        _ => false,
    }
}

/// Two numbers of which the first is the lower one.
fn rising(fields: &Fields<'_>, key: &str, problems: &mut Problems) -> Got<[f64; 2]> {
    let got = fields.pair(key, &FREQUENCY, problems);
    let Got::Is([low, high]) = got else { return got };
    if low < high {
        return got;
    }
    let list = |low, high| format!("[{}, {}]", show_number(low), show_number(high));
    let message = format!("{key} = {} is not in rising order", list(low, high));
    let example = if low == high { "[lower, upper]".to_owned() } else { list(high, low) };
    let repair = format!("write the lower edge first: {}", problems.assign(key, &example));
    problems.add(fields.value_place(key), message, repair);
    Got::Bad
}

/// `edge_hz`.
fn edge(fields: &Fields<'_>, problems: &mut Problems) -> Option<Placement> {
    let edge_hz = fields.number("edge_hz", &FREQUENCY, problems);
    // Another key in its place has been refused already.
    if !edge_hz.is_there() && !fields.has("edges_hz") && !ROW_KEYS.iter().any(|key| fields.has(key)) {
        fields.missing("edge_hz", "add the frequency of the edge in hertz", problems);
    }
    Some(Placement::Edge { edge_hz: edge_hz.value()? })
}

/// `edges_hz`, or `center_hz` with `width_hz` or `q`.
fn edges_or_row(
    fields: &Fields<'_>,
    kind: FilterKind,
    steepness: Steepness,
    problems: &mut Problems,
) -> Option<Placement> {
    let written = ROW_KEYS.iter().find(|key| fields.has(key));
    let row_meant = ROW_KEYS.iter().any(|key| fields.has(key) || fields.is_meant(key));
    let edges_hz = rising(fields, "edges_hz", problems);
    if let (Some(key), true) = (written, fields.has("edges_hz")) {
        let why = "edges_hz already says where the edges are";
        fields.refuse(key, why, "keep edges_hz, or center_hz with width_hz or q", problems);
        return None;
    }
    if edges_hz.is_there() {
        return Some(Placement::Edges { edges_hz: edges_hz.value()? });
    }
    if !row_meant {
        match steepness {
            // One edge has been refused already.
            _ if fields.has("edge_hz") => {}
            Steepness::Limits => fields.missing("edges_hz", "add both edges in hertz", problems),
            Steepness::Order | Steepness::Unclear => {
                let ways = "write edges_hz, or center_hz with width_hz or q";
                problems.add(fields.place, format!("{} has neither edges_hz nor center_hz", fields.what), ways);
            }
        }
        return None;
    }
    if let (Steepness::Limits, Some(key)) = (steepness, written) {
        let why = "stop_edges_hz goes with edges_hz alone";
        let repair = "write edges_hz with stop_edges_hz, or order in place of stop_edges_hz";
        fields.refuse(key, why, repair, problems);
        return None;
    }
    let row = row(fields, "width_hz", problems)?;
    let fits = match kind {
        FilterKind::Bandpass => passes(&row, fields, problems),
        _ => disjoint(&row, fields, problems),
    };
    fits.then_some(Placement::Row(row))
}

/// Whether anything passes all lines of a row of band-passes, which run one after another.
fn passes(row: &Row, fields: &Fields<'_>, problems: &mut Problems) -> bool {
    let (Some(first), Some(last)) = (row.lines().next(), row.lines().last()) else { return true };
    if last.from_hz < first.to_hz {
        return true;
    }
    let message = format!(
        "the lines of a bandpass row run one after another, and nothing passes both {} to {} Hz and {} to {} Hz",
        show_hz(first.from_hz),
        show_hz(first.to_hz),
        show_hz(last.from_hz),
        show_hz(last.to_hz)
    );
    problems.add(fields.key_place("harmonics"), message, "remove harmonics, or write a bandstop for what must go");
    false
}
