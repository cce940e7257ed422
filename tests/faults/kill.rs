//! Killed hard at a hundred moments of a run, and run again.

use super::fixtures::Noise;
use super::season::{Outputs, Season, Way, is_passing};
use std::collections::BTreeMap;
use std::os::unix::process::ExitStatusExt;
use std::path::Path;
use std::process::Child;
use std::time::{Duration, Instant};

const MOMENTS: usize = 100;
const SIGKILL: i32 = 9;

/// When a run is killed.
#[derive(Clone, Copy, Debug)]
enum Moment {
    /// So long after its start.
    Delay(Duration),
    /// As soon as so many outputs have their names, and so much later.
    Outputs(usize, Duration),
    /// As soon as the journal holds so many bytes.
    Journal(u64),
    /// As soon as the report has its name and so much later.
    Report(Duration),
}

impl Moment {
    /// The moments of one hundred, spread over the run by kind and by a seeded draw.
    fn drawn(index: usize, draw: &mut Noise, length: Duration) -> Moment {
        let mut unit = || (draw.next() + 1.0) / 2.0;
        match index % 5 {
            0 | 1 => Moment::Delay(length.mul_f64(unit())),
            2 => Moment::Outputs((unit() * 13.0) as usize, Duration::from_micros((unit() * 3000.0) as u64)),
            3 => Moment::Journal((unit() * 120_000.0) as u64),
            // All outputs are there and the report is being written, or it just was.
            _ if unit() < 0.7 => Moment::Outputs(12, Duration::from_micros((unit() * 20_000.0) as u64)),
            _ => Moment::Report(Duration::from_micros((unit() * 2000.0) as u64)),
        }
    }

    /// Waits for the moment, or for the end of the run if that is sooner.
    fn wait(self, child: &mut Child, out: &Path) {
        let start = Instant::now();
        let mut later = Duration::ZERO;
        loop {
            let reached = match self {
                Moment::Delay(delay) => start.elapsed() >= delay,
                Moment::Journal(bytes) => {
                    out.join(".bandproof-journal").metadata().is_ok_and(|journal| journal.len() >= bytes.max(1))
                }
                Moment::Outputs(count, after) => {
                    later = after;
                    out.exists() && outputs_in(out) >= count
                }
                Moment::Report(after) => {
                    later = after;
                    out.join("bandproof-report.json").exists()
                }
            };
            if reached || child.try_wait().unwrap().is_some() {
                break;
            }
            std::thread::sleep(Duration::from_micros(200));
        }
        std::thread::sleep(later);
    }
}

/// Recordings under their names; the folder is being written to while it is read.
fn outputs_in(out: &Path) -> usize {
    let files = walkdir::WalkDir::new(out).into_iter().filter_map(Result::ok);
    files.filter(|file| file.path().extension().is_some_and(|ending| ending == "wav")).count()
}

/// Kills a run at `moment` and says whether it was still going.
fn killed(season: &Season, way: Way, moment: Moment) -> bool {
    let mut child = season.start(way);
    moment.wait(&mut child, &season.bench.path(way.out()));
    child.kill().unwrap();
    child.wait().unwrap().signal() == Some(SIGKILL)
}

#[test]
fn killed_at_any_moment_a_run_leaves_nothing_wrong_and_the_next_completes_it() {
    let season = Season::new();
    let whole: BTreeMap<Way, Outputs> = Way::ALL.into_iter().map(|way| (way, season.undisturbed(way))).collect();
    season.clear();
    let clock = Instant::now();
    season.run(Way::TwoThreads, "timed");
    let length = clock.elapsed();
    let mut draw = Noise(20_260_512);
    let (mut index, mut met, mut left_something) = (0, 0, 0);
    while met < MOMENTS {
        assert!(index < 5 * MOMENTS, "only {met} of {index} runs were met by a kill");
        let way = Way::ALL[index / 5 % Way::ALL.len()];
        let whole = &whole[&way];
        season.clear();
        // Every seventh run is killed three times before it is let through.
        let rounds = if index % 7 == 0 { 3 } else { 1 };
        let mut what = format!("moment {index}, {way:?}");
        let mut hits = 0;
        for _ in 0..rounds {
            let moment = Moment::drawn(index, &mut draw, length);
            what = format!("{what}, killed at {moment:?}");
            hits += usize::from(killed(&season, way, moment));
            season.assert_inputs_untouched(&what);
            season.assert_no_wrong_file(whole, &what);
        }
        index += 1;
        if hits == 0 {
            // It was over sooner, which counts for nothing here.
            season.assert_complete(whole, &what);
            continue;
        }
        met += 1;
        let left = super::season::outputs(&season.bench.path("out"));
        left_something += usize::from(left.keys().any(|name| is_passing(name)));
        season.run(way, &what);
        season.assert_inputs_untouched(&what);
        season.assert_complete(whole, &what);
    }
    // Else most were killed before they wrote anything, and this test shows little.
    assert!(left_something * 3 >= MOMENTS, "{left_something} runs left temporary files or a journal");
}
