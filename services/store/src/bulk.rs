//! How many rows go into one statement.
//!
//! Each number of rows is another text, and prepared texts are kept: so rows go in powers of two, and a group of any
//! size needs few texts.

/// Rows in one statement at most: SQLite takes 32,766 values, and no table has more than 63 columns.
const LARGEST: usize = 256;

/// Cuts a slice into pieces whose lengths are powers of two, the largest first.
pub(crate) fn pieces<T>(mut rows: &[T]) -> impl Iterator<Item = &[T]> {
    std::iter::from_fn(move || {
        let length = 1 << rows.len().min(LARGEST).checked_ilog2()?;
        let (piece, rest) = rows.split_at(length);
        rows = rest;
        Some(piece)
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pieces_are_powers_of_two_and_leave_nothing_out() {
        let rows: Vec<u32> = (0..777).collect();
        let lengths: Vec<usize> = pieces(&rows).map(<[u32]>::len).collect();
        assert_eq!(lengths, [256, 256, 256, 8, 1]);
        assert_eq!(pieces(&rows).flatten().copied().collect::<Vec<_>>(), rows);
        assert_eq!(pieces::<u32>(&[]).count(), 0);
    }
}
