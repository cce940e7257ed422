//! What the report's spec comes to here, at each of its sample rates.

use super::listing::Listing;
use super::{Command, Disagreement, RecheckError};
use crate::design::{Design, design};
use crate::job::pair::PairTask;
use crate::job::plan::{dither_name, history, treatment};
use crate::job::recording::Treatment;
use crate::report::DesignEntry;
use crate::section::Section;
use crate::spec::{self, Spec, SpecSyntax};
use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;

/// What is done at each sample rate, and where that is not what the report says.
#[derive(Debug)]
pub(super) struct Rates {
    pub(super) spec: Spec,
    pub(super) treatments: BTreeMap<u32, Treatment>,
    /// The same for pairs that something else filtered.
    pub(super) pairs: BTreeMap<u32, PairTask>,
    pub(super) disagreements: Vec<Disagreement>,
}

impl Rates {
    /// Designs what the report's spec asks for and holds it against the report's sections.
    pub(super) fn of(report: &Path, listing: &Listing) -> Result<Self, RecheckError> {
        let unusable = |cause: String| RecheckError::Spec { path: report.into(), cause };
        let text = serde_json::to_vec(&listing.head.spec.normalized).map_err(|error| unusable(error.to_string()))?;
        let spec =
            spec::parse(&text, SpecSyntax::Json, "spec.normalized").map_err(|error| unusable(error.to_string()))?;
        let told: BTreeMap<u32, &DesignEntry> =
            listing.head.designs.iter().map(|design| (design.rate_hz, design)).collect();
        // `measure` writes no samples.
        let dither = if listing.command == Command::Measure { "none" } else { dither_name(&spec) };
        let done = listing.entries.iter().filter(|entry| entry.done());
        let needed: BTreeSet<u32> = done.filter_map(|entry| entry.rate_hz).chain(told.keys().copied()).collect();
        let mut rates = Rates { spec, treatments: BTreeMap::new(), pairs: BTreeMap::new(), disagreements: Vec::new() };
        for rate_hz in needed {
            let what = match design(&rates.spec, rate_hz) {
                Ok(found) => {
                    let what = told.get(&rate_hz).map_or_else(
                        || Some("the report has recordings at this rate and no design".to_owned()),
                        |told| difference(told, &found, dither),
                    );
                    // What the program appended that wrote the report, whichever version this is.
                    let history =
                        history(&rates.spec, &found, &listing.head.tool_version, &listing.head.spec.file_sha256);
                    let treatment = Treatment { history, ..treatment(&rates.spec, &found) };
                    rates.treatments.insert(rate_hz, treatment);
                    if listing.command == Command::Measure {
                        rates.pairs.insert(rate_hz, PairTask::new(&rates.spec, &found));
                    }
                    what
                }
                Err(error) => Some(format!("the report's spec can't be designed here: {error}")),
            };
            rates.disagreements.extend(what.map(|what| Disagreement::Design { rate_hz, what }));
        }
        Ok(rates)
    }
}

/// Where the design found is not the one told, bit for bit.
fn difference(told: &DesignEntry, found: &Design, dither: &str) -> Option<String> {
    const WHY: &str = "another version of this program wrote the report, or it was changed since";
    let (then, now) = (told.sections.len(), found.sections.len());
    if then != now {
        return Some(format!("the report has {then} sections, and its spec comes to {now} here: {WHY}"));
    }
    let both = told.sections.iter().zip(&found.sections).zip(1..);
    let differing = both.clone().find_map(|((then, now), place)| Some((place, coefficient(then, now)?)));
    if let Some((place, (name, then, now))) = differing {
        return Some(format!(
            "{name} of section {place} of {} is {then:?} in the report, and its spec comes to {now:?} here: {WHY}",
            told.sections.len()
        ));
    }
    if told.passes != found.passes {
        return Some(format!(
            "passes is {} in the report, and its spec comes to {} here: {WHY}",
            told.passes, found.passes
        ));
    }
    (told.dither != dither)
        .then(|| format!("the dither is `{}` in the report, and its spec comes to `{dither}` here: {WHY}", told.dither))
}

/// The first coefficient with other bits.
fn coefficient(then: &Section, now: &Section) -> Option<(&'static str, f64, f64)> {
    const NAMES: [&str; 6] = ["b[0]", "b[1]", "b[2]", "a[0]", "a[1]", "a[2]"];
    let pairs = then.b.iter().chain(&then.a).zip(now.b.iter().chain(&now.a));
    let mut named = NAMES.into_iter().zip(pairs);
    named.find_map(|(name, (then, now))| (then.to_bits() != now.to_bits()).then_some((name, *then, *now)))
}
