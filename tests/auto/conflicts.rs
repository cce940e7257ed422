//! Where there is no cascade: what is said, and that it is true.

use bandproof::design::auto::{self, AutoError, Conflict};
use bandproof::spec::{self, Extent, Requirement, Spec, SpecSyntax};

const RATES_HZ: [u32; 1] = [48_000];

fn parse(text: &str) -> Spec {
    spec::parse(text.as_bytes(), SpecSyntax::Toml, "task.toml").unwrap()
}

fn bands(reduce: (f64, f64, f64), keep: (f64, f64, f64), top: &str) -> Spec {
    parse(&format!(
        "design = \"auto\"\n{top}\n\
         [[band]]\nname = \"rumble\"\nfrom_hz = {}\nto_hz = {}\nreduce_db = {}\n\
         [[band]]\nname = \"calls\"\nfrom_hz = {}\nto_hz = {}\nkeep_db = {}\n",
        reduce.0, reduce.1, reduce.2, keep.0, keep.1, keep.2
    ))
}

fn refused(spec: &Spec) -> (Conflict, String) {
    let error = auto::resolve(spec, &RATES_HZ).unwrap_err();
    let sentence = error.to_string();
    let AutoError::Conflict(conflict) = error else { panic!("{sentence}") };
    (*conflict, sentence)
}

fn moved(spec: &Spec, conflict: &Conflict, end_hz: f64) -> Spec {
    let mut spec = spec.clone();
    let keep = spec.bands.iter_mut().find(|band| band.name == conflict.keep).unwrap();
    let Extent::Range { from_hz, to_hz } = &mut keep.extent else { panic!() };
    if conflict.keep_hz.0 >= conflict.line_hz.1 {
        *from_hz = end_hz
    } else {
        *to_hz = end_hz
    }
    spec
}

fn with_reduction(spec: &Spec, conflict: &Conflict, db: f64) -> Spec {
    let mut spec = spec.clone();
    let line = spec.bands.iter_mut().find(|band| band.name == conflict.line).unwrap();
    line.requirement = Requirement::Reduce { reduce_db: db };
    spec
}

/// What is said to be enough is, and four fifths of it are not.
fn check(spec: &Spec) -> String {
    let (conflict, sentence) = refused(spec);
    let (enough_hz, end_hz) = conflict.enough.unwrap_or_else(|| panic!("{sentence}"));
    auto::resolve(&moved(spec, &conflict, end_hz), &RATES_HZ).unwrap_or_else(|error| panic!("{sentence}: {error}"));
    let near_hz = if conflict.keep_hz.0 >= conflict.line_hz.1 { conflict.line_hz.1 } else { conflict.line_hz.0 };
    let short_hz = near_hz + 0.8 * (end_hz - near_hz);
    assert!(auto::resolve(&moved(spec, &conflict, short_hz), &RATES_HZ).is_err(), "{sentence}");
    assert!((enough_hz - (end_hz - near_hz).abs()).abs() < 1e-5, "{sentence}");
    if let Some(db) = conflict.reachable_db {
        auto::resolve(&with_reduction(spec, &conflict, db), &RATES_HZ).unwrap();
        let more_db = db + 0.1 * conflict.reduce_db;
        assert!(auto::resolve(&with_reduction(spec, &conflict, more_db), &RATES_HZ).is_err(), "{sentence}");
    }
    sentence
}

#[test]
fn a_gap_too_narrow_for_a_family_is_told_with_true_figures() {
    let butterworth = "[auto]\nfamily = \"butterworth\"";
    let sentence = check(&bands((0.0, 80.0, 60.0), (100.0, 8000.0, 0.1), butterworth));
    assert!(
        sentence.starts_with(
            "bands \"rumble\" (0 to 80 Hz, down by 60 dB) and \"calls\" (from 100 Hz, within 0.1 dB): within \
             Butterworth filters of order up to 20 the transition takes at least "
        ),
        "{sentence}"
    );
    assert!(sentence.contains("and 20 Hz are there; move \"calls\" up to 1"), "{sentence}");
    assert!(sentence.contains(", or ask for "), "{sentence}");
}

#[test]
fn a_band_above_is_told_from_its_other_end() {
    let butterworth = "[auto]\nfamily = \"butterworth\"";
    let sentence = check(&bands((9500.0, 12_000.0, 60.0), (100.0, 9000.0, 0.1), butterworth));
    assert!(sentence.contains("(up to 9000 Hz, within 0.1 dB)"), "{sentence}");
    assert!(sentence.contains("move \"calls\" down to "), "{sentence}");
}

#[test]
fn bands_that_touch_leave_no_room() {
    let sentence = check(&bands((0.0, 100.0, 40.0), (100.0, 8000.0, 0.5), ""));
    assert!(sentence.contains("within orders up to 14") && sentence.contains("0 Hz are there"), "{sentence}");
}

#[test]
fn a_line_in_a_band_that_does_not_except_it_is_told() {
    let mut spec = bands((0.0, 50.0, 40.0), (100.0, 8000.0, 0.5), "");
    // No spec file gets this far.
    spec.bands[0].extent = Extent::Range { from_hz: 90.0, to_hz: 120.0 };
    let sentence = auto::resolve(&spec, &RATES_HZ).unwrap_err().to_string();
    assert!(
        sentence.starts_with("bands \"rumble\" (90 to 120 Hz) and \"calls\" (100 to 8000 Hz) share frequencies"),
        "{sentence}"
    );
}

#[test]
fn an_exception_without_room_is_told() {
    // The gap between the lines is as narrow as a hundredth of their extents.
    let spec = parse(
        "design = \"auto\"\n\
         [[band]]\nname = \"hum\"\ncenter_hz = 100\nspan_hz = 99.9\nharmonics = 4\nreduce_db = 80\n\
         [[band]]\nname = \"calls\"\nfrom_hz = 20\nto_hz = 8000\nkeep_db = 0.1\nexcept = [\"hum\"]\n",
    );
    let sentence = auto::resolve(&spec, &RATES_HZ).unwrap_err().to_string();
    assert!(sentence.contains("\"hum x") && sentence.contains("\"calls\""), "{sentence}");
}

#[test]
fn where_nothing_is_to_be_kept_no_band_is_named_that_nobody_wrote() {
    let spec = parse("design = \"auto\"\n[[band]]\nname = \"all\"\nfrom_hz = 0\nto_hz = 24000\nreduce_db = 40\n");
    let error = auto::resolve(&spec, &RATES_HZ).unwrap_err();
    assert_eq!(
        error.to_string(),
        "band \"all\" (0 to 24000 Hz, down by 40 dB): no band is to be kept, and then all that is farther from each \
         line than 4.5 times its width counts as kept within 3 dB; here nothing is that far, and no filter takes out \
         everything; add a band with keep_db for what must stay, or narrow \"all\""
    );
    // What it says to do helps.
    let kept = "[[band]]\nname = \"low\"\nfrom_hz = 0\nto_hz = 10\nkeep_db = 3\n";
    let narrowed =
        format!("design = \"auto\"\n[[band]]\nname = \"all\"\nfrom_hz = 100\nto_hz = 24000\nreduce_db = 40\n{kept}");
    auto::resolve(&parse(&narrowed), &RATES_HZ).unwrap();
}

#[test]
fn what_can_be_had_beside_nothing_said_can_be_had() {
    let text = |reduce_db: f64| {
        format!(
            "design = \"auto\"\n[auto]\nfamily = \"bessel\"\n\
             [[band]]\nname = \"hum\"\nfrom_hz = 100\nto_hz = 200\nreduce_db = {reduce_db}\n"
        )
    };
    // Up to 650 Hz no Bessel filter falls so far.
    let error = auto::resolve(&parse(&text(170.0)), &RATES_HZ).unwrap_err();
    let AutoError::Unsaid(unsaid) = &error else { panic!("{error}") };
    let db = unsaid.reachable_db.unwrap();
    assert!(error.to_string().contains(&format!(", or ask for {db} dB")), "{error}");
    auto::resolve(&parse(&text(db)), &RATES_HZ).unwrap();
}

#[test]
fn a_reduction_that_no_response_shows_is_told_with_the_most_that_can_be_asked_for() {
    let text = |reduce_db: f64| bands((20.0, 30.0, reduce_db), (100.0, 1000.0, 0.5), "");
    let error = auto::resolve(&text(177.0), &RATES_HZ).unwrap_err();
    assert_eq!(error, AutoError::TooDeep { line: "rumble".to_owned(), reduce_db: 177.0 });
    assert!(error.to_string().ends_with("ask for 176 dB or less, or write the stages yourself"), "{error}");
    auto::resolve(&text(176.0), &RATES_HZ).unwrap();
}

#[test]
fn a_keep_band_of_which_nothing_is_left_is_named() {
    let spec = "design = \"auto\"\n[[band]]\nname = \"hum\"\nfrom_hz = 100\nto_hz = 110\nreduce_db = 20\n\
                [[band]]\nname = \"call\"\nfrom_hz = 100\nto_hz = 110\nkeep_db = 1\nexcept = [\"hum\"]\n";
    assert_eq!(
        auto::resolve(&parse(spec), &RATES_HZ).unwrap_err().to_string(),
        "nothing of band \"call\" (100 to 110 Hz) is left beside what it excepts; widen it, or remove it"
    );
}

#[test]
fn too_few_sections_are_told_with_how_many_it_takes() {
    let mut spec = bands((0.0, 80.0, 60.0), (100.0, 8000.0, 0.1), "[auto]\nmax_sections = 2");
    let error = auto::resolve(&spec, &RATES_HZ).unwrap_err();
    let AutoError::TooFew { needed, allowed: 2 } = error else { panic!("{error}") };
    assert!(error.to_string().contains(&format!("set max_sections to {needed} or more")), "{error}");
    spec.auto.as_mut().unwrap().max_sections = Some(needed);
    auto::resolve(&spec, &RATES_HZ).unwrap();
}

#[test]
fn a_band_beyond_half_a_rate_follows_the_spec() {
    let spec = bands((9000.0, 15_000.0, 40.0), (100.0, 5000.0, 0.5), "");
    let sentence = auto::resolve(&spec, &[16_000, 48_000]).unwrap_err().to_string();
    assert!(sentence.contains("at 16000 Hz") && sentence.contains("band \"rumble\""), "{sentence}");
    let spec = Spec { beyond_half_rate: spec::BeyondHalfRate::LeaveOut, ..spec };
    auto::resolve(&spec, &[16_000, 48_000]).unwrap();
}

/// The room of the wide band reaches over the first lines of the row, so that the others can't be
/// written as one row, and those that do not fit at the lower rate are not left out quietly.
#[test]
fn lines_of_a_row_that_only_stages_of_their_own_take_out_are_named_with_the_rate_they_do_not_fit() {
    let text = "design = \"auto\"\n\
                [[band]]\nname = \"wind\"\nfrom_hz = 100\nto_hz = 350\nreduce_db = 20\n\
                [[band]]\nname = \"hum\"\ncenter_hz = 400\nspan_hz = 8\nharmonics = 6\nreduce_db = 20\n";
    let rates_hz = [4000, 16_000];
    let spec = parse(text);
    let error = auto::resolve(&spec, &rates_hz).unwrap_err();
    assert_eq!(
        error.to_string(),
        "band \"hum x5\" (1996 to 2004 Hz) does not fit at 4000 Hz; one stage for its whole row would leave it out \
         there, but beside the other bands its line takes a stage of its own, which beyond_half_rate = \"error\" \
         refuses; set beyond_half_rate = \"leave-out\", with which there is a cascade"
    );
    // What it says to do helps.
    let left_out = Spec { beyond_half_rate: spec::BeyondHalfRate::LeaveOut, ..spec };
    auto::resolve(&left_out, &rates_hz).unwrap();
}
