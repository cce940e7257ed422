//! Ctrl-C and a polite end from outside.

use super::Exit;
use signal_hook::consts::{SIGINT, SIGTERM, SIGXFSZ};
use signal_hook::iterator::Signals;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, PoisonError};

/// What the first SIGINT or SIGTERM sets, and what the second takes away before it ends
/// the program.
#[derive(Default)]
pub struct Interrupt {
    asked: AtomicBool,
    temporary: Mutex<Vec<PathBuf>>,
    /// Tells the user that the first one was heard.
    answer: Mutex<Option<Box<dyn Fn() + Send>>>,
}

impl Interrupt {
    /// Listens for signals from now on; the second ends the program at once with the
    /// status of an interrupted run.
    ///
    /// # Errors
    /// The system does not take the handlers.
    pub fn watch(self: &Arc<Self>) -> io::Result<()> {
        let mut signals = Signals::new([SIGINT, SIGTERM])?;
        let heard = Arc::clone(self);
        std::thread::Builder::new().name("signals".into()).spawn(move || {
            for _ in signals.forever() {
                if heard.asked.swap(true, Ordering::Relaxed) {
                    // Held until the end, so that no thread can begin another file.
                    let files = heard.temporary.lock().unwrap_or_else(PoisonError::into_inner);
                    remove(&files);
                    std::process::exit(Exit::Interrupted.code().into());
                }
                if let Some(answer) = &*heard.answer.lock().unwrap_or_else(PoisonError::into_inner) {
                    answer();
                }
            }
        })?;
        Ok(())
    }

    /// What is to be done at once when the first signal comes, in the thread that hears it.
    pub fn answer_with(&self, answer: impl Fn() + Send + 'static) {
        *self.answer.lock().unwrap_or_else(PoisonError::into_inner) = Some(Box::new(answer));
    }

    /// Whether the run is to end early.
    pub fn asked(&self) -> bool {
        self.asked.load(Ordering::Relaxed)
    }

    /// Notes a file that must not be left if the program ends at once.
    pub fn temporary(&self, path: &Path) {
        let mut files = self.temporary.lock().unwrap_or_else(PoisonError::into_inner);
        // Those that have got their final name by now are no longer there.
        files.retain(|file| file.exists());
        files.push(path.to_path_buf());
    }
}

/// Lets writing beyond a limit on the size of files be an error of that file: the signal
/// that comes with it would end the program.
///
/// # Errors
/// The system does not take the handler.
pub fn outlive_file_size_limit() -> io::Result<()> {
    signal_hook::flag::register(SIGXFSZ, Arc::default()).map(drop)
}

fn remove(files: &[PathBuf]) {
    for file in files {
        // Gone already, or on a disk that is: there is nothing else to be done.
        _ = fs::remove_file(file);
    }
}
