//! What has to do with the sample rate, and what has not.

use crate::support::designed;
use bandproof::design::{self, Design, DesignError};
use bandproof::job::JobError;
use bandproof::spec::{self, SpecSyntax};

const DIGITAL: &str = "[[stage]]\nkind = \"digital\"\nnumerator = [0.25]\ndenominator = [1, -0.75]\n";

fn made(toml: &str, rate_hz: u32) -> Result<Design, DesignError> {
    design::design(&spec::parse(toml.as_bytes(), SpecSyntax::Toml, "test.toml").unwrap(), rate_hz)
}

/// What `filter` says of a recording at this rate.
fn told(toml: &str, rate_hz: u32) -> String {
    let cause = Box::new(made(toml, rate_hz).unwrap_err());
    JobError::Design { recording: "station-b/0512.wav".to_owned(), cause }.to_string()
}

#[test]
fn coefficients_for_one_sample_rate_are_used_at_no_other() {
    let rated = format!("{DIGITAL}rate_hz = 48000\n");
    assert_eq!(designed(&rated, 48_000).sections, designed(DIGITAL, 48_000).sections);
    assert_eq!(
        told(&rated, 44_100),
        "stage 1 (digital): its coefficients are those of a filter at 48000 Hz (rate_hz), and at a sample rate of 44100 Hz \
         they would be another filter; give those for 44100 Hz in a spec of its own; the first recording with that rate is \
         station-b/0512.wav, and --exclude leaves recordings out"
    );
    // It fits below half the rate, so nothing leaves it out.
    assert!(made(&format!("beyond_half_rate = \"leave-out\"\n{rated}"), 44_100).is_err());
}

#[test]
fn coefficients_for_any_sample_rate_are_told_to_be_the_same_at_all() {
    let remarks = |toml: &str| designed(toml, 44_100).stages[0].remarks.join("\n");
    let same = "the coefficients are the same at every sample rate; give rate_hz to hold them to one";
    assert!(remarks(DIGITAL).contains(same));
    assert!(!remarks(&format!("{DIGITAL}rate_hz = 44100\n")).contains(same));
    let analog = "[[stage]]\nkind = \"analog\"\npoles_hz = [-100]\ngain = 100\nmatch_hz = 100\n";
    assert!(!remarks(analog).contains(same));
}

#[test]
fn limits_that_no_order_holds_are_told_with_the_sample_rate() {
    let toml = "[[stage]]\nkind = \"bandpass\"\nfamily = \"bessel\"\nedges_hz = [1000, 2000]\n\
                stop_edges_hz = [999, 2001]\nripple_db = 0.5\nstop_db = 60\n";
    let text = told(toml, 22_050);
    assert!(
        text.starts_with("stage 1 (1500 Hz): at a sample rate of 22050 Hz no Bessel bandpass up to order "),
        "{text}"
    );
    assert!(
        text.ends_with(
            "; the first recording with that rate is station-b/0512.wav, and --exclude leaves recordings out"
        )
    );
}

#[test]
fn what_is_wrong_at_every_rate_has_nothing_to_do_with_recordings() {
    for keys in [
        "kind = \"digital\"\nnumerator = [1]\ndenominator = [1, -1.5]",
        "kind = \"analog\"\npoles_hz = [1000]\ngain = 1",
        "kind = \"digital\"\nnumerator = [1e20]\ndenominator = [1, -0.5]",
    ] {
        let text = told(&format!("[[stage]]\n{keys}\n"), 48_000);
        assert!(!text.contains("recording"), "{text}");
    }
}
