//! What a reader has to know of a transfer function that runs: what its digits are good for,
//! what rounding to f64 costs, and where the bilinear transform bends the response.

use super::digits::Digits;
use super::risk::{Judged, Place};
use super::written::{At, Written};
use crate::design::extrema::Profile;
use crate::design::wording::figure;
use crate::design::{BandDesign, exceptions, response};
use crate::section::Section;
use core::f64::consts::TAU;

/// Deviations below this are not worth a sentence, dB.
const LEAST_DB: f64 = 1e-3;

/// Where there are no bands, the response matters down to this far below its largest gain, dB.
const MATTERS_DB: f64 = 60.0;

/// What more digits should bring the response within where there are no bands, dB.
const GOOD_DB: f64 = 0.01;

/// What the rounding of section coefficients may cost without a word, dB.
const FLOOR_DB: f64 = 1e-4;

/// Down to where that is looked at, dB below the largest gain.
const FLOOR_MATTERS_DB: f64 = 100.0;

/// Between the points of a [`Profile`] a bound may be larger by this part: they are a tenth of
/// the distance to the nearest pole or zero apart, so a resonance that reaches its height
/// between two of them is higher by (1/20)^2.
const BETWEEN: f64 = 1.0025;

/// A stage among the others.
#[derive(Clone, Copy, Debug)]
pub struct Context<'a> {
    /// The stage's own sections.
    pub own: &'a [Section],
    /// The sections of all stages before it, and after.
    pub others: [&'a [Section]; 2],
    /// What the whole cascade promises.
    pub bands: &'a [BandDesign],
    /// Sample rate, Hz.
    pub rate_hz: f64,
}

/// A written transfer function at many frequencies.
pub(super) struct Survey {
    /// Rising.
    pub places: Vec<Place>,
}

impl Survey {
    pub fn new(written: &Written, context: Context<'_>) -> Survey {
        let Context { own, others: [before, after], bands, rate_hz } = context;
        let whole = [before, own, after].concat();
        let mut marks = Vec::new();
        for band in bands {
            let extent = (band.band.line.from_hz, band.band.line.to_hz);
            let kept = exceptions::remainder(extent, &band.excepted_hz);
            marks.extend(kept.into_iter().chain([extent]).flat_map(|(from_hz, to_hz)| [from_hz, to_hz]));
        }
        let profile = Profile::new(&whole, rate_hz, &marks);
        let places = profile.points().iter().map(|point| Place {
            hz: point.hz,
            rest_db: response::gain_db(before, point.hz, rate_hz) + response::gain_db(after, point.hz, rate_hz),
            at: written.at(point.hz, rate_hz),
        });
        Survey { places: places.collect() }
    }

    /// Where a pole may lie on the unit circle, or on the imaginary axis, Hz.
    pub fn may_be_unstable(&self, shrink: f64) -> Option<f64> {
        let doubtful = |at: &At| at.parts.iter().any(|part| part.in_denominator && part.may_vanish(shrink));
        self.places.iter().find(|place| doubtful(&place.at)).map(|place| place.hz)
    }

    /// How many more digits settle that no pole does.
    pub fn settled_by(&self, digits: Digits) -> Option<i32> {
        (0..=digits.room).find(|&more| self.may_be_unstable(shrink(more)).is_none())
    }
}

/// What is left of half a unit after `more` digits.
pub(super) fn shrink(more: i32) -> f64 {
    libm::exp10(-f64::from(more))
}

/// What to do where no number of digits helps.
pub(super) const OTHER_FORM: &str = "no number of digits that f64 holds would do in this form, so give zeros, poles and \
                                     gain, or sections";

/// Where the digits put no requirement at risk.
const HOLDS_ALL_THE_SAME: &str =
    "every requirement that holds as written holds for all coefficients that round to these";

/// About stability: that the digits leave it open.
pub(super) fn stability(survey: &Survey, digits: Digits) -> Option<String> {
    let at_hz = survey.may_be_unstable(1.0)?;
    let repair = match survey.settled_by(digits) {
        Some(more) => format!("{} would settle it", digits.more(more)),
        None => OTHER_FORM.to_owned(),
    };
    Some(format!(
        "it is stable as written, but {}, and half a unit in the last one could move a pole out of the stable region \
         near {} Hz; {repair}",
        digits.given(),
        hertz(at_hz)
    ))
}

/// How far the digits may move the response, and what that puts at risk.
pub(super) fn accuracy(survey: &Survey, bands: &[BandDesign], digits: Digits) -> Option<String> {
    if bands.is_empty() { whole_range(survey, digits) } else { in_bands(survey, bands, digits) }
}

fn in_bands(survey: &Survey, bands: &[BandDesign], digits: Digits) -> Option<String> {
    let judged: Vec<Judged<'_>> = bands.iter().map(|band| Judged::new(band, &survey.places)).collect();
    let mut told: Vec<String> = Vec::new();
    let mut untold = 0;
    for band in &judged {
        let off = band.deviation();
        let fails = !band.holds(1.0);
        let may_hold = band.may_hold_after_all();
        if !(fails || may_hold || band.is_kept() && off.db >= LEAST_DB) {
            continue;
        }
        if told.len() == 3 {
            untold += 1;
            continue;
        }
        let (from_hz, to_hz) = (hertz(band.design.band.line.from_hz), hertz(band.design.band.line.to_hz));
        let name = &band.design.band.name;
        let risk = match (fails, may_hold) {
            (true, _) => ", and what it requires may fail",
            (false, true) => ", which may be why what it requires fails",
            (false, false) => "",
        };
        told.push(format!("in \"{name}\" ({from_hz} to {to_hz} Hz) the response may be off by {}{risk}", off.told()));
    }
    // A filter that may not be stable promises nothing.
    let certain = survey.may_be_unstable(1.0).is_none();
    if told.is_empty() {
        let matters = certain && digits.room > 0 && judged.iter().any(|band| band.deviation().db >= LEAST_DB);
        return matters.then(|| format!("{}: {HOLDS_ALL_THE_SAME}", digits.given()));
    }
    if untold > 0 {
        told.push(format!("likewise in {untold} other bands"));
    }
    let verdict = if judged.iter().any(Judged::may_hold_after_all) {
        "; more digits would tell".to_owned()
    } else if judged.iter().all(|band| band.holds(1.0)) {
        if certain { format!("; {HOLDS_ALL_THE_SAME}") } else { String::new() }
    } else {
        let enough = (1..=digits.room).find(|&more| judged.iter().all(|band| band.holds(shrink(more))));
        match enough {
            Some(more) => format!("; {} would hold every requirement", digits.more(more)),
            None => format!("; {OTHER_FORM}"),
        }
    };
    Some(format!("{}: {}{verdict}", digits.given(), told.join(", ")))
}

fn whole_range(survey: &Survey, digits: Digits) -> Option<String> {
    let largest = survey.places.iter().map(|place| place.at.bounds(0.0).level_db).fold(f64::NEG_INFINITY, f64::max);
    let matters = |place: &&Place| place.at.bounds(0.0).level_db >= largest - MATTERS_DB;
    let off = |shrink: f64| super::risk::worst(survey.places.iter().filter(matters), shrink);
    let as_given = off(1.0);
    if as_given.db < LEAST_DB {
        return None;
    }
    let verdict = match (0..=digits.room).find(|&more| off(shrink(more)).db <= GOOD_DB) {
        Some(0) => String::new(),
        Some(more) => format!("; {} would bring that below {GOOD_DB} dB", digits.more(more)),
        None => format!("; {OTHER_FORM}"),
    };
    Some(format!(
        "{}: where its gain is within {MATTERS_DB} dB of the largest, the response may be off by {}{verdict}",
        digits.given(),
        as_given.told()
    ))
}

/// The largest deviation the digits allow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Deviation {
    pub db: f64,
    pub at_hz: f64,
}

impl Deviation {
    fn told(self) -> String {
        if self.db.is_finite() {
            // Rounded up: it is a bound.
            let tenth = libm::exp10(libm::floor(libm::log10(self.db)) - 1.0);
            let up = libm::ceil(self.db * BETWEEN / tenth) * tenth;
            format!("up to {} dB (at {} Hz)", figure(up), hertz(self.at_hz))
        } else {
            format!("any amount (near {} Hz)", hertz(self.at_hz))
        }
    }
}

/// What the sections in f64 are off by from what is written.
pub(super) fn rounding(survey: &Survey, own: &[Section], rate_hz: f64) -> Option<String> {
    let level_db = |place: &Place| place.at.bounds(0.0).level_db;
    let largest = survey.places.iter().map(level_db).fold(f64::NEG_INFINITY, f64::max);
    let matters = survey.places.iter().filter(|place| level_db(place) >= largest - FLOOR_MATTERS_DB);
    let off = |place: &Place| (response::gain_db(own, place.hz, rate_hz) - level_db(place)).abs();
    let worst = matters.max_by(|a, b| off(a).total_cmp(&off(b)))?;
    let db = off(worst);
    (db > FLOOR_DB).then(|| {
        format!(
            "section coefficients in f64 miss the response as written by up to {db:.1e} dB (at {} Hz); poles or zeros \
             so near the unit circle can't be held better",
            hertz(worst.hz)
        )
    })
}

/// Departures of the digital response from the analog one that are told, dB.
const WARPED_DB: [f64; 2] = [0.1, 1.0];

/// Where the bilinear transform bends the response. `k_rad` is K in rad/s.
pub(super) fn warping(written: &Written, survey: &Survey, k_rad: f64, rate_hz: f64) -> Option<String> {
    let analog_db = |hz: f64| {
        let tangent = TAU * hz / k_rad;
        let secant = libm::hypot(1.0, tangent);
        written.at_angle(tangent / secant, 1.0 / secant).bounds(0.0).level_db
    };
    let digital_db = |hz: f64| written.at(hz, rate_hz).bounds(0.0).level_db;
    let mut grid: Vec<f64> = survey.places.iter().map(|place| place.hz).collect();
    // What the digital response does at f, the analog one does at its image.
    let images: Vec<f64> = grid
        .iter()
        .map(|hz| k_rad / TAU * crate::design::transform::prewarp(*hz, rate_hz))
        .filter(|hz| *hz < rate_hz / 2.0)
        .collect();
    grid.extend(images);
    grid.sort_by(f64::total_cmp);
    let both: Vec<(f64, f64, f64)> = grid.iter().map(|&hz| (hz, digital_db(hz), analog_db(hz))).collect();
    let largest = both.iter().map(|both| both.1.max(both.2)).fold(f64::NEG_INFINITY, f64::max);
    let matters = both.iter().filter(|both| both.1.max(both.2) >= largest - MATTERS_DB);
    let apart = |hz: f64| (digital_db(hz) - analog_db(hz)).abs();
    let mut last_hz = 0.0;
    let (mut first, mut most): ([Option<f64>; 2], (f64, f64)) = ([None; 2], (0.0, 0.0));
    for &(hz, digital, analog) in matters {
        let off = (digital - analog).abs();
        for (first, limit) in first.iter_mut().zip(WARPED_DB) {
            if first.is_none() && off >= limit {
                *first = Some(crossing(last_hz, hz, |hz| apart(hz) >= limit));
            }
        }
        if off > most.0 {
            most = (off, hz);
        }
        last_hz = hz;
    }
    let bent = "the bilinear transform bends the frequency axis";
    match first {
        [None, _] => None,
        [Some(tenth_hz), None] => Some(format!(
            "{bent}: the response departs from that of the transfer function by 0.1 dB at {} Hz and by {:.2} dB at most \
             (at {} Hz)",
            hertz(tenth_hz),
            most.0,
            hertz(most.1)
        )),
        [Some(tenth_hz), Some(one_hz)] => Some(format!(
            "{bent}: the response departs from that of the transfer function by 0.1 dB at {} Hz and by 1 dB at {} Hz",
            hertz(tenth_hz),
            hertz(one_hz)
        )),
    }
}

/// Between `low` and `high`, where `reached` first holds; it does at `high`.
fn crossing(low: f64, high: f64, reached: impl Fn(f64) -> bool) -> f64 {
    let (mut low, mut high) = (low, high);
    for _ in 0..50 {
        let middle = 0.5 * (low + high);
        if reached(middle) { high = middle } else { low = middle }
    }
    high
}

/// A frequency with at most three decimals.
fn hertz(hz: f64) -> String {
    figure(libm::round(hz * 1000.0) / 1000.0)
}
