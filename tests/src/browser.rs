//! Headless Chromium, for what can only be seen in a browser.

use std::path::Path;
use std::process::Command;

/// The names under which systems have it.
const NAMES: [&str; 3] = ["chromium", "chromium-browser", "google-chrome"];

/// Opens a page in a window of that size, with further options, and returns what Chromium prints on standard output and
/// on standard error. None where there is no Chromium.
///
/// # Errors
/// What the operating system says if Chromium can't be run.
pub fn open(
    page: &Path,
    (width, height): (u32, u32),
    options: &[&str],
) -> std::io::Result<Option<(String, String)>> {
    let profile = tempfile::tempdir()?;
    for name in NAMES {
        let run = Command::new(name)
            // The machines of tests are root's, where Chromium's own sandbox can't be.
            .args([
                "--headless",
                "--no-sandbox",
                "--disable-gpu",
                "--hide-scrollbars",
                "--force-prefers-reduced-motion",
            ])
            .args([
                "--enable-logging=stderr",
                "--virtual-time-budget=20000",
                "--disable-background-networking",
            ])
            .arg(format!("--user-data-dir={}", profile.path().display()))
            .arg(format!("--window-size={width},{height}"))
            .args(options)
            .arg(format!("file://{}", page.display()))
            .output();
        match run {
            Ok(output) => {
                let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).into_owned();
                return Ok(Some((text(&output.stdout), text(&output.stderr))));
            }
            Err(error) if error.kind() == std::io::ErrorKind::NotFound => {}
            Err(error) => return Err(error),
        }
    }
    Ok(None)
}
