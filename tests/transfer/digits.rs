//! What is said of digits holds when coefficients are really rounded.

use crate::support::{assert_within, decimals, designed, exact, expand, frequencies, polynomials, significant};
use bandproof::design::recipe::Recipe;
use bandproof::design::{self, Check, Design, DesignError, response};
use bandproof::section::Section;
use bandproof::spec::{self, Coefficient, DigitalFilter, DigitalStage, SpecSyntax, Stage};

const RATE_HZ: u32 = 48_000;
const RATE: f64 = 48_000.0;

/// Stages whose polynomials some digits hold.
const STAGES: [&str; 8] = [
    "kind = \"lowpass\"\nfamily = \"butterworth\"\norder = 4\nedge_hz = 6000",
    "kind = \"highpass\"\nfamily = \"butterworth\"\norder = 3\nedge_hz = 400",
    "kind = \"lowpass\"\nfamily = \"chebyshev1\"\norder = 5\nedge_hz = 3000\nripple_db = 0.5",
    "kind = \"lowpass\"\nfamily = \"elliptic\"\norder = 4\nedge_hz = 5000\nripple_db = 0.1\nstop_db = 50",
    "kind = \"bandpass\"\nfamily = \"butterworth\"\norder = 2\nedges_hz = [2000, 6000]",
    "kind = \"bandstop\"\nfamily = \"chebyshev2\"\norder = 2\nedges_hz = [3000, 5000]\nstop_db = 40",
    "kind = \"notch\"\ncenter_hz = 1000\nwidth_hz = 100",
    "kind = \"highpass\"\nfamily = \"bessel\"\norder = 6\nedge_hz = 4000",
];

fn whole_is_exact(given: Vec<Coefficient>) -> Vec<Coefficient> {
    given.into_iter().map(|c| if c.value.fract() == 0.0 { exact(c.value) } else { c }).collect()
}

#[test]
fn a_response_read_back_from_rounded_polynomials_stays_within_the_bounds() {
    for stage in STAGES {
        let sections = designed(&format!("[[stage]]\n{stage}\n"), RATE_HZ).sections;
        let (b, a) = expand(&sections);
        for digits in 3..=11 {
            for (b, a) in
                [(decimals(&b, digits), decimals(&a, digits)), (significant(&b, digits), significant(&a, digits))]
            {
                let recipe = Recipe::Digital(DigitalFilter::Transfer(polynomials(b, whole_is_exact(a))));
                for hz in frequencies(RATE) {
                    assert_within(
                        &recipe,
                        hz,
                        RATE,
                        response::gain_db(&sections, hz, RATE),
                        &format!("{stage}, {digits}"),
                    );
                }
            }
        }
    }
}

/// A spec with bands, and a stage in place of those written.
fn with(bands: &str, stage: DigitalFilter) -> Result<Design, DesignError> {
    let any = "[[band]]\nname = \"any\"\nfrom_hz = 1\nto_hz = 2\n";
    let text = if bands.is_empty() { any } else { bands };
    let mut spec = spec::parse(text.as_bytes(), SpecSyntax::Toml, "test.toml").unwrap();
    if bands.is_empty() {
        spec.bands.clear();
    }
    spec.stages = vec![Stage::Digital(DigitalStage { filter: stage, rate_hz: None })];
    design::design(&spec, RATE_HZ)
}

/// Bands that the stage of the same place among [`STAGES`] holds with little to spare.
const BANDS: [&str; 8] = [
    "[[band]]\nname = \"keep\"\nfrom_hz = 0\nto_hz = 4000\nkeep_db = 0.2\n[[band]]\nname = \"low\"\nfrom_hz = 14000\nto_hz = 20000\nreduce_db = 39\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 1000\nto_hz = 20000\nkeep_db = 0.1\n[[band]]\nname = \"low\"\nfrom_hz = 1\nto_hz = 100\nreduce_db = 35\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 0\nto_hz = 3000\nkeep_db = 0.51\n[[band]]\nname = \"low\"\nfrom_hz = 6000\nto_hz = 20000\nreduce_db = 44\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 0\nto_hz = 5000\nkeep_db = 0.12\n[[band]]\nname = \"low\"\nfrom_hz = 13000\nto_hz = 23000\nreduce_db = 49.9\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 3000\nto_hz = 4000\nkeep_db = 0.1\n[[band]]\nname = \"low\"\nfrom_hz = 100\nto_hz = 600\nreduce_db = 27\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 0\nto_hz = 1500\nkeep_db = 9.9\n[[band]]\nname = \"low\"\nfrom_hz = 3000\nto_hz = 5000\nreduce_db = 39.9\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 0\nto_hz = 700\nkeep_db = 0.2\n[[band]]\nname = \"low\"\nfrom_hz = 999\nto_hz = 1001\nreduce_db = 30\n",
    "[[band]]\nname = \"keep\"\nfrom_hz = 12000\nto_hz = 20000\nkeep_db = 0.5\n[[band]]\nname = \"low\"\nfrom_hz = 1\nto_hz = 800\nreduce_db = 50\n",
];

fn told(design: &Design) -> Option<&String> {
    design.stages[0].remarks.iter().find(|remark| remark.starts_with("coefficients are given to"))
}

/// From `start` decimals on the remark names the digits that hold every requirement: rounded
/// to them, every requirement is guaranteed and nothing is at risk; with one fewer it is.
#[test]
fn the_digits_that_are_named_hold_and_one_fewer_does_not() {
    let mut named = 0;
    for (stage, bands) in STAGES.into_iter().zip(BANDS) {
        let whole = designed(&format!("[[stage]]\n{stage}\n{bands}"), RATE_HZ);
        assert!(whole.bands.iter().all(|band| band.check == Some(Check::Guaranteed)), "{stage}: {:?}", whole.bands);
        let (b, a) = expand(&whole.sections);
        let at = |places: usize| {
            with(
                bands,
                DigitalFilter::Transfer(polynomials(
                    whole_is_exact(decimals(&b, places)),
                    whole_is_exact(decimals(&a, places)),
                )),
            )
        };
        for start in 3..=6 {
            // What fails as it stands is told by an error or the check.
            let Ok(design) = at(start) else { continue };
            if design.bands.iter().any(|band| band.check != Some(Check::Guaranteed)) {
                continue;
            }
            let Some(remark) = told(&design).filter(|remark| remark.contains("may fail")) else { continue };
            assert!(remark.starts_with(&format!("coefficients are given to {start} decimals: in \"")), "{remark}");
            let (before, _) =
                remark.split_once(" decimals would hold every requirement").unwrap_or_else(|| panic!("{remark}"));
            let enough: usize = before.rsplit(' ').next().unwrap().parse().unwrap();
            let holding = at(enough).unwrap();
            assert!(holding.bands.iter().all(|band| band.check == Some(Check::Guaranteed)), "{stage}: {remark}");
            assert!(
                !told(&holding).is_some_and(|remark| remark.contains("may fail")),
                "{stage}: {remark}\n{holding:#?}"
            );
            let fewer = at(enough - 1).unwrap();
            let fails = fewer.bands.iter().any(|band| band.check != Some(Check::Guaranteed));
            assert!(fails || told(&fewer).is_some_and(|remark| remark.contains("may fail")), "{stage}: {remark}");
            named += 1;
        }
    }
    println!("{named} remarks");
    assert!(named >= 8);
}

#[test]
fn a_remark_names_band_figure_frequency_and_digits() {
    let (b, a) = expand(&designed(&format!("[[stage]]\n{}\n", STAGES[1]), RATE_HZ).sections);
    let stage = DigitalFilter::Transfer(polynomials(decimals(&b, 5), whole_is_exact(decimals(&a, 5))));
    let design = with(BANDS[1], stage.clone()).unwrap();
    let remark = told(&design).unwrap();
    assert!(
        remark.starts_with(
            "coefficients are given to 5 decimals: in \"keep\" (1000 to 20000 Hz) the response may be off by up to "
        ),
        "{remark}"
    );
    assert!(remark.contains(" dB (at ") && remark.ends_with(" decimals would hold every requirement"), "{remark}");
    // Without bands the whole range is looked at.
    let design = with("", stage).unwrap();
    let remark = told(&design).unwrap();
    assert!(
        remark.contains("within 60 dB of the largest") && remark.ends_with("decimals would bring that below 0.01 dB"),
        "{remark}"
    );
    // Digits to spare are no matter.
    let stage = DigitalFilter::Transfer(polynomials(significant(&b, 15), whole_is_exact(significant(&a, 15))));
    assert_eq!(told(&with(BANDS[1], stage).unwrap()), None);
}

/// 0.9 z^-1 for 0.904 z^-1: the band is missed as written, and the digits are why.
#[test]
fn digits_that_may_be_why_a_requirement_fails_are_told() {
    let exact_pole = DigitalFilter::Transfer(polynomials(
        decimals(&[0.096], 3),
        vec![exact(1.0), Coefficient { value: -0.904, unit: 1e-3 }],
    ));
    let bands = "[[band]]\nname = \"hum\"\nfrom_hz = 0\nto_hz = 100\nkeep_db = 0.1\n";
    assert_eq!(with(bands, exact_pole).unwrap().bands[0].check, Some(Check::Guaranteed));
    let short = DigitalFilter::Transfer(polynomials(
        decimals(&[0.096], 3),
        vec![exact(1.0), Coefficient { value: -0.9, unit: 0.1 }],
    ));
    let design = with(bands, short).unwrap();
    assert_eq!(design.bands[0].check, Some(Check::Impossible));
    let remark = told(&design).unwrap();
    assert!(
        remark.contains(
            "(0 to 100 Hz) the response may be off by up to 6.1 dB (at 0 Hz), which may be why what it requires fails; more digits would tell"
        ),
        "{remark}"
    );
}

/// A pole pair so near the circle at so low a frequency that section coefficients in f64 move it.
#[test]
fn what_f64_can_not_hold_is_told() {
    let toml = "[[stage]]\nkind = \"analog\"\npoles_hz = [[-0.002, 0.3], [-0.002, -0.3]]\nzeros_hz = []\ngain = 0.09\n";
    let remarks = designed(toml, 384_000).stages[0].remarks.clone();
    assert!(
        remarks
            .iter()
            .any(|remark| remark.starts_with("section coefficients in f64 miss the response as written by up to ")),
        "{remarks:?}"
    );
    let toml = toml.replace("0.3", "300.5").replace("0.002", "5.5").replace("0.09", "90000");
    let remarks = designed(&toml, 384_000).stages[0].remarks.clone();
    assert!(!remarks.iter().any(|remark| remark.starts_with("section coefficients")), "{remarks:?}");
}

/// A low-pass to two decimals, and what it takes off a band at the upper end.
fn short_low_pass(reduce_db: f64) -> Design {
    let bands = format!("[[band]]\nname = \"whine\"\nfrom_hz = 20000\nto_hz = 24000\nreduce_db = {reduce_db}\n");
    with(&bands, DigitalFilter::Transfer(polynomials(decimals(&SHORT_B, 2), whole_is_exact(decimals(&SHORT_A, 2)))))
        .unwrap()
}

const SHORT_B: [f64; 2] = [0.25, 0.25];
const SHORT_A: [f64; 2] = [1.0, -0.51];

/// The largest gain from 20 to 24 kHz of coefficients that are off by parts of half a unit.
fn moved_db(parts: [f64; 3]) -> f64 {
    let off = |value: f64, part: f64| value + 0.005 * part;
    let b = [off(SHORT_B[0], parts[0]), off(SHORT_B[1], parts[1]), 0.0];
    let sections = [Section { b, a: [1.0, off(SHORT_A[1], parts[2]), 0.0] }];
    let hz = (0..=400).map(|i| 20_000.0 + 10.0 * f64::from(i));
    hz.map(|hz| response::gain_db(&sections, hz, RATE)).fold(f64::NEG_INFINITY, f64::max)
}

#[test]
fn where_digits_put_nothing_at_risk_all_that_round_to_them_hold() {
    let holding = short_low_pass(20.0);
    assert_eq!(holding.bands[0].check, Some(Check::Guaranteed));
    assert_eq!(
        told(&holding).unwrap(),
        "coefficients are given to 2 decimals: every requirement that holds as written holds for all coefficients that \
         round to these"
    );
    // Corners, and points inside: steps that have no common multiple fill the cube.
    let corners = (0..8).map(|k| [0, 1, 2].map(|bit| if k >> bit & 1 == 0 { -1.0 } else { 1.0 }));
    let inside =
        (1..2000).map(|k| [0.618_034, 0.414_214, 0.732_051].map(|step| (f64::from(k) * step).fract() * 2.0 - 1.0));
    let largest = corners.chain(inside).map(moved_db).fold(f64::NEG_INFINITY, f64::max);
    assert!(largest <= -20.0, "{largest} dB");
    assert!(largest > moved_db([0.0; 3]) + 0.1, "{largest} dB");
    // With less to spare than that there is no such promise.
    let failing = short_low_pass(-0.5 * (largest + moved_db([0.0; 3])));
    assert_eq!(failing.bands[0].check, Some(Check::Guaranteed));
    let remark = told(&failing).unwrap();
    assert!(remark.contains("what it requires may fail") && !remark.contains("round to these"), "{remark}");
}

/// Poles that may lie outside the circle far from every band: nothing is promised of it.
#[test]
fn digits_that_leave_stability_open_promise_no_requirement() {
    let bands = "[[band]]\nname = \"whine\"\nfrom_hz = 20000\nto_hz = 24000\nreduce_db = 10\n";
    let stage = polynomials(decimals(&[0.05, 0.05], 2), vec![exact(1.0), Coefficient { value: -0.996, unit: 1e-2 }]);
    let design = with(bands, DigitalFilter::Transfer(stage)).unwrap();
    let remarks = &design.stages[0].remarks;
    assert!(remarks.iter().any(|remark| remark.contains("could move a pole")), "{remarks:?}");
    assert!(!remarks.iter().any(|remark| remark.contains("round to these")), "{remarks:?}");
}
