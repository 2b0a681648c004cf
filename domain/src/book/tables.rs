//! The projection tables. Ids and digests are bytes, times are microseconds, amounts are base units.

use super::table::{Column, Table};

/// Every projection table; raise [`PROJECTION_VERSION`] with each change here or in the fold.
pub fn tables() -> &'static [&'static Table] {
    static TABLES: [&Table; 19] = [
        &ADDITION,
        &ADOPTION,
        &BATCH,
        &CODE,
        &COMMAND,
        &DESCRIBED,
        &DEVIATION,
        &ENTRY_INDEX,
        &HOLDING,
        &LEG,
        &LOT,
        &PERSON,
        &PROPOSAL,
        &READING,
        &RECORD,
        &SETTING,
        &SIGNOFF,
        &SUBJECT,
        &SUBJECT_ENTRY,
    ];
    &TABLES
}

/// A store whose tables are of another version builds them anew.
pub const PROJECTION_VERSION: i64 = 1;

/// One row an entry: what it is and how it stands.
pub static ENTRY_INDEX: Table = Table {
    name: "entry_index",
    columns: &[
        Column::int("seq").check("seq >= 0"),
        Column::bytes("id"),
        Column::text("kind"),
        Column::int("occurred_at"),
        Column::int("recorded_at"),
        Column::text("actor"),
        Column::bytes("command"),
        Column::int("standing").check("standing in (0, 1, 2)"),
        Column::int("amended_by").or_null(),
    ],
    key: 1,
    indexes: &[&["id"]],
};

/// How many entries there are about a subject.
pub static SUBJECT: Table = Table {
    name: "subject",
    columns: &[Column::bytes("subject"), Column::int("n").check("n >= 1")],
    key: 1,
    indexes: &[],
};

/// Which entry is a subject's n-th.
pub static SUBJECT_ENTRY: Table = Table {
    name: "subject_entry",
    columns: &[
        Column::bytes("subject"),
        Column::int("n").check("n >= 1"),
        Column::int("seq").check("seq >= 0"),
    ],
    key: 2,
    indexes: &[],
};

/// Which entries a command wrote: the memory behind idempotency.
pub static COMMAND: Table = Table {
    name: "command",
    columns: &[
        Column::bytes("command"),
        Column::int("first_seq").check("first_seq >= 0"),
        Column::int("entries").check("entries >= 1"),
        Column::bytes("print"),
    ],
    key: 1,
    indexes: &[],
};

/// Which subject a human code names.
pub static CODE: Table = Table {
    name: "code",
    columns: &[Column::text("kind"), Column::text("code"), Column::bytes("id")],
    key: 2,
    indexes: &[],
};

/// Movements of matter.
pub static LEG: Table = Table {
    name: "leg",
    columns: &[
        Column::int("seq"),
        Column::int("leg").check("leg >= 0"),
        Column::bytes("holding"),
        Column::int("direction").check("direction in (-1, 1)"),
        Column::text("dimension"),
        Column::int("amount_base").check("amount_base >= 0"),
        Column::int("occurred_at"),
    ],
    key: 2,
    indexes: &[&["holding", "occurred_at", "seq"]],
};

/// What is booked where.
pub static HOLDING: Table = Table {
    name: "holding",
    columns: &[
        Column::bytes("holding"),
        Column::text("of_kind").check("of_kind in ('lot', 'batch', 'unexplained')"),
        Column::bytes("of_id"),
        Column::bytes("vessel").or_null(),
        Column::int("mass_ug"),
        Column::int("volume_ul"),
        Column::int("pieces"),
    ],
    key: 1,
    indexes: &[],
};

/// Lots.
pub static LOT: Table = Table {
    name: "lot",
    columns: &[
        Column::bytes("lot"),
        Column::text("code"),
        Column::bytes("material"),
        Column::bytes("supplier").or_null(),
        Column::text("supplier_lot").or_null(),
        Column::bytes("holding"),
        Column::text("status").check("status in ('held', 'released', 'rejected')"),
        Column::int("received_at"),
        Column::int("expires_at").or_null(),
        Column::text("dimension"),
        Column::int("received_base").check("received_base >= 0"),
        Column::int("remaining_base"),
    ],
    key: 1,
    indexes: &[&["received_at", "lot"]],
};

/// Batches.
pub static BATCH: Table = Table {
    name: "batch",
    columns: &[
        Column::bytes("batch"),
        Column::text("code"),
        Column::text("product_class"),
        Column::bytes("vessel"),
        Column::bytes("holding"),
        Column::int("opened_at"),
        Column::int("liquid_ul").check("liquid_ul > 0"),
        Column::text("last_gravity").or_null(),
        Column::int("last_gravity_at").or_null(),
    ],
    key: 1,
    indexes: &[&["opened_at", "batch"]],
};

/// Values read.
pub static READING: Table = Table {
    name: "reading",
    columns: &[
        Column::int("seq"),
        Column::int("item").check("item >= 0"),
        Column::bytes("batch"),
        Column::bytes("holding"),
        Column::text("quantity"),
        Column::int("occurred_at"),
        Column::text("value"),
        Column::text("unit"),
        Column::text("qualifier").or_null(),
        Column::text("corrected").or_null(),
    ],
    key: 2,
    indexes: &[&["batch", "occurred_at", "seq"]],
};

/// Additions, a row for each lot that went in.
pub static ADDITION: Table = Table {
    name: "addition",
    columns: &[
        Column::int("seq"),
        Column::int("line").check("line >= 0"),
        Column::bytes("batch"),
        Column::bytes("holding"),
        Column::bytes("lot"),
        Column::bytes("material"),
        Column::int("occurred_at"),
        Column::text("dimension"),
        Column::int("amount_base").check("amount_base >= 0"),
        Column::text("verdict"),
    ],
    key: 2,
    indexes: &[&["lot", "occurred_at"], &["batch", "occurred_at"]],
};

/// Proposals with the answer they got.
pub static PROPOSAL: Table = Table {
    name: "proposal",
    columns: &[
        Column::bytes("proposal"),
        Column::int("seq"),
        Column::bytes("batch"),
        Column::int("planned_at"),
        Column::int("lapses_at"),
        Column::text("verdict").check("verdict in ('clear', 'advise', 'refer', 'refuse')"),
    ],
    key: 1,
    indexes: &[&["batch", "seq"]],
};

/// Signatures.
pub static SIGNOFF: Table = Table {
    name: "signoff",
    columns: &[
        Column::int("seq"),
        Column::int("target_seq"),
        Column::text("signer"),
        Column::text("meaning"),
        Column::text("binds"),
        Column::int("occurred_at"),
    ],
    key: 1,
    indexes: &[&["target_seq"]],
};

/// Deviations.
pub static DEVIATION: Table = Table {
    name: "deviation",
    columns: &[
        Column::bytes("deviation"),
        Column::text("code"),
        Column::text("title"),
        Column::bytes("batch").or_null(),
        Column::int("opened_at"),
        Column::int("resolved_at").or_null(),
    ],
    key: 1,
    indexes: &[&["opened_at", "deviation"]],
};

/// Materials, parties, vessels and instruments as last described.
pub static DESCRIBED: Table = Table {
    name: "described",
    columns: &[
        Column::text("kind"),
        Column::bytes("id"),
        Column::text("code"),
        Column::text("name"),
        Column::int("since"),
    ],
    key: 2,
    indexes: &[],
};

/// People's roles.
pub static PERSON: Table = Table {
    name: "person",
    columns: &[Column::bytes("person"), Column::int("enrolled_at"), Column::text("roles")],
    key: 1,
    indexes: &[],
};

/// Settings that differ from the defaults.
pub static SETTING: Table = Table {
    name: "setting",
    columns: &[Column::text("name"), Column::text("value")],
    key: 1,
    indexes: &[],
};

/// Rule sets that bind.
pub static ADOPTION: Table = Table {
    name: "adoption",
    columns: &[
        Column::text("rule_set"),
        Column::text("standing"),
        Column::text("version"),
        Column::text("digest"),
        Column::int("since"),
    ],
    key: 2,
    indexes: &[],
};

/// Records handed out.
pub static RECORD: Table = Table {
    name: "record",
    columns: &[
        Column::int("seq"),
        Column::bytes("batch"),
        Column::int("batch_n").check("batch_n >= 1"),
        Column::int("log_size").check("log_size >= 1"),
        Column::text("pdf"),
        Column::text("handed_to"),
        Column::int("occurred_at"),
    ],
    key: 1,
    indexes: &[&["batch", "seq"]],
};
