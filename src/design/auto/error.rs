//! Why no cascade is found, with the figures that would change it.

use super::margin::REDUCE_SPARE;
use super::needs::{MOST_EXTENTS, UNSAID_KEEP_DB};
use crate::design::check::CAP_DB;
use crate::design::wording::figure;

/// Why no cascade is found.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum AutoError {
    /// The bands themselves do not fit at a rate.
    #[error("{0}")]
    Bands(String),
    /// There is no rate to design for.
    #[error("a cascade is found for the sample rates that are there, and there is none")]
    NoRate,
    /// A range to take out lies in one to keep.
    #[error(
        "bands \"{line}\" ({} to {} Hz) and \"{keep}\" ({} to {} Hz) share frequencies, and no cascade both \
         takes out and keeps them; name \"{line}\" in except of \"{keep}\" if it has reduce_db, or move one of the bands",
        figure(.line_hz.0), figure(.line_hz.1), figure(.keep_hz.0), figure(.keep_hz.1)
    )]
    Overlap {
        /// The band to take out.
        line: String,
        /// Where it is, Hz.
        line_hz: (f64, f64),
        /// The band to keep.
        keep: String,
        /// Where it is, Hz.
        keep_hz: (f64, f64),
    },
    /// A keep band lies in a line that it excepts.
    #[error(
        "nothing of band \"{keep}\" ({} to {} Hz) is left beside what it excepts; widen it, or remove it",
        figure(.keep_hz.0), figure(.keep_hz.1)
    )]
    NothingKept {
        /// The band.
        keep: String,
        /// Where it is, Hz.
        keep_hz: (f64, f64),
    },
    /// A reduction that no response shows, margin included.
    #[error(
        "band \"{line}\" must come down by {} dB, and attenuations are told down to {} dB, of which {} % are kept in \
         hand; ask for {} dB or less, or write the stages yourself",
        figure(*.reduce_db), figure(CAP_DB), figure(100.0 * REDUCE_SPARE), libm::floor(CAP_DB / (1.0 + REDUCE_SPARE))
    )]
    TooDeep {
        /// The band to take out.
        line: String,
        /// What it must fall by, dB.
        reduce_db: f64,
    },
    /// More sections are needed than `max_sections` allows.
    #[error(
        "the bands take {needed} second-order sections, and max_sections is {allowed}; \
         set max_sections to {needed} or more, widen the gaps between the bands, or ask for less"
    )]
    TooFew {
        /// What it takes.
        needed: u32,
        /// What is allowed.
        allowed: u32,
    },
    /// Lines of a row take stages of their own, which must fit at every rate.
    #[error(
        "band \"{line}\" ({} to {} Hz) does not fit at {rate_hz} Hz; one stage for its whole row would leave it out \
         there, but beside the other bands its line takes a stage of its own, which beyond_half_rate = \"error\" \
         refuses; set beyond_half_rate = \"leave-out\", with which there is a cascade",
        figure(.line_hz.0), figure(.line_hz.1)
    )]
    OneByOne {
        /// The first such line.
        line: String,
        /// Where it is, Hz.
        line_hz: (f64, f64),
        /// The lowest sample rate, Hz.
        rate_hz: u32,
    },
    /// There is no band to keep, and not even the rest of the spectrum can be kept.
    #[error("{}", unsaid(.0))]
    Unsaid(Box<Unsaid>),
    /// Two bands that no cascade within the limits parts.
    #[error("{}", conflict(.0))]
    Conflict(Box<Conflict>),
    /// Every part can be had alone, and all together can't.
    #[error(
        "within {limits} no cascade takes out and keeps all that the bands ask for, though each part of it can be had \
         alone; {}",
        if .repair.is_empty() { "raise keep_db, or take out fewer bands" } else { .repair }
    )]
    Together {
        /// What the search was held to.
        limits: String,
        /// What was found to help.
        repair: String,
    },
}

/// A band to take out beside which nothing can be kept, where no band says what to keep.
#[derive(Clone, Debug, PartialEq)]
pub struct Unsaid {
    /// The band to take out.
    pub line: String,
    /// Where it is, Hz.
    pub line_hz: (f64, f64),
    /// What it must fall by, dB.
    pub reduce_db: f64,
    /// What the search was held to: `orders up to 14`.
    pub limits: String,
    /// Whether anything is left farther away at all.
    pub is_anything_left: bool,
    /// The largest reduction that can be had as the bands are, dB.
    pub reachable_db: Option<f64>,
}

fn unsaid(unsaid: &Unsaid) -> String {
    let Unsaid { line, line_hz, reduce_db, limits, is_anything_left, reachable_db } = unsaid;
    let what = if *is_anything_left {
        format!("within {limits} no cascade does both")
    } else {
        "here nothing is that far, and no filter takes out everything".to_owned()
    };
    let ask = reachable_db.map_or_else(String::new, |db| format!(", or ask for {} dB", figure(db)));
    format!(
        "band \"{line}\" ({} to {} Hz, down by {} dB): no band is to be kept, and then all that is farther from each \
         line than {} times its width counts as kept within {} dB; {what}; add a band with keep_db for what must \
         stay, or narrow \"{line}\"{ask}",
        figure(line_hz.0),
        figure(line_hz.1),
        figure(*reduce_db),
        figure(0.5 * (MOST_EXTENTS - 1.0)),
        figure(UNSAID_KEEP_DB)
    )
}

/// A band to take out and one to keep that can't be had together.
#[derive(Clone, Debug, PartialEq)]
pub struct Conflict {
    /// The band to take out.
    pub line: String,
    /// Where it is, Hz.
    pub line_hz: (f64, f64),
    /// What it must fall by, dB.
    pub reduce_db: f64,
    /// The band to keep.
    pub keep: String,
    /// Where it is, Hz.
    pub keep_hz: (f64, f64),
    /// What it must stay within, dB.
    pub keep_db: f64,
    /// Whether the keep band excepts the other one.
    pub is_excepted: bool,
    /// What the search was held to: `orders up to 14`.
    pub limits: String,
    /// The distance between the two, Hz.
    pub gap_hz: f64,
    /// The least distance that is enough, and the end of the keep band that makes it so, Hz.
    pub enough: Option<(f64, f64)>,
    /// The largest reduction that can be had as the bands are, dB.
    pub reachable_db: Option<f64>,
}

fn conflict(conflict: &Conflict) -> String {
    let Conflict { line, line_hz, keep, keep_hz, .. } = conflict;
    let below = keep_hz.0 >= line_hz.1;
    let kept = if conflict.is_excepted {
        format!("{} to {} Hz", figure(keep_hz.0), figure(keep_hz.1))
    } else if below {
        format!("from {} Hz", figure(keep_hz.0))
    } else {
        format!("up to {} Hz", figure(keep_hz.1))
    };
    let mut text = format!(
        "bands \"{line}\" ({} to {} Hz, down by {} dB) and \"{keep}\" ({kept}, within {} dB)",
        figure(line_hz.0),
        figure(line_hz.1),
        figure(conflict.reduce_db),
        figure(conflict.keep_db)
    );
    text.push_str(&match (conflict.enough, conflict.is_excepted) {
        (Some((enough_hz, _)), _) => format!(
            ": within {} the transition takes at least {} Hz, and {} Hz are there",
            conflict.limits,
            figure(enough_hz),
            figure(conflict.gap_hz)
        ),
        (None, true) => format!(
            ": within {} no stop is that deep and leaves as much of the band as it must (it may take ten times \
             the extent of the line, and a quarter of the gap to the next)",
            conflict.limits
        ),
        (None, false) => format!(": within {} no cascade has both", conflict.limits),
    });
    let mut repairs = Vec::new();
    if let Some((_, end_hz)) = conflict.enough {
        let which = if below { "up to" } else { "down to" };
        repairs.push(format!("move \"{keep}\" {which} {} Hz", figure(end_hz)));
    }
    if let Some(db) = conflict.reachable_db {
        repairs.push(format!("ask for {} dB", figure(db)));
    }
    if repairs.is_empty() {
        repairs.push(format!("ask for less of \"{line}\", or raise keep_db"));
    }
    format!("{text}; {}", repairs.join(", or "))
}
