//! Types, units and ranges of single values.

use crate::{read, refused, refused_json};

const LOWPASS: &str = "[[stage]]\nkind = 'lowpass'\n";

/// A low-pass with these keys.
fn lowpass(keys: &str) -> String {
    refused(&format!("{LOWPASS}{keys}"))
}

/// What is said about a low-pass whose `edge_hz` is written in line 5 like this.
fn edge(value: &str) -> String {
    let said = lowpass(&format!("family = 'bessel'\norder = 2\nedge_hz = {value}"));
    said.strip_prefix("spec.toml:5:11: ").unwrap_or_else(|| panic!("{said}")).to_owned()
}

#[test]
fn a_unit_inside_the_value() {
    for (value, plain) in [
        ("'50 Hz'", "50"),
        ("'50'", "50"),
        ("'50.5Hz'", "50.5"),
        ("' 50 hz '", "50"),
        ("'1.5 kHz'", "1500"),
        ("'12 KHZ'", "12000"),
    ] {
        let text = value.trim_matches('\'');
        assert_eq!(
            edge(value),
            format!("edge_hz is the text \"{text}\", not a number; write a plain number in hertz: edge_hz = {plain}")
        );
    }
    assert_eq!(edge("'low'"), "edge_hz is the text \"low\", not a number; write a plain number in hertz");
    assert_eq!(edge("'3 dB'"), "edge_hz is the text \"3 dB\", not a number; write a plain number in hertz");
    assert_eq!(
        refused_json(r#"{"band": [{"name": "a", "from_hz": 1, "to_hz": 2, "residual_dbfs": "-90 dBFS"}]}"#),
        "spec.json: band[0].residual_dbfs: residual_dbfs is the text \"-90 dBFS\", not a number; \
         write a plain number in decibels relative to full scale: \"residual_dbfs\": -90"
    );
}

#[test]
fn other_types_in_place_of_a_number() {
    assert_eq!(edge("true"), "edge_hz is true, not a number; write a plain number in hertz");
    assert_eq!(edge("[40]"), "edge_hz is a list, not a number; write a plain number in hertz");
    assert_eq!(edge("{a = 1}"), "edge_hz is a table, not a number; write a plain number in hertz");
    assert_eq!(edge("2031-05-02"), "edge_hz is a date or time, not a number; write a plain number in hertz");
    assert_eq!(
        refused_json(r#"{"stage": [{"kind": "notch", "center_hz": null, "q": 3}]}"#),
        "spec.json: stage[0].center_hz: center_hz is null, not a number; write a plain number in hertz"
    );
}

#[test]
fn numbers_that_are_not_finite_or_not_positive() {
    assert_eq!(edge("nan"), "edge_hz is NaN, not a finite number; give a frequency above 0 Hz");
    assert_eq!(
        edge("inf"),
        "edge_hz is inf, not a finite number; give a frequency above 0 and at most 2147483647.5 Hz"
    );
    assert_eq!(edge("-inf"), "edge_hz is -inf, not a finite number; give a frequency above 0 Hz");
    assert_eq!(edge("0"), "edge_hz = 0 is out of range; give a frequency above 0 Hz");
    assert_eq!(edge("-50"), "edge_hz = -50 is out of range; give a frequency above 0 Hz");
    // Half of 2^32 - 1, the highest rate of a WAV header.
    assert_eq!(
        edge("2147483648"),
        "edge_hz = 2147483648 is out of range; give a frequency above 0 and at most 2147483647.5 Hz"
    );
    assert!(edge("99999999999999999999999").starts_with("edge_hz = 1e23 is out of range"));
    assert!(edge(&"9".repeat(60)).starts_with("edge_hz is inf, not a finite number"));
}

#[test]
fn whole_numbers_stand_for_others_and_written_in_any_base() {
    let text = |edge: &str| format!("{LOWPASS}family = 'chebyshev1'\norder = 3\nripple_db = 1\nedge_hz = {edge}");
    let forty = read(&text("40.0"));
    for same in ["40", "+40", "4e1", "0x28", "0o50", "0b101000", "4_0"] {
        assert_eq!(read(&text(same)), forty, "{same}");
    }
    // `order = 3.0` is a whole number too, as in JSON.
    assert_eq!(read(&text("40").replace("order = 3", "order = 3.0")), forty);
}

/// (stage keys before, key, first value below the range, lowest, highest, first above,
/// what to give)
type Range<'r> = (&'r str, &'r str, &'r str, &'r str, &'r str, &'r str, &'r str);

#[test]
fn ranges_end_where_they_say() {
    let cheb1 = "[[stage]]\nkind = 'lowpass'\nfamily = 'chebyshev1'\nedge_hz = 9\n";
    let cheb2 = "[[stage]]\nkind = 'lowpass'\nfamily = 'chebyshev2'\nedge_hz = 9\norder = 2\n";
    let elliptic = "[[stage]]\nkind = 'lowpass'\nfamily = 'elliptic'\nedge_hz = 9\nripple_db = 1\nstop_db = 40\n";
    let ripple = "[[stage]]\nkind = 'lowpass'\nfamily = 'chebyshev1'\nedge_hz = 9\norder = 2\n";
    let cheb1 = &format!("{cheb1}ripple_db = 1\n");
    let notch = "[[stage]]\nkind = 'notch'\ncenter_hz = 1\nwidth_hz = 0.1\n";
    let band = "[[band]]\nname = 'b'\nfrom_hz = 5\nto_hz = 9\n";
    let output = "stage = [{kind = 'notch', center_hz = 1, q = 3}]\n[output]\n";
    let low = "5e-324";
    let cases: &[Range<'_>] = &[
        (cheb1, "order", "0", "1", "20", "21", "an order from 1 to 20"),
        (elliptic, "order", "0", "1", "14", "15", "an order for elliptic from 1 to 14"),
        (ripple, "ripple_db", "0", low, "12", "12.000000000000002", "a ripple above 0 and at most 12 dB"),
        (
            cheb2,
            "stop_db",
            "3.0103",
            "3.010300000000001",
            "200",
            "200.00000000000003",
            "a stop band attenuation above 3.0103 and at most 200 dB",
        ),
        (notch, "harmonics", "0", "1", "500", "501", "a whole number from 1 to 500"),
        (band, "reduce_db", "0", low, "200", "200.00000000000003", "an attenuation above 0 and at most 200 dB"),
        (band, "keep_db", "0", low, "200", "200.00000000000003", "a tolerance above 0 and at most 200 dB"),
        (
            band,
            "residual_dbfs",
            "-200.00000000000003",
            "-200",
            "0",
            "5e-324",
            "a level relative to full scale from -200 to 0 dBFS",
        ),
        (output, "gain_db", "-200.00000000000003", "-200", "200", "200.00000000000003", "a gain from -200 to 200 dB"),
    ];
    for (before, key, below, lowest, highest, above, give) in cases {
        let with = |value: &str| format!("{before}{key} = {value}\n");
        for outside in [below, above] {
            let said = refused(&with(outside));
            let number: f64 = outside.parse().unwrap();
            let shown = if number == 5e-324 { "5e-324".to_owned() } else { number.to_string() };
            let line = before.lines().count() + 1;
            let column = key.len() + 4;
            assert_eq!(said, format!("spec.toml:{line}:{column}: {key} = {shown} is out of range; give {give}"));
        }
        read(&with(lowest));
        read(&with(highest));
    }
}

#[test]
fn fractions_of_what_is_counted() {
    assert_eq!(
        lowpass("family = 'bessel'\norder = 2.5\nedge_hz = 4"),
        "spec.toml:4:9: order is 2.5, not a whole number; give an order from 1 to 20"
    );
}

#[test]
fn ripple_and_stop_band_attenuation_belong_to_their_families() {
    let all = "order = 2\nedge_hz = 40\nripple_db = 1\nstop_db = 40";
    assert_eq!(
        lowpass(&format!("family = 'butterworth'\n{all}")),
        "spec.toml:6:1: ripple_db in the lowpass stage: butterworth has no pass band ripple to choose; \
         remove it, or choose chebyshev1 or elliptic\n\
         spec.toml:7:1: stop_db in the lowpass stage: butterworth has no stop band attenuation to choose; \
         remove it, or choose chebyshev2 or elliptic"
    );
    assert_eq!(lowpass(&format!("family = 'bessel'\n{all}")).lines().count(), 2);
    assert!(lowpass(&format!("family = 'chebyshev1'\n{all}")).starts_with("spec.toml:7:1: stop_db in the lowpass"));
    assert!(lowpass(&format!("family = 'chebyshev2'\n{all}")).starts_with("spec.toml:6:1: ripple_db in the lowpass"));
    read(&format!("{LOWPASS}family = 'elliptic'\n{all}"));
    let none = "order = 2\nedge_hz = 40";
    assert_eq!(
        lowpass(&format!("family = 'elliptic'\n{none}")),
        "spec.toml:1:1: the lowpass stage has no ripple_db; elliptic needs its pass band ripple in decibels\n\
         spec.toml:1:1: the lowpass stage has no stop_db; elliptic needs its stop band attenuation in decibels"
    );
    assert_eq!(
        lowpass("family = 'elliptic'\norder = 2\nedge_hz = 40\nripple_db = 6\nstop_db = 6"),
        "spec.toml:7:11: stop_db = 6 is not above ripple_db = 6; \
         the stop band must lie deeper than the ripple: raise stop_db"
    );
}

#[test]
fn keys_of_another_kind_of_stage() {
    assert_eq!(
        lowpass("family = 'bessel'\norder = 2\ncenter_hz = 50\nq = 3"),
        "spec.toml:5:1: center_hz in the lowpass stage: a low-pass or high-pass has one edge; \
         write edge_hz instead\n\
         spec.toml:6:1: q in the lowpass stage: a low-pass or high-pass has one edge; write edge_hz instead"
    );
    assert_eq!(
        refused("[[stage]]\nkind = 'notch'\nfamily = 'bessel'\norder = 2\nedge_hz = 50\nq = 4"),
        "spec.toml:3:1: family in the notch stage: a notch is always one second-order section a line; remove it\n\
         spec.toml:4:1: order in the notch stage: a notch is always one second-order section a line; remove it\n\
         spec.toml:5:1: edge_hz in the notch stage: a notch lies around a center; write center_hz with width_hz or q"
    );
    let bandstop = "[[stage]]\nkind = 'bandstop'\nfamily = 'bessel'\norder = 2\n";
    let ways = "write edges_hz, or center_hz with width_hz or q";
    assert_eq!(
        refused(bandstop),
        format!("spec.toml:1:1: the bandstop stage has neither edges_hz nor center_hz; {ways}")
    );
    assert_eq!(
        refused(&format!("{bandstop}edge_hz = 4")),
        format!("spec.toml:5:1: edge_hz in the bandstop stage: it has two edges; {ways}")
    );
    assert_eq!(
        refused(&format!("{bandstop}edges_hz = [4, 5]\nharmonics = 2")),
        "spec.toml:6:1: harmonics in the bandstop stage: edges_hz already says where the edges are; \
         keep edges_hz, or center_hz with width_hz or q"
    );
    assert_eq!(
        refused(&format!("{bandstop}edges_hz = [4, 5, 6]")),
        "spec.toml:5:12: edges_hz is a list of 3, not of two numbers; \
         write the lower and the upper one: edges_hz = [48.4, 51.6]"
    );
}

#[test]
fn what_every_stage_needs() {
    assert_eq!(
        refused("[[stage]]\nq = 3"),
        "spec.toml:1:1: the stage has no kind; \
         say what it does: kind is one of lowpass, highpass, bandpass, bandstop, notch, \
         peak, lowshelf, highshelf, weighting, digital, analog"
    );
    assert_eq!(
        lowpass(""),
        "spec.toml:1:1: the lowpass stage has no family; \
         choose one of butterworth, chebyshev1, chebyshev2, elliptic, bessel\n\
         spec.toml:1:1: the lowpass stage has neither order nor stop_edge_hz; \
         add the order of the low-pass prototype, or stop_edge_hz with ripple_db and stop_db\n\
         spec.toml:1:1: the lowpass stage has no edge_hz; add the frequency of the edge in hertz"
    );
}

#[test]
fn names_and_titles_are_plain_text() {
    let band = |name: &str| format!("[[band]]\nname = {name}\nfrom_hz = 1\nto_hz = 2");
    assert_eq!(
        refused("[[band]]\nfrom_hz = 1\nto_hz = 2"),
        "spec.toml:1:1: the band has no name; add a name: the report calls the band by it"
    );
    assert_eq!(refused(&band("''")), "spec.toml:2:8: the name \"\" is empty; give the band a name of one line");
    assert!(refused(&band("' '")).contains("the name \" \" is empty"));
    assert_eq!(
        refused(&band("\"a\\nb\"")),
        "spec.toml:2:8: the name \"a\\nb\" holds a control character; give the band a name of one line"
    );
    assert_eq!(refused(&band("7")), "spec.toml:2:8: name is 7, not text; write text in quotation marks");
    read(&band("'Röhricht 🐦'"));
    let titled = |title: &str| format!("title = {title}\n{}", band("'b'"));
    assert_eq!(
        refused(&titled("\"a\\u001b[31m\"")),
        "spec.toml:1:9: title \"a\\u{1b}[31m\" holds a control character; remove it"
    );
    read(&titled("\"\"\"two\nlines\tand a tab\"\"\""));
}

#[test]
fn lists_and_tables_where_they_belong() {
    assert_eq!(
        refused("[stage]\nkind = 'notch'"),
        "spec.toml:1:2: stage is a table, not a list of tables; begin each stage with [[stage]] in double brackets"
    );
    assert_eq!(
        refused_json(r#"{"band": {"name": "a"}}"#),
        "spec.json: band: band is a table, not a list of tables; \
         put the band objects into a list: \"band\": [{ ... }]"
    );
    assert_eq!(
        refused("output = 3\n[[stage]]\nkind = 'notch'\ncenter_hz = 3\nq = 3"),
        "spec.toml:1:10: output is 3, not a table; write a table of keys"
    );
    assert_eq!(
        refused("[[band]]\nname = 'a'\nfrom_hz = 1\nto_hz = 2\nkeep_db = 1\nexcept = 'hum'"),
        "spec.toml:6:10: except is the text \"hum\", not a list; write a list of names: except = [\"hum\"]"
    );
}

#[test]
fn yes_and_no_are_true_and_false_without_quotation_marks() {
    let with = |value: &str| format!("[output]\nhistory = {value}\n[[stage]]\nkind = 'notch'\ncenter_hz = 1\nq = 3");
    for truth in [true, false] {
        assert_eq!(read(&with(&truth.to_string())).output.history, truth);
    }
    for (value, said) in [
        ("'true'", "history is the text \"true\", not true or false; write true without quotation marks"),
        ("'False'", "history is the text \"False\", not true or false; write false without quotation marks"),
        ("'yes'", "history is the text \"yes\", not true or false; write true or false"),
        ("1", "history is 1, not true or false; write true or false"),
        ("[]", "history is a list, not true or false; write true or false"),
        ("{}", "history is a table, not true or false; write true or false"),
    ] {
        assert_eq!(refused(&with(value)), format!("spec.toml:2:11: {said}"));
    }
    assert_eq!(
        refused_json(
            r#"{"output": {"history": null}, "stage": [{"kind": "notch", "center_hz": 1, "q": 3}], "rate": true}"#
        ),
        "spec.json: rate: rate can't be true; choose one of header, acoustic\n\
         spec.json: output.history: history is null, not true or false; write true or false"
    );
    // A number is no yes.
    let said = lowpass("family = 'bessel'\norder = true\nedge_hz = 50");
    assert!(said.contains("order is true, not a number"), "{said}");
}
