//! Each fuzz target for a moment: nothing is found, and sound inputs are sound. Longer: see `oddwell_tests::fuzz`.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_tests::fuzz::{Find, run, targets};

#[test]
fn readers_answer_damaged_inputs() {
    for target in targets().unwrap() {
        for attempt in 0..3 {
            target
                .answer(attempt, target.sound(attempt))
                .unwrap_or_else(|said| panic!("{}: {said}", target.name));
        }
        // Evaluating and checking are slower than reading.
        let attempts = if ["power", "window", "evaluate", "check"].contains(&target.name) { 20 } else { 300 };
        let outcome = run(&target, 7, |tried, _| tried >= attempts);
        let found: Vec<&Find> = outcome.found.iter().map(|found| &found.find).collect();
        assert!(found.is_empty(), "{}: {found:?}", target.name);
    }
}
