//! `design = "auto"`, `[auto]` and `phase`.

use bandproof::spec::*;

use crate::{read, refused, refused_json};

const BANDS: &str = "[[band]]\nname = 'hum'\nfrom_hz = 49\nto_hz = 51\nreduce_db = 30\n\
                     [[band]]\nname = 'calls'\nfrom_hz = 90\nto_hz = 6000\nkeep_db = 0.5\n";

fn written(spec: &Spec) -> serde_json::Value {
    serde_json::to_value(spec).unwrap()
}

#[test]
fn the_word_and_the_table_both_ask_for_it() {
    let plain = Some(Auto::default());
    assert_eq!(read(&format!("design = 'auto'\n{BANDS}")).auto, plain);
    assert_eq!(read(&format!("[auto]\n{BANDS}")).auto, plain);
    assert_eq!(read(&format!("design = 'auto'\nstage = []\n[auto]\n{BANDS}")).auto, plain);
    assert_eq!(read(BANDS).auto, None);
    assert_eq!(
        read(&format!("[auto]\nfamily = 'elliptic'\nmax_sections = 12\n{BANDS}")).auto,
        Some(Auto { family: Some(Family::Elliptic), max_sections: Some(12) })
    );
}

#[test]
fn it_is_written_as_the_word_and_the_table_where_that_holds_something() {
    let plain = written(&read(&format!("[auto]\n{BANDS}")));
    assert_eq!(plain["design"], "auto");
    assert!(plain.get("auto").is_none());
    let limited = written(&read(&format!("[auto]\nmax_sections = 12\n{BANDS}")));
    assert_eq!(limited["design"], "auto");
    assert_eq!(limited["auto"].to_string(), r#"{"max_sections":12}"#);
    assert!(written(&read(BANDS)).get("design").is_none());
    let keys: Vec<_> = limited.as_object().unwrap().keys().cloned().collect();
    assert_eq!(keys, ["beyond_half_rate", "phase", "design", "auto", "output", "stage", "band"]);
}

#[test]
fn a_cascade_to_be_found_is_no_identity() {
    assert!(read(BANDS).is_identity());
    assert!(!read(&format!("design = 'auto'\n{BANDS}")).is_identity());
}

#[test]
fn stages_beside_it() {
    let stage = "[[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 30\n";
    let repair = "remove the stages, or remove design and auto to keep them";
    assert_eq!(
        refused(&format!("design = 'auto'\n{stage}{BANDS}")),
        format!("spec.toml:2:3: the spec has a stage, and design asks to find the cascade from the bands; {repair}")
    );
    assert_eq!(
        refused(&format!("[auto]\n{stage}{stage}{BANDS}")),
        format!("spec.toml:2:3: the spec has 2 stages, and auto asks to find the cascade from the bands; {repair}")
    );
}

#[test]
fn bands_that_a_search_can_do_nothing_with() {
    let residual = "[[band]]\nname = 'whine'\nfrom_hz = 15750\nto_hz = 15850\nresidual_dbfs = -90\n";
    for bands in [format!("{residual}{BANDS}"), residual.to_owned()] {
        assert_eq!(
            refused(&format!("design = 'auto'\n{bands}")),
            "spec.toml:6:1: the band \"whine\" has residual_dbfs, which no filter makes certain: \
             it depends on the recording; give it reduce_db, or write the stages"
        );
    }
    let keep = "[[band]]\nname = 'calls'\nfrom_hz = 90\nto_hz = 6000\nkeep_db = 0.5\n";
    let nothing = "no band has reduce_db, so that there is nothing to cut; give reduce_db to what must go, or remove";
    assert_eq!(refused(&format!("design = 'auto'\n{keep}")), format!("spec.toml:1:1: {nothing} design"));
    assert_eq!(refused("title = 'a'\ndesign = 'auto'"), format!("spec.toml:2:1: {nothing} design"));
    assert_eq!(refused_json(r#"{"auto": {}}"#), format!("spec.json: auto: {nothing} auto"));
    // A limit that is wrong is all that is said.
    let said = refused(&format!("design = 'auto'\n{}", BANDS.replace("= 30", "= -30")));
    assert_eq!(said.lines().count(), 1, "{said}");
}

#[test]
fn values_and_words_of_the_search() {
    let with = |keys: &str| refused(&format!("[auto]\n{keys}\n{BANDS}"));
    for sections in ["0", "201"] {
        assert_eq!(
            with(&format!("max_sections = {sections}")),
            format!("spec.toml:2:16: max_sections = {sections} is out of range; give a whole number from 1 to 200")
        );
    }
    assert_eq!(with("order = 3"), "spec.toml:2:1: unknown key \"order\" in auto; order belongs in a stage");
    assert_eq!(with("sections = 3"), "spec.toml:2:1: unknown key \"sections\" in auto; did you mean max_sections?");
    assert_eq!(
        refused(&format!("design = 'manual'\n{BANDS}")),
        "spec.toml:1:10: design can't be \"manual\"; write \"auto\", or remove it"
    );
    assert_eq!(
        refused(&format!("design = true\n{BANDS}")),
        "spec.toml:1:10: design can't be true; did you mean \"auto\"?"
    );
    assert_eq!(
        refused(&format!("auto = true\n{BANDS}")),
        "spec.toml:1:8: auto is true, not a table; write a table of keys"
    );
    assert_eq!(
        refused(&format!("max_sections = 3\n{BANDS}")),
        "spec.toml:1:1: unknown key \"max_sections\" in the spec; max_sections belongs in auto"
    );
}

#[test]
fn the_phase_is_read_and_always_written() {
    for phase in Phase::ALL {
        let spec = read(&format!("phase = '{}'\n{BANDS}", phase.name()));
        assert_eq!((spec.phase, &written(&spec)["phase"]), (*phase, &phase.name().into()));
    }
    assert_eq!(read(BANDS).phase, Phase::Causal);
    assert_eq!(written(&read(BANDS))["phase"], "causal");
    assert_eq!(
        refused(&format!("phase = 'linear'\n{BANDS}")),
        "spec.toml:1:9: phase can't be \"linear\"; choose one of causal, zero"
    );
    assert_eq!(
        refused(&format!("phase = 'zero-phase'\n{BANDS}")),
        "spec.toml:1:9: phase can't be \"zero-phase\"; did you mean \"zero\"? (one of causal, zero)"
    );
}

#[test]
fn stages_without_a_half_do_not_run_backward() {
    let stages = "[[stage]]\nkind = 'weighting'\ncurve = 'A'\n\
                  [[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 30\n\
                  [[stage]]\nkind = 'digital'\nnumerator = [1]\ndenominator = [1, -0.5]\n\
                  [[stage]]\nkind = 'analog'\nnumerator = [1]\ndenominator = [1, 1]\n";
    let said = |number, kind| {
        format!(
            "stage {number} ({kind}) can't run forward and backward: one pass would have half of its decibels, \
             which no rational filter has; remove the stage, or write phase = \"causal\""
        )
    };
    assert_eq!(
        refused(&format!("phase = 'zero'\n{stages}")),
        format!(
            "spec.toml:2:1: {}\nspec.toml:9:1: {}\nspec.toml:13:1: {}",
            said(1, "weighting"),
            said(3, "digital"),
            said(4, "analog")
        )
    );
    assert_eq!(read(&format!("phase = 'causal'\n{stages}")).stages.len(), 4);
    let halved = "[[stage]]\nkind = 'peak'\ncenter_hz = 50\nq = 30\ngain_db = 3\n\
                  [[stage]]\nkind = 'lowpass'\nfamily = 'bessel'\norder = 2\nedge_hz = 100\n";
    assert_eq!(read(&format!("phase = 'zero'\n{halved}")).stages.len(), 2);
}
