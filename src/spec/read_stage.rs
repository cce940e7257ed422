//! `[[stage]]`.

use super::fields::{Fields, Got};
use super::problems::Problems;
use super::quantity::{Low, Quantity};
use super::read::{FREQUENCY, MAX_DB, row};
use super::tree::{Node, show_hz, show_number};
use super::types::{Family, FilterKind, FilterStage, NotchStage, Placement, Row, Stage, Width};
use super::words::Word;

/// Pass band ripple. The handbook tables end at 3 dB; 12 dB is four times as much, and
/// nobody means more.
pub(super) const RIPPLE: Quantity = Quantity { noun: "a ripple", unit: "dB", low: Low::Above(0.0), high: 12.0 };

/// Stop band attenuation. At 10 log10(2) dB (half power, here rounded up) and less, the
/// edge of the stop band would lie inside what counts as the pass band.
pub(super) const STOP: Quantity =
    Quantity { noun: "a stop band attenuation", unit: "dB", low: Low::Above(3.0103), high: MAX_DB };

pub(super) const KEYS: &[&str] = &[
    "kind",
    "family",
    "order",
    "edge_hz",
    "edges_hz",
    "center_hz",
    "width_hz",
    "q",
    "harmonics",
    "ripple_db",
    "stop_db",
];
pub(super) const EDGE_KEYS: &[&str] = &["kind", "family", "order", "edge_hz", "ripple_db", "stop_db"];
pub(super) const BAND_KEYS: &[&str] =
    &["kind", "family", "order", "edges_hz", "center_hz", "width_hz", "q", "harmonics", "ripple_db", "stop_db"];
pub(super) const NOTCH_KEYS: &[&str] = &["kind", "center_hz", "width_hz", "q", "harmonics"];

/// `kind`: the designed filters, and the notch.
#[derive(Clone, Copy)]
pub(super) enum Kind {
    Filter(FilterKind),
    Notch,
}

impl Word for Kind {
    const ALL: &'static [Self] = &[
        Self::Filter(FilterKind::Lowpass),
        Self::Filter(FilterKind::Highpass),
        Self::Filter(FilterKind::Bandpass),
        Self::Filter(FilterKind::Bandstop),
        Self::Notch,
    ];
    const ALIASES: &'static [(&'static str, Self)] = &[
        ("lp", Self::Filter(FilterKind::Lowpass)),
        ("lpf", Self::Filter(FilterKind::Lowpass)),
        ("highcut", Self::Filter(FilterKind::Lowpass)),
        ("hp", Self::Filter(FilterKind::Highpass)),
        ("hpf", Self::Filter(FilterKind::Highpass)),
        ("lowcut", Self::Filter(FilterKind::Highpass)),
        ("bp", Self::Filter(FilterKind::Bandpass)),
        ("bpf", Self::Filter(FilterKind::Bandpass)),
        ("bs", Self::Filter(FilterKind::Bandstop)),
        ("bsf", Self::Filter(FilterKind::Bandstop)),
        ("bandreject", Self::Filter(FilterKind::Bandstop)),
        ("stop", Self::Filter(FilterKind::Bandstop)),
        ("comb", Self::Notch),
        ("hum", Self::Notch),
    ];

    fn word(self) -> &'static str {
        match self {
            Self::Filter(kind) => kind.name(),
            Self::Notch => NotchStage::KIND_NAME,
        }
    }
}

/// Reads one stage; nothing where something is wrong with it.
pub(super) fn stage(node: &Node, problems: &mut Problems) -> Option<Stage> {
    let mut fields = Fields::open(node, "the stage", problems)?;
    // The kind first: what the other keys may be hangs on it.
    let kind = fields.word::<Kind>("kind", problems);
    if let Got::Is(kind) = kind {
        fields.what = format!("the {} stage", kind.word());
    }
    let fitting = match kind {
        Got::Is(Kind::Filter(FilterKind::Lowpass | FilterKind::Highpass)) => EDGE_KEYS,
        Got::Is(Kind::Filter(FilterKind::Bandpass | FilterKind::Bandstop)) => BAND_KEYS,
        Got::Is(Kind::Notch) => NOTCH_KEYS,
        Got::Absent | Got::Bad => KEYS,
    };
    fields.only(KEYS, fitting, problems);
    match kind {
        Got::Is(Kind::Filter(kind)) => filter(&fields, kind, problems).map(Stage::Filter),
        Got::Is(Kind::Notch) => notch(&fields, problems).map(Stage::Notch),
        Got::Bad => None,
        Got::Absent => {
            let repair = "say what it does: kind is one of lowpass, highpass, bandpass, bandstop, notch";
            fields.missing("kind", repair, problems);
            None
        }
    }
}

fn notch(fields: &Fields<'_>, problems: &mut Problems) -> Option<NotchStage> {
    for key in ["family", "order", "ripple_db", "stop_db"] {
        fields.refuse(key, "a notch is always one second-order section a line", "remove it", problems);
    }
    for key in ["edge_hz", "edges_hz"] {
        fields.refuse(key, "a notch lies around a center", "write center_hz with width_hz or q", problems);
    }
    let row = row(fields, "width_hz", problems)?;
    disjoint(&row, fields, problems).then_some(NotchStage { row })
}

fn filter(fields: &Fields<'_>, kind: FilterKind, problems: &mut Problems) -> Option<FilterStage> {
    let family = fields.word::<Family>("family", problems);
    if !family.is_there() {
        let repair = "choose one of butterworth, chebyshev1, chebyshev2, elliptic, bessel";
        fields.missing("family", repair, problems);
    }
    let family = family.value();
    let order = fields.whole("order", &order_range(family), problems);
    if !order.is_there() {
        fields.missing("order", "add the order of the low-pass prototype", problems);
    }
    let placement = match kind {
        FilterKind::Lowpass | FilterKind::Highpass => edge(fields, problems),
        FilterKind::Bandpass | FilterKind::Bandstop => edges_or_row(fields, kind, problems),
    };
    let ripples = ripples(fields, family, problems);
    let (ripple_db, stop_db) = ripples?;
    Some(FilterStage { kind, family: family?, order: order.value()?, placement: placement?, ripple_db, stop_db })
}

/// From 1 on; without a family as far as any goes.
pub(super) fn order_range(family: Option<Family>) -> Quantity {
    let noun = if family == Some(Family::Elliptic) { "an order for elliptic" } else { "an order" };
    let high = family.unwrap_or(Family::Butterworth).highest_order();
    Quantity { noun, unit: "", low: Low::From(1.0), high: f64::from(high) }
}

/// Ripple and stop band attenuation, each there exactly where the family takes it;
/// nothing where one of them is wrong.
fn ripples(fields: &Fields<'_>, family: Option<Family>, problems: &mut Problems) -> Option<(Option<f64>, Option<f64>)> {
    // Without a family the values are looked at, their presence is not.
    let Some(family) = family else {
        fields.number("ripple_db", &RIPPLE, problems);
        fields.number("stop_db", &STOP, problems);
        return None;
    };
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
    if let (Some(ripple), Some(stop)) = (ripple_db, stop_db)
        && stop <= ripple
    {
        problems.add(
            fields.value_place("stop_db"),
            format!("stop_db = {} is not above ripple_db = {}", show_number(stop), show_number(ripple)),
            "the stop band must lie deeper than the ripple: raise stop_db",
        );
        return None;
    }
    Some((ripple_db, stop_db))
}

/// `edge_hz`.
fn edge(fields: &Fields<'_>, problems: &mut Problems) -> Option<Placement> {
    let strangers = ["edges_hz", "center_hz", "width_hz", "q", "harmonics"];
    for key in strangers {
        fields.refuse(key, "a low-pass or high-pass has one edge", "write edge_hz instead", problems);
    }
    let edge_hz = fields.number("edge_hz", &FREQUENCY, problems);
    if !edge_hz.is_there() && !strangers.iter().any(|key| fields.has(key)) {
        fields.missing("edge_hz", "add the frequency of the edge in hertz", problems);
    }
    Some(Placement::Edge { edge_hz: edge_hz.value()? })
}

/// `edges_hz`, or `center_hz` with `width_hz` or `q`.
fn edges_or_row(fields: &Fields<'_>, kind: FilterKind, problems: &mut Problems) -> Option<Placement> {
    let ways = "write edges_hz, or center_hz with width_hz or q";
    fields.refuse("edge_hz", "it has two edges", ways, problems);
    let row_keys = ["center_hz", "width_hz", "q", "harmonics"];
    let written = row_keys.iter().find(|key| fields.has(key));
    let row_meant = row_keys.iter().any(|key| fields.has(key) || fields.is_meant(key));
    let edges_hz = fields.pair("edges_hz", &FREQUENCY, problems);
    if let (Some(key), true) = (written, fields.has("edges_hz")) {
        let why = "edges_hz already says where the edges are";
        fields.refuse(key, why, "keep edges_hz, or center_hz with width_hz or q", problems);
        return None;
    }
    if edges_hz.is_there() {
        let [low, high] = edges_hz.value()?;
        if low >= high {
            let list = |low, high| format!("[{}, {}]", show_number(low), show_number(high));
            let message = format!("edges_hz = {} is not in rising order", list(low, high));
            let example = if low == high { "[lower, upper]".to_owned() } else { list(high, low) };
            let repair = format!("write the lower edge first: {}", problems.assign("edges_hz", &example));
            problems.add(fields.value_place("edges_hz"), message, repair);
            return None;
        }
        return Some(Placement::Edges { edges_hz: [low, high] });
    }
    if !row_meant {
        if !fields.has("edge_hz") {
            problems.add(fields.place, format!("{} has neither edges_hz nor center_hz", fields.what), ways);
        }
        return None;
    }
    let row = row(fields, "width_hz", problems)?;
    let fits = match kind {
        FilterKind::Bandpass => passes(&row, fields, problems),
        _ => disjoint(&row, fields, problems),
    };
    fits.then_some(Placement::Row(row))
}

/// Whether the lines of a row of stops leave something between them: where they don't,
/// it is one wide stop, and the row is not what was meant.
fn disjoint(row: &Row, fields: &Fields<'_>, problems: &mut Problems) -> bool {
    let Some((low, high)) = row.lines().zip(row.lines().skip(1)).find(|(low, high)| low.to_hz >= high.from_hz) else {
        return true;
    };
    let (key, repair) = match row.width {
        Width::Hz(_) => {
            ("width_hz", format!("give a width_hz below {}, the distance of the lines", show_number(row.center_hz)))
        }
        Width::Q(_) => ("q", format!("give a q above {}, or fewer harmonics", f64::from(row.harmonics) - 0.5)),
    };
    let message = format!(
        "lines {} and {} of the row overlap ({} to {} Hz and {} to {} Hz), so that nothing passes between them",
        low.harmonic,
        high.harmonic,
        show_hz(low.from_hz),
        show_hz(low.to_hz),
        show_hz(high.from_hz),
        show_hz(high.to_hz)
    );
    problems.add(fields.value_place(key), message, repair);
    false
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
