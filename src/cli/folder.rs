//! The results' folder: it appears whole or not at all.
//!
//! Files go to a hidden folder beside the target. At the end the two exchange names in
//! one step where the system can (`renameat2`, `renamex_np`); elsewhere the old folder
//! steps aside first and is put back, by this run or the next, if the new one does not
//! arrive. A folder that `facula` did not write is never replaced.

use super::interrupt;
use anyhow::{Context, Result, bail};
use std::fs::{self, File};
use std::path::{Path, PathBuf};

/// Held locked in a folder under construction, so that another run can tell it from a dead one's.
const LOCK: &str = ".lock";

/// A results' folder under construction.
pub struct Folder {
    target: PathBuf,
    partial: PathBuf,
    /// Keeps the lock until the folder is in place.
    lock: Option<File>,
}

impl Folder {
    /// Begin beside `target`, after checking that it may be replaced.
    pub fn begin(target: &Path) -> Result<Folder> {
        let target = std::path::absolute(target)
            .and_then(follow)
            .with_context(|| format!("\"{}\" is no place for results", target.display()))?;
        if std::env::current_dir().is_ok_and(|here| here.starts_with(&target)) {
            bail!(
                "\"{}\" is no place for results while you stand in it: name a folder below it with --out",
                target.display()
            );
        }
        let (Some(parent), Some(name)) = (target.parent(), target.file_name()) else {
            bail!(
                "\"{}\" is no place for results: name a folder with --out",
                target.display()
            );
        };
        let name = name.to_string_lossy();
        fs::create_dir_all(parent)
            .with_context(|| format!("\"{}\" cannot be made", parent.display()))?;
        let aside = parent.join(format!(".{name}.previous"));
        if aside.exists() && !target.exists() {
            fs::rename(&aside, &target).with_context(|| {
                format!(
                    "the earlier results in \"{}\" cannot be put back",
                    aside.display()
                )
            })?;
        }
        refuse_foreign(&target)?;
        sweep(parent, &format!(".{name}.partial-"));
        let partial = parent.join(format!(".{name}.partial-{}", std::process::id()));
        let cannot = || format!("results cannot be written to \"{}\"", parent.display());
        fs::create_dir(&partial).with_context(cannot)?;
        *interrupt::partial() = Some(partial.clone());
        let mut folder = Folder {
            target: target.clone(),
            partial,
            lock: None,
        };
        let lock = File::create(folder.partial.join(LOCK)).with_context(cannot)?;
        // Where files cannot be locked, a dead run's folder merely stays behind.
        let _ = lock.try_lock();
        folder.lock = Some(lock);
        Ok(folder)
    }

    /// Add a file.
    pub fn write(&self, name: &str, bytes: &[u8]) -> Result<()> {
        fs::write(self.partial.join(name), bytes)
            .with_context(|| format!("{name} cannot be written; earlier results are untouched"))
    }

    /// Put the folder in place of the target; returns the target.
    pub fn finish(mut self) -> Result<PathBuf> {
        let mut partial = interrupt::partial();
        self.lock = None;
        fs::remove_file(self.partial.join(LOCK))
            .and_then(|()| replace(&self.partial, &self.target))
            .with_context(|| {
                format!(
                    "\"{}\" cannot be put in place; earlier results are untouched",
                    self.target.display()
                )
            })
            .inspect_err(|_| discard(&self.partial))?;
        *partial = None;
        drop(partial);
        Ok(std::mem::take(&mut self.target))
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        if interrupt::partial().take().is_some() {
            discard(&self.partial);
        }
    }
}

/// What a link leads to, so that the link itself is not replaced; else the path as it is.
fn follow(path: PathBuf) -> std::io::Result<PathBuf> {
    if fs::symlink_metadata(&path).is_ok_and(|found| found.is_symlink()) {
        fs::canonicalize(path)
    } else {
        Ok(path)
    }
}

/// Remove a folder on the way out of a failure that is being reported already.
fn discard(partial: &Path) {
    let _ = fs::remove_dir_all(partial);
}

/// Refuse a target that is neither absent, empty, nor a folder of ours.
fn refuse_foreign(target: &Path) -> Result<()> {
    let shown = target.display();
    match fs::metadata(target) {
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => return Ok(()),
        Err(error) => {
            return Err(error).with_context(|| format!("\"{shown}\" cannot be looked at"));
        }
        Ok(found) if !found.is_dir() => bail!("\"{shown}\" is a file: name a folder with --out"),
        Ok(_) => {}
    }
    let mut entries =
        fs::read_dir(target).with_context(|| format!("\"{shown}\" cannot be looked at"))?;
    if entries.next().is_none() {
        return Ok(());
    }
    let ours = fs::read_to_string(target.join("summary.json"))
        .ok()
        .and_then(|text| serde_json::from_str::<serde_json::Value>(&text).ok())
        .is_some_and(|summary| summary.get("facula").is_some());
    if !ours {
        bail!(
            "\"{shown}\" holds something that facula did not write: name another folder with --out"
        );
    }
    Ok(())
}

/// Remove folders that runs now dead left under construction.
fn sweep(parent: &Path, prefix: &str) {
    for entry in fs::read_dir(parent).into_iter().flatten().flatten() {
        if entry.file_name().to_string_lossy().starts_with(prefix)
            && File::open(entry.path().join(LOCK)).is_ok_and(|lock| lock.try_lock().is_ok())
        {
            discard(&entry.path());
        }
    }
}

/// Put `partial` in place of `target`, and remove what was there.
fn replace(partial: &Path, target: &Path) -> std::io::Result<()> {
    if !target.exists() {
        return fs::rename(partial, target);
    }
    if exchange(partial, target) {
        // The new results are in place; the old ones now bear the partial name.
        discard(partial);
        return Ok(());
    }
    let name = target.file_name().unwrap_or_default().to_string_lossy();
    let aside = target.with_file_name(format!(".{name}.previous"));
    if aside.exists() {
        fs::remove_dir_all(&aside)?;
    }
    fs::rename(target, &aside)?;
    if let Err(error) = fs::rename(partial, target) {
        fs::rename(&aside, target)?;
        return Err(error);
    }
    discard(&aside);
    Ok(())
}

/// Exchange two names in one step, where the system can.
#[cfg(any(target_os = "linux", target_os = "macos"))]
fn exchange(one: &Path, other: &Path) -> bool {
    use rustix::fs::{CWD, RenameFlags, renameat_with};
    renameat_with(CWD, one, CWD, other, RenameFlags::EXCHANGE).is_ok()
}

#[cfg(not(any(target_os = "linux", target_os = "macos")))]
fn exchange(_one: &Path, _other: &Path) -> bool {
    false
}
