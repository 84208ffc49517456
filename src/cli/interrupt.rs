//! Ctrl-C: stop at once and leave nothing half-written.
//!
//! The library needs no cooperation for this: results exist only as a folder under
//! construction, which the handler removes. While that folder is being put in place
//! the handler waits, so that the exchange is whole or not at all.

use std::path::PathBuf;
use std::sync::{Mutex, MutexGuard, PoisonError};
use std::time::Duration;

/// The folder under construction.
static PARTIAL: Mutex<Option<PathBuf>> = Mutex::new(None);

/// Take charge of Ctrl-C (and of termination, where the system tells).
pub fn watch() {
    // A system without signals changes nothing for the user.
    let _ = ctrlc::set_handler(|| {
        let partial = partial();
        if let Some(folder) = partial.as_ref() {
            // Another thread may just be adding a file: try until it is gone.
            for _ in 0..20 {
                if std::fs::remove_dir_all(folder).is_ok() || !folder.exists() {
                    break;
                }
                std::thread::sleep(Duration::from_millis(10));
            }
        }
        super::terminal::complain(
            "interrupted; nothing was written, earlier results are untouched",
        );
        std::process::exit(super::FAILED.into());
    });
}

/// The folder under construction; while this is held an interruption waits.
pub fn partial() -> MutexGuard<'static, Option<PathBuf>> {
    PARTIAL.lock().unwrap_or_else(PoisonError::into_inner)
}
