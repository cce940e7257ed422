//! The ways in which the stages of a design were designed.

use crate::design::{Design, DesignedStage};
use crate::spec::{Curve, DigitalFilter, Stage};

/// How a stage gets from what the spec says to its sections.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Way {
    /// Prototype, band transform, bilinear transform.
    Prototype,
    /// The note's formulas.
    Equalizer,
    /// The matched z transform.
    Weighting,
    /// Sections, as they are.
    Sections,
    /// A transfer function in z, as it is.
    Digital,
    /// A transfer function in s and the bilinear transform.
    Analog,
}

impl Way {
    const ALL: [Way; 6] = [Way::Prototype, Way::Equalizer, Way::Weighting, Way::Sections, Way::Digital, Way::Analog];

    fn of(stage: &Stage) -> Way {
        match stage {
            Stage::Filter(_) | Stage::Notch(_) => Way::Prototype,
            Stage::Equalizer(_) => Way::Equalizer,
            Stage::Weighting(_) => Way::Weighting,
            Stage::Digital(digital) if matches!(digital.filter, DigitalFilter::Sections(_)) => Way::Sections,
            Stage::Digital(_) => Way::Digital,
            Stage::Analog(_) => Way::Analog,
        }
    }

    /// Those that `design` took, each once.
    fn taken(design: &Design) -> impl Iterator<Item = Way> + '_ {
        let takes = |way: &Way| design.stages.iter().any(|stage| Way::of(&stage.placed.stage) == *way);
        Way::ALL.into_iter().filter(takes)
    }
}

/// In full, one way after another.
pub fn described(design: &Design) -> String {
    let described = |way| match way {
        Way::Prototype => {
            "analog prototypes (zeros, poles, gain), bilinear transform with edges prewarped (of a notch: center \
             and width), zeros paired with the nearest poles"
        }
        Way::Equalizer => {
            "peaks and shelves by the formulas of the W3C Working Group Note Audio EQ Cookbook (8 June 2021)"
        }
        Way::Weighting => {
            "weighting from the analog poles and zeros of its curve by the matched z transform, with real zeros and \
             poles fitted to what its gain in dB then lacks; K at 48 kHz as printed"
        }
        Way::Sections => "second-order sections as given",
        Way::Digital => "transfer functions in z as given, factored in doubled precision",
        Way::Analog => "transfer functions in s as given, factored in doubled precision, bilinear transform",
    };
    Way::taken(design).map(described).collect::<Vec<_>>().join("; ")
}

/// What follows on "the filter", one clause for each way: `was designed from ...`.
pub fn clauses(design: &Design) -> Vec<String> {
    Way::taken(design).map(|way| way.clause(design)).collect()
}

impl Way {
    fn clause(self, design: &Design) -> String {
        match self {
            Way::Prototype => {
                let prewarped = prewarped(design);
                format!("was designed from analog prototypes by the bilinear transform with {prewarped}")
            }
            Way::Equalizer => {
                "has its peaks and shelves from the formulas of the W3C note Audio EQ Cookbook".to_owned()
            }
            Way::Weighting if is_printed(design) => {
                "has its weighting with the coefficients printed in the standard".to_owned()
            }
            Way::Weighting => {
                "has its weighting from the poles and zeros of the standard by the matched z transform with \
                               a fitted correction"
                    .to_owned()
            }
            Way::Sections => "has its sections as given".to_owned(),
            Way::Digital => "has its transfer function in z as given".to_owned(),
            Way::Analog => {
                "has its transfer function in s as given and brought to z by the bilinear transform".to_owned()
            }
        }
    }
}

/// Whether all standard curves are K at the rate for which its standard prints coefficients.
fn is_printed(design: &Design) -> bool {
    let mut curves = design.stages.iter().filter_map(|stage| match &stage.placed.stage {
        Stage::Weighting(weighting) => Some(weighting.curve),
        _ => None,
    });
    design.rate_hz == 48_000 && curves.all(|curve| curve == Curve::K)
}

/// What of the stages with prototypes keeps its place under the bilinear transform.
fn prewarped(design: &Design) -> &'static str {
    let is_notch = |stage: &DesignedStage| matches!(stage.placed.stage, Stage::Notch(_));
    let is_filter = |stage: &&DesignedStage| matches!(stage.placed.stage, Stage::Filter(_));
    let notches = design.stages.iter().filter(|stage| is_notch(stage)).count();
    let edges = design.stages.iter().filter(is_filter).map(|stage| stage.placed.edges_hz.len()).sum();
    match (edges, notches) {
        (1, 1) => "a prewarped edge, center, and width",
        (1, 2..) => "a prewarped edge, centers, and widths",
        (2.., 1) => "prewarped edges, center, and width",
        (0, ..=1) => "prewarped center and width",
        (0, _) => "prewarped centers and widths",
        (1, 0) => "a prewarped edge",
        (_, 0) => "prewarped edges",
        _ => "prewarped edges, centers, and widths",
    }
}
