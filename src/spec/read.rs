//! From the tree to the normalized spec: the top level, `[output]`, `[auto]`, and what stages
//! and bands share.

use super::SpecSyntax;
use super::contradict;
use super::demands;
use super::error::{Place, Problem};
use super::fields::{Fields, Got};
use super::problems::Problems;
use super::quantity::{Low, Quantity};
use super::read_band;
use super::read_stage;
use super::stages::{Family, Line, Row, Width};
use super::tree::{Node, Value, quote, show_hz, show_number};
use super::types::{Auto, BeyondHalfRate, Dither, OutputEncoding, OutputSpec, Overload, Phase, RateMeaning, Spec};
use super::words::DesignWay;

/// Half the highest sample rate that the 32-bit field of a WAV header can state, Hz: no
/// frequency above it lies below half the rate of any recording.
const MAX_HZ: f64 = u32::MAX as f64 / 2.0;

/// Levels below this many dB under full scale are "below arithmetic" in every figure, so
/// no larger ratio could ever be shown to hold.
pub(super) const MAX_DB: f64 = 200.0;

/// Most lines of a row: the multiples of 50 Hz up to 25 kHz. The time a design takes
/// grows with their square, and is some ten seconds for this many.
const MAX_HARMONICS: f64 = 500.0;

/// A Q up to this one reaches from the center down to 0 Hz.
pub(super) const Q_AT_ZERO_HZ: f64 = 0.5;

/// A frequency that can't be 0.
pub(super) const FREQUENCY: Quantity = Quantity { noun: "a frequency", unit: "Hz", low: Low::Above(0.0), high: MAX_HZ };

pub(super) const WIDTH: Quantity = Quantity { noun: "a width", unit: "Hz", low: Low::Above(0.0), high: MAX_HZ };
pub(super) const Q: Quantity = Quantity { noun: "a Q (center over width)", unit: "", low: Low::Above(0.0), high: 1e12 };
pub(super) const HARMONICS: Quantity =
    Quantity { noun: "a whole number", unit: "", low: Low::From(1.0), high: MAX_HARMONICS };
pub(super) const GAIN: Quantity = Quantity { noun: "a gain", unit: "dB", low: Low::From(-MAX_DB), high: MAX_DB };

/// Most sections of a cascade that is found: as many as a row of 200 notches has.
pub(super) const MAX_SECTIONS: Quantity =
    Quantity { noun: "a whole number", unit: "", low: Low::From(1.0), high: 200.0 };

pub(super) const TOP_KEYS: &[&str] =
    &["title", "beyond_half_rate", "reference_band", "rate", "phase", "design", "auto", "output", "stage", "band"];
pub(super) const AUTO_KEYS: &[&str] = &["family", "max_sections"];
pub(super) const OUTPUT_KEYS: &[&str] = &["encoding", "dither", "overload", "gain_db", "history"];

/// Reads a whole spec.
///
/// # Errors
/// Everything that is wrong with it, in the order found.
pub(super) fn spec(root: &Node, syntax: SpecSyntax) -> Result<Spec, Vec<Problem>> {
    let mut problems = Problems::new(syntax);
    let spec = top(root, &mut problems);
    match spec {
        Some(spec) if problems.is_empty() => Ok(spec),
        _ => Err(problems.finish()),
    }
}

fn top(root: &Node, problems: &mut Problems) -> Option<Spec> {
    let mut fields = Fields::open(root, "the spec", problems)?;
    fields.only(TOP_KEYS, TOP_KEYS, problems);
    let title = title(&fields, problems);
    let beyond_half_rate = fields.word("beyond_half_rate", problems).or(BeyondHalfRate::default());
    let reference = fields.text("reference_band", problems);
    let rate = fields.word::<RateMeaning>("rate", problems);
    let phase = fields.word("phase", problems);
    let auto = auto(&fields, problems);
    let output = match fields.entry("output") {
        Some(entry) => output(&entry.node, problems),
        None => Some(OutputSpec::default()),
    };
    let stage_nodes = tables(&fields, "stage", problems);
    let band_nodes = tables(&fields, "band", problems);
    let nothing_written = |nodes: &Option<&[Node]>| nodes.is_some_and(<[Node]>::is_empty);
    let is_empty = nothing_written(&stage_nodes) && nothing_written(&band_nodes);
    if is_empty && !auto.is_there() && !fields.any_meant() {
        let repair = match problems.syntax {
            SpecSyntax::Toml => "add a [[stage]] to filter or a [[band]] to measure",
            SpecSyntax::Json => "add a \"stage\" to filter or a \"band\" to measure",
        };
        problems.add(&Place::Whole, "the spec is empty: it has no stage and no band", repair);
    }
    let stages: Vec<_> = stage_nodes.unwrap_or_default().iter().map(|node| read_stage::stage(node, problems)).collect();
    let bands: Vec<_> = band_nodes.unwrap_or_default().iter().map(|node| read_band::band(node, problems)).collect();
    contradict::check(&bands, problems);
    if auto.is_there() {
        demands::auto(&fields, stages.len(), &bands, problems);
    }
    if let Got::Is(Phase::Zero) = phase {
        demands::zero_phase(&stages, stage_nodes.unwrap_or_default(), problems);
    }
    if let Got::Is(name) = reference {
        contradict::check_reference(&bands, name, fields.value_place("reference_band"), problems);
    }
    Some(Spec {
        title: title?,
        beyond_half_rate: beyond_half_rate?,
        rate: rate.value(),
        output: output?,
        phase: phase.or(Phase::default())?,
        auto: auto.map(Some).or(None)?,
        reference_band: reference.value().map(str::to_owned),
        stages: stages.into_iter().collect::<Option<_>>()?,
        bands: bands.into_iter().map(read_band::ReadBand::finish).collect::<Option<_>>()?,
    })
}

/// The title, or `None` inside where there is none. It is printed to terminals, so it
/// holds no control characters but line breaks and tabs.
fn title(fields: &Fields<'_>, problems: &mut Problems) -> Option<Option<String>> {
    let text = match fields.text("title", problems) {
        Got::Absent => return Some(None),
        Got::Bad => return None,
        Got::Is(text) => text,
    };
    if text.chars().any(|c| c.is_control() && !matches!(c, '\n' | '\r' | '\t')) {
        let message = format!("title {} holds a control character", quote(text));
        problems.add(fields.value_place("title"), message, "remove it");
        return None;
    }
    Some(Some(text.to_owned()))
}

/// `design` and `[auto]`, one of which implies the other.
fn auto(fields: &Fields<'_>, problems: &mut Problems) -> Got<Auto> {
    let design = fields.word::<DesignWay>("design", problems);
    let table = fields.get("auto", |node| {
        let mut fields = Fields::open(node, "auto", problems)?;
        fields.only(AUTO_KEYS, AUTO_KEYS, problems);
        let family = fields.word::<Family>("family", problems).map(Some).or(None);
        let max_sections = fields.whole("max_sections", &MAX_SECTIONS, problems).map(Some).or(None);
        Some(Auto { family: family?, max_sections: max_sections? })
    });
    match (design, table) {
        (Got::Bad, _) => Got::Bad,
        (Got::Is(DesignWay::Auto), Got::Absent) => Got::Is(Auto::default()),
        (_, table) => table,
    }
}

fn output(node: &Node, problems: &mut Problems) -> Option<OutputSpec> {
    let mut fields = Fields::open(node, "output", problems)?;
    fields.only(OUTPUT_KEYS, OUTPUT_KEYS, problems);
    let encoding = fields.word("encoding", problems).or(OutputEncoding::default());
    let dither = fields.word("dither", problems).or(Dither::default());
    let overload = fields.word("overload", problems).or(Overload::default());
    let gain_db = fields.number("gain_db", &GAIN, problems).or(0.0);
    let history = fields.flag("history", problems).or(false);
    Some(OutputSpec { encoding: encoding?, dither: dither?, overload: overload?, gain_db: gain_db?, history: history? })
}

/// The tables of `[[key]]`; empty where there are none, nothing where the key is wrong.
fn tables<'n>(fields: &Fields<'n>, key: &str, problems: &mut Problems) -> Option<&'n [Node]> {
    let Some(entry) = fields.entry(key) else { return Some(&[]) };
    match &entry.node.value {
        Value::List(nodes) => Some(nodes),
        other => {
            let repair = match problems.syntax {
                SpecSyntax::Toml => format!("begin each {key} with [[{key}]] in double brackets"),
                SpecSyntax::Json => format!("put the {key} objects into a list: \"{key}\": [{{ ... }}]"),
            };
            let message = format!("{key} is {}, not a list of tables", other.show());
            problems.add(&entry.key_place, message, repair);
            None
        }
    }
}

/// `center_hz` with a width and `harmonics`; `width_key` is `width_hz` or `span_hz`.
///
/// Every line of a row that is returned has `0 < from_hz < center_hz < to_hz`.
pub(super) fn row(fields: &Fields<'_>, width_key: &'static str, problems: &mut Problems) -> Option<Row> {
    let center_hz = fields.number("center_hz", &FREQUENCY, problems);
    let hz = fields.number(width_key, &WIDTH, problems);
    let q = fields.number("q", &Q, problems);
    let harmonics = fields.whole("harmonics", &HARMONICS, problems).or(1);
    // An edge in place of a center has been refused already.
    if !center_hz.is_there() && !fields.has("edge_hz") && !fields.has("edges_hz") {
        let repair = match width_key {
            "span_hz" => "add the center of the band in hertz",
            _ => "add the center of the first line in hertz",
        };
        fields.missing("center_hz", repair, problems);
    }
    let width = match (hz, q) {
        (Got::Absent, Got::Absent) => {
            let message = format!("{} has neither {width_key} nor q", fields.what);
            let repair = format!("add {width_key} (edge to edge, in hertz) or q (center over width)");
            problems.add(fields.place, message, repair);
            None
        }
        (hz, Got::Absent) => hz.value().map(Width::Hz),
        (Got::Absent, q) => q.value().map(Width::Q),
        _ => {
            let message = format!("{} has both {width_key} and q, which say the same", fields.what);
            problems.add(fields.key_place("q"), message, "keep one of them");
            None
        }
    };
    let row = Row { center_hz: center_hz.value()?, width: width?, harmonics: harmonics? };
    holds(&row, fields, width_key, problems).then_some(row)
}

/// Whether the lines lie above 0 Hz and have a width that numbers can tell.
fn holds(row: &Row, fields: &Fields<'_>, width_key: &str, problems: &mut Problems) -> bool {
    let key = match row.width {
        Width::Hz(_) => width_key,
        Width::Q(_) => "q",
    };
    let Row { center_hz, .. } = *row;
    // With one width for all lines, and with one Q, the first line reaches lowest.
    if let Some(line) = row.lines().next().filter(|line| line.from_hz <= 0.0) {
        let (given, repair) = match row.width {
            Width::Hz(hz) => {
                (hz, format!("give a {width_key} below {}, twice the center", show_number(2.0 * center_hz)))
            }
            Width::Q(q) => (q, format!("give a q above {Q_AT_ZERO_HZ}")),
        };
        let message = format!(
            "{key} = {} around {} Hz begins at {} Hz, which is not above 0 Hz",
            show_number(given),
            show_number(center_hz),
            show_hz(line.from_hz)
        );
        problems.add(fields.value_place(key), message, repair);
        return false;
    }
    let told = |line: Line| line.from_hz < line.center_hz && line.center_hz < line.to_hz;
    if !row.lines().all(told) {
        let message = format!(
            "{key} makes lines so narrow at {} Hz that their edges fall onto the center",
            show_number(center_hz)
        );
        problems.add(fields.value_place(key), message, "make it wider");
        return false;
    }
    true
}
