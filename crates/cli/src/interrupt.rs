//! Ctrl-C and SIGTERM: the first asks a fit to stop and write what there is, the second ends the program.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::ending::Status;
use crate::output::{Output, say};

/// Whether the user asked to stop.
#[derive(Clone, Debug, Default)]
pub(crate) struct Interrupt(Arc<AtomicBool>);

impl Interrupt {
    /// Listens from now on.
    pub(crate) fn listen(output: Output) -> Self {
        let interrupt = Self::default();
        let heard = interrupt.clone();
        let handler = move || {
            if heard.0.swap(true, Ordering::SeqCst) {
                std::process::exit(i32::from(Status::Interrupted.code()));
            }
            if !output.quiet {
                say(
                    "\nstopping, and writing what has been sampled; once more ends at once and writes nothing",
                );
            }
        };
        // Fails only if something listens already, or the system cannot: then a signal ends the program as it always does.
        let _ = ctrlc::set_handler(handler);
        interrupt
    }

    /// Whether a signal came.
    pub(crate) fn came(&self) -> bool {
        self.0.load(Ordering::SeqCst)
    }
}
