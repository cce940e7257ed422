//! `reference_band`: which bands it may name, and what is said of the others.

use bandproof::spec::{self, SpecSyntax};

use crate::{read, refused, refused_json};

const BANDS: &str = "[[band]]\nname = 'calls'\nfrom_hz = 990\nto_hz = 1010\nkeep_db = 0.5\n\
                     [[band]]\nname = 'tones'\ncenter_hz = 60\nspan_hz = 2\nharmonics = 8\n\
                     [[band]]\nname = 'single'\ncenter_hz = 600\nspan_hz = 2\nharmonics = 1\n\
                     [[band]]\nname = 'hum'\ncenter_hz = 50\nspan_hz = 1\nharmonics = 4\nreduce_db = 30\n\
                     [[band]]\nname = 'whine'\nfrom_hz = 15750\nto_hz = 15850\nresidual_dbfs = -90\n";

/// What is said about a reference band of this name.
fn said_of(name: &str) -> String {
    refused(&format!("reference_band = '{name}'\n{BANDS}"))
}

#[test]
fn a_keep_band_an_observed_band_and_a_line_of_a_row_can_be_the_reference() {
    for name in ["calls", "single", "tones x1", "tones x8"] {
        let spec = read(&format!("reference_band = '{name}'\n{BANDS}"));
        assert_eq!(spec.reference_band.as_deref(), Some(name));
    }
    assert_eq!(read(BANDS).reference_band, None);
}

#[test]
fn it_stands_in_the_normalized_spec_before_the_tables() {
    let spec = read(&format!("reference_band = 'calls'\n{BANDS}"));
    let json = serde_json::to_value(&spec).unwrap();
    assert_eq!(json["reference_band"], "calls");
    let keys: Vec<_> = json.as_object().unwrap().keys().cloned().collect();
    assert_eq!(keys, ["beyond_half_rate", "reference_band", "phase", "output", "stage", "band"]);
    assert_eq!(spec::parse(json.to_string().as_bytes(), SpecSyntax::Json, "spec.json").unwrap(), spec);
    assert!(!serde_json::to_string(&read(BANDS)).unwrap().contains("reference_band"));
}

#[test]
fn a_name_that_no_band_has() {
    assert_eq!(
        said_of("cals"),
        "spec.toml:1:18: reference_band names \"cals\", which is no band of this spec; did you mean \"calls\"?"
    );
    // The nearest by spelling has a limit that shows no gain, so it is not the one suggested.
    assert_eq!(
        said_of("whines"),
        "spec.toml:1:18: reference_band names \"whines\", which is no band of this spec; \
         name a band that has keep_db or no requirement, or remove it"
    );
    assert_eq!(
        refused("reference_band = 'calls'\n[[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 30"),
        "spec.toml:1:18: reference_band names \"calls\", which is no band of this spec; \
         name a band that has keep_db or no requirement, or remove it"
    );
    // A row of one line is reported by its bare name.
    assert!(said_of("single x1").ends_with("which is no band of this spec; did you mean \"single\"?"));
}

#[test]
fn a_line_that_the_row_does_not_have() {
    for name in ["tones x9", "tones x0", "tones x01", "tones x"] {
        assert_eq!(
            said_of(name),
            format!(
                "spec.toml:1:18: reference_band names \"{name}\", which is no band of this spec; \
                 the bands of that row are \"tones x1\" to \"tones x8\""
            )
        );
    }
}

#[test]
fn a_row_of_several_lines() {
    assert_eq!(
        said_of("tones"),
        "spec.toml:1:18: reference_band names a row of 8 bands, and only one can be the reference; \
         name one of \"tones x1\" to \"tones x8\""
    );
}

#[test]
fn bands_that_show_no_gain() {
    for (name, key) in [("hum", "reduce_db"), ("hum x2", "reduce_db"), ("whine", "residual_dbfs")] {
        assert_eq!(
            said_of(name),
            format!(
                "spec.toml:1:18: reference_band names \"{name}\", which has {key} and so shows no gain; \
                 name a band that has keep_db or no requirement, or remove it"
            )
        );
    }
}

#[test]
fn values_that_are_no_name() {
    assert_eq!(
        refused(&format!("reference_band = 1\n{BANDS}")),
        "spec.toml:1:18: reference_band is 1, not text; write text in quotation marks"
    );
    assert_eq!(
        refused_json(r#"{"reference_band": ["a"], "band": [{"name": "a", "from_hz": 1, "to_hz": 2}]}"#),
        "spec.json: reference_band: reference_band is a list, not text; write text in quotation marks"
    );
    assert!(said_of("").contains("reference_band names \"\", which is no band of this spec"));
}

#[test]
fn the_key_in_json_has_its_path() {
    assert_eq!(
        refused_json(r#"{"reference_band": "b", "band": [{"name": "a", "from_hz": 1, "to_hz": 2, "reduce_db": 3}]}"#),
        "spec.json: reference_band: reference_band names \"b\", which is no band of this spec; \
         name a band that has keep_db or no requirement, or remove it"
    );
}

#[test]
fn a_band_with_a_problem_of_its_own_is_not_called_unknown() {
    let nameless = "reference_band = 'calls'\n[[band]]\nfrom_hz = 1\nto_hz = 2";
    assert_eq!(refused(nameless), "spec.toml:2:1: the band has no name; add a name: the report calls the band by it");
    let out_of_range = "reference_band = 'calls'\n[[band]]\nname = 'calls'\nfrom_hz = 1\nto_hz = 2\nkeep_db = -1";
    assert_eq!(refused(out_of_range).lines().count(), 1);
}

#[test]
fn in_a_table_it_is_sent_to_the_top() {
    let inside = format!("{BANDS}reference_band = 'calls'");
    assert_eq!(
        refused(&inside),
        "spec.toml:27:1: unknown key \"reference_band\" in the band \"whine\"; \
         reference_band belongs at the top of the spec, outside every table"
    );
}
