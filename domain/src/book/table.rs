//! Projection tables as data: what a table is called, what its columns hold, and the changes entries make to it.
//!
//! A projection is a pure function of the log: it is dropped and rebuilt at will. The store makes the tables from
//! these definitions and puts the site before the key; nothing here knows SQL beyond the text of a column check.

/// What a column holds.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum CellKind {
    /// A 64-bit integer.
    Int,
    /// Text.
    Text,
    /// Bytes: ids and digests.
    Bytes,
}

/// One column.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Column {
    /// Its name.
    pub name: &'static str,
    /// What it holds.
    pub kind: CellKind,
    /// Whether it may be empty.
    pub nullable: bool,
    /// A condition over the column's name, valid on both engines: the type's range said a second time.
    pub check: Option<&'static str>,
}

impl Column {
    /// An integer.
    pub const fn int(name: &'static str) -> Self {
        Self { name, kind: CellKind::Int, nullable: false, check: None }
    }

    /// A text.
    pub const fn text(name: &'static str) -> Self {
        Self { name, kind: CellKind::Text, nullable: false, check: None }
    }

    /// Bytes.
    pub const fn bytes(name: &'static str) -> Self {
        Self { name, kind: CellKind::Bytes, nullable: false, check: None }
    }

    /// The same, possibly empty.
    #[must_use]
    pub const fn or_null(mut self) -> Self {
        self.nullable = true;
        self
    }

    /// The same, with a condition.
    #[must_use]
    pub const fn check(mut self, condition: &'static str) -> Self {
        self.check = Some(condition);
        self
    }
}

/// One projection table.
#[derive(Debug, Eq, PartialEq)]
pub struct Table {
    /// Its name.
    pub name: &'static str,
    /// Its columns; the first `key` of them are the key within the site.
    pub columns: &'static [Column],
    /// How many columns make the key.
    pub key: usize,
    /// Further indexes, by column names.
    pub indexes: &'static [&'static [&'static str]],
}

/// A value of a column.
#[derive(Clone, Debug, Eq, Ord, PartialEq, PartialOrd)]
pub enum Cell {
    /// Nothing.
    Null,
    /// An integer.
    Int(i64),
    /// A text.
    Text(String),
    /// Bytes.
    Bytes(Vec<u8>),
}

impl From<i64> for Cell {
    fn from(value: i64) -> Self {
        Self::Int(value)
    }
}
impl From<&str> for Cell {
    fn from(value: &str) -> Self {
        Self::Text(value.to_owned())
    }
}
impl From<String> for Cell {
    fn from(value: String) -> Self {
        Self::Text(value)
    }
}
impl From<uuid::Uuid> for Cell {
    fn from(value: uuid::Uuid) -> Self {
        Self::Bytes(value.as_bytes().to_vec())
    }
}
impl From<&[u8]> for Cell {
    fn from(value: &[u8]) -> Self {
        Self::Bytes(value.to_vec())
    }
}
impl<T: Into<Self>> From<Option<T>> for Cell {
    fn from(value: Option<T>) -> Self {
        value.map_or(Self::Null, Into::into)
    }
}

/// One row, its cells in the table's order.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Row {
    /// Where it belongs.
    pub table: &'static Table,
    /// Its cells.
    pub cells: Vec<Cell>,
}

impl Row {
    /// The cells that identify it within the site.
    pub fn key(&self) -> &[Cell] {
        &self.cells[..self.table.key]
    }
}

/// What an entry does to the tables.
#[derive(Clone, Debug, Eq, PartialEq)]
pub enum Change {
    /// This row is there now, whatever was there before.
    Put(Row),
    /// No row of this key is there any more.
    Remove {
        /// The table.
        table: &'static Table,
        /// The whole key.
        key: Vec<Cell>,
    },
}
