//! Designs of surveys with something wrong, each with the whole message.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BASE, resolve};

const DESIGN: &str =
    "\n[survey.design]\nseparation = { low = 24.0, high = 144.0, width = 8.0 }\narea = 4000.0\n";
const NEAR: &str = "design = { volume = 2.0e9, first_density = 8.0e-4, second_density = 3.0e-3 }";
const FAR: &str = "design = { redshifts = [0.5, 0.7], first_density = 8.0e-4, second_density = 3.0e-3 }";

/// The base study with a design, on lines 19 to 21, and its bins with theirs on 26 and 34.
fn designed() -> String {
    let keep = "keep = [{ separation = [24.0, 144.0], multipoles = [1, 3] }]\n";
    let text = BASE.replacen(keep, &format!("{keep}{DESIGN}"), 1);
    let text = text.replacen("redshift = 0.35\n", &format!("redshift = 0.35\n{NEAR}\n"), 1);
    text.replacen("redshift = 0.6\n", &format!("redshift = 0.6\n{FAR}\n"), 1)
}

#[test]
fn every_bad_design_says_what_is_wrong_in_full() {
    resolve(&designed(), &[]).unwrap();
    let whole = "separation = { low = 24.0, high = 144.0, width = 8.0 }";
    let table = [
        (
            whole,
            "multipoles = [1]",
            "study.toml:19:1: [survey.design] needs `separation`; add `separation = { low = 24.0, high = 144.0, width = 8.0 }`",
        ),
        (
            whole,
            "separation = { low = 24.0, high = 144.0 }",
            "study.toml:20:14: `separation` of [survey.design] needs `width`; add `width = 8.0`",
        ),
        (
            whole,
            "separation = { low = 24.0, high = 24.5, width = 8.0 }",
            "study.toml:20:49: `width` must be above 0, and such that 1 to 1000 shells fit between low and high, not 8.0; change the width, or the ends",
        ),
        (
            whole,
            "separation = [24.0, 40.0, 40.0]",
            "study.toml:20:14: `separation` must be of rising edges, not 40.0 before 40.0; sort them",
        ),
        (
            whole,
            "separation = 24.0",
            "study.toml:20:14: `separation` must be edges, or their low end, high end and width, not the number 24.0; write `separation = { low = 24.0, high = 144.0, width = 8.0 }`",
        ),
        (
            whole,
            "separation = [24.0, 40.0]\nwavenumber = [0.1, 0.2]",
            "study.toml:21:14: `wavenumber` cannot stand beside `separation`; a design is of one space; give the other a survey of its own",
        ),
        (
            whole,
            "multipoles = [1, 1]\nseparation = [24.0, 40.0]",
            "study.toml:20:14: `multipoles` must be 0, 1, 2, 3 or 4, each once, not 1; remove it from the list",
        ),
        (
            whole,
            "separation = [24.0, 40.0]\nvolume = 1e9",
            "study.toml:21:1: `volume` is not a key of [survey.design]; known: `multipoles`, `separation`, `wavenumber`, `area`",
        ),
        (
            "area = 4000.0",
            "area = 41300.0",
            "study.toml:21:8: `larkfield.design.area` must be above 0 and at most the whole sky, 41253, not 41300.0; give it in square degrees",
        ),
        (
            "area = 4000.0\n",
            "",
            "study.toml:33:24: `larkfield.far.design.redshifts` needs `area` beside it; say how many square degrees were seen, or give the volume",
        ),
        (
            NEAR,
            "",
            "study.toml:24:8: `[survey.design]` needs `larkfield.near.design` beside it; say how much of each bin is seen, as design = { volume = 2.0e9, first_density = 8.0e-4, second_density = 3.0e-3 }",
        ),
        (
            DESIGN,
            "",
            "study.toml:22:10: `larkfield.near.design` needs `[survey.design]` beside it; say in which shells the bins are measured, or remove it",
        ),
        (
            NEAR,
            "design = { first_density = 8.0e-4, second_density = 3.0e-3 }",
            "study.toml:26:10: `design` of [[survey.bin]] needs `volume`; add `volume = 2.0e9`",
        ),
        (
            NEAR,
            "design = { volume = 2.0e9, redshifts = [0.3, 0.4], first_density = 8.0e-4, second_density = 3.0e-3 }",
            "study.toml:26:40: `redshifts` stands beside `volume`, which says the same; give the volume, or the redshifts between which the survey's `area` was seen",
        ),
        (
            NEAR,
            "design = { volume = -1.0, first_density = 8.0e-4, second_density = 0.0 }",
            "study.toml:26:21: `larkfield.near.design.volume` must be above 0, not -1.0; it is a volume in (Mpc/h)^3, as in 2.0e9\nstudy.toml:26:68: `larkfield.near.design.second_density` must be above 0, not 0.0; it is a number density in (h/Mpc)^3, as in 8.0e-4",
        ),
        (
            "redshifts = [0.5, 0.7]",
            "redshifts = [0.61, 0.7]",
            "study.toml:34:24: `larkfield.far.design.redshifts` must be 0 or above, with the bin's redshift between them, not [0.61, 0.7]; a bin's redshift is the pair-weighted mean of what lies between its edges",
        ),
        (
            DESIGN,
            "unit = \"Mpc\"\n\n[survey.design]\nseparation = [24.0, 32.0]\narea = 9.0\n",
            "study.toml:18:8: `larkfield.unit` must be \"Mpc/h\" where there is a design, not \"Mpc\"; give the design in Mpc/h, and remove it",
        ),
    ];
    let mut wrong = Vec::new();
    for (from, to, message) in table {
        let text = designed();
        assert_eq!(text.matches(from).count(), 1, "{from}");
        let said = resolve(&text.replacen(from, to, 1), &[]).err().unwrap_or_else(|| "nothing".to_owned());
        if said != message {
            wrong.push(format!("## {to}\nsaid: {said}\nmust: {message}"));
        }
    }
    assert!(wrong.is_empty(), "{} of the messages differ:\n{}", wrong.len(), wrong.join("\n"));
}
