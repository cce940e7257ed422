//! Figures and sentences that messages about a design have in common.

use super::check::{BandDesign, Check};
use crate::spec::Requirement;

/// A figure with at most six decimals and no trailing zeros.
pub fn figure(value: f64) -> String {
    let fixed = format!("{value:.6}");
    let short = fixed.trim_end_matches('0').trim_end_matches('.');
    if short == "-0" { "0".to_owned() } else { short.to_owned() }
}

/// The radius of a pole that lies `distance` inside the unit circle, negative outside:
/// `1.0003`, or `1 + 2.0e-9` where six decimals show nothing of the distance.
pub fn radius(distance: f64) -> String {
    if distance.abs() >= 1e-6 {
        figure(1.0 - distance)
    } else if distance == 0.0 {
        "1".to_owned()
    } else {
        format!("1 {} {:.1e}", if distance < 0.0 { '+' } else { '-' }, distance.abs())
    }
}

/// A level or attenuation as the report rounds it.
pub fn decibel(value: f64) -> String {
    figure(libm::round(value * 1000.0) / 1000.0)
}

/// `value` as [`decibel`], or with as many more decimals (up to 12) as show by how much its
/// magnitude lies beyond `limit`, to a tenth: `-0.62`, `-0.2000013` of 0.2.
pub fn beyond(value: f64, limit: f64) -> String {
    let over = value.abs() - limit.abs();
    let shown = |places: usize| format!("{value:.places$}");
    let tells = |text: &String| {
        text.parse().is_ok_and(|shown: f64| (shown.abs() - limit.abs() - over).abs() <= 0.1 * over.abs())
    };
    let text = (3..12).map(shown).find(tells).unwrap_or_else(|| shown(12));
    let short = text.trim_end_matches('0').trim_end_matches('.');
    if short == "-0" { "0".to_owned() } else { short.to_owned() }
}

/// What is impossible about a band, with the figure and the repair; `None` where
/// nothing is. `has_stages` says whether there is any filter at this rate.
pub fn impossible(band: &BandDesign, rate_hz: u32, has_stages: bool) -> Option<String> {
    if band.check != Some(Check::Impossible) {
        return None;
    }
    let name = format!("band \"{}\" at {rate_hz} Hz", band.band.name);
    let (from_hz, to_hz) = (figure(band.band.line.from_hz), figure(band.band.line.to_hz));
    match (&band.band.requirement, band.violation) {
        (Requirement::Keep { keep_db, .. }, Some(violation)) => {
            let (gain_db, at_hz) = (beyond(violation.gain_db, *keep_db), figure(violation.at_hz));
            let repair = if violation.gain_db < 0.0 {
                "raise keep_db, narrow the band, move the edge of the stage that takes it out, \
                 or name the reduce band that lies there in except"
            } else {
                "raise keep_db, narrow the band, or change the stage that raises it"
            };
            Some(format!(
                "{name}: keep_db = {} does not hold, the gain is {gain_db} dB at {at_hz} Hz; {repair}",
                figure(*keep_db)
            ))
        }
        (Requirement::Keep { .. }, None) => Some(format!(
            "{name}: the exceptions take out all of {from_hz} to {to_hz} Hz and leave nothing to keep; \
             widen the band, narrow the stops, or take names out of except"
        )),
        (Requirement::Reduce { reduce_db }, _) if !has_stages => Some(format!(
            "{name}: reduce_db = {} can't be reached, no stage filters anything at this rate; \
             add a stage that takes out {from_hz} to {to_hz} Hz",
            figure(*reduce_db)
        )),
        (Requirement::Reduce { reduce_db }, violation) => {
            let at = violation.map_or_else(String::new, |violation| format!(" (at {} Hz)", figure(violation.at_hz)));
            Some(format!(
                "{name}: reduce_db = {} can't be reached, the largest attenuation from {from_hz} to {to_hz} Hz \
                 is {} dB{at}; raise stop_db or order, widen the stop or move it onto the band, or lower reduce_db",
                figure(*reduce_db),
                beyond(band.attenuation_max_db, *reduce_db)
            ))
        }
        (Requirement::Residual { .. } | Requirement::Observe, _) => None,
    }
}

#[cfg(test)]
mod tests {
    use super::{beyond, figure};

    #[test]
    fn a_figure_beyond_its_limit_shows_by_how_much() {
        let cases = [
            (-0.62, 0.2, "-0.62"),
            (-0.200_001_304, 0.2, "-0.2000013"),
            (26.999_98, 27.0, "26.99998"),
            (26.0, 27.0, "26"),
            (-15.104_2, 27.0, "-15.104"),
            (0.5, 0.5, "0.5"),
            (0.0, 0.0, "0"),
        ];
        for (value, limit, text) in cases {
            assert_eq!(beyond(value, limit), text);
        }
    }

    #[test]
    fn figures_have_no_trailing_zeros_and_no_negative_zero() {
        let cases =
            [(350.0, "350"), (15_931.666_666_67, "15931.666667"), (-0.000_000_1, "0"), (0.5, "0.5"), (-3.0, "-3")];
        for (value, text) in cases {
            assert_eq!(figure(value), text);
        }
    }
}
