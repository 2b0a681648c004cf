//! How many rows go into one statement.
//!
//! Each number of rows is another text, and prepared texts are kept: so only some numbers are used, few enough to keep
//! all their texts and close enough together that a group of any size needs few statements.

/// Rows in one statement at most: SQLite takes 32,766 values (its manual, "Limits", number 9), and no table has
/// more than 63 columns.
const LARGEST: usize = 256;

/// Cuts a slice into pieces of 256, 128 or 64, then a multiple of 8, then what is left.
pub(crate) fn pieces<T>(mut rows: &[T]) -> impl Iterator<Item = &[T]> {
    std::iter::from_fn(move || {
        let length = match rows.len().min(LARGEST) {
            0 => return None,
            few @ 1..8 => few,
            some @ 8..64 => some / 8 * 8,
            many => 1 << many.ilog2(),
        };
        let (piece, rest) = rows.split_at(length);
        rows = rest;
        Some(piece)
    })
}

/// Cuts what is looked up into lists whose lengths are powers of two, repeating the last item: to ask for it twice does
/// no harm.
pub(crate) fn padded<T: Copy>(items: &[T]) -> impl Iterator<Item = Vec<T>> {
    items.chunks(LARGEST).map(|chunk| {
        let mut list = chunk.to_vec();
        if let Some(last) = chunk.last() {
            list.resize(chunk.len().next_power_of_two(), *last);
        }
        list
    })
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use super::*;

    #[test]
    fn pieces_leave_nothing_out() {
        let rows: Vec<u32> = (0..799).collect();
        let lengths: Vec<usize> = pieces(&rows).map(<[u32]>::len).collect();
        assert_eq!(lengths, [256, 256, 256, 24, 7]);
        assert_eq!(pieces(&rows).flatten().copied().collect::<Vec<_>>(), rows);
        assert_eq!(pieces::<u32>(&[]).count(), 0);
    }

    #[test]
    fn a_group_of_any_size_needs_few_statements_of_few_lengths() {
        let rows = [0_u8; LARGEST];
        let mut lengths = BTreeSet::new();
        for size in 1..=LARGEST {
            let pieces: Vec<_> = pieces(&rows[..size]).map(<[u8]>::len).collect();
            assert!(pieces.len() <= 4, "{size}: {pieces:?}");
            lengths.extend(pieces);
        }
        assert_eq!(lengths.len(), 7 + 7 + 3);
    }

    #[test]
    fn a_list_is_filled_up_with_its_last_item() {
        assert_eq!(padded(&[1, 2, 3, 4, 5]).collect::<Vec<_>>(), [[1, 2, 3, 4, 5, 5, 5, 5]]);
        assert_eq!(padded(&[0; 600]).map(|list| list.len()).collect::<Vec<_>>(), [256, 256, 128]);
        assert_eq!(padded::<u8>(&[]).count(), 0);
    }
}
