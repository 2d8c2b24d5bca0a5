//! Too few steps inside the bound: the insertion-index test and the comparison of estimates must see it.

#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

mod common;

use common::{estimate, normal};
use oddwell_evidence::comparison::agreement;
use oddwell_evidence::{LEAST_INSERTION_PROBABILITY, Nested, SteppingStones, Sweeps};

#[test]
fn one_sweep_inside_the_bound_is_seen() {
    let target = normal(10);
    let stepping = estimate(&target, &SteppingStones { runs: 4, ..SteppingStones::default() }, 1);
    let sound = Nested { live_points: 400, runs: 2, ..Nested::default() };
    let whole = estimate(&target, &sound, 1);
    assert!(whole.insertion_p_value.unwrap() > 0.01, "{whole:?}");
    assert!(agreement(&[("nested", &whole), ("stepping", &stepping)]).agree);

    let sabotaged = estimate(&target, &Nested { sweeps: Sweeps::Exactly(1), ..sound }, 1);
    assert!(sabotaged.insertion_p_value.unwrap() < LEAST_INSERTION_PROBABILITY, "{sabotaged:?}");
    assert!(!sabotaged.votes && sabotaged.doubt.is_some());
    assert!(!agreement(&[("nested", &sabotaged), ("stepping", &stepping)]).agree);

    // The comparison alone sees it too, were the insertion indices not looked at.
    let mut unwatched = sabotaged;
    unwatched.insertion_p_value = None;
    unwatched.votes = true;
    let found = agreement(&[("nested", &unwatched), ("stepping", &stepping)]);
    assert!(!found.agree && found.disagreements.len() == 1, "{found:?}");
}
