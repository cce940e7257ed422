//! The sentence for a methods section, as people will paste it.

use crate::methods::{designed, of_file};
use bandproof::design::Design;
use bandproof::report::Methods;

fn sentence(design: &Design, dither: &str) -> String {
    Methods::new(design, Some(dither)).unwrap().sentence
}

/// The sentences of `sentences.txt`, one a paragraph under a line with its name.
fn expected(name: &str) -> String {
    let all = include_str!("sentences.txt").replace("\r\n", "\n");
    let (_, rest) = all.split_once(&format!("# {name}\n")).unwrap_or_else(|| panic!("no sentence for {name}"));
    rest.split("\n\n").next().unwrap().trim_end().replace('\n', " ")
}

fn check(name: &str, design: &Design, dither: &str) {
    let found = sentence(design, dither);
    let program = format!("bandproof {}", env!("CARGO_PKG_VERSION"));
    assert_eq!(found.replace(&program, "bandproof VERSION"), expected(name), "{name}");
}

#[test]
fn the_specs_that_come_along_read_like_this() {
    for (name, rate_hz, dither) in [
        ("reed-bed", 48_000, "triangular-1"),
        ("converter-whine", 44_100, "triangular-1"),
        ("notch-997", 96_000, "none"),
        ("third-octave", 48_000, "triangular-1"),
    ] {
        check(name, &of_file(&format!("filter-specs/{name}.toml"), rate_hz), dither);
    }
}

const LOWPASS: &str =
    "[[stage]]\nkind = \"lowpass\"\nfamily = \"chebyshev1\"\norder = 1\nedge_hz = 3000\nripple_db = 0.5\n";
const STOP: &str = "[[stage]]\nkind = \"highpass\"\nfamily = \"chebyshev2\"\norder = 6\nedge_hz = 60\nstop_db = 50\n";
const ROW: &str = "[[stage]]\nkind = \"notch\"\ncenter_hz = 60\nq = 30\nharmonics = 5\n";
const WIDE_ROW: &str = "[[stage]]\nkind = \"notch\"\ncenter_hz = 100\nwidth_hz = 2.5\nharmonics = 3\n";
const Q_ROW: &str =
    "[[stage]]\nkind = \"bandstop\"\nfamily = \"bessel\"\norder = 2\ncenter_hz = 60\nq = 20\nharmonics = 4\n";
const HUM: &str = "[[band]]\nname = \"hum\"\ncenter_hz = 60\nspan_hz = 0.1\nharmonics = 4\nreduce_db = 20\n";
const SEEN: &str = "[[band]]\nname = \"voices\"\nfrom_hz = 300\nto_hz = 2000\n";

#[test]
fn a_first_order_stage_without_bands() {
    check("one first-order section", &designed(LOWPASS, 22_050), "none");
}

#[test]
fn rows_with_a_quality_or_a_width() {
    check("rows", &designed(&[ROW, WIDE_ROW, HUM, SEEN].concat(), 48_000), "triangular-1");
    check("a row of stops", &designed(&[Q_ROW, HUM].concat(), 11_025), "none");
}

#[test]
fn many_stages_of_all_sorts() {
    let spec = [STOP, LOWPASS, LOWPASS, LOWPASS, ROW, SEEN].concat();
    check("many", &designed(&spec, 48_000), "triangular-1");
}

/// Of five lines two fit below 150 Hz, then one, and a row of one is no row.
#[test]
fn a_row_of_which_little_is_left() {
    check("two lines left", &designed(ROW, 300), "none");
    check("one line left", &designed(ROW, 200), "none");
}

#[test]
fn a_row_of_bands_that_are_kept() {
    let rows = "[[band]]\nname = \"partials\"\ncenter_hz = 500\nspan_hz = 10\nharmonics = 3\nkeep_db = 3\n";
    check("kept rows", &designed(&[LOWPASS, rows].concat(), 48_000), "none");
}

/// Of every kind, each of another family.
#[test]
fn orders_that_follow_from_limits() {
    let limits = |kind: &str, family: &str, edges: &str| {
        format!("[[stage]]\nkind = \"{kind}\"\nfamily = \"{family}\"\nripple_db = 0.25\nstop_db = 48\n{edges}\n")
    };
    let one_edge = [
        limits("lowpass", "butterworth", "edge_hz = 3000\nstop_edge_hz = 4500"),
        limits("highpass", "bessel", "edge_hz = 60\nstop_edge_hz = 4"),
    ];
    check("limits of one edge", &designed(&one_edge.concat(), 48_000), "none");
    let two_edges = [
        limits("bandpass", "chebyshev2", "edges_hz = [90, 6000]\nstop_edges_hz = [60.5, 9000]"),
        limits("bandstop", "elliptic", "edges_hz = [47, 53]\nstop_edges_hz = [49, 51]"),
    ];
    check("limits of two edges", &designed(&two_edges.concat(), 48_000), "none");
    let moved = limits("bandstop", "elliptic", "edges_hz = [45, 60]\nstop_edges_hz = [49, 51]");
    check("a moved edge", &designed(&moved, 48_000), "none");
}

/// A reduce band that reaches into the pass band, and a keep band with a stop in it.
#[test]
fn bands_that_are_met_in_part() {
    let hum = "[[band]]\nname = \"hum\"\nfrom_hz = 55\nto_hz = 20000\nreduce_db = 50\n";
    let kept = "[[band]]\nname = \"low \\\"voices\\\"\"\nfrom_hz = 40\nto_hz = 90\nkeep_db = 1\nexcept = [\"line\"]\n";
    let line = "[[band]]\nname = \"line\"\nfrom_hz = 59.9\nto_hz = 60.1\nreduce_db = 20\n";
    check("in part", &designed(&[STOP, hum].concat(), 48_000), "none");
    check("excepted", &designed(&[ROW, kept, line].concat(), 48_000), "none");
}

#[test]
fn two_passes_are_told_with_what_their_figures_mean() {
    let spec = ["phase = \"zero\"\n", STOP, ROW, HUM, SEEN].concat();
    let applied = Methods::new(&designed(&spec, 48_000), Some("triangular-1")).unwrap();
    for told in [
        "in two passes, forward and backward (zero phase, not causal; orders are those of one pass, all other figures \
         those of both together), through a Chebyshev type II high-pass of order 6",
        "The filter (total order 16 in 8 second-order sections in each pass) was designed",
        "from the steady state of the first sample of each pass, with the recording continued at both ends by its own \
         samples turned about the first and the last one, and settled within",
        " s of either end; by its exact response it took at least",
        "passed \"voices\" (300 to 2000 Hz) with gains from -180 or less to 0 dB; integer output",
    ] {
        assert!(applied.sentence.contains(told), "{told:?} in {}", applied.sentence);
    }
    assert!(!applied.sentence.contains("delay"), "{}", applied.sentence);
    let found = Methods::new(&designed(&spec, 48_000), None).unwrap();
    let told = "a zero-phase IIR filter, not causal, that runs forward and backward (total order 16 in 8 second-order \
                sections in each pass; orders are those of one pass, all other figures those of both together): a \
                Chebyshev";
    assert!(found.sentence.contains(told), "{told:?} in {}", found.sentence);
    assert_eq!((found.passes, found.direction.as_str(), found.causal), (2, "forward and backward", false));
    assert_eq!((found.phase.as_str(), found.start_state), ("zero", None));
    assert!(applied.start_state.is_some_and(|state| state.contains("odd extension")));
    assert!(applied.bands.iter().all(|band| band.group_delay_s.is_none_or(|s| s.get() == 0.0)));
}

#[test]
fn no_stage_is_no_filter() {
    check("identity", &designed(SEEN, 44_100), "none");
    let left_out = format!("beyond_half_rate = \"leave-out\"\n{LOWPASS}{SEEN}");
    check("left out", &designed(&left_out, 5000), "none");
}

#[test]
fn what_something_else_filtered_was_only_measured() {
    for (name, spec) in [("measured", [STOP, SEEN].concat()), ("measured without stages", SEEN.to_owned())] {
        let found = Methods::new(&designed(&spec, 48_000), None).unwrap().sentence;
        let program = format!("bandproof {}", env!("CARGO_PKG_VERSION"));
        assert_eq!(found.replace(&program, "bandproof VERSION"), expected(name));
    }
}

#[test]
fn every_sentence_ends_once_and_has_no_loose_ends() {
    for spec in [LOWPASS, STOP, ROW, WIDE_ROW, Q_ROW, SEEN, &[STOP, ROW, Q_ROW, HUM, SEEN].concat()] {
        for rate_hz in [11_025, 48_000, 192_000] {
            let text = sentence(&designed(spec, rate_hz), "triangular-1");
            assert!(text.starts_with("Recordings sampled at ") && text.ends_with('.'), "{text}");
            for loose in ["  ", " ,", " ;", ",,", ";;", "..", "()", "NaN", "inf ", " 0 Hz wide", "-0 ", "\n"] {
                assert!(!text.contains(loose), "{loose:?} in {text}");
            }
        }
    }
}
