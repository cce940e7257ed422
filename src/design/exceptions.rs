//! What a keep band's exceptions take out of it.

use super::extrema::Profile;
use crate::spec::NamedBand;

/// The ranges (Hz) around the bands named by `except` in which the gain is below
/// `-keep_db`, clipped to `from_hz..to_hz`, rising and disjoint.
///
/// A named band is taken out whole, even where the response inside it comes up again;
/// beyond its ends the range goes on as long as the gain stays below `-keep_db`. An
/// end found on the response lies on the side where the gain is no longer below.
pub fn ranges(
    profile: &Profile<'_>,
    (from_hz, to_hz): (f64, f64),
    keep_db: f64,
    except: &[String],
    bands: &[NamedBand],
) -> Vec<(f64, f64)> {
    let fallen = |gain_db: f64| gain_db < -keep_db;
    let mut ranges: Vec<(f64, f64)> = bands
        .iter()
        .filter(|band| except.iter().any(|name| *name == band.base_name || *name == band.name))
        .map(|band| {
            let (mut low, mut high) = (band.line.from_hz, band.line.to_hz);
            if fallen(profile.gain_db(low)) {
                low = profile.end_below(low, fallen).map_or(from_hz.min(low), |(_, outside)| outside);
            }
            if fallen(profile.gain_db(high)) {
                high = profile.end_above(high, fallen).map_or(to_hz.max(high), |(_, outside)| outside);
            }
            (low.max(from_hz), high.min(to_hz))
        })
        .filter(|(low, high)| low < high)
        .collect();
    ranges.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut merged: Vec<(f64, f64)> = Vec::new();
    for (low, high) in ranges {
        match merged.last_mut() {
            Some(last) if low <= last.1 => last.1 = last.1.max(high),
            _ => merged.push((low, high)),
        }
    }
    merged
}

/// What of `from_hz..to_hz` lies outside `ranges` (as [`ranges`] returns them).
pub fn remainder((from_hz, to_hz): (f64, f64), ranges: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let starts = [from_hz].into_iter().chain(ranges.iter().map(|range| range.1));
    let ends = ranges.iter().map(|range| range.0).chain([to_hz]);
    starts.zip(ends).filter(|(low, high)| low < high).collect()
}

#[cfg(test)]
mod tests {
    use super::remainder;

    #[test]
    fn the_remainder_and_the_ranges_make_up_the_band() {
        let band = (90.0, 500.0);
        assert_eq!(remainder(band, &[]), [band]);
        assert_eq!(remainder(band, &[(98.0, 102.0), (148.0, 152.0)]), [(90.0, 98.0), (102.0, 148.0), (152.0, 500.0)]);
        assert_eq!(remainder(band, &[(90.0, 102.0), (400.0, 500.0)]), [(102.0, 400.0)]);
        assert!(remainder(band, &[band]).is_empty());
    }
}
