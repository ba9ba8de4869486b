//! Writing to the terminal: what is said is said plainly, and a reader that has gone away is no error.

use std::io::Write as _;

use crate::escape;

/// A line, or several, to standard output.
pub(crate) fn out(text: &str) {
    // `ropewalk … | head` closes the pipe early; there is nobody left to tell.
    let _ = writeln!(std::io::stdout().lock(), "{}", escape::terminal(text));
}

/// A line, or several, to standard error.
pub(crate) fn err(text: &str) {
    let _ = writeln!(std::io::stderr().lock(), "{}", escape::terminal(text));
}
