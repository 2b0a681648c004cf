//! The last head this instance signed for each site, kept outside the database.
//!
//! A database put back from an old backup, or forked by a second instance, would sign a history that contradicts one
//! already handed out. The writer therefore asks [`LastSigned::last`] and compares before it signs, and after the
//! commit tells [`LastSigned::store`] what it signed; a commit that failed leaves no trace here.
//!
//! One record of 86 bytes per site, written in place by one `pwrite` and **not** synced: an fsync for each commit
//! would halve the rate of a single client. After a power cut the file may lag behind the log, which is harmless
//! (an older head is still a prefix), and a record of one disk sector is not torn. A lost file means only that the
//! next head is accepted unseen, so it belongs into no backup: restoring it together with the database hides a fork.

use std::collections::HashMap;
use std::fs::{File, OpenOptions};
use std::io;
use std::os::unix::fs::{FileExt, OpenOptionsExt};
use std::path::PathBuf;
use std::sync::{Mutex, PoisonError};

use domain::ids::SiteId;

/// Twenty digits, a blank, 64 hexadecimal digits, a line feed.
const RECORD: usize = 86;

/// Size and root of a signed head.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct SignedHead {
    /// How many entries.
    pub size: u64,
    /// The root hash over them (RFC 9162).
    pub root: [u8; 32],
}

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

/// The memory of what was signed last, one file per site.
#[derive(Debug)]
pub struct LastSigned {
    directory: PathBuf,
    files: Mutex<HashMap<SiteId, File>>,
}

impl LastSigned {
    pub(super) fn in_directory(directory: PathBuf) -> Self {
        Self { directory, files: Mutex::new(HashMap::new()) }
    }

    /// What was signed last for a site, if anything was.
    ///
    /// # Errors
    /// [`LastSignedError::Damaged`] or [`LastSignedError::Io`].
    pub fn last(&self, site: SiteId) -> Result<Option<SignedHead>, LastSignedError> {
        self.with_file(site, read)?.ok_or_else(|| LastSignedError::Damaged(self.path(site)))
    }

    /// Remembers `head` as the last one signed.
    ///
    /// # Errors
    /// [`LastSignedError::Io`].
    pub fn store(&self, site: SiteId, head: SignedHead) -> Result<(), LastSignedError> {
        let record = write_record(&head);
        self.with_file(site, |file| file.write_all_at(record.as_bytes(), 0))
    }

    fn path(&self, site: SiteId) -> PathBuf {
        self.directory.join(format!("{site}.head"))
    }

    fn with_file<T>(
        &self,
        site: SiteId,
        work: impl FnOnce(&File) -> io::Result<T>,
    ) -> Result<T, LastSignedError> {
        let failed = |source| LastSignedError::Io { path: self.path(site), source };
        let mut files = self.files.lock().unwrap_or_else(PoisonError::into_inner);
        let file = match files.entry(site) {
            std::collections::hash_map::Entry::Occupied(known) => known.into_mut(),
            std::collections::hash_map::Entry::Vacant(new) => {
                let mut options = OpenOptions::new();
                options.read(true).write(true).create(true).truncate(false).mode(0o600);
                new.insert(options.open(self.path(site)).map_err(failed)?)
            }
        };
        work(file).map_err(failed)
    }
}

/// `Some(None)` for a new, empty file; `None` for a damaged one.
#[expect(clippy::option_option, reason = "nothing yet and nothing readable are different answers")]
fn read(file: &File) -> io::Result<Option<Option<SignedHead>>> {
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

fn write_record(head: &SignedHead) -> String {
    let (high, low) = head.root.split_at(16);
    let hex = |half: &[u8]| half.iter().fold(0_u128, |sum, byte| (sum << 8) | u128::from(*byte));
    format!("{:020} {:032x}{:032x}\n", head.size, hex(high), hex(low))
}

fn read_record(record: &[u8; RECORD]) -> Option<SignedHead> {
    let text = std::str::from_utf8(record).ok()?;
    let (size, root) = text.strip_suffix('\n')?.split_once(' ')?;
    let mut head = SignedHead { size: size.parse().ok()?, root: [0; 32] };
    for (byte, digits) in head.root.iter_mut().zip(root.as_bytes().chunks(2)) {
        *byte = u8::from_str_radix(std::str::from_utf8(digits).ok()?, 16).ok()?;
    }
    (write_record(&head) == text).then_some(head)
}

#[cfg(test)]
mod tests {
    use uuid::Uuid;

    use super::*;

    const SITE: SiteId = SiteId(Uuid::from_u128(7));

    fn head(size: u64, root: u8) -> SignedHead {
        SignedHead { size, root: [root; 32] }
    }

    #[test]
    fn what_was_signed_last_is_remembered_over_a_restart() {
        let home = tempfile::tempdir().unwrap();
        let memory = LastSigned::in_directory(home.path().to_owned());
        assert_eq!(memory.last(SITE).unwrap(), None);
        memory.store(SITE, head(1, 1)).unwrap();
        memory.store(SITE, head(9, 2)).unwrap();
        let restarted = LastSigned::in_directory(home.path().to_owned());
        assert_eq!(restarted.last(SITE).unwrap(), Some(head(9, 2)));
        assert_eq!(restarted.last(SiteId(Uuid::from_u128(8))).unwrap(), None);
    }

    #[test]
    fn a_damaged_record_is_noticed() {
        let home = tempfile::tempdir().unwrap();
        let path = home.path().join(format!("{SITE}.head"));
        let good = write_record(&head(9, 0xab));
        assert_eq!(good.len(), RECORD);
        for bad in [&good[..50], &good.replace('a', "A"), &good.replace(' ', "x"), "nonsense"] {
            std::fs::write(&path, bad).unwrap();
            let memory = LastSigned::in_directory(home.path().to_owned());
            assert!(matches!(memory.last(SITE), Err(LastSignedError::Damaged(_))), "{bad:?}");
        }
    }
}
