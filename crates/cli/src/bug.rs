//! What a user sees of a panic: that the program is at fault, not the study, and what to report.

use std::panic::{self, AssertUnwindSafe, PanicHookInfo};
use std::sync::atomic::{AtomicBool, Ordering};

use crate::ending::Status;
use crate::output::say;

/// Runs the program. A panic anywhere, also on another thread, is said once and ends it with status 1.
pub(crate) fn guarded(program: impl FnOnce() -> Status) -> Status {
    let said = AtomicBool::new(false);
    panic::set_hook(Box::new(move |info| {
        // Many threads may meet the same fault at once.
        if !said.swap(true, Ordering::Relaxed) {
            say(&text(&message(info), &info.location().map(ToString::to_string).unwrap_or_default()));
        }
    }));
    // Nothing that the program held is looked at afterwards.
    panic::catch_unwind(AssertUnwindSafe(program)).unwrap_or(Status::InputWrong)
}

fn message(info: &PanicHookInfo<'_>) -> String {
    let payload = info.payload();
    let text = payload.downcast_ref::<&str>().copied().or_else(|| payload.downcast_ref().map(String::as_str));
    text.unwrap_or("no message").to_owned()
}

fn text(message: &str, location: &str) -> String {
    format!(
        "error: this is a bug in oddwell {}, not in your study: {message} ({location})\n\
         please report it with this message, the command line and, if you can share them, the study and its data; \
         results of a run at hand are not written",
        env!("CARGO_PKG_VERSION")
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_panic_is_said_and_ends_with_status_1() {
        let before = panic::take_hook();
        let status =
            guarded(|| std::thread::scope(|scope| scope.spawn(fault).join().unwrap_or_else(|_| fault())));
        panic::set_hook(before);
        assert_eq!(status, Status::InputWrong);
    }

    #[allow(clippy::panic, reason = "the thing to be caught")]
    fn fault() -> Status {
        panic!("a fault for a test");
    }

    #[test]
    fn it_names_version_fault_and_place() {
        assert_eq!(
            text("index out of bounds", "crates/model/src/lib.rs:7:3"),
            concat!(
                "error: this is a bug in oddwell ",
                env!("CARGO_PKG_VERSION"),
                ", not in your study: index out of bounds (crates/model/src/lib.rs:7:3)\n",
                "please report it with this message, the command line and, if you can share them, the study and its \
                 data; results of a run at hand are not written"
            )
        );
    }
}
