//! Finished sections against the exact response of what was given (`make_transfer.py`).

use crate::support::{all_exact, analog, conditioning, digital, exact, numbers, polynomials, roots};
use bandproof::design::extrema::Profile;
use bandproof::design::{response, transfer};
use bandproof::section::Section;
use bandproof::spec::{AnalogStage, DigitalFilter, RootUnit, Transfer, WrittenSection};
use num_complex::Complex64;
use serde_json::Value;

fn file() -> Value {
    serde_json::from_str(include_str!("../reference/transfer.json")).unwrap()
}

/// Every polynomial of every section is rounded once, and evaluated with as much again: twice
/// the conditioning in units of 2^-53, and as much for a last digit in the wrong place.
const ROUNDINGS: f64 = 4.0;

fn hold(sections: &[Section], entry: &Value, rate_hz: f64) -> f64 {
    let mut worst = 0.0f64;
    for point in entry["response"].as_array().unwrap() {
        let point = numbers(point);
        let want = Complex64::new(point[1], point[2]);
        let got = response::at(sections, point[0], rate_hz);
        if want.norm() == 0.0 {
            assert!(got.norm() < 1e-14, "{got}: {entry}\n{sections:#?}");
            continue;
        }
        let bound = ROUNDINGS * conditioning(sections, point[0], rate_hz) * f64::EPSILON / 2.0;
        let off = (got - want).norm() / want.norm();
        assert!(off <= bound, "{off:e} over {bound:e} at {} Hz: {got} for {want}\n{entry}\n{sections:#?}", point[0]);
        worst = worst.max(off / bound);
    }
    worst
}

fn digital_stage(entry: &Value) -> DigitalFilter {
    match entry["form"].as_str().unwrap() {
        "polynomials" => digital(&numbers(&entry["numerator"]), &numbers(&entry["denominator"])),
        "roots" => DigitalFilter::Transfer(Transfer::Roots {
            zeros: roots(&entry["zeros"]),
            poles: roots(&entry["poles"]),
            gain: exact(entry["gain"].as_f64().unwrap()),
        }),
        _ => {
            let three = |value: &Value| all_exact(&numbers(value)).try_into().unwrap();
            let sections = entry["sections"].as_array().unwrap().iter();
            DigitalFilter::Sections(sections.map(|s| WrittenSection { b: three(&s["b"]), a: three(&s["a"]) }).collect())
        }
    }
}

fn analog_stage(entry: &Value) -> AnalogStage {
    let transfer = match entry["form"].as_str().unwrap() {
        "polynomials" => {
            polynomials(all_exact(&numbers(&entry["numerator"])), all_exact(&numbers(&entry["denominator"])))
        }
        _ => Transfer::Roots {
            zeros: roots(&entry["zeros"]),
            poles: roots(&entry["poles"]),
            gain: exact(entry["gain"].as_f64().unwrap()),
        },
    };
    let unit = if entry["hertz"].as_bool() == Some(true) { RootUnit::Hertz } else { RootUnit::RadiansPerSecond };
    AnalogStage { unit, ..analog(transfer, entry["match_hz"].as_f64()) }
}

#[test]
fn sections_have_the_response_of_what_was_given_in_z() {
    let file = file();
    let rate_hz = file["rate_hz"].as_f64().unwrap();
    let entries = file["digital"].as_array().unwrap();
    let mut worst = 0.0f64;
    for entry in entries {
        let sections =
            transfer::digital(&digital_stage(entry), rate_hz).unwrap_or_else(|error| panic!("{error}: {entry}"));
        worst = worst.max(hold(&sections, entry, rate_hz));
    }
    println!("{} filters, worst {worst:.2} of the bound", entries.len());
    assert!(entries.len() > 140);
}

#[test]
fn sections_have_the_response_of_what_was_given_in_s() {
    let file = file();
    let rate_hz = file["rate_hz"].as_f64().unwrap();
    let entries = file["analog"].as_array().unwrap();
    let mut worst = 0.0f64;
    for entry in entries {
        let sections =
            transfer::analog(&analog_stage(entry), rate_hz).unwrap_or_else(|error| panic!("{error}: {entry}"));
        worst = worst.max(hold(&sections, entry, rate_hz));
    }
    println!("{} filters, worst {worst:.2} of the bound", entries.len());
    assert!(entries.len() == 198);
}

/// No part of the cascade before a cut is louder than the whole by more than the grid that
/// gains are set on misses (1 dB), nor lower by more than one step of 2 and that.
#[test]
fn the_parts_of_a_cascade_neither_overload_nor_sink() {
    let file = file();
    let rate_hz = file["rate_hz"].as_f64().unwrap();
    let peak_db = |sections: &[Section]| {
        let profile = Profile::new(sections, rate_hz, &[]);
        profile.points().iter().map(|point| point.gain_db).fold(f64::NEG_INFINITY, f64::max)
    };
    let mut cuts = 0;
    for entry in file["digital"].as_array().unwrap().iter().filter(|entry| entry["form"] != "sections") {
        let sections = transfer::digital(&digital_stage(entry), rate_hz).unwrap();
        let whole_db = peak_db(&sections);
        for cut in 1..sections.len() {
            let above_db = peak_db(&sections[..cut]) - whole_db;
            assert!((-7.1..1.0).contains(&above_db), "{above_db} dB at cut {cut}: {entry}\n{sections:#?}");
            cuts += 1;
        }
    }
    assert!(cuts > 400, "{cuts}");
}
