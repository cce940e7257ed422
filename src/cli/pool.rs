//! The threads that a command may use.

use super::exit::Exit;
use super::screen::complain;
use rayon::{ThreadPool, ThreadPoolBuilder};

/// That many threads, for what searches or designs on several. Complains where there can't be so
/// many.
pub fn pool(threads: usize) -> Result<ThreadPool, Exit> {
    ThreadPoolBuilder::new().num_threads(threads).build().map_err(|cause| {
        complain(&format!("{threads} threads can't be started: {cause}; give fewer with --jobs"));
        Exit::Failed
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_runs_there_has_as_many_threads_as_asked_for() {
        for threads in [1, 3] {
            assert_eq!(pool(threads).unwrap().install(rayon::current_num_threads), threads);
        }
    }
}
