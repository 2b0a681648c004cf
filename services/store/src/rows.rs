//! Reads rows of projection tables: what pages and lists are made of.

use domain::book::table::{Cell, CellKind, Column, Row, Table};
use sqlx::{QueryBuilder, Row as _};

use crate::StoreError;
use crate::db::{Conn, on};
use crate::schema::SITE;
use crate::sites::SiteNumber;
use crate::writes::push_cell;

/// Reads one row by the kinds of its columns.
macro_rules! decode {
    ($row:expr, $table:expr) => {{
        let cell = |(index, column): (usize, &Column)| -> Result<Cell, StoreError> {
            Ok(match column.kind {
                CellKind::Int => $row.try_get::<Option<i64>, _>(index)?.into(),
                CellKind::Text => $row.try_get::<Option<String>, _>(index)?.into(),
                CellKind::Bytes => {
                    $row.try_get::<Option<Vec<u8>>, _>(index)?.map_or(Cell::Null, Cell::Bytes)
                }
            })
        };
        let cells = $table.columns.iter().enumerate().map(cell).collect::<Result<_, _>>()?;
        Ok(Row { table: $table, cells })
    }};
}

/// Which way a column is ordered.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Order {
    /// Smallest first.
    Rising(&'static str),
    /// Largest first.
    Falling(&'static str),
}

/// A question to one table: equal columns, then a bound on one of them, an order, and at most so many rows.
#[derive(Clone, Debug)]
pub struct Select<'a> {
    table: &'static Table,
    equal: Vec<(&'a str, Cell)>,
    beyond: Option<(&'a str, &'static str, Cell)>,
    order: Vec<Order>,
    limit: i64,
}

impl<'a> Select<'a> {
    /// Every row of a table, in no certain order.
    pub const fn of(table: &'static Table) -> Self {
        Self { table, equal: Vec::new(), beyond: None, order: Vec::new(), limit: i64::MAX }
    }

    /// Only rows with this value; [`Cell::Null`] means an empty column.
    #[must_use]
    pub fn equal(mut self, column: &'a str, value: impl Into<Cell>) -> Self {
        self.equal.push((column, value.into()));
        self
    }

    /// Only rows beyond this value: where the next page begins.
    #[must_use]
    pub fn above(mut self, column: &'a str, value: impl Into<Cell>) -> Self {
        self.beyond = Some((column, ">", value.into()));
        self
    }

    /// Only rows before this value.
    #[must_use]
    pub fn below(mut self, column: &'a str, value: impl Into<Cell>) -> Self {
        self.beyond = Some((column, "<", value.into()));
        self
    }

    /// Ordered by this, after what was named before.
    #[must_use]
    pub fn order(mut self, order: Order) -> Self {
        self.order.push(order);
        self
    }

    /// At most so many rows.
    #[must_use]
    pub const fn limit(mut self, rows: i64) -> Self {
        self.limit = rows;
        self
    }

    /// The rows of a site.
    ///
    /// # Errors
    /// [`StoreError::NoColumn`] if a column is not of the table, or [`StoreError::Database`].
    pub async fn fetch(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
    ) -> Result<Vec<Row>, StoreError> {
        self.check_names()?;
        let names: Vec<&str> = self.table.columns.iter().map(|c| c.name).collect();
        let head = format!("select {} from {} where {SITE} = ", names.join(", "), self.table.name);
        on!(conn, |c| {
            let mut query = QueryBuilder::new(head);
            query.push_bind(site.0);
            for (name, cell) in &self.equal {
                if *cell == Cell::Null {
                    query.push(format!(" and {name} is null"));
                } else {
                    query.push(format!(" and {name} = "));
                    push_cell!(query, CellKind::Int, cell);
                }
            }
            if let Some((name, sign, cell)) = &self.beyond {
                query.push(format!(" and {name} {sign} "));
                push_cell!(query, CellKind::Int, cell);
            }
            query.push(self.ordering()).push(" limit ").push_bind(self.limit);
            let rows = query.build().fetch_all(c).await?;
            rows.iter().map(|row| decode!(row, self.table)).collect()
        })
    }

    fn ordering(&self) -> String {
        let parts: Vec<String> = self
            .order
            .iter()
            .map(|order| match order {
                Order::Rising(name) => (*name).to_owned(),
                Order::Falling(name) => format!("{name} desc"),
            })
            .collect();
        if parts.is_empty() { String::new() } else { format!(" order by {}", parts.join(", ")) }
    }

    /// Names become text of a statement, so only names of the definition pass.
    fn check_names(&self) -> Result<(), StoreError> {
        let ordered = self.order.iter().map(|order| match order {
            Order::Rising(name) | Order::Falling(name) => *name,
        });
        let asked = self.equal.iter().map(|(name, _)| *name);
        let bound = self.beyond.iter().map(|(name, _, _)| *name);
        for name in asked.chain(bound).chain(ordered) {
            if !self.table.columns.iter().any(|column| column.name == name) {
                return Err(StoreError::NoColumn {
                    table: self.table.name.to_owned(),
                    column: name.to_owned(),
                });
            }
        }
        Ok(())
    }
}
