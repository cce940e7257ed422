//! That fewer sections are not enough: searched by other means, not assumed.

use crate::independent::Problem;
use crate::tasks::{TASKS, Task};
use bandproof::design::auto::{self, Found};

/// Starts for each structure.
fn effort() -> u32 {
    std::env::var("BANDPROOF_AUTO_EFFORT").ok().and_then(|starts| starts.parse().ok()).unwrap_or(3)
}

fn found(task: &Task) -> Found {
    let spec = task.spec();
    auto::find(&spec, spec.auto.unwrap(), task.rates_hz).unwrap_or_else(|error| panic!("{}: {error}", task.name))
}

/// Tasks that are searched as a whole, every fourth one.
fn whole_tasks(part: usize) -> impl Iterator<Item = &'static Task> {
    TASKS.iter().filter(|task| task.rows.is_empty()).skip(part).step_by(4)
}

/// With one section fewer no structure is found that holds, even without the margin that
/// the program keeps; with as many, the same search finds one, so it is able to.
fn none_with_one_fewer(part: usize) {
    for task in whole_tasks(part) {
        let sections = found(task).sections;
        let problem = Problem::new(task, |_| true);
        let fewer = problem.best(sections - 1, effort());
        assert!(fewer < 0.0, "{}: {} sections hold with {fewer} to spare", task.name, sections - 1);
        // A start more: what is there must be found.
        let as_many = problem.best(sections, effort().max(4));
        assert!(as_many >= 0.0, "{}: {sections} sections are not found to hold: {as_many}", task.name);
    }
}

#[test]
fn no_cascade_with_one_section_fewer_is_found_1() {
    none_with_one_fewer(0);
}

#[test]
fn no_cascade_with_one_section_fewer_is_found_2() {
    none_with_one_fewer(1);
}

#[test]
fn no_cascade_with_one_section_fewer_is_found_3() {
    none_with_one_fewer(2);
}

#[test]
fn no_cascade_with_one_section_fewer_is_found_4() {
    none_with_one_fewer(3);
}

/// Of rows every place is asked alone, with all that the keep bands may lose: one section
/// fewer in all would leave some place with fewer than it can do with.
#[test]
fn rows_take_what_their_places_take_alone() {
    for task in TASKS.iter().filter(|task| !task.rows.is_empty()) {
        let problem = Problem::new(task, |_| true);
        let floor: u32 = (0..problem.place_count())
            .map(|place| {
                let alone = problem.only(place);
                if alone.is_empty() { 0 } else { (1..8).find(|count| alone.best(*count, effort()) >= 0.0).unwrap() }
            })
            .sum();
        assert_eq!(found(task).sections, floor, "{}", task.name);
    }
}

#[test]
fn it_takes_no_more_sections_than_a_careful_person() {
    let mut compared = 0;
    for task in TASKS {
        let Some(by_hand) = task.by_hand else { continue };
        let sections = found(task).sections;
        assert!(sections <= by_hand, "{}: {sections} sections, {by_hand} by hand", task.name);
        compared += 1;
    }
    assert!(compared >= 10);
}

#[test]
fn there_are_tasks_enough() {
    assert!(TASKS.len() >= 20);
}
