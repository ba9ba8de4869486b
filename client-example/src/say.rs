//! Writing to the terminal: what is said is said plainly, and a reader that has gone away is no error.

use std::io::{self, Write as _};
use std::sync::atomic::{AtomicBool, Ordering};

use crate::escape;

/// Whether something that was said could not be written.
static LOST: AtomicBool = AtomicBool::new(false);

/// A line, or several, to standard output.
pub(crate) fn out(text: &str) {
    let mut stdout = io::stdout().lock();
    let written = writeln!(stdout, "{}", escape::terminal(text)).and_then(|()| stdout.flush());
    // `ropewalk … | head` closes the pipe early; there is nobody left to tell.
    if written.is_err_and(|error| error.kind() != io::ErrorKind::BrokenPipe) {
        LOST.store(true, Ordering::Relaxed);
    }
}

/// Whether something that was said to standard output could not be written, other than to a reader that has gone.
pub(crate) fn is_lost() -> bool {
    LOST.load(Ordering::Relaxed)
}

/// A line, or several, to standard error.
pub(crate) fn err(text: &str) {
    let _ = writeln!(std::io::stderr().lock(), "{}", escape::terminal(text));
}
