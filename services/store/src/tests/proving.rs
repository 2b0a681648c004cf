//! Proofs over a log that is long enough to have full tiles.

use domain::ledger::tiles::Edge;
use domain::ledger::tree::TreeHead;
use domain::ledger::tree::{Frontier, Hash, leaf_hash, verify_consistency, verify_inclusion};
use sqlx::QueryBuilder;

use super::book::{Book, Ground};
use crate::db::on;
use crate::log::Head;
use crate::proofs::Prover;
use crate::tiles;
use crate::writes::Writes;

const LENGTH: u64 = 66_000;

fn leaf(seq: u64) -> Hash {
    leaf_hash(&seq.to_be_bytes())
}

fn head_of(size: u64) -> TreeHead {
    let mut frontier = Frontier::default();
    (0..size).for_each(|seq| frontier.push(leaf(seq)));
    frontier.head()
}

/// Writes leaf hashes and tiles without the book; nothing reads the entries' bytes here.
async fn write_long_log(book: &Book) {
    let mut tx = book.db.begin().await.unwrap();
    let number = book.site.number;
    let seqs: Vec<i64> = (0..i64::try_from(LENGTH).unwrap()).collect();
    on!(&mut tx.conn(), |c| for piece in seqs.chunks(1_000) {
        let mut query = QueryBuilder::new("insert into entry (site, seq, bytes, leaf_hash) ");
        query.push_values(piece, |mut values, seq| {
            let hash = leaf(seq.cast_unsigned()).0.to_vec();
            values.push_bind(number.0).push_bind(seq).push_bind(&b"{}"[..]).push_bind(hash);
        });
        query.build().execute(&mut *c).await.unwrap();
    });
    let mut edge = Edge::default();
    for tile in (0..LENGTH).flat_map(|seq| edge.push(leaf(seq))) {
        tiles::put(&mut tx.conn(), number, &tile).await.unwrap();
    }
    let frontier = edge.frontier();
    let head = Head {
        root: frontier.root(),
        frontier,
        note: String::new(),
        last_recorded_at: domain::stamp::Micros(0),
    };
    let mut writes = Writes::default();
    writes.head(&head);
    writes.send(&mut tx.conn(), number).await.unwrap();
    tx.commit().await.unwrap();
}

async fn check(ground: Ground) {
    let book = Book::open(ground).await;
    write_long_log(&book).await;
    let mut held = book.db.reader().await.unwrap();
    let (mut conn, site, prover) = (held.conn(), book.site.number, Prover::default());
    assert_eq!(tiles::count(&mut conn, site).await.unwrap(), 1);

    let whole = head_of(LENGTH);
    for seq in [0, 255, 256, 40_000, 65_535, 65_536, LENGTH - 1] {
        let proof = prover.inclusion(&mut conn, site, seq, LENGTH).await.unwrap();
        verify_inclusion(&leaf(seq), seq, &whole, &proof).unwrap();
    }
    for old in [1, 300, 65_536, 65_999] {
        let proof = prover.consistency(&mut conn, site, old, LENGTH).await.unwrap();
        verify_consistency(&head_of(old), &whole, &proof).unwrap();
    }
    let early = prover.inclusion(&mut conn, site, 7, 500).await.unwrap();
    verify_inclusion(&leaf(7), 7, &head_of(500), &early).unwrap();
    assert!(prover.inclusion(&mut conn, site, 0, LENGTH + 1).await.is_err());
}

#[tokio::test]
async fn proofs_from_stored_tiles_hold_on_sqlite() {
    check(Ground::file()).await;
}

#[tokio::test]
async fn proofs_from_stored_tiles_hold_on_postgres() {
    check(Ground::server()).await;
}
