//! `[[band]]`.

use super::error::Place;
use super::fields::{Fields, Got};
use super::problems::Problems;
use super::quantity::{Low, Quantity};
use super::read::{FREQUENCY, MAX_DB, row};
use super::tree::{Node, quote, show_number};
use super::types::{Band, Extent, Requirement};

pub(super) const REDUCE: Quantity = Quantity { noun: "an attenuation", unit: "dB", low: Low::Above(0.0), high: MAX_DB };
pub(super) const KEEP: Quantity = Quantity { noun: "a tolerance", unit: "dB", low: Low::Above(0.0), high: MAX_DB };
pub(super) const RESIDUAL: Quantity =
    Quantity { noun: "a level relative to full scale", unit: "dBFS", low: Low::From(-MAX_DB), high: 0.0 };

/// A lower edge: 0 Hz is one, though the lowest bins never belong to a band.
pub(super) const FROM: Quantity = Quantity { low: Low::From(0.0), ..FREQUENCY };

pub(super) const KEYS: &[&str] = &[
    "name",
    "from_hz",
    "to_hz",
    "center_hz",
    "span_hz",
    "q",
    "harmonics",
    "reduce_db",
    "keep_db",
    "residual_dbfs",
    "except",
];
pub(super) const REQUIREMENTS: [&str; 3] = ["reduce_db", "keep_db", "residual_dbfs"];

/// A band with its places; `None` where a problem has been noted.
pub(super) struct ReadBand<'n> {
    /// Its name.
    pub name: Option<&'n str>,
    /// Where the name stands.
    pub name_place: &'n Place,
    /// Where the band begins.
    pub place: &'n Place,
    /// Where it is.
    pub extent: Option<Extent>,
    /// What must hold in it.
    pub requirement: Option<Requirement>,
    /// Where the key `residual_dbfs` stands, if it does.
    pub residual_place: Option<&'n Place>,
    /// Where the key `except` stands, if it does.
    pub except_place: Option<&'n Place>,
    /// The places of the names in `except`.
    pub except_name_places: Vec<&'n Place>,
}

impl ReadBand<'_> {
    /// The band without its places.
    pub fn finish(self) -> Option<Band> {
        Some(Band { name: self.name?.to_owned(), extent: self.extent?, requirement: self.requirement? })
    }
}

/// Reads one band.
pub(super) fn band<'n>(node: &'n Node, problems: &mut Problems) -> ReadBand<'n> {
    let mut read = ReadBand {
        name: None,
        name_place: &node.place,
        place: &node.place,
        extent: None,
        requirement: None,
        residual_place: None,
        except_place: None,
        except_name_places: Vec::new(),
    };
    let Some(mut fields) = Fields::open(node, "the band", problems) else { return read };
    let name = fields.text("name", problems);
    if let Got::Is(name) = name {
        fields.what = format!("the band {}", quote(name));
    }
    fields.only(KEYS, KEYS, problems);
    if !name.is_there() {
        fields.missing("name", "add a name: the report calls the band by it", problems);
    }
    read.name = name.value().filter(|name| name_holds(name, &fields, problems));
    read.name_place = fields.value_place("name");
    read.extent = extent(&fields, problems);
    let (requirement, except_name_places) = requirement(&fields, problems);
    read.requirement = requirement;
    read.residual_place = fields.entry("residual_dbfs").map(|entry| &entry.key_place);
    read.except_place = fields.entry("except").map(|entry| &entry.key_place);
    read.except_name_places = except_name_places;
    read
}

fn name_holds(name: &str, fields: &Fields<'_>, problems: &mut Problems) -> bool {
    let wrong = if name.trim().is_empty() {
        "is empty"
    } else if name.chars().any(char::is_control) {
        "holds a control character"
    } else {
        return true;
    };
    let message = format!("the name {} {wrong}", quote(name));
    problems.add(fields.value_place("name"), message, "give the band a name of one line");
    false
}

/// `from_hz` with `to_hz`, or `center_hz` with `span_hz` or `q`.
fn extent(fields: &Fields<'_>, problems: &mut Problems) -> Option<Extent> {
    let ways = "give from_hz and to_hz, or center_hz with span_hz or q";
    let there = |key: &&str| fields.has(key) || fields.is_meant(key);
    let range_key = ["from_hz", "to_hz"].into_iter().find(there);
    let row_key = ["center_hz", "span_hz", "q", "harmonics"].into_iter().find(there);
    match (range_key, row_key) {
        (None, None) => {
            problems.add(fields.place, format!("{} does not say where it is", fields.what), ways);
            None
        }
        (Some(range_key), Some(row_key)) => {
            let message = format!("{} says twice where it is, by {range_key} and by {row_key}", fields.what);
            problems.add(fields.key_place(row_key), message, ways);
            None
        }
        (None, Some(_)) => row(fields, "span_hz", problems).map(Extent::Row),
        (Some(_), None) => {
            let from_hz = fields.number("from_hz", &FROM, problems);
            let to_hz = fields.number("to_hz", &FREQUENCY, problems);
            for (key, got) in [("from_hz", from_hz), ("to_hz", to_hz)] {
                if !got.is_there() {
                    fields.missing(key, ways, problems);
                }
            }
            let (from_hz, to_hz) = (from_hz.value()?, to_hz.value()?);
            if from_hz >= to_hz {
                let message = format!("from_hz = {} is not below to_hz = {}", show_number(from_hz), show_number(to_hz));
                problems.add(fields.key_place("from_hz"), message, "put the lower edge into from_hz");
                return None;
            }
            Some(Extent::Range { from_hz, to_hz })
        }
    }
}

/// The requirement and the places of the names in `except`.
fn requirement<'n>(fields: &Fields<'n>, problems: &mut Problems) -> (Option<Requirement>, Vec<&'n Place>) {
    let reduce_db = fields.number("reduce_db", &REDUCE, problems);
    let keep_db = fields.number("keep_db", &KEEP, problems);
    let residual_dbfs = fields.number("residual_dbfs", &RESIDUAL, problems);
    let except = fields.texts("except", problems);
    let written: Vec<_> = REQUIREMENTS.into_iter().filter(|key| fields.has(key)).collect();
    if let [_, second, ..] = written.as_slice() {
        let names = written.join(" and ");
        let message = format!("{} has {} requirements, {names}", fields.what, written.len());
        problems.add(fields.key_place(second), message, "keep one, and write another band for the other");
        return (None, Vec::new());
    }
    if !keep_db.is_there() && except.is_there() {
        let why = "only a keep band has exceptions";
        fields.refuse("except", why, "remove it, or move it to the keep band", problems);
        return (None, Vec::new());
    }
    let requirement = match (reduce_db, keep_db, residual_dbfs) {
        (Got::Absent, Got::Absent, Got::Absent) => Some(Requirement::Observe),
        (Got::Is(reduce_db), Got::Absent, Got::Absent) => Some(Requirement::Reduce { reduce_db }),
        (Got::Absent, Got::Absent, Got::Is(residual_dbfs)) => Some(Requirement::Residual { residual_dbfs }),
        (Got::Absent, Got::Is(keep_db), Got::Absent) => {
            let named = except.or(Vec::new());
            let places = named.iter().flatten().map(|(_, place)| *place).collect();
            let keep = named.map(|named| Requirement::Keep {
                keep_db,
                except: named.into_iter().map(|(name, _)| name.to_owned()).collect(),
            });
            return (keep, places);
        }
        _ => None,
    };
    (requirement, Vec::new())
}
