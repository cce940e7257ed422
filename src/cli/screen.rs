//! The two streams: what was asked for goes to stdout, errors go to stderr.

use super::Exit;
use super::table::printable;
use std::io::{self, Write, stderr, stdout};

/// Writes `bandproof: ` and a sentence to stderr, each line of several with the name.
/// Control characters are escaped: an error may name a file, whose name must not steer the
/// terminal.
pub fn complain(sentences: &str) {
    let mut err = stderr().lock();
    for line in sentences.lines() {
        // Nobody is left to tell if stderr itself is gone.
        let _ = writeln!(err, "bandproof: {}", printable(line));
    }
}

/// Writes `bandproof: ` and a text of several lines to stderr: what is wrong with the
/// command line and how it is used.
pub fn complain_of_usage(text: &str) {
    let _ = writeln!(stderr().lock(), "bandproof: {}", text.trim_end());
}

/// Writes the help to stderr: nothing was asked for.
pub fn show_help(text: &str) {
    let _ = write!(stderr().lock(), "{text}");
}

/// Prints `text` and ends with `exit`, or with a graver status if stdout does not
/// take it.
pub fn print(text: &str, exit: Exit) -> Exit {
    print_with(exit, |out| out.write_all(text.as_bytes()))
}

/// Lets `write` print, and ends with `exit` or with a graver status if that fails.
/// A reader that has seen enough and closed the pipe is no failure.
pub fn print_with(exit: Exit, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Exit {
    let mut out = io::BufWriter::new(stdout().lock());
    match write(&mut out).and_then(|()| out.flush()) {
        Ok(()) => exit,
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => exit,
        Err(error) => {
            complain(&format!("printing to standard output failed: {error}"));
            exit.max(Exit::Failed)
        }
    }
}

/// Prints a JSON document in the report's layout.
pub fn print_document(document: &serde_json::Value, exit: Exit) -> Exit {
    print_with(exit, |mut out| {
        bandproof::report::write_pretty(&mut out, document, 0)?;
        out.write_all(b"\n")
    })
}
