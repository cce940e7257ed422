//! A million damaged files.

use std::panic::{AssertUnwindSafe, catch_unwind, resume_unwind};
use std::sync::LazyLock;

use crate::check::{Outcome, check, keep};
use crate::corpus::documents;
use crate::document::Document;
use crate::mutate::{restructure, strike};
use crate::random::Random;
use crate::runner::{self, Plan};

static CORPUS: LazyLock<Vec<Document>> = LazyLock::new(documents);

/// Cases in an ordinary run of the tests.
const CASES: u64 = 1_000_000;

/// The file of a case, and whether nothing was done to it.
fn file(random: &mut Random) -> (Vec<u8>, bool) {
    let original = &CORPUS[random.below(CORPUS.len())];
    if random.one_in(64) {
        return (original.bytes(), true);
    }
    let blows = 1 + random.below(5);
    let to_parts = random.below(blows + 1);
    let mut file = if to_parts == 0 {
        original.bytes()
    } else {
        let mut document = original.clone();
        for _ in 0..to_parts {
            restructure(&mut document, &CORPUS, random);
        }
        document.bytes()
    };
    for _ in to_parts..blows {
        let other = if random.one_in(4) { CORPUS[random.below(CORPUS.len())].bytes() } else { Vec::new() };
        strike(&mut file, &other, random);
    }
    (file, false)
}

fn case(seed: u64, number: u64) -> Outcome {
    let mut random = Random::of_case(seed, number);
    let (file, is_legal) = file(&mut random);
    catch_unwind(AssertUnwindSafe(|| check(&file, is_legal, &mut random))).unwrap_or_else(|cause| {
        println!("case {number}: {}", keep(&file, &format!("fuzz-{seed}-{number}.wav")));
        resume_unwind(cause)
    })
}

#[test]
fn no_file_panics_hangs_or_is_written_otherwise_than_claimed() {
    let plan = Plan::of_environment(CASES, 1);
    let [refused, unreadable, repaired, identical, doubtful] =
        runner::run("no_file_panics", plan, |seed, number| case(seed, number) as usize);
    println!(
        "{refused} refused, {unreadable} with bad samples, {repaired} repaired, {identical} identical, \
         {doubtful} not to be read back"
    );
    // None of the outcomes may become a rarity that no longer tests anything.
    if plan.is_large() {
        let all = plan.end - plan.first;
        // The last way out is for damage of several kinds at once.
        assert!(doubtful < all / 10_000, "{doubtful}");
        assert!(refused > all / 5 && unreadable > all / 5000 && repaired > all / 50 && identical > all / 50);
    }
}

#[test]
fn every_file_of_the_corpus_is_legal_and_read() {
    let mut random = Random::of_case(1, 0);
    for document in CORPUS.iter() {
        assert_eq!(check(&document.bytes(), true, &mut random), Outcome::Identical);
    }
}
