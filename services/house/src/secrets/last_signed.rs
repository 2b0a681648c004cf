//! The last head this instance signed for each log, kept outside the database.
//!
//! A database put back from an old backup, or forked by a second instance, would sign a history that contradicts one
//! already handed out. The writer therefore asks [`LastSigned::last`] and compares before it signs, and after the
//! commit tells [`LastSigned::store`] what it signed; a commit that failed leaves no trace here. A log is known by its
//! origin, the name under which its heads are signed, not by what a database says of its sites. Each file is read
//! once; then its record is remembered.
//!
//! One record of 86 bytes per log, written in place by one `pwrite` and **not** synced: an fsync for each commit
//! would halve the rate of a single client. After a power cut the file may lag behind the log, which is harmless
//! (an older head is still a prefix), and a record of one disk sector is not torn. A lost file means only that the
//! next head is accepted unseen, so it belongs into no backup: restoring it together with the database hides a fork.

use std::collections::HashMap;
use std::fs::{File, OpenOptions};
use std::io;
use std::os::unix::fs::{FileExt, OpenOptionsExt};
use std::path::PathBuf;
use std::sync::{Mutex, PoisonError};

use domain::ledger::tree::{Hash, TreeHead};

/// Twenty digits, a blank, 64 hexadecimal digits, a line feed.
const RECORD: usize = 86;

/// Why what was signed last is not known.
#[derive(Debug, thiserror::Error)]
pub enum LastSignedError {
    /// The record on disk is not one of ours.
    #[error("{path} is damaged: compare the log with the last head that left the house, then remove the file",
        path = .0.display())]
    Damaged(PathBuf),
    /// Reading or writing failed.
    #[error("{path} cannot be used", path = .path.display())]
    Io {
        /// The file.
        path: PathBuf,
        /// The cause.
        source: io::Error,
    },
}

/// The memory of what was signed last, one file per log.
#[derive(Debug)]
pub struct LastSigned {
    directory: PathBuf,
    known: Mutex<HashMap<String, Known>>,
}

impl LastSigned {
    pub(super) fn in_directory(directory: PathBuf) -> Self {
        Self { directory, known: Mutex::new(HashMap::new()) }
    }

    /// What was signed last for a log, if anything was.
    ///
    /// # Errors
    /// [`LastSignedError::Damaged`] or [`LastSignedError::Io`].
    pub fn last(&self, origin: &str) -> Result<Option<TreeHead>, LastSignedError> {
        self.with(origin, |known| Ok(known.head))
    }

    /// Remembers `head` as the last one signed.
    ///
    /// # Errors
    /// [`LastSignedError::Io`].
    pub fn store(&self, origin: &str, head: TreeHead) -> Result<(), LastSignedError> {
        let record = write_record(&head);
        self.with(origin, |known| {
            known.file.write_all_at(record.as_bytes(), 0)?;
            known.head = Some(head);
            Ok(())
        })
    }

    fn path(&self, origin: &str) -> PathBuf {
        self.directory.join(format!("{}.head", Hash::of(origin.as_bytes())))
    }

    fn with<T>(
        &self,
        origin: &str,
        work: impl FnOnce(&mut Known) -> io::Result<T>,
    ) -> Result<T, LastSignedError> {
        let failed = |source| LastSignedError::Io { path: self.path(origin), source };
        let mut all = self.known.lock().unwrap_or_else(PoisonError::into_inner);
        if !all.contains_key(origin) {
            all.insert(origin.to_owned(), self.open(origin)?);
        }
        let known = all.get_mut(origin).ok_or_else(|| failed(io::ErrorKind::NotFound.into()))?;
        work(known).map_err(failed)
    }

    fn open(&self, origin: &str) -> Result<Known, LastSignedError> {
        let path = self.path(origin);
        let mut options = OpenOptions::new();
        options.read(true).write(true).create(true).truncate(false).mode(0o600);
        let opened = options.open(&path).and_then(|file| Ok((read(&file)?, file)));
        match opened {
            Ok((Some(head), file)) => Ok(Known { file, head }),
            Ok((None, _)) => Err(LastSignedError::Damaged(path)),
            Err(source) => Err(LastSignedError::Io { path, source }),
        }
    }
}

/// A log's file, and what it says.
#[derive(Debug)]
struct Known {
    file: File,
    head: Option<TreeHead>,
}

/// `Some(None)` for a new, empty file; `None` for a damaged one.
#[expect(clippy::option_option, reason = "nothing yet and nothing readable are different answers")]
fn read(file: &File) -> io::Result<Option<Option<TreeHead>>> {
    if file.metadata()?.len() == 0 {
        return Ok(Some(None));
    }
    let mut record = [0_u8; RECORD];
    match file.read_exact_at(&mut record, 0) {
        Ok(()) => Ok(read_record(&record).map(Some)),
        Err(error) if error.kind() == io::ErrorKind::UnexpectedEof => Ok(None),
        Err(error) => Err(error),
    }
}

fn write_record(head: &TreeHead) -> String {
    format!("{:020} {}\n", head.size, head.root)
}

fn read_record(record: &[u8; RECORD]) -> Option<TreeHead> {
    let text = std::str::from_utf8(record).ok()?;
    let (size, root) = text.strip_suffix('\n')?.split_once(' ')?;
    let head = TreeHead { size: size.parse().ok()?, root: root.parse().ok()? };
    (write_record(&head) == text).then_some(head)
}

#[cfg(test)]
mod tests {
    use super::*;

    const LOG: &str = "cellar.example/book";

    fn head(size: u64, root: u8) -> TreeHead {
        TreeHead { size, root: Hash([root; 32]) }
    }

    #[test]
    fn what_was_signed_last_is_remembered_over_a_restart() {
        let home = tempfile::tempdir().unwrap();
        let memory = LastSigned::in_directory(home.path().to_owned());
        assert_eq!(memory.last(LOG).unwrap(), None);
        memory.store(LOG, head(1, 1)).unwrap();
        memory.store(LOG, head(9, 2)).unwrap();
        assert_eq!(memory.last(LOG).unwrap(), Some(head(9, 2)));
        let restarted = LastSigned::in_directory(home.path().to_owned());
        assert_eq!(restarted.last(LOG).unwrap(), Some(head(9, 2)));
        assert_eq!(restarted.last("other.example/book").unwrap(), None);
    }

    #[test]
    fn a_damaged_record_is_noticed() {
        let home = tempfile::tempdir().unwrap();
        let path = home.path().join(format!("{}.head", Hash::of(LOG.as_bytes())));
        let good = write_record(&head(9, 0xab));
        assert_eq!(good.len(), RECORD);
        for bad in [&good[..50], &good.replace('a', "A"), &good.replace(' ', "x"), "nonsense"] {
            std::fs::write(&path, bad).unwrap();
            let memory = LastSigned::in_directory(home.path().to_owned());
            assert!(matches!(memory.last(LOG), Err(LastSignedError::Damaged(_))), "{bad:?}");
        }
    }
}
