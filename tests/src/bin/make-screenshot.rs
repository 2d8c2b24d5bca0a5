//! Makes the picture of the demo's page that the README shows: `cargo run --release -p oddwell-tests --bin make-screenshot`.
//!
//! Needs Chromium.

use oddwell_report::{PageInput, page};
use oddwell_study::review::{Review, review};
use oddwell_study::{Control, FitOptions, Study, fit};
use oddwell_tests::browser::open;
use std::error::Error;
use std::path::Path;

/// The window: as wide as a laptop's half, as high as the answer.
const SIZE: (u32, u32) = (980, 1180);

fn main() -> Result<(), Box<dyn Error>> {
    let demo = Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo");
    let folder = tempfile::tempdir()?;
    let study = Study::read(demo.join("study.toml"), &[])?;
    let mut runs: Vec<Review> = Vec::new();
    for name in ["constant", "per-bin"] {
        let options = FitOptions {
            out: folder.path().join(name),
            existing: oddwell_study::Existing::Refuse,
            seed: None,
            maximum_evaluations: None,
            command: vec!["oddwell fit data-demo/study.toml".to_owned()],
            threads: 2,
        };
        fit(&study, study.hypothesis(Some(name))?, &options, &mut |_, _| Control::Continue)?;
        runs.push(review(&options.out)?);
    }
    let made = page(&PageInput { runs: &runs, weighed: &[], command: "oddwell report", version: "oddwell" });
    let file = folder.path().join("page.html");
    std::fs::write(&file, made.html)?;
    let picture = demo.join("report.png");
    let option = format!("--screenshot={}", picture.display());
    if open(&file, SIZE, &[&option])?.is_none() {
        return Err("there is no Chromium; install Debian's package chromium".into());
    }
    let bytes = std::fs::metadata(&picture)?.len();
    if bytes > 400_000 {
        return Err(format!("{} has {bytes} bytes, more than a README should load", picture.display()).into());
    }
    Ok(())
}
