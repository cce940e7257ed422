//! Runs numbered cases on several threads and says which one failed.
//!
//! * `BANDPROOF_FUZZ_CASES`: how many cases (of the container; of specs a tenth).
//! * `BANDPROOF_FUZZ_SEED`: other cases.
//! * `BANDPROOF_FUZZ_CASE`: this one alone.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};
use std::sync::mpsc::{RecvTimeoutError, channel};
use std::time::Duration;

/// Without [`Plan::seed`] given.
const SEED: u64 = 20_260_512;

/// A case takes microseconds. One that takes longer than this runs in circles.
const HANGS: Duration = Duration::from_secs(60);

/// Which cases.
#[derive(Clone, Copy, Debug)]
pub struct Plan {
    pub seed: u64,
    pub first: u64,
    pub end: u64,
}

fn variable(name: &str) -> Option<u64> {
    let text = std::env::var(name).ok()?;
    Some(text.parse().unwrap_or_else(|_| panic!("{name}={text}: not a number")))
}

impl Plan {
    /// What the environment asks for; `cases` divided by `share` where it says nothing
    /// of a number, else that number divided by `share`.
    pub fn of_environment(cases: u64, share: u64) -> Self {
        let seed = variable("BANDPROOF_FUZZ_SEED").unwrap_or(SEED);
        match variable("BANDPROOF_FUZZ_CASE") {
            Some(case) => Plan { seed, first: case, end: case + 1 },
            None => Plan { seed, first: 0, end: variable("BANDPROOF_FUZZ_CASES").unwrap_or(cases) / share },
        }
    }

    /// Whether there are enough cases for shares to mean something.
    pub fn is_large(&self) -> bool {
        self.end - self.first >= 10_000
    }
}

/// Failures after which a thread gives up: enough to see which kinds there are.
const ENOUGH: usize = 100;

/// What the threads of a run share.
struct Shared<C> {
    plan: Plan,
    threads: u64,
    case: C,
    /// The case each thread is at.
    at: Vec<AtomicU64>,
}

/// What one thread saw.
struct Seen<const N: usize> {
    counts: [u64; N],
    failures: Vec<(u64, String)>,
}

/// Runs `case` for every number of the plan and counts what came of them, `N` kinds.
///
/// Panics with the numbers of cases that panic, the first of each kind, or of a case
/// that does not end.
pub fn run<const N: usize>(
    test: &str,
    plan: Plan,
    case: impl Fn(u64, u64) -> usize + Send + Sync + 'static,
) -> [u64; N] {
    let threads = std::thread::available_parallelism().map_or(1, |n| n.get().min(2)) as u64;
    let at = (0..threads).map(|_| AtomicU64::new(plan.first)).collect();
    let shared = Arc::new(Shared { plan, threads, case, at });
    let (report, reports) = channel::<Seen<N>>();
    for thread in 0..threads {
        let (shared, report) = (Arc::clone(&shared), report.clone());
        std::thread::spawn(move || drop(report.send(work(&shared, thread))));
    }
    drop(report);
    let replay = |number: u64| {
        format!("BANDPROOF_FUZZ_SEED={} BANDPROOF_FUZZ_CASE={number} cargo test --test fuzz {test}", plan.seed)
    };
    let mut all = Seen { counts: [0; N], failures: Vec::new() };
    let mut before: Vec<u64> = Vec::new();
    loop {
        match reports.recv_timeout(HANGS) {
            Ok(Seen { counts, failures }) => {
                all.counts.iter_mut().zip(counts).for_each(|(count, more)| *count += more);
                all.failures.extend(failures);
            }
            Err(RecvTimeoutError::Disconnected) => break,
            Err(RecvTimeoutError::Timeout) => {
                // A thread that is through stands still too, so all of them have to.
                let now: Vec<u64> = shared.at.iter().map(|at| at.load(Ordering::Relaxed)).collect();
                assert!(now != before, "none of the cases {now:?} ends\n{}", replay(now[0]));
                before = now;
            }
        }
    }
    if !all.failures.is_empty() {
        let kinds = kinds(&all.failures);
        let lines = kinds.iter().map(|(number, text, times)| format!("{times} times: {text}\n{}\n", replay(*number)));
        panic!("{} cases failed\n{}", all.failures.len(), lines.collect::<String>());
    }
    all.counts
}

fn work<const N: usize, C: Fn(u64, u64) -> usize>(shared: &Shared<C>, thread: u64) -> Seen<N> {
    let mut seen = Seen { counts: [0; N], failures: Vec::new() };
    let plan = shared.plan;
    for number in (plan.first + thread..plan.end).step_by(shared.threads as usize) {
        shared.at[thread as usize].store(number, Ordering::Relaxed);
        match catch_unwind(AssertUnwindSafe(|| (shared.case)(plan.seed, number))) {
            Ok(kind) => seen.counts[kind] += 1,
            Err(cause) => {
                let text = cause.downcast_ref::<String>().cloned();
                let text = text.or_else(|| cause.downcast_ref::<&str>().map(|&text| text.to_owned()));
                seen.failures.push((number, text.unwrap_or_default()));
                if seen.failures.len() >= ENOUGH {
                    break;
                }
            }
        }
    }
    seen
}

/// The first failure of each kind, with how many there are: figures apart, they begin
/// alike.
fn kinds(failures: &[(u64, String)]) -> Vec<(u64, &str, usize)> {
    let kind = |text: &str| text.chars().filter(|c| !c.is_ascii_digit()).take(30).collect::<String>();
    let mut kinds: Vec<(u64, &str, usize)> = Vec::new();
    for (number, text) in failures {
        match kinds.iter_mut().find(|(_, first, _)| kind(first) == kind(text)) {
            Some((_, _, times)) => *times += 1,
            None => kinds.push((*number, text, 1)),
        }
    }
    kinds
}
