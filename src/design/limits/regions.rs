//! What a finished filter leaves of its limits.

use crate::design::Slack;
use crate::design::check::CAP_DB;
use crate::design::extrema::Profile;
use crate::design::recipe::FilterRecipe;
use crate::design::transform::{prewarp, unwarp};
use crate::section::Section;
use crate::spec::FilterKind;

/// Limits of one pass or of all passes together, and where they hold.
#[derive(Clone, Copy, Debug)]
pub(super) struct Limits<'a> {
    pub kind: FilterKind,
    /// Where the ripple ends, Hz: one, or two rising ones.
    pub edges_hz: &'a [f64],
    /// Where the stop band begins, Hz; as many.
    pub stop_hz: &'a [f64],
    pub ripple_db: f64,
    pub stop_db: f64,
    pub rate_hz: f64,
}

/// What an edge speaks of: from the edge to the far end of its side.
struct Region {
    at_hz: f64,
    is_stop: bool,
    from_hz: f64,
    to_hz: f64,
}

impl Limits<'_> {
    /// The slack at each pass edge, then at each stop edge, of the exact response of
    /// `sections`, made from `recipe`.
    pub fn slack(&self, recipe: &FilterRecipe, sections: &[Section]) -> Vec<Slack> {
        let marks: Vec<f64> = self.edges_hz.iter().chain(self.stop_hz).copied().collect();
        let profile = Profile::new(sections, self.rate_hz, &marks);
        self.regions(recipe).iter().map(|region| self.slack_in(region, &profile)).collect()
    }

    fn slack_in(&self, region: &Region, profile: &Profile<'_>) -> Slack {
        let gains_db = profile.within(region.from_hz, region.to_hz).map(|point| point.gain_db);
        let (limit_db, slack_db) = if region.is_stop {
            (self.stop_db, gains_db.map(|gain_db| -gain_db - self.stop_db).fold(CAP_DB, f64::min))
        } else {
            (self.ripple_db, gains_db.map(|gain_db| self.ripple_db - gain_db.abs()).fold(CAP_DB, f64::min))
        };
        Slack { at_hz: region.at_hz, limit_db, is_stop: region.is_stop, slack_db }
    }

    /// A side between two edges is parted where the transform has its center, so that each
    /// edge has a figure of its own.
    fn regions(&self, recipe: &FilterRecipe) -> Vec<Region> {
        let half_hz = self.rate_hz / 2.0;
        let center = recipe.edges_hz.iter().map(|&hz| prewarp(hz, self.rate_hz)).product();
        let center_hz = unwarp(libm::sqrt(center), self.rate_hz);
        let sides = |edges_hz: &[f64], is_stop: bool| -> Vec<Region> {
            let below = |at_hz, from_hz| Region { at_hz, is_stop, from_hz, to_hz: at_hz };
            let above = |at_hz, to_hz| Region { at_hz, is_stop, from_hz: at_hz, to_hz };
            let inside = (self.kind == FilterKind::Bandpass) != is_stop;
            match *edges_hz {
                [hz] if (self.kind == FilterKind::Lowpass) != is_stop => vec![below(hz, 0.0)],
                [hz] => vec![above(hz, half_hz)],
                // The center may lie beyond the stop edges of a band-stop: then the nearer
                // one speaks of itself alone.
                [low_hz, high_hz] if inside => {
                    let middle_hz = center_hz.max(low_hz).min(high_hz);
                    vec![above(low_hz, middle_hz), below(high_hz, middle_hz)]
                }
                [low_hz, high_hz] => vec![below(low_hz, 0.0), above(high_hz, half_hz)],
                _ => Vec::new(),
            }
        };
        let mut regions = sides(self.edges_hz, false);
        regions.extend(sides(self.stop_hz, true));
        regions
    }
}
