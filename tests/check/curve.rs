//! The response as a table for plots.

use bandproof::design::check::CAP_DB;
use bandproof::design::curve::{DEEP_DB, MOST_ROWS, Row, TOLERANCE_DB, curve};
use bandproof::design::{Design, design, response};
use bandproof::spec::{SpecSyntax, parse};

const HUM: &str = "
    beyond_half_rate = \"leave-out\"
    [[stage]]
    kind = \"highpass\"
    family = \"chebyshev1\"
    order = 5
    edge_hz = 20
    ripple_db = 0.2
    [[stage]]
    kind = \"bandstop\"
    family = \"elliptic\"
    order = 4
    center_hz = 50
    width_hz = 1.1
    harmonics = 3
    ripple_db = 0.1
    stop_db = 60
    [[stage]]
    kind = \"notch\"
    center_hz = 15800
    q = 200
    [[band]]
    name = \"hum\"
    center_hz = 50
    span_hz = 0.3
    harmonics = 3
    reduce_db = 40
    [[band]]
    name = \"calls\"
    from_hz = 45.5
    to_hz = 6000
    keep_db = 0.5
    except = [\"hum\"]
    [[band]]
    name = \"whine\"
    from_hz = 15790
    to_hz = 15810
    residual_dbfs = -90
    [[band]]
    name = \"all\"
    from_hz = 60
    to_hz = 15000
    keep_db = 3.25
    except = [\"hum\"]
";

fn designed(toml: &str, rate_hz: u32) -> Design {
    design(&parse(toml.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap(), rate_hz).unwrap()
}

/// Frequencies from 0 to half the rate, half of them evenly spaced in their logarithm.
fn anywhere(rate_hz: f64) -> impl Iterator<Item = f64> {
    (0..20_000).map(move |i| {
        let part = (f64::from(i) * 0.618_033_988_749_894_9).fract();
        rate_hz / 2.0 * if i % 2 == 0 { part } else { libm::pow(1e-5, part) }
    })
}

fn interpolated(rows: &[Row<'_>], hz: f64) -> f64 {
    let above = rows.partition_point(|row| row.frequency_hz < hz).max(1);
    let (a, b) = (&rows[above - 1], &rows[above]);
    if b.frequency_hz == a.frequency_hz {
        return b.gain_db;
    }
    a.gain_db + (hz - a.frequency_hz) / (b.frequency_hz - a.frequency_hz) * (b.gain_db - a.gain_db)
}

/// Half the tolerance is kept at the quarters of each step, which leaves as much for what
/// the gain does between them.
#[test]
fn a_line_through_the_rows_is_the_gain() {
    for (rate_hz, passes) in [(48_000, 1), (48_000, 2), (384_000, 1), (22_050, 1)] {
        let design = Design { passes, ..designed(HUM, rate_hz) };
        let (rows, net) = (curve(&design), design.net_sections());
        assert!(rows.len() < 20_000, "{} rows", rows.len());
        let (mut seen, mut worst) = (0, 0.0);
        for hz in anywhere(f64::from(rate_hz)) {
            let exact_db = response::gain_db(&net, hz, f64::from(rate_hz));
            if exact_db > DEEP_DB {
                let off_db = (interpolated(&rows, hz) - exact_db).abs();
                assert!(off_db <= TOLERANCE_DB, "{off_db} dB off at {hz} Hz and {rate_hz} Hz");
                worst = f64::max(worst, off_db);
                seen += 1;
            }
        }
        println!("{} rows at {rate_hz} Hz, worst {worst} dB of {seen}", rows.len());
        // Within a tenth of the high-pass's edge it is deeper.
        assert!(seen > 16_000);
    }
}

#[test]
fn every_edge_has_a_row_and_rows_rise_from_0_hz_to_half_the_rate() {
    let design = designed(HUM, 48_000);
    let rows = curve(&design);
    assert_eq!((rows[0].frequency_hz, rows[rows.len() - 1].frequency_hz), (0.0, 24_000.0));
    assert!(rows.windows(2).all(|pair| pair[0].frequency_hz <= pair[1].frequency_hz));
    assert!(rows.windows(3).all(|three| three[0].frequency_hz < three[2].frequency_hz), "twice at most");
    let at = |hz: f64| rows.iter().filter(|row| row.frequency_hz == hz).collect::<Vec<_>>();
    for hz in design.stages.iter().flat_map(|stage| &stage.placed.edges_hz) {
        assert!(!at(*hz).is_empty(), "{hz} Hz");
    }
    for band in &design.bands {
        for hz in
            band.excepted_hz.iter().flat_map(|&(a, b)| [a, b]).chain([band.band.line.from_hz, band.band.line.to_hz])
        {
            let here = at(hz);
            assert!(here.len() == 2, "{hz} Hz: {here:?}");
        }
    }
}

/// `[frequency, low, high]` and the bands of the rows at the edges of some.
#[test]
fn limits_change_between_the_two_rows_of_an_edge() {
    let design = designed(HUM, 48_000);
    let rows = curve(&design);
    let at = |hz: f64| -> Vec<(Option<f64>, Option<f64>, String)> {
        let here = rows.iter().filter(|row| row.frequency_hz == hz);
        here.map(|row| (row.limit_low_db, row.limit_high_db, row.bands.join("+"))).collect()
    };
    let some = |low: f64, high: f64, bands: &str| (Some(low), Some(high), bands.to_owned());
    let none = |bands: &str| (None, None, bands.to_owned());
    assert_eq!(at(45.5), [none(""), some(-0.5, 0.5, "calls")]);
    assert_eq!(at(60.0), [some(-0.5, 0.5, "calls"), some(-0.5, 0.5, "calls+all")]);
    assert_eq!(at(6_000.0), [some(-0.5, 0.5, "calls+all"), some(-3.25, 3.25, "all")]);
    let reduce = |bands: &str| (None, Some(-40.0), bands.to_owned());
    let [low, high] = [99.85, 100.15].map(at);
    assert_eq!((low, high), (vec![none(""), reduce("hum x2")], vec![reduce("hum x2"), none("")]));
    assert_eq!(at(15_790.0)[1], none("whine"), "a level is no limit of a gain");
    // Where the exceptions of a keep band begin and end.
    let calls = design.bands.iter().find(|band| band.band.name == "calls").unwrap();
    let (from_hz, _) = calls.excepted_hz[1];
    assert_eq!(at(from_hz), [some(-0.5, 0.5, "calls+all"), some(-3.25, 3.25, "all")]);
}

#[test]
fn figures_are_those_of_the_response() {
    let design = designed(HUM, 48_000);
    let mut zeros = 0;
    for row in curve(&design) {
        let (hz, sections) = (row.frequency_hz, &design.sections);
        let gain_db = response::gain_db(sections, hz, 48_000.0);
        assert_eq!(row.group_delay_s, response::group_delay_s(sections, hz, 48_000.0));
        match row.phase_deg {
            Some(deg) => {
                assert_eq!(row.gain_db, gain_db.max(-CAP_DB));
                assert_eq!(deg, response::phase_rad(sections, hz, 48_000.0).to_degrees());
            }
            None => {
                // The zero itself lies between two f64.
                assert!(row.gain_db == -CAP_DB && gain_db < -140.0, "{row:?}: {gain_db}");
                zeros += 1;
            }
        }
    }
    // 0 Hz, four of each line, the notch; the two rows of an edge do not fall on any.
    assert_eq!(zeros, 1 + 3 * 4 + 1);
}

#[test]
fn both_ways_there_is_twice_the_gain_and_no_phase() {
    let once = designed(HUM, 48_000);
    let twice = Design { passes: 2, ..once.clone() };
    for row in curve(&twice) {
        let gain_db = response::gain_db(&once.sections, row.frequency_hz, 48_000.0);
        assert!((row.gain_db - (2.0 * gain_db).max(-CAP_DB)).abs() < 1e-9 || row.phase_deg.is_none());
        assert!(row.phase_deg.is_none_or(|deg| deg == 0.0) && row.group_delay_s == 0.0);
    }
}

#[test]
fn without_stages_it_is_a_flat_line() {
    let design = designed("[[band]]\nname = \"all\"\nfrom_hz = 10\nto_hz = 4000\nkeep_db = 1", 8_000);
    let rows = curve(&design);
    assert!(rows.iter().all(|row| row.gain_db == 0.0 && row.phase_deg == Some(0.0) && row.group_delay_s == 0.0));
    assert_eq!((design.rounding_db, design.rounding_at_hz), (0.0, 0.0));
}

#[test]
fn the_number_of_rows_is_bounded() {
    let row = "[[stage]]\nkind = \"bandstop\"\nfamily = \"elliptic\"\norder = 8\ncenter_hz = 50\nwidth_hz = 2\n\
               harmonics = 60\nripple_db = 0.01\nstop_db = 100";
    let rows = curve(&designed(row, 48_000)).len();
    assert!(rows > 10_000 && rows <= MOST_ROWS, "{rows}");
}

/// Two passes double what rounding does, and sections that a user gives have a bound.
#[test]
fn rounding_is_told_for_the_whole_design() {
    let design = designed(HUM, 48_000);
    assert!(design.rounding_db > 1e-12 && design.rounding_db < 1e-6, "{}", design.rounding_db);
    let low = "[[stage]]\nkind = \"lowpass\"\nfamily = \"elliptic\"\norder = 14\nedge_hz = 20\nripple_db = 3\n\
               stop_db = 20";
    let design = designed(low, 48_000);
    assert!(design.rounding_db > 1e-5 && (design.rounding_at_hz - 20.0).abs() < 0.1, "{design:?}");
}
