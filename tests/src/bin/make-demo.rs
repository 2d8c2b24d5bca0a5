//! Makes the measurements of the demo: `cargo run --release -p oddwell-tests --bin make-demo` from the top of the project.

use std::path::Path;
use std::process::ExitCode;

fn main() -> ExitCode {
    let folder = Path::new("data-demo");
    let made = oddwell_tests::demo::files(&folder.join("study.toml")).map_err(|error| error.to_string());
    let written = made.and_then(|files| {
        files.into_iter().try_for_each(|(name, content)| {
            std::fs::write(folder.join(&name), content).map_err(|error| format!("{name}: {error}"))
        })
    });
    match written {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            #[allow(clippy::print_stderr, reason = "a program's message to whoever runs it")]
            {
                eprintln!("{message}");
            }
            ExitCode::FAILURE
        }
    }
}
