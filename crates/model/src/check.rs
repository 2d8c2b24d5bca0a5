//! What a setup must fulfil.

use crate::error::ModelError;
use crate::setup::ModelSetup;

/// Refuses what can't be predicted.
pub(crate) fn check(setup: &ModelSetup) -> Result<(), ModelError> {
    let fail = |what: String, value: String, rule: &'static str, way_out: &'static str| {
        Err(ModelError::Setup { what, value, rule, way_out })
    };
    for bin in &setup.bins {
        if bin.nodes.is_empty() {
            return fail(bin.path(), "no redshift".into(), "a bin needs a redshift", "give `redshift`");
        }
        for &(redshift, _) in &bin.nodes {
            if !(redshift > 0.0 && redshift.is_finite()) {
                let what = format!("{}.redshift", bin.path());
                return fail(
                    what,
                    redshift.to_string(),
                    "must be above 0",
                    "give the redshift, not a scale factor",
                );
            }
        }
        if bin.growth_given && (setup.felt_by.reaches_matter() && !setup.departure.parameters().is_empty()) {
            let what = format!("{}.growth_rate", bin.path());
            let rule = "given growth goes only with a departure felt by light";
            return fail(what, "given".into(), rule, "remove it, or let light alone feel the departure");
        }
    }
    if setup.growth_index && setup.felt_by.reaches_matter() && !setup.departure.parameters().is_empty() {
        let rule = "a growth index goes only with a departure felt by light";
        let way_out = "remove it, or let light alone feel the departure";
        return fail("prediction.growth_index".into(), "given".into(), rule, way_out);
    }
    if !(setup.smallest_damping >= 0.0 && setup.smallest_damping.is_finite()) {
        let value = setup.smallest_damping.to_string();
        return fail(
            "prediction.damping".into(),
            value,
            "must be 0 or above, in Mpc/h",
            "give 0.5 if in doubt",
        );
    }
    for (index, row) in setup.rows.iter().enumerate() {
        let what = format!("row {}", index + 1);
        if row.bin >= setup.bins.len() {
            return fail(what, format!("bin {}", row.bin), "its bin must exist", "give the index of a bin");
        }
        if row.multipole > 4 {
            return fail(what, format!("multipole {}", row.multipole), "must be 0 to 4", "remove the row");
        }
        let (low, high) = row.edges.unwrap_or((0.0, f64::MAX));
        if !(row.at > 0.0 && row.at.is_finite() && low >= 0.0 && low < high) {
            let value = format!("{} in {low}–{high}", row.at);
            return fail(what, value, "positions are above 0 and edges in order", "correct the table");
        }
    }
    Ok(())
}
