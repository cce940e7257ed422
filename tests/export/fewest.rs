//! The fewest digits and bits: they hold, and fewer do not.

use crate::support::{SHORT, exported, reference, specs, written};
use bandproof::export::precision::{self, MOST_BITS, MOST_DIGITS};
use bandproof::export::{ExportError, Form};

#[test]
fn the_digits_named_hold_and_no_fewer_do() {
    for (name, spec, rates_hz) in specs() {
        for rate_hz in rates_hz {
            let reference = reference(&spec, rate_hz);
            let fewest = precision::fewest_digits(&reference).unwrap();
            // Rounding is no better with every digit more, so all of them are tried.
            let holds: Vec<u32> = (1..=MOST_DIGITS)
                .filter(|&digits| reference.hold(&precision::with_digits(&reference, digits)).1.is_empty())
                .collect();
            assert_eq!(holds.first(), Some(&fewest), "{name} at {rate_hz} Hz: {holds:?}");
            assert!(fewest > 2 && fewest < 16, "{name} at {rate_hz} Hz takes {fewest}");
            let told = precision::holding_digits(&reference).unwrap();
            assert!(told.each().eq(holds) && told.fewest() == fewest, "{name} at {rate_hz} Hz: {told:?}");
            // With one digit fewer the command says what is lost.
            match exported(&spec, rate_hz, Form::Equation, Some(fewest - 1), None) {
                Ok(exported) => assert!(!exported.weaker.is_empty(), "{name} at {rate_hz} Hz"),
                Err(ExportError::Lost { losses, holding, .. }) => {
                    assert!(!losses.is_empty());
                    assert_eq!(holding, Some(format!("{} hold", told.text())));
                }
                Err(error) => panic!("{name} at {rate_hz} Hz: {error}"),
            }
            assert!(exported(&spec, rate_hz, Form::Equation, Some(fewest), None).unwrap().weaker.is_empty());
        }
    }
}

/// Call-times' order was found from limits, which it touches: any rounding may cross one.
#[test]
fn a_limit_that_is_crossed_by_a_hair_is_told_with_its_figures() {
    let call_times = bandproof::spec::load(std::path::Path::new("filter-specs/call-times.toml")).unwrap();
    let reference = reference(&call_times, 48_000);
    let holding = precision::holding_digits(&reference).unwrap();
    let lost: Vec<u32> =
        (holding.fewest()..MOST_DIGITS).filter(|&digits| holding.each().all(|d| d != digits)).collect();
    assert!(!lost.is_empty(), "no number of digits between is lost: {holding:?}");
    for digits in lost {
        let error = exported(&call_times, 48_000, Form::C, Some(digits), None).unwrap_err().to_string();
        assert!(error.starts_with(&format!("with {digits} digits: band \"bird calls\" has a gain of ")), "{error}");
        assert!(error.ends_with(&format!(" Hz where 0.2 dB are allowed; {} hold", holding.text())), "{error}");
        let gain_db: f64 = error.split("gain of ").nth(1).unwrap().split(' ').next().unwrap().parse().unwrap();
        assert!(gain_db.abs() > 0.2 && gain_db.abs() < 0.201, "{error}");
    }
}

#[test]
fn the_bits_named_hold_and_no_fewer_do() {
    for (name, spec, rates_hz) in specs() {
        for rate_hz in rates_hz {
            let reference = reference(&spec, rate_hz);
            let Some((fewest, rounded)) = precision::shortest_words(&reference) else {
                assert_eq!((name, rate_hz), ("narrow notch", 384_000));
                let refused = exported(&spec, rate_hz, Form::Fixed, None, None);
                assert!(matches!(refused, Err(ExportError::NoWordLength { .. })), "{refused:?}");
                continue;
            };
            assert!(rounded.losses.is_empty() && fewest <= MOST_BITS);
            for bits in precision::FEWEST_BITS..fewest {
                let fewer = precision::with_bits(&reference, bits);
                assert!(
                    fewer.is_err() || !fewer.unwrap().losses.is_empty(),
                    "{name} at {rate_hz} Hz: {bits} bits hold"
                );
            }
        }
    }
}

#[test]
fn a_requirement_that_no_word_holds_is_a_requirement() {
    // White noise of words of 32 bits is at -194 dBFS.
    let band = "[[band]]\nname = \"rest\"\nfrom_hz = 20000\nto_hz = 22000\nresidual_dbfs = -199\n";
    let spec = written(&format!("{SHORT}\n{band}"));
    let exported = exported(&spec, 48_000, Form::Fixed, None, Some(MOST_BITS)).unwrap();
    assert!(!exported.weaker.is_empty());
    assert!(exported.text.contains("as asked for; no word length up to 32 bits holds every requirement"));
    assert!(!exported.text.contains("no band has a requirement"), "{}", exported.text);
}

#[test]
fn words_are_long_enough_for_their_noise() {
    // By its response alone this spec would hold in words of 8 bits, with noise far above
    // the 50 dB that a full-scale whine has to come down.
    let (_, whine, _) = specs().remove(1);
    let reference = reference(&whine, 48_000);
    let (bits, rounded) = precision::shortest_words(&reference).unwrap();
    let noise_dbfs = |rounded: precision::Rounded| rounded.words.unwrap().1.noise_dbfs.unwrap();
    assert!(noise_dbfs(rounded) <= -50.0);
    let fewer = precision::with_bits(&reference, bits - 1).unwrap();
    assert!(fewer.losses.iter().any(|loss| loss.sentence.contains("rounding makes noise")), "{:?}", fewer.losses);
    assert!(noise_dbfs(fewer) > -50.0);
}
