//! `[[stage]]`: what all kinds have in common, and the notch.

use super::fields::{Fields, Got};
use super::kind::{KEYS, Kind};
use super::problems::Problems;
use super::read::row;
use super::read_equalizer::{equalizer, weighting};
use super::read_filter::filter;
use super::read_transfer::{analog, digital};
use super::stages::{NotchStage, Row, Stage, Width};
use super::tree::{Node, show_hz, show_number};
use super::words::Word;

/// Reads one stage; nothing where something is wrong with it.
pub(super) fn stage(node: &Node, problems: &mut Problems) -> Option<Stage> {
    let mut fields = Fields::open(node, "the stage", problems)?;
    // The kind first: what the other keys may be hangs on it.
    let kind = fields.word::<Kind>("kind", problems);
    let Got::Is(kind) = kind else {
        fields.only(KEYS, KEYS, problems);
        if !kind.is_there() {
            let kinds = Kind::ALL.iter().map(|kind| kind.word()).collect::<Vec<_>>().join(", ");
            fields.missing("kind", &format!("say what it does: kind is one of {kinds}"), problems);
        }
        return None;
    };
    fields.what = format!("the {} stage", kind.word());
    fields.only(KEYS, kind.keys(), problems);
    let strangers: Vec<_> = KEYS.iter().filter(|key| !kind.keys().contains(key) && fields.has(key)).collect();
    for key in &strangers {
        let (why, repair) = kind.stranger(key);
        fields.refuse(key, &why, &repair, problems);
    }
    let stage = match kind {
        Kind::Filter(kind) => filter(&fields, kind, problems).map(Stage::Filter),
        Kind::Notch => notch(&fields, problems).map(Stage::Notch),
        Kind::Equalizer(kind) => equalizer(&fields, kind, problems).map(Stage::Equalizer),
        Kind::Weighting => weighting(&fields, problems).map(Stage::Weighting),
        Kind::Digital => digital(&fields, problems).map(Stage::Digital),
        Kind::Analog => analog(&fields, problems).map(Stage::Analog),
    };
    stage.filter(|_| strangers.is_empty())
}

fn notch(fields: &Fields<'_>, problems: &mut Problems) -> Option<NotchStage> {
    let row = row(fields, "width_hz", problems)?;
    disjoint(&row, fields, problems).then_some(NotchStage { row })
}

/// Whether the lines of a row of stops leave something between them: where they don't,
/// it is one wide stop, and the row is not what was meant.
pub(super) fn disjoint(row: &Row, fields: &Fields<'_>, problems: &mut Problems) -> bool {
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
