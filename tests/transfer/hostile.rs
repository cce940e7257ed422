//! Any values built by hand: an error or a filter, never a panic.

use crate::support::{analog, digital, exact, polynomials, root};
use bandproof::design::recipe::Recipe;
use bandproof::design::transfer::{self, Context, TransferError};
use bandproof::design::{self, DesignError};
use bandproof::export::{ExportError, Form, Request, export};
use bandproof::section::Section;
use bandproof::spec::{
    self, AnalogStage, Coefficient, DigitalFilter, DigitalStage, Root, RootUnit, Spec, SpecFile, SpecSyntax, Stage,
    Transfer, WrittenSection,
};
use proptest::prelude::*;

const RATE: f64 = 48_000.0;

fn value() -> impl Strategy<Value = f64> {
    prop_oneof![
        6 => -3.0..3.0f64,
        2 => Just(0.0),
        1 => Just(1.0),
        1 => any::<f64>(),
        1 => (-300i32..300, -1.0..1.0f64).prop_map(|(power, x)| x * 10f64.powi(power)),
    ]
}

fn number() -> impl Strategy<Value = Coefficient> {
    let unit = prop_oneof![3 => Just(0.0), 3 => (-12i32..2).prop_map(|power| 10f64.powi(power)), 1 => any::<f64>()];
    (value(), unit).prop_map(|(value, unit)| Coefficient { value, unit })
}

fn numbers() -> impl Strategy<Value = Vec<Coefficient>> {
    prop_oneof![4 => prop::collection::vec(number(), 0..6), 1 => prop::collection::vec(number(), 0..66)]
}

fn any_roots() -> impl Strategy<Value = Vec<Root>> {
    let pair = (number(), number(), any::<bool>()).prop_map(|(re, im, conjugate)| {
        let mirrored = Root { re, im: Coefficient { value: -im.value, ..im } };
        if conjugate { vec![Root { re, im }, mirrored] } else { vec![Root { re, im: exact(0.0) }] }
    });
    prop::collection::vec(pair, 0..6).prop_map(|pairs| pairs.concat())
}

fn any_transfer() -> impl Strategy<Value = Transfer> {
    prop_oneof![
        (numbers(), numbers()).prop_map(|(numerator, denominator)| polynomials(numerator, denominator)),
        (any_roots(), any_roots(), number()).prop_map(|(zeros, poles, gain)| Transfer::Roots { zeros, poles, gain }),
    ]
}

fn any_digital() -> impl Strategy<Value = DigitalFilter> {
    let three = || [number(), number(), number()];
    let section = (three(), three()).prop_map(|(b, a)| WrittenSection { b, a });
    prop_oneof![
        3 => any_transfer().prop_map(DigitalFilter::Transfer),
        1 => prop::collection::vec(section, 0..4).prop_map(DigitalFilter::Sections),
    ]
}

fn sane(made: Result<Vec<Section>, TransferError>, recipe: Recipe) {
    match made {
        Err(error) => assert!(!error.to_string().is_empty()),
        Ok(own) => {
            assert!(!own.is_empty() && own.iter().all(|s| s.a[0] == 1.0));
            assert!(own.iter().flat_map(|s| s.b.iter().chain(&s.a)).all(|c| c.is_finite()));
            let context = Context { own: &own, others: [&[], &[]], bands: &[], rate_hz: RATE };
            assert!(transfer::remarks(&recipe, context).iter().all(|remark| !remark.contains("NaN")));
        }
    }
}

/// A cascade of the stages in z, and nothing else.
fn cascade(stages: Vec<DigitalFilter>) -> Spec {
    let mut spec = spec::parse(PLAIN.as_bytes(), SpecSyntax::Toml, "test.toml").unwrap();
    spec.stages = stages.into_iter().map(|filter| Stage::Digital(DigitalStage { filter, rate_hz: None })).collect();
    spec
}

/// Replaced by what is tested.
const PLAIN: &str = "[[stage]]\nkind = 'notch'\ncenter_hz = 50\nwidth_hz = 5\n";

/// Designed and in integers, or refused.
fn refused(spec: Spec) -> Option<DesignError> {
    let refused = design::design(&spec, 48_000).err();
    let spec = SpecFile { spec, file_sha256: "0".repeat(64) };
    let request =
        Request { spec: &spec, file_name: "test.toml", rate_hz: 48_000, form: Form::Fixed, digits: None, bits: None };
    match (export(&request), &refused) {
        (Ok(exported), None) => assert!(!exported.text.contains("NaN") && !exported.text.contains("inf")),
        (Err(ExportError::NoWordLength { .. }), None) | (Err(ExportError::Design(_)), Some(_)) => {}
        (other, refused) => panic!("{other:?}, and the design was refused with {refused:?}"),
    }
    refused
}

fn written(b: [f64; 3], a: [f64; 3]) -> WrittenSection {
    WrittenSection { b: b.map(exact), a: a.map(exact) }
}

/// 1e200 (1 - z^-1) twice has a gain of 0 at rest, and overflows everywhere else.
#[test]
fn a_gain_that_overflows_beside_0_hz_is_refused() {
    let difference = || written([1e200, -1e200, 0.0], [1.0, 0.0, 0.0]);
    let both = cascade(vec![DigitalFilter::Sections(vec![difference(), difference()])]);
    let error = refused(both).unwrap();
    // 20 log10(2e200), at half the rate.
    assert_eq!(
        error.to_string(),
        "stage 1 (digital): at a sample rate of 48000 Hz it has a gain of 4006 dB at 24000 Hz, and more than 1000 dB may \
         overflow; lower its gain"
    );
    // A numerator of which four times the first coefficient is no f64.
    let largest = cascade(vec![DigitalFilter::Sections(vec![written([8e307, -1.6e308, 8e307], [1.0, 0.0, 0.0])])]);
    assert!(matches!(refused(largest), Some(DesignError::Gain { together: false, .. })));
}

/// 199 dB each: six stages are one too many.
#[test]
fn stages_that_overflow_together_are_refused_at_the_first_that_is_too_much() {
    let gain = || DigitalFilter::Sections(vec![written([8.9e9, 0.0, 0.0], [1.0, 0.0, 0.0])]);
    assert!(refused(cascade((0..5).map(|_| gain()).collect())).is_none());
    let error = refused(cascade((0..100).map(|_| gain()).collect())).unwrap();
    assert!(matches!(error, DesignError::Gain { together: true, .. }));
    assert!(error.to_string().starts_with("stage 6 (digital): "), "{error}");
    assert!(error.to_string().contains(" it and the stages before it have a gain of 1194 dB "), "{error}");
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(100))]

    #[test]
    fn any_digital_stages_are_designed_and_exported_or_refused(stages in prop::collection::vec(any_digital(), 1..4)) {
        refused(cascade(stages));
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(400))]

    #[test]
    fn any_digital_stage_is_a_filter_or_refused(stage in any_digital()) {
        sane(transfer::digital(&stage, RATE), Recipe::Digital(stage));
    }

    #[test]
    fn any_analog_stage_is_a_filter_or_refused(
        transfer in any_transfer(),
        hertz in any::<bool>(),
        match_hz in prop::option::of(value()),
    ) {
        let unit = if hertz { RootUnit::Hertz } else { RootUnit::RadiansPerSecond };
        let stage = AnalogStage { unit, ..analog(transfer, match_hz) };
        sane(transfer::analog(&stage, RATE), Recipe::Analog(stage));
    }
}

/// Multiple poles and zeros, on top of one another to the last digit, of any count.
#[test]
fn multiple_roots_are_taken_apart() {
    for count in 1..=12 {
        let power = |c: [f64; 3]| (0..count).fold(vec![1.0], |product, _| crate::support::times(&product, &c));
        // Exact in f64: (1 + z^-1/2 + z^-2/4)^count over (1 - z^-2/4)^count.
        if count <= 8 {
            let sections = transfer::digital(&digital(&power([1.0, 0.5, 0.25]), &power([1.0, 0.0, -0.25])), RATE);
            assert_eq!(sections.unwrap().len(), count);
        }
        let sections = transfer::digital(&digital(&power([1.0, 2.0, 1.0]), &[1.0]), RATE).unwrap();
        assert!(sections.iter().all(|s| s.b[0] == s.b[2] && s.b[1] == 2.0 * s.b[0]), "{sections:?}");
    }
    let poles = vec![root(0.5, 0.25), root(0.5, 0.25), root(0.5, -0.25), root(0.5, -0.25)];
    let stage = DigitalFilter::Transfer(Transfer::Roots { zeros: vec![], poles, gain: exact(1.0) });
    assert_eq!(transfer::digital(&stage, RATE).unwrap().len(), 2);
}
