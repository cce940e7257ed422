//! Whether a band's requirement survives what the digits leave open.

use super::remarks::Deviation;
use super::written::At;
use crate::design::{BandDesign, exceptions};
use crate::spec::Requirement;

/// As in [`crate::design::check`]: a limit that is just met is missed by rounding.
const TOLERANCE_DB: f64 = 1e-6;

/// One frequency.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Place {
    pub hz: f64,
    /// Gain of the other stages, dB.
    pub rest_db: f64,
    pub at: At,
}

impl Place {
    /// Least, written and largest gain of the whole cascade, dB.
    fn net_db(&self, shrink: f64) -> [f64; 3] {
        let bounds = self.at.bounds(shrink);
        // A zero of another stage outweighs whatever this one does.
        let net = |db: f64| if self.rest_db == f64::NEG_INFINITY { self.rest_db } else { self.rest_db + db };
        [bounds.low_db, bounds.level_db, bounds.high_db].map(net)
    }

    fn off_db(&self, shrink: f64) -> f64 {
        let bounds = self.at.bounds(shrink);
        let off = |a: f64, b: f64| if a == b { 0.0 } else { a - b };
        off(bounds.high_db, bounds.level_db).max(off(bounds.level_db, bounds.low_db))
    }
}

/// The largest deviation among places.
pub(super) fn worst<'a>(places: impl Iterator<Item = &'a Place>, shrink: f64) -> Deviation {
    let each = places.map(|place| Deviation { db: place.off_db(shrink), at_hz: place.hz });
    each.fold(Deviation { db: 0.0, at_hz: 0.0 }, |most, one| if one.db > most.db { one } else { most })
}

/// What has to hold of the places of a band.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Demand {
    /// The gain lies within plus or minus this.
    Within(f64),
    /// The gain is this or lower everywhere.
    Below(f64),
    /// It is somewhere.
    SomewhereBelow(f64),
    /// It does not hold as written, or there is nothing to hold.
    Nothing,
}

/// A band, its places and what the stage as written holds there.
pub(super) struct Judged<'a> {
    pub design: &'a BandDesign,
    places: Vec<&'a Place>,
    demand: Demand,
}

impl<'a> Judged<'a> {
    pub fn new(design: &'a BandDesign, places: &'a [Place]) -> Judged<'a> {
        let extent = (design.band.line.from_hz, design.band.line.to_hz);
        let kept = exceptions::remainder(extent, &design.excepted_hz);
        let inside = |place: &&Place| kept.iter().any(|&(from, to)| (from..=to).contains(&place.hz));
        let places: Vec<&Place> = places.iter().filter(inside).collect();
        let all = |demand: Demand| places.iter().all(|place| meets(place, demand, 0.0));
        let any = |demand: Demand| places.iter().any(|place| meets(place, demand, 0.0));
        let lowered = |limit_db: f64| {
            if all(Demand::Below(limit_db)) {
                Demand::Below(limit_db)
            } else if any(Demand::Below(limit_db)) {
                Demand::SomewhereBelow(limit_db)
            } else {
                Demand::Nothing
            }
        };
        let demand = match design.band.requirement {
            Requirement::Keep { keep_db, .. } if all(Demand::Within(keep_db)) => Demand::Within(keep_db),
            Requirement::Reduce { reduce_db } => lowered(-reduce_db),
            Requirement::Residual { residual_dbfs } => lowered(residual_dbfs),
            Requirement::Keep { .. } | Requirement::Observe => Demand::Nothing,
        };
        Judged { design, places, demand }
    }

    /// Whether the band is there to be passed or observed, so that its response matters both
    /// ways.
    pub fn is_kept(&self) -> bool {
        matches!(self.design.band.requirement, Requirement::Keep { .. } | Requirement::Observe)
    }

    /// The largest deviation in the band as written.
    pub fn deviation(&self) -> Deviation {
        worst(self.places.iter().copied(), 1.0)
    }

    /// Whether the requirement fails as written, but would hold for some errors within the
    /// digits at every frequency.
    pub fn may_hold_after_all(&self) -> bool {
        let net_db = || self.places.iter().map(|place| place.net_db(1.0));
        let reaches = |limit_db: f64| net_db().any(|[low_db, ..]| low_db <= limit_db);
        let fails = self.demand == Demand::Nothing && !self.places.is_empty();
        fails
            && match self.design.band.requirement {
                Requirement::Keep { keep_db, .. } => {
                    net_db().all(|[low_db, _, high_db]| low_db <= keep_db && high_db >= -keep_db)
                }
                Requirement::Reduce { reduce_db } => reaches(-reduce_db),
                Requirement::Residual { residual_dbfs } => reaches(residual_dbfs),
                Requirement::Observe => false,
            }
    }

    /// Whether what holds as written holds for any errors of `shrink` times half a unit.
    pub fn holds(&self, shrink: f64) -> bool {
        match self.demand {
            Demand::Nothing => true,
            Demand::SomewhereBelow(_) => self.places.iter().any(|place| meets(place, self.demand, shrink)),
            Demand::Within(_) | Demand::Below(_) => self.places.iter().all(|place| meets(place, self.demand, shrink)),
        }
    }
}

fn meets(place: &Place, demand: Demand, shrink: f64) -> bool {
    let [low_db, _, high_db] = place.net_db(shrink);
    match demand {
        Demand::Within(keep_db) => high_db <= keep_db + TOLERANCE_DB && low_db >= -keep_db - TOLERANCE_DB,
        Demand::Below(limit_db) | Demand::SomewhereBelow(limit_db) => high_db <= limit_db + TOLERANCE_DB,
        Demand::Nothing => true,
    }
}
