//! What an unknown key or word was probably meant to be.

use crate::refused;

/// The key suggested for `key` in a table that begins like this.
fn suggested(before: &str, key: &str) -> Option<String> {
    let said = refused(&format!("{before}{key} = 1\n"));
    let unknown = format!("unknown key \"{key}\" in ");
    let line = said.lines().find(|line| line.contains(&unknown)).unwrap_or_else(|| panic!("{key}: {said}"));
    let (_, repair) = line.split_once("; did you mean ")?;
    Some(repair.trim_end_matches('?').to_owned())
}

fn check(before: &str, table: &[(&str, &[&str])]) {
    for (meant, written) in table {
        for key in *written {
            assert_eq!(suggested(before, key).as_deref(), Some(*meant), "{key} after {before:?}");
        }
    }
}

const LOWPASS: &str = "[[stage]]\nkind = 'lowpass'\n";
const BANDSTOP: &str = "[[stage]]\nkind = 'bandstop'\n";
const NOTCH: &str = "[[stage]]\nkind = 'notch'\n";
const BAND: &str = "[[band]]\n";

#[test]
fn keys_of_a_stage_with_one_edge() {
    check(
        LOWPASS,
        &[
            (
                "edge_hz",
                &["edge", "cutoff", "cutoff_hz", "fc", "frequency", "freq", "f0", "edge_khz", "egde_hz", "edgeHz"],
            ),
            ("ripple_db", &["ripple", "rp", "Ripple_dB", "ripple-db", "riple_db"]),
            ("stop_db", &["stop", "rs", "attenuation", "atten", "depth", "stopdb"]),
            ("order", &["n", "ordr", "Order", "filter_order"]),
            ("kind", &["type", "filter_type", "knd"]),
            ("family", &["prototype", "familly", "design"]),
            ("stop_edge_hz", &["stop_edge", "stopband", "stop_freq", "ws", "stop_edge_khz", "stop_egde_hz"]),
        ],
    );
}

#[test]
fn keys_of_stages_with_lines() {
    check(
        NOTCH,
        &[
            ("center_hz", &["freq", "frequency", "f0", "center", "centre_hz", "centr_hz", "frequency_hz"]),
            ("width_hz", &["bw", "bandwidth", "width", "bandwidth_hz", "span_hz"]),
            ("q", &["Q", "quality", "q_factor"]),
            ("harmonics", &["harmonic", "n_harmonics", "overtones", "harmonis"]),
        ],
    );
    check(
        BANDSTOP,
        &[
            ("edges_hz", &["edges", "cutoff", "edge", "from_hz", "low", "edge_khz"]),
            ("center_hz", &["freq"]),
            ("stop_db", &["depth", "reduce_db"]),
            ("stop_edges_hz", &["stop_edges", "stopband", "stopband_hz", "stop_edge"]),
        ],
    );
}

#[test]
fn keys_of_peaks_shelves_and_curves() {
    check(
        "[[stage]]\nkind = 'peak'\n",
        &[
            ("center_hz", &["freq", "f0", "center"]),
            ("gain_db", &["boost", "gian_db", "Gain_dB", "volume"]),
            ("q", &["Q", "quality"]),
        ],
    );
    check(
        "[[stage]]\nkind = 'highshelf'\n",
        &[("edge_hz", &["freq", "cutoff", "corner_hz"]), ("slope", &["S", "shelf_slope", "steepness", "slop"])],
    );
    check("[[stage]]\nkind = 'weighting'\n", &[("curve", &["weighting", "weight", "curv", "Curve"])]);
}

#[test]
fn keys_of_transfer_functions() {
    check(
        "[[stage]]\nkind = 'digital'\n",
        &[
            ("numerator", &["num", "b", "numerater"]),
            ("denominator", &["den", "a", "Denominator"]),
            ("sections", &["sos", "section", "biquads"]),
            ("zeros", &["zero", "z", "zeroes"]),
            ("poles", &["pole", "p"]),
            ("gain", &["k", "scale", "gian"]),
            ("rate_hz", &["rate", "sample_rate", "samplerate_hz", "fs", "sr"]),
        ],
    );
    check(
        "[[stage]]\nkind = 'analog'\n",
        &[("match_hz", &["prewarp", "prewarp_hz", "match", "matched_hz"]), ("poles_hz", &["poles_khz"])],
    );
}

#[test]
fn keys_of_a_band() {
    check(
        BAND,
        &[
            ("from_hz", &["from", "low", "lower", "low_hz", "fmin", "form_hz"]),
            ("to_hz", &["to", "high", "upper_hz", "fmax"]),
            ("center_hz", &["freq", "center", "frequency"]),
            ("span_hz", &["bw", "bandwidth", "width_hz", "span"]),
            ("reduce_db", &["attenuation", "attenuation_db", "atten", "depth", "reduce", "stop_db", "reduction_db"]),
            ("keep_db", &["tolerance", "tolerance_db", "keep", "ripple"]),
            ("residual_dbfs", &["level", "level_dbfs", "residual", "residual_db"]),
            ("except", &["exceptions", "exclude", "excpt"]),
            ("name", &["label", "nam"]),
        ],
    );
}

#[test]
fn keys_of_the_output_and_the_top() {
    check(
        "[output]\n",
        &[
            ("encoding", &["bits", "bit_depth", "format", "encodng"]),
            ("gain_db", &["gain", "gian_db"]),
            ("dither", &["dithering", "dihter"]),
            ("overload", &["clip", "clipping", "overlaod"]),
            ("history", &["coding_history", "append-history", "histroy"]),
        ],
    );
    check(
        "",
        &[
            ("title", &["name", "titel"]),
            ("stage", &["stages", "filter", "filters"]),
            ("band", &["bands", "requirements"]),
            ("output", &["out", "ouput"]),
            ("rate", &["sample_rate", "samplerate", "fs", "time_expansion", "TE", "rate_hz", "raet"]),
            ("phase", &["zero_phase", "zerophase", "direction", "pahse"]),
            ("design", &["mode", "auto_design", "desing"]),
            ("beyond_half_rate", &["nyquist", "beyond_nyquist", "beyond-half-rate"]),
            ("reference_band", &["reference", "ref", "ref_band", "referenceBand", "refrence_band", "reference_hz"]),
        ],
    );
}

#[test]
fn a_key_near_none_lists_what_is_known() {
    assert_eq!(
        refused("[output]\nwobble = 1\n[[stage]]\nkind = 'notch'\ncenter_hz = 1\nq = 3"),
        "spec.toml:2:1: unknown key \"wobble\" in output; known keys here: encoding, dither, overload, gain_db, history"
    );
}

#[test]
fn a_key_in_the_wrong_table_is_sent_to_the_right_one() {
    let notch = "[[stage]]\nkind = 'notch'\ncenter_hz = 1\nq = 3\n";
    assert_eq!(
        refused(&format!("edge_hz = 40\n{notch}")),
        "spec.toml:1:1: unknown key \"edge_hz\" in the spec; edge_hz belongs in a stage"
    );
    assert_eq!(
        refused(&format!("{notch}overload = 'clip'")),
        "spec.toml:5:1: unknown key \"overload\" in the notch stage; overload belongs in output"
    );
    assert_eq!(
        refused(&format!("{notch}phase = 'zero'")),
        "spec.toml:5:1: unknown key \"phase\" in the notch stage; \
         phase belongs at the top of the spec, outside every table"
    );
}

#[test]
fn a_key_that_was_meant_is_not_reported_missing_as_well() {
    assert_eq!(
        refused("[[stage]]\nkind = 'notch'\nfreq = 50\nbw = 3"),
        "spec.toml:3:1: unknown key \"freq\" in the notch stage; did you mean center_hz?\n\
         spec.toml:4:1: unknown key \"bw\" in the notch stage; did you mean width_hz?"
    );
    assert_eq!(
        refused("[[filters]]\nkind = 'notch'"),
        "spec.toml:1:3: unknown key \"filters\" in the spec; did you mean stage?"
    );
}

#[test]
fn words_that_are_no_choice() {
    let said = |text: &str| refused(&format!("{text}\n[[band]]\nname = 'b'\nfrom_hz = 1\nto_hz = 2"));
    assert_eq!(
        said("beyond_half_rate = 'leave_out'"),
        "spec.toml:1:20: beyond_half_rate can't be \"leave_out\"; \
         did you mean \"leave-out\"? (one of error, leave-out)"
    );
    assert_eq!(
        said("[output]\nencoding = 'mp3'"),
        "spec.toml:2:12: encoding can't be \"mp3\"; choose one of same, pcm16, pcm24, pcm32, float32, float64"
    );
    for (key, written, meant) in [
        ("encoding", "16", "pcm16"),
        ("encoding", "'24-bit'", "pcm24"),
        ("encoding", "'PCM_16'", "pcm16"),
        ("encoding", "'float'", "float32"),
        ("encoding", "'pmc32'", "pcm32"),
        ("dither", "false", "none"),
        ("dither", "'TPDF'", "triangular"),
        ("overload", "'saturate'", "clip"),
        ("overload", "'normalize'", "scale"),
    ] {
        let said = said(&format!("[output]\n{key} = {written}"));
        assert!(said.contains(&format!("did you mean \"{meant}\"?")), "{key} = {written}: {said}");
    }
    for (written, meant) in [("'acoustics'", "acoustic"), ("'sound'", "acoustic"), ("'Header'", "header")] {
        let said = refused(&format!("rate = {written}\n[[stage]]\nkind = 'notch'\ncenter_hz = 1\nq = 3"));
        assert!(said.contains(&format!("did you mean \"{meant}\"?")), "{written}: {said}");
    }
    for (key, written, meant) in [
        ("kind", "low-pass", "lowpass"),
        ("kind", "HP", "highpass"),
        ("kind", "bandreject", "bandstop"),
        ("kind", "noth", "notch"),
    ] {
        let said = refused(&format!("[[stage]]\n{key} = '{written}'"));
        assert!(said.contains(&format!("did you mean \"{meant}\"?")), "{key} = {written}: {said}");
    }
    for (written, meant) in
        [("butter", "butterworth"), ("Chebyshev", "chebyshev1"), ("cheby2", "chebyshev2"), ("eliptic", "elliptic")]
    {
        let said = refused(&format!("{LOWPASS}family = '{written}'\norder = 2\nedge_hz = 3"));
        assert!(said.contains(&format!("did you mean \"{meant}\"?")), "{written}: {said}");
    }
}

#[test]
fn long_texts_are_cut_and_not_compared() {
    let key = "x".repeat(1000);
    let said = refused(&format!("{key} = 1\n[[stage]]\nkind = 'notch'\ncenter_hz = 1\nq = 3"));
    assert_eq!(
        said,
        format!(
            "spec.toml:1:1: unknown key \"{}...\" in the spec; \
             known keys here: title, beyond_half_rate, reference_band, rate, phase, design, auto, output, \
             stage, band",
            "x".repeat(60)
        )
    );
}

#[test]
fn a_key_in_decibels_is_never_meant_to_be_one_in_hertz() {
    for key in ["min_db", "max_db", "span_db", "from_dbfs", "reduce_hz", "level_hz"] {
        assert_eq!(suggested(BAND, key), None, "{key}");
    }
}

#[test]
fn a_key_of_another_meaning_is_not_bent_to_a_known_one() {
    for key in ["phase", "max_sections", "enabled", "rate"] {
        assert_eq!(suggested(LOWPASS, key), None, "{key}");
    }
    for key in ["history", "channels", "numerator", "max_sections"] {
        assert_eq!(suggested("", key), None, "{key}");
    }
}
