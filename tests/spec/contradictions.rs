//! What can't be meant, each with the very words a user reads: the place, what is wrong,
//! and the repair.

use crate::{read, refused, refused_json};

const CALLS: &str = "[[band]]\nname = 'calls'\nfrom_hz = 90\nto_hz = 6000\nkeep_db = 0.5\n";
const HUM: &str = "[[band]]\nname = 'hum'\ncenter_hz = 50\nspan_hz = 1\nharmonics = 8\nreduce_db = 30\n";

fn stage(keys: &str) -> String {
    refused(&format!("[[stage]]\n{keys}"))
}

fn band(keys: &str) -> String {
    refused(&format!("[[band]]\nname = 'b'\n{keys}"))
}

#[test]
fn a_reduce_band_inside_a_keep_band() {
    assert_eq!(
        refused(&format!("{HUM}{CALLS}")),
        "spec.toml:7:1: the reduce band \"hum x2\" (99.5 to 100.5 Hz) lies inside the keep band \"calls\" \
         (90 to 6000 Hz); add except = [\"hum\"] to the keep band, or move one of the bands"
    );
    read(&format!("{HUM}{CALLS}except = ['hum']"));
}

#[test]
fn a_reduce_band_inside_a_keep_band_in_json() {
    let spec = r#"{"band": [{"name": "calls", "from_hz": 90, "to_hz": 6000, "keep_db": 0.5},
                           {"name": "hum", "from_hz": 99, "to_hz": 101, "reduce_db": 30}]}"#;
    assert_eq!(
        refused_json(spec),
        "spec.json: band[0]: the reduce band \"hum\" (99 to 101 Hz) lies inside the keep band \"calls\" \
         (90 to 6000 Hz); add \"except\": [\"hum\"] to the keep band, or move one of the bands"
    );
}

#[test]
fn a_reduce_band_that_reaches_into_a_keep_band_contradicts_it_there() {
    let low = |to_hz: &str| format!("{CALLS}[[band]]\nname = 'low'\nfrom_hz = 80\nto_hz = {to_hz}\nreduce_db = 20");
    assert_eq!(
        refused(&low("90.1")),
        "spec.toml:1:1: the reduce band \"low\" (80 to 90.1 Hz) reaches into the keep band \"calls\" \
         (90 to 6000 Hz); add except = [\"low\"] to the keep band, or move one of the bands"
    );
    // Bands own from_hz and not to_hz: these two share no frequency.
    read(&low("90"));
    read(&format!("{CALLS}[[band]]\nname = 'high'\nfrom_hz = 6000\nto_hz = 7000\nreduce_db = 20"));
    // A reduce band around the keep band.
    assert!(
        refused(&format!("{CALLS}[[band]]\nname = 'all'\nfrom_hz = 5\nto_hz = 9000\nreduce_db = 20"))
            .contains("\"all\" (5 to 9000 Hz) reaches into the keep band")
    );
}

#[test]
fn lines_are_excepted_one_by_one_or_by_the_name_of_the_row() {
    let inside: Vec<_> = (2..=8).map(|line| format!("'hum x{line}'")).collect();
    read(&format!("{CALLS}except = [{}]\n{HUM}", inside.join(", ")));
    assert_eq!(
        refused(&format!("{CALLS}except = ['hum x2', 'hum x4']\n{HUM}")),
        "spec.toml:6:1: the reduce band \"hum x3\" (149.5 to 150.5 Hz) lies inside the keep band \"calls\" \
         (90 to 6000 Hz); name \"hum\" in except, or move one of the bands"
    );
}

#[test]
fn every_pair_of_rows_is_compared_line_by_line() {
    // Keep bands at 60, 120, 180, ... of 2 Hz; reduce bands at 50, 100, ...: they first
    // meet at 300 Hz, the 5th of the one and the 6th of the other.
    let keep = "[[band]]\nname = 'tones'\ncenter_hz = 60\nspan_hz = 2\nharmonics = 10\nkeep_db = 1\n";
    assert!(refused(&format!("{keep}{HUM}")).contains(
        "the reduce band \"hum x6\" (299.5 to 300.5 Hz) lies inside the keep band \"tones x5\" (299 to 301 Hz)"
    ));
    read(&format!("{}{HUM}", keep.replace("harmonics = 10", "harmonics = 4")));
}

#[test]
fn residual_and_observed_bands_may_lie_in_a_keep_band() {
    read(&format!("{CALLS}[[band]]\nname = 'r'\nfrom_hz = 99\nto_hz = 101\nresidual_dbfs = -90"));
    read(&format!("{CALLS}[[band]]\nname = 'o'\nfrom_hz = 99\nto_hz = 101"));
}

#[test]
fn edges_out_of_order() {
    assert_eq!(
        stage("kind = 'bandpass'\nfamily = 'bessel'\norder = 3\nedges_hz = [51.6, 48.4]"),
        "spec.toml:5:12: edges_hz = [51.6, 48.4] is not in rising order; \
         write the lower edge first: edges_hz = [48.4, 51.6]"
    );
    assert_eq!(
        stage("kind = 'bandpass'\nfamily = 'bessel'\norder = 3\nedges_hz = [50, 50]"),
        "spec.toml:5:12: edges_hz = [50, 50] is not in rising order; \
         write the lower edge first: edges_hz = [lower, upper]"
    );
    assert_eq!(
        band("from_hz = 100\nto_hz = 90"),
        "spec.toml:3:1: from_hz = 100 is not below to_hz = 90; put the lower edge into from_hz"
    );
    assert!(band("from_hz = 90\nto_hz = 90").contains("from_hz = 90 is not below to_hz = 90"));
}

#[test]
fn a_band_with_two_requirements() {
    assert_eq!(
        band("from_hz = 90\nto_hz = 100\nreduce_db = 30\nkeep_db = 1"),
        "spec.toml:6:1: the band \"b\" has 2 requirements, reduce_db and keep_db; \
         keep one, and write another band for the other"
    );
    assert!(
        band("from_hz = 90\nto_hz = 100\nreduce_db = 30\nkeep_db = 1\nresidual_dbfs = -3")
            .contains("has 3 requirements, reduce_db and keep_db and residual_dbfs")
    );
}

#[test]
fn a_name_used_twice() {
    assert_eq!(
        refused(&format!("{HUM}{HUM}")),
        "spec.toml:8:8: the name \"hum\" is used twice, first in line 2; give each band a name of its own"
    );
    assert_eq!(
        refused_json(r#"{"band": [{"name": "a", "from_hz": 1, "to_hz": 2}, {"name": "a", "from_hz": 3, "to_hz": 4}]}"#),
        "spec.json: band[1].name: the name \"a\" is used twice, first in band[0].name; \
         give each band a name of its own"
    );
}

#[test]
fn a_name_that_is_the_name_of_a_line_of_a_row() {
    let other = |name: &str| format!("[[band]]\nname = '{name}'\nfrom_hz = 1000\nto_hz = 1001\n");
    assert_eq!(
        refused(&format!("{}{HUM}", other("hum x8"))),
        "spec.toml:2:8: the name \"hum x8\" is used twice: it is also a line of the row \"hum\" in line 6; \
         give each band a name of its own"
    );
    // No line of that row is called so; a row of one line has no numbers.
    for name in ["hum x9", "hum x0", "hum x08", "hum x+8", "hum  x8", "humx8"] {
        read(&format!("{}{HUM}", other(name)));
    }
    read(&format!("{}{}", other("hum x1"), HUM.replace("harmonics = 8", "harmonics = 1")));
}

#[test]
fn except_that_names_no_reduce_band() {
    assert_eq!(
        refused(&format!("{CALLS}except = ['wind']\n{HUM}")),
        "spec.toml:6:11: except names \"wind\", which is no band of this spec; \
         name a band that has reduce_db, or remove it"
    );
    assert_eq!(
        refused(&format!("{CALLS}except = ['hmu']\n{HUM}")),
        "spec.toml:6:11: except names \"hmu\", which is no band of this spec; did you mean \"hum\"?"
    );
    assert_eq!(
        refused(&format!("{CALLS}except = ['hum', 'hum x9']\n{HUM}")),
        "spec.toml:6:18: except names \"hum x9\", which is no band of this spec; did you mean \"hum\"?"
    );
    assert_eq!(
        refused(&format!("{CALLS}except = ['calls']\n{HUM}")),
        "spec.toml:6:11: except names \"calls\", which has no reduce_db; \
         name a band that has reduce_db, or remove it"
    );
}

#[test]
fn except_outside_a_keep_band() {
    assert_eq!(
        band("from_hz = 90\nto_hz = 100\nreduce_db = 3\nexcept = ['x']"),
        "spec.toml:6:1: except in the band \"b\": only a keep band has exceptions; \
         remove it, or move it to the keep band"
    );
}

#[test]
fn an_empty_spec() {
    assert_eq!(
        refused(""),
        "spec.toml: the spec is empty: it has no stage and no band; \
         add a [[stage]] to filter or a [[band]] to measure"
    );
    assert_eq!(refused("title = 'nothing'\nstage = []\n[output]\ngain_db = 3"), refused(""));
    assert_eq!(
        refused_json("{}"),
        "spec.json: the spec is empty: it has no stage and no band; add a \"stage\" to filter or a \"band\" to measure"
    );
}

#[test]
fn a_band_that_says_twice_or_not_where_it_is() {
    let ways = "give from_hz and to_hz, or center_hz with span_hz or q";
    assert_eq!(band(""), format!("spec.toml:1:1: the band \"b\" does not say where it is; {ways}"));
    assert_eq!(band("from_hz = 3"), format!("spec.toml:1:1: the band \"b\" has no to_hz; {ways}"));
    assert_eq!(band("to_hz = 3"), format!("spec.toml:1:1: the band \"b\" has no from_hz; {ways}"));
    assert_eq!(
        band("from_hz = 3\nto_hz = 5\ncenter_hz = 4"),
        format!("spec.toml:5:1: the band \"b\" says twice where it is, by from_hz and by center_hz; {ways}")
    );
    assert_eq!(
        band("center_hz = 50"),
        "spec.toml:1:1: the band \"b\" has neither span_hz nor q; \
         add span_hz (edge to edge, in hertz) or q (center over width)"
    );
    assert_eq!(
        band("center_hz = 50\nspan_hz = 1\nq = 50"),
        "spec.toml:5:1: the band \"b\" has both span_hz and q, which say the same; keep one of them"
    );
    assert_eq!(
        band("span_hz = 1"),
        "spec.toml:1:1: the band \"b\" has no center_hz; add the center of the band in hertz"
    );
}

#[test]
fn a_line_that_reaches_zero() {
    assert_eq!(
        band("center_hz = 50\nspan_hz = 100"),
        "spec.toml:4:11: span_hz = 100 around 50 Hz begins at 0 Hz, which is not above 0 Hz; \
         give a span_hz below 100, twice the center"
    );
    assert_eq!(
        stage("kind = 'notch'\ncenter_hz = 50\nq = 0.25"),
        "spec.toml:4:5: q = 0.25 around 50 Hz begins at -50 Hz, which is not above 0 Hz; give a q above 0.5"
    );
    read("[[band]]\nname = 'b'\ncenter_hz = 50\nspan_hz = 99.9");
    read("[[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 0.51");
}

#[test]
fn a_line_without_width() {
    assert_eq!(
        stage("kind = 'notch'\ncenter_hz = 15800\nwidth_hz = 1e-20"),
        "spec.toml:4:12: width_hz makes lines so narrow at 15800 Hz that their edges fall onto the center; \
         make it wider"
    );
}

#[test]
fn stops_that_overlap_their_neighbors() {
    let bandstop = "kind = 'bandstop'\nfamily = 'bessel'\norder = 3\ncenter_hz = 50\nharmonics = 8\n";
    assert_eq!(
        stage(&format!("{bandstop}width_hz = 60")),
        "spec.toml:7:12: lines 1 and 2 of the row overlap (20 to 80 Hz and 70 to 130 Hz), \
         so that nothing passes between them; give a width_hz below 50, the distance of the lines"
    );
    assert_eq!(
        stage("kind = 'notch'\ncenter_hz = 50\nq = 7\nharmonics = 8"),
        "spec.toml:4:5: lines 7 and 8 of the row overlap (325 to 375 Hz and 371.429 to 428.571 Hz), \
         so that nothing passes between them; give a q above 7.5, or fewer harmonics"
    );
    // The advice holds.
    read(&format!("[[stage]]\n{bandstop}width_hz = 49.9"));
    read("[[stage]]\nkind = 'notch'\ncenter_hz = 50\nq = 7.51\nharmonics = 8");
    // One line has no neighbor.
    read("[[stage]]\nkind = 'notch'\ncenter_hz = 50\nwidth_hz = 60");
    // Bands are only looked at: theirs may overlap.
    read("[[band]]\nname = 'b'\ncenter_hz = 50\nspan_hz = 60\nharmonics = 8");
}

#[test]
fn a_row_of_band_passes_that_lets_nothing_through() {
    let bandpass = "kind = 'bandpass'\nfamily = 'bessel'\norder = 3\ncenter_hz = 50\n";
    assert_eq!(
        stage(&format!("{bandpass}width_hz = 10\nharmonics = 3")),
        "spec.toml:7:1: the lines of a bandpass row run one after another, and nothing passes both \
         45 to 55 Hz and 145 to 155 Hz; remove harmonics, or write a bandstop for what must go"
    );
    read(&format!("[[stage]]\n{bandpass}width_hz = 10\nharmonics = 1"));
    // 15 to 85 Hz and 65 to 135 Hz: 65 to 85 Hz passes both.
    read(&format!("[[stage]]\n{bandpass}width_hz = 70\nharmonics = 2"));
}

#[test]
fn everything_wrong_is_reported_at_once_in_the_order_of_the_file() {
    let spec = "titel = 'a'\n[[band]]\nname = 'b'\nfrom_hz = -1\nto_hz = 'x'\n[[stage]]\nkind = 'notch'\nq = 0\n";
    assert_eq!(
        refused(spec),
        "spec.toml:1:1: unknown key \"titel\" in the spec; did you mean title?\n\
         spec.toml:4:11: from_hz = -1 is out of range; give a frequency of at least 0 Hz\n\
         spec.toml:5:9: to_hz is the text \"x\", not a number; write a plain number in hertz\n\
         spec.toml:6:1: the notch stage has no center_hz; add the center of the first line in hertz\n\
         spec.toml:8:5: q = 0 is out of range; give a Q (center over width) above 0"
    );
}

#[test]
fn two_hundred_problems_are_listed() {
    let text: String = (0..201).map(|number| format!("key{number} = 1\n")).collect();
    let said = refused(&text);
    assert_eq!(said.lines().count(), 201);
    assert_eq!(
        said.lines().last(),
        Some("spec.toml: there are more than these 200 problems; check that this file is a spec")
    );
}
