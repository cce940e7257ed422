//! What an unknown key, word or name was probably meant to be.

use super::kind::KEYS as STAGE_KEYS;
use super::read::{AUTO_KEYS, OUTPUT_KEYS, TOP_KEYS};
use super::read_band::KEYS as BAND_KEYS;
use super::words::Word;

/// Words that people write for a key, and the keys they may mean; the first one that
/// fits the table is suggested. Lower case, without separators and unit.
const KEY_MEANINGS: &[(&[&str], &[&str])] = &[
    (&["edge", "cutoff", "fc", "corner", "passedge"], &["edge_hz", "edges_hz", "center_hz", "from_hz"]),
    (&["edges", "cutoffs", "corners", "wn", "passband"], &["edges_hz", "edge_hz", "from_hz"]),
    (
        &["stopedge", "stopbandedge", "stopfrequency", "stopfreq", "stopcorner", "fstop", "fs2", "ws"],
        &["stop_edge_hz", "stop_edges_hz"],
    ),
    (
        &["stopband", "stopedges", "stopbandedges", "stopfrequencies", "stoprange"],
        &["stop_edges_hz", "stop_edge_hz", "edges_hz", "from_hz"],
    ),
    (
        &["freq", "frequency", "f0", "hz", "f", "center", "centre", "centerfrequency", "centrefrequency", "notch"],
        &["center_hz", "edge_hz"],
    ),
    (&["frequencies", "freqs", "range"], &["edges_hz", "from_hz"]),
    (&["bw", "bandwidth", "width", "span", "extent"], &["width_hz", "span_hz"]),
    (&["quality", "qfactor", "qualityfactor"], &["q"]),
    (&["n", "filterorder"], &["order"]),
    (&["harmonic", "overtones", "multiples", "lines", "nharmonics", "numharmonics"], &["harmonics"]),
    (&["ripple", "rp", "passripple", "passbandripple", "maxripple"], &["ripple_db", "keep_db"]),
    (
        &["rs", "stop", "stopatten", "stopattenuation", "stopbandattenuation"],
        &["stop_db", "reduce_db", "stop_edge_hz", "stop_edges_hz"],
    ),
    (
        &[
            "attenuation",
            "atten",
            "attenuate",
            "depth",
            "reduce",
            "reduction",
            "suppress",
            "suppression",
            "rejection",
            "cut",
        ],
        &["reduce_db", "stop_db"],
    ),
    (&["keep", "tolerance", "tol", "flatness", "within", "deviation"], &["keep_db", "ripple_db"]),
    (&["residual", "residualdb", "level", "maxlevel", "limit", "remaining"], &["residual_dbfs"]),
    (&["low", "lo", "lower", "from", "start", "fmin", "min", "flo", "flow", "begin"], &["from_hz", "edges_hz"]),
    (&["high", "hi", "upper", "to", "end", "fmax", "max", "fhi", "fhigh"], &["to_hz", "edges_hz"]),
    (&["exceptions", "exclude", "excluding", "ignore", "without", "but"], &["except"]),
    (&["type", "filtertype", "filter", "btype", "response"], &["kind", "stage"]),
    (&["prototype", "ftype", "design", "approximation", "method", "characteristic"], &["family"]),
    (&["id", "label", "title", "description"], &["name", "title"]),
    (&["name", "comment", "notes"], &["title"]),
    (&["bits", "bitdepth", "format", "sampleformat", "subtype", "depth", "sampletype"], &["encoding"]),
    (&["dithering", "noiseshaping"], &["dither"]),
    (&["clipping", "clip", "overflow", "saturation", "onoverload"], &["overload"]),
    (&["gain", "volume", "amplification", "boost", "cut", "level"], &["gain_db", "gain"]),
    (&["k", "scale", "scaling"], &["gain"]),
    (&["shelfslope", "steepness", "s"], &["slope"]),
    (&["weighting", "weight", "standard", "network"], &["curve"]),
    (&["num", "numer", "b", "bcoefficients", "feedforward"], &["numerator", "b"]),
    (&["den", "denom", "a", "acoefficients", "feedback"], &["denominator", "a"]),
    (&["sos", "biquads", "biquad", "section", "secondordersections"], &["sections", "stage"]),
    (&["zero", "z"], &["zeros", "zeros_hz"]),
    (&["pole", "p"], &["poles", "poles_hz"]),
    (&["prewarp", "prewarping", "warp", "match", "matched", "matchfrequency", "matchedfrequency"], &["match_hz"]),
    (&["stages", "filters", "sections"], &["stage"]),
    (&["bands", "requirement", "requirements", "limits"], &["band"]),
    (&["out", "outputs", "write"], &["output"]),
    (
        &[
            "samplerate",
            "fs",
            "sr",
            "timeexpansion",
            "te",
            "expansion",
            "rates",
            "whichrate",
            "ratemeaning",
            "timebase",
        ],
        &["rate", "rate_hz"],
    ),
    (&["codinghistory", "log", "provenance", "metadata", "appendhistory", "writehistory"], &["history"]),
    (
        &["reference", "ref", "refband", "referencerange", "zeroband", "normalizeband", "calibrationband", "levelband"],
        &["reference_band"],
    ),
    (&["zerophase", "direction", "passes", "forwardbackward", "filtfilt", "causal", "phaseresponse"], &["phase"]),
    (&["mode", "autodesign", "designmode", "automatic"], &["design"]),
    (&["search", "autooptions", "automaticdesign"], &["auto"]),
    (&["sectionlimit", "mostsections", "nsections", "sections", "sectioncount", "limit", "budget"], &["max_sections"]),
    (&["beyondnyquist", "nyquist", "abovehalfrate", "halfrate", "outofrange"], &["beyond_half_rate"]),
];

/// Least likeness of two spellings, 0 to 1 (share of letters that need no edit, swaps of
/// neighbors counted as one edit). Two letters in three: `ordr` finds `order`, and
/// `slope` does not find `stop`.
const LIKENESS: f64 = 2.0 / 3.0;

/// Lower case, letters and digits only.
fn bare(text: &str) -> String {
    text.chars().filter(|c| c.is_alphanumeric()).flat_map(char::to_lowercase).collect()
}

/// Units at the end of keys, and what they measure.
const UNITS: [(&str, &str); 4] = [("khz", "frequency"), ("hz", "frequency"), ("dbfs", "level"), ("db", "level")];

/// A bare key and what the unit at its end measures, if there is one.
fn split_unit(bare: &str) -> (&str, Option<&'static str>) {
    let split = UNITS.iter().find_map(|(unit, measures)| Some((bare.strip_suffix(unit)?, Some(*measures))));
    split.filter(|(stem, _)| !stem.is_empty()).unwrap_or((bare, None))
}

/// Without a unit at its end.
fn without_unit(bare: &str) -> &str {
    split_unit(bare).0
}

/// Whether a key in one unit may be meant by one in the other: `min_db` is no frequency.
fn units_agree(written: &str, known: &str) -> bool {
    match (split_unit(written).1, split_unit(known).1) {
        (Some(written), Some(known)) => written == known,
        _ => true,
    }
}

/// The best of `choices` by spelling.
fn nearest<T>(text: &str, choices: impl Iterator<Item = (T, String)>) -> Option<T> {
    let likeness = |choice: &str| strsim::normalized_damerau_levenshtein(text, choice);
    let scored = choices.map(|(value, choice)| (likeness(&choice), value)).filter(|(score, _)| *score >= LIKENESS);
    scored.max_by(|(a, _), (b, _)| a.total_cmp(b)).map(|(_, value)| value)
}

/// Texts longer than this (bytes) are no misspelled key: comparing spellings takes time
/// that grows with their length.
const MAX_COMPARED: usize = 64;

/// The key of `fitting` that `written` was probably meant to be.
pub(super) fn key(written: &str, fitting: &[&'static str]) -> Option<&'static str> {
    if written.len() > MAX_COMPARED {
        return None;
    }
    let written = bare(written);
    let stem = without_unit(&written);
    let mut fitting: Vec<_> = fitting.iter().filter(|key| units_agree(&written, &bare(key))).copied().collect();
    if split_unit(&written).1.is_some() {
        // `poles_khz` is nearer to `poles_hz` than to `poles`.
        fitting.sort_by_key(|key| split_unit(&bare(key)).1.is_none());
    }
    let same = |key: &&&'static str| bare(key) == written;
    let by_meaning = |text: &str| {
        let meant = KEY_MEANINGS.iter().filter(|(words, _)| words.contains(&text));
        meant.flat_map(|(_, keys)| *keys).find_map(|key| fitting.iter().find(|known| *known == key))
    };
    let by_stem = || fitting.iter().find(|key| without_unit(&bare(key)) == stem);
    let by_spelling = || {
        let spelled = fitting.iter().map(|key| (key, bare(key)));
        let stems = fitting.iter().map(|key| (key, without_unit(&bare(key)).to_owned()));
        nearest(&written, spelled).or_else(|| nearest(stem, stems))
    };
    fitting
        .iter()
        .find(same)
        .or_else(|| by_meaning(&written))
        .or_else(by_stem)
        .or_else(|| by_meaning(stem))
        .or_else(by_spelling)
        .copied()
}

/// Where a key belongs which is unknown where it was written. `name` is left
/// out: what has no name elsewhere is rarely meant to be a band.
pub(super) fn home(written: &str) -> Option<&'static str> {
    let homes = [
        ("in output", OUTPUT_KEYS),
        ("in a stage", STAGE_KEYS),
        ("in auto", AUTO_KEYS),
        ("in a band", BAND_KEYS),
        ("at the top of the spec, outside every table", TOP_KEYS),
    ];
    let owners = homes.iter().filter(|(_, keys)| written != "name" && keys.contains(&written));
    owners.map(|(home, _)| *home).next()
}

/// The choice that `written` was probably meant to be.
pub(super) fn word<W: Word>(written: &str) -> Option<W> {
    if written.len() > MAX_COMPARED {
        return None;
    }
    let written = bare(written);
    let exact = W::ALL.iter().copied().find(|choice| bare(choice.word()) == written);
    let alias = || W::ALIASES.iter().find(|(alias, _)| *alias == written).map(|(_, choice)| *choice);
    let spelled = || nearest(&written, W::ALL.iter().map(|choice| (*choice, bare(choice.word()))));
    exact.or_else(alias).or_else(spelled)
}

/// The name of `known` that is spelled most like `written`.
pub(super) fn name<'k>(written: &str, known: impl Iterator<Item = &'k str>) -> Option<&'k str> {
    if written.len() > MAX_COMPARED {
        return None;
    }
    let written = bare(written);
    nearest(&written, known.filter(|name| name.len() <= MAX_COMPARED).map(|name| (name, bare(name))))
}
