//! Where a message points.

use bandproof::spec::{self, Place, SpecError, SpecSyntax};

use crate::{refused, refused_json};

fn places(text: &str, syntax: SpecSyntax) -> Vec<Place> {
    let error = spec::parse(text.as_bytes(), syntax, "spec").unwrap_err();
    assert!(!error.problems().is_empty(), "{error}");
    error.problems().iter().map(|problem| problem.place.clone()).collect()
}

fn toml_places(text: &str) -> Vec<(usize, usize)> {
    let at = |place| match place {
        Place::At { line, column } => (line, column),
        other => panic!("{other:?}"),
    };
    places(text, SpecSyntax::Toml).into_iter().map(at).collect()
}

const BAND: &str = "[[band]]\nname = 'a'\nfrom_hz = 5\nto_hz = 9\n";

#[test]
fn an_unknown_key_is_pointed_at_itself_a_bad_value_at_the_value_a_missing_key_at_its_table() {
    assert_eq!(toml_places(&format!("foo = 1\n{BAND}")), [(1, 1)]);
    assert_eq!(toml_places(&format!("{BAND}  foo = 1\n")), [(5, 3)]);
    assert_eq!(toml_places(&format!("{BAND}keep_db   =   -1\n")), [(5, 15)]);
    assert_eq!(toml_places(&format!("{BAND}\n  [[stage]]\n  kind = 'notch'\n  q = 3")), [(6, 3)]);
}

#[test]
fn columns_count_characters() {
    // Two-byte and four-byte characters before the place, on its line and above it.
    assert_eq!(toml_places("title = 'é🐦'\nband = [{name = 'é🐦', foo = 1, from_hz = 1, to_hz = 2}]"), [(2, 23)]);
}

#[test]
fn windows_line_ends_and_a_byte_order_mark_do_not_shift() {
    assert_eq!(toml_places(&format!("\u{feff}foo = 1\r\n{}", BAND.replace('\n', "\r\n"))), [(1, 1)]);
    assert_eq!(toml_places(&format!("{}foo = 1\r\n", BAND.replace('\n', "\r\n"))), [(5, 1)]);
}

#[test]
fn inline_tables_dotted_keys_and_quoted_keys_are_pointed_at() {
    assert_eq!(toml_places(&format!("output = {{ gain_db = 0, gian_db = 1 }}\n{BAND}")), [(1, 25)]);
    assert_eq!(toml_places(&format!("output.gain_db = 999\n{BAND}")), [(1, 18)]);
    assert_eq!(toml_places(&format!("output . foo = 999\n{BAND}")), [(1, 10)]);
    assert_eq!(toml_places(&format!("\"a b\" = 999\n{BAND}")), [(1, 1)]);
    let list = "[[stage]]\nkind = 'bandstop'\nfamily = 'bessel'\norder = 2\nedges_hz = [\n  40,\n  -1,\n]";
    assert_eq!(toml_places(list), [(7, 3)]);
}

#[test]
fn json_paths_count_from_zero() {
    let path = |text: &str| places(text, SpecSyntax::Json);
    let at = |path: &str| Place::Path(path.to_owned());
    assert_eq!(
        path(
            r#"{"stage": [{"kind": "notch", "center_hz": 50, "q": 30},
                       {"kind": "lowpass", "family": "bessel", "order": 2, "edge_hz": "40"},
                       {"kind": "bandstop", "family": "bessel", "order": 2, "edges_hz": [40, -1]}]}"#
        ),
        [at("stage[1].edge_hz"), at("stage[2].edges_hz[1]")]
    );
    assert_eq!(
        path(r#"{"output": {"foo": 1}, "stage": [{"kind": "notch", "q": 3}]}"#),
        [at("output.foo"), at("stage[0]")]
    );
    assert_eq!(
        path(r#"{"a\nb": 1, "band": [{"name": "a", "from_hz": 1, "to_hz": 2}]}"#),
        [at("\"a\\nb\"")],
        "an odd key is quoted"
    );
    assert_eq!(path("[]"), [Place::Whole]);
}

#[test]
fn a_key_that_stands_twice() {
    assert_eq!(
        refused_json(r#"{"band": [{"name": "a", "from_hz": 1, "to_hz": 2, "name": "b"}]}"#),
        "spec.json: band[0].name: the key \"name\" stands twice in the band; keep one of them"
    );
    assert_eq!(
        refused("title = 'a'\n\n title = 'b'"),
        "spec.toml:3:2: not valid TOML: duplicate key `title`; correct this place"
    );
}

#[test]
fn text_that_is_not_toml_or_json() {
    let at = |text: &str, syntax| match spec::parse(text.as_bytes(), syntax, "spec") {
        Err(SpecError::Syntax { line, column, .. }) => (line, column),
        other => panic!("{other:?}"),
    };
    assert_eq!(at("title = 'a'\norder 3\n", SpecSyntax::Toml).0, 2);
    assert_eq!(at("title = 'é' b", SpecSyntax::Toml), (1, 13));
    // The JSON parser points at the last character it took in.
    assert_eq!(at("{\n \"é\": 1,,}", SpecSyntax::Json), (2, 9));
    assert_eq!(at("", SpecSyntax::Json), (1, 1));
    assert_eq!(at("{\"a\": NaN}", SpecSyntax::Json).0, 1);
    assert_eq!(refused_json("{\n\"band\": [}"), "spec.json:2:10: not valid JSON: expected value; correct this place");
}

#[test]
fn text_that_nests_too_deep_is_no_spec() {
    for (open, syntax) in [("[", SpecSyntax::Json), ("{\"a\":", SpecSyntax::Json)] {
        let error = spec::parse(open.repeat(100_000).as_bytes(), syntax, "spec").unwrap_err();
        assert!(matches!(error, SpecError::Syntax { .. }), "{error}");
    }
    for text in [format!("a = {}", "[".repeat(100_000)), format!("{}a = 1", "a.".repeat(100_000))] {
        let error = spec::parse(text.as_bytes(), SpecSyntax::Toml, "spec").unwrap_err();
        assert!(matches!(error, SpecError::Syntax { .. }), "{error}");
    }
}
