//! Identifiers, drawn here and nowhere else.
//!
//! An id is a UUID of version 7 (RFC 9562 section 5.7): 48 bits of milliseconds, so that ids sort by time, and 74
//! bits drawn anew for each id. No counter is shared between ids: an entry's id also keeps its leaf hash unguessable
//! for those who may not read the entry. An id is no secret for all that, and never opens a door.

use domain::stamp::Micros;
use uuid::{Builder, Uuid};

/// The operating system gave no randomness.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
#[error("the operating system gives no randomness")]
pub struct NoRandomness(#[from] getrandom::Error);

/// Draws identifiers.
#[derive(Clone, Copy, Debug, Default)]
pub struct Ids;

impl Ids {
    /// Draws an id of any kind for something that begins at `at`; a time before 1970 counts as 1970.
    ///
    /// # Errors
    /// [`NoRandomness`].
    ///
    /// ```
    /// use domain::{ids::BatchId, stamp::Micros};
    /// let id: BatchId = house::ids::Ids.draw(Micros(1_757_610_000_000_000))?;
    /// assert_eq!(id.0.get_version_num(), 7);
    /// # Ok::<(), house::ids::NoRandomness>(())
    /// ```
    pub fn draw<T: From<Uuid>>(self, at: Micros) -> Result<T, NoRandomness> {
        let mut random = [0_u8; 10];
        getrandom::fill(&mut random)?;
        let millis = u64::try_from(at.0.div_euclid(1_000)).unwrap_or(0);
        Ok(Builder::from_unix_timestamp_millis(millis, &random).into_uuid().into())
    }
}

#[cfg(test)]
mod tests {
    use std::collections::HashSet;

    use super::*;

    #[test]
    fn ids_are_version_7_and_carry_their_millisecond() {
        let id: Uuid = Ids.draw(Micros(1_757_610_000_123_456)).unwrap();
        assert_eq!(id.get_version_num(), 7);
        assert_eq!(id.get_variant(), uuid::Variant::RFC4122);
        assert_eq!(id.as_u128() >> 80, 1_757_610_000_123);
        let early: Uuid = Ids.draw(Micros(-5)).unwrap();
        assert_eq!(early.as_u128() >> 80, 0);
    }

    #[test]
    fn all_free_bits_differ_between_ids_of_one_millisecond() {
        let at = Micros(1_757_610_000_000_000);
        let ids: Vec<u128> = (0..200).map(|_| Ids.draw::<Uuid>(at).unwrap().as_u128()).collect();
        assert_eq!(ids.iter().collect::<HashSet<_>>().len(), ids.len());
        let ever_set = ids.iter().fold(0, |a, b| a | b);
        let always_set = ids.iter().fold(u128::MAX, |a, b| a & b);
        let free: u128 = (0xfff << 64) | ((1 << 62) - 1);
        assert_eq!((ever_set & !always_set) & free, free, "a free bit never moved");
    }
}
