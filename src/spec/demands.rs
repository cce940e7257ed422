//! What `design = "auto"` and `phase = "zero"` ask of stages and bands.

use super::fields::Fields;
use super::problems::Problems;
use super::read_band::ReadBand;
use super::stages::Stage;
use super::tree::{Node, quote};
use super::types::Requirement;

/// A cascade that is found from the bands has no stages, something to cut, and nothing to
/// promise that no filter can.
pub(super) fn auto(fields: &Fields<'_>, stages: usize, bands: &[ReadBand<'_>], problems: &mut Problems) {
    let key = if fields.has("design") { "design" } else { "auto" };
    if stages > 0 {
        let stage = if stages == 1 { "a stage".to_owned() } else { format!("{stages} stages") };
        let message = format!("the spec has {stage}, and {key} asks to find the cascade from the bands");
        let repair = "remove the stages, or remove design and auto to keep them";
        problems.add(fields.key_place("stage"), message, repair);
    }
    for band in bands {
        if let Some(place) = band.residual_place {
            let name = band.name.map(|name| format!(" {}", quote(name))).unwrap_or_default();
            let message =
                format!("the band{name} has residual_dbfs, which no filter makes certain: it depends on the recording");
            problems.add(place, message, "give it reduce_db, or write the stages");
        }
    }
    // What is wrong with a band may be its limit.
    let may_reduce = |band: &ReadBand<'_>| {
        matches!(band.requirement, Some(Requirement::Reduce { .. }) | None) || band.residual_place.is_some()
    };
    if !bands.iter().any(may_reduce) && !fields.is_meant("band") {
        let message = "no band has reduce_db, so that there is nothing to cut";
        problems.add(fields.key_place(key), message, format!("give reduce_db to what must go, or remove {key}"));
    }
}

/// Both passes together must give what the spec says, so one pass gives half of the decibels:
/// half of those of a rational filter are in general those of none.
pub(super) fn zero_phase(stages: &[Option<Stage>], nodes: &[Node], problems: &mut Problems) {
    for (index, (stage, node)) in stages.iter().zip(nodes).enumerate() {
        let Some(stage @ (Stage::Weighting(_) | Stage::Digital(_) | Stage::Analog(_))) = stage else { continue };
        let message = format!(
            "stage {} ({}) can't run forward and backward: one pass would have half of its decibels, \
             which no rational filter has",
            index + 1,
            stage.kind_name()
        );
        problems.add(
            &node.place,
            message,
            format!("remove the stage, or write {}", problems.assign("phase", "\"causal\"")),
        );
    }
}
