//! What the program's exit status says.

use bandproof::report::{Summary, Verdict};
use std::process::ExitCode;

/// Exit statuses, the gravest last: where several apply, the gravest is the one that
/// is returned.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Exit {
    /// Every recording done, no band missed.
    Done,
    /// Some band missed.
    Missed,
    /// Some recording could not be processed, or a report could not be written.
    Failed,
    /// Something is wrong with the command line, the spec or the folders: nothing was written.
    Refused,
    /// Interrupted.
    Interrupted,
}

impl Exit {
    /// The number a shell sees.
    pub fn code(self) -> u8 {
        match self {
            Exit::Done => 0,
            Exit::Missed => 1,
            Exit::Refused => 2,
            Exit::Failed => 3,
            Exit::Interrupted => 130,
        }
    }

    /// What a finished run came to. With `strict`, what is unproven counts as missed.
    pub fn of_run(summary: &Summary, strict: bool) -> Self {
        let missed = summary.bands.iter().any(|band| band.missed > 0);
        let unproven = summary.verdict == Verdict::Unproven || summary.bands.iter().any(|band| band.unproven > 0);
        let bands = if missed || (strict && unproven) { Exit::Missed } else { Exit::Done };
        let recordings = if summary.failed > 0 { Exit::Failed } else { Exit::Done };
        bands.max(recordings)
    }
}

impl From<Exit> for ExitCode {
    fn from(exit: Exit) -> Self {
        ExitCode::from(exit.code())
    }
}

#[cfg(test)]
mod tests {
    use super::Exit::{Done, Failed, Interrupted, Missed, Refused};
    use super::*;
    use bandproof::report::{BandSummary, Skipped};

    #[test]
    fn the_gravest_status_wins() {
        let gravest_first = [Interrupted, Refused, Failed, Missed, Done];
        assert_eq!(gravest_first.map(Exit::code), [130, 2, 3, 1, 0]);
        for (place, grave) in gravest_first.into_iter().enumerate() {
            for milder in &gravest_first[place..] {
                assert_eq!(grave.max(*milder), grave);
                assert_eq!(milder.max(&grave), &grave);
            }
        }
    }

    #[test]
    fn a_run_ends_with_what_it_came_to() {
        // failed, missed, unproven, the run's verdict; plain and strict status
        let table = [
            (0, 0, 0, Verdict::Met, Done, Done),
            (0, 0, 2, Verdict::Met, Done, Missed),
            (0, 0, 0, Verdict::Unproven, Done, Missed),
            (0, 1, 0, Verdict::Missed, Missed, Missed),
            (1, 0, 0, Verdict::Met, Failed, Failed),
            (1, 1, 0, Verdict::Missed, Failed, Failed),
            (1, 0, 1, Verdict::Unproven, Failed, Failed),
        ];
        for (failed, missed, unproven, verdict, plain, strict) in table {
            let name = "hum".to_owned();
            let band = BandSummary { name, met: 1, missed, unproven, worst_db: None, median_db: None };
            let skipped = Skipped::default();
            let summary = Summary {
                recordings: 3,
                done: 3 - failed,
                failed,
                skipped,
                unpaired: None,
                bands: vec![band],
                verdict,
            };
            assert_eq!(Exit::of_run(&summary, false), plain, "{summary:?}");
            assert_eq!(Exit::of_run(&summary, true), strict, "{summary:?}");
        }
    }
}
