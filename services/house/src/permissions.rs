//! Who may call what: the permission table, one readable piece of data.
//!
//! A row is looked up by method and matched path, as the router writes it. A route without a row is refused, so a new
//! route that nobody thought about is closed, not open; a test walks the router's own list against the table.
//! `HEAD` is judged as `GET`. What the table does not say: whether an object exists or belongs to the caller's site.

use crate::roles::Role;
use crate::roles::Role::{Admin, Auditor, Cellar, Lead, Quality};

/// Who a row lets in.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Who {
    /// Everybody, signed in or not.
    Public,
    /// Whoever is signed in and holds any role on the site.
    AnyRole,
    /// Whoever holds one of these roles on the site.
    Roles(&'static [Role]),
}

/// One row of the table.
#[derive(Clone, Copy, Debug)]
pub struct Row {
    /// The method's name in capitals.
    pub method: &'static str,
    /// The path as the router matched it.
    pub path: &'static str,
    /// Who may.
    pub who: Who,
}

/// What the table says about one request.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Decision {
    /// Go on.
    Allowed,
    /// Nobody is signed in, and the row asks for somebody.
    SignIn,
    /// Signed in, but none of the caller's roles is on the row.
    Forbidden,
    /// The table has no such row: refused, and a fault of ours.
    NoRow,
}

const CELLAR_AND_UP: Who = Who::Roles(&[Cellar, Lead, Quality]);
const REFERENCE: Who = Who::Roles(&[Lead, Quality, Admin]);
const LEAD_OR_QUALITY: Who = Who::Roles(&[Lead, Quality]);
const QUALITY: Who = Who::Roles(&[Quality]);
const ADMIN: Who = Who::Roles(&[Admin]);

/// The whole table.
pub const TABLE: &[Row] = &[
    // The doors.
    row("POST", "/v1/sessions", Who::Public),
    row("GET", "/v1/founding", Who::Public),
    row("POST", "/v1/founding", Who::Public),
    row("GET", "/healthz", Who::Public),
    row("GET", "/readyz", Who::Public),
    row("GET", "/v1/openapi.json", Who::Public),
    row("GET", "/v1/me", Who::AnyRole),
    row("POST", "/v1/clock", ADMIN),
    // People.
    row("GET", "/v1/people", Who::Roles(&[Quality, Admin, Auditor])),
    row("POST", "/v1/people", ADMIN),
    row("PUT", "/v1/people/{id}/roles/{role}", ADMIN),
    row("DELETE", "/v1/people/{id}/roles/{role}", ADMIN),
    // The site's rules.
    row("GET", "/v1/settings", Who::AnyRole),
    row("PATCH", "/v1/settings", Who::Roles(&[Quality, Admin])),
    row("GET", "/v1/rule-sets", Who::AnyRole),
    row("POST", "/v1/rule-sets/{id}/adoptions", QUALITY),
    // Reference data.
    row("GET", "/v1/materials", Who::AnyRole),
    row("POST", "/v1/materials", REFERENCE),
    row("GET", "/v1/materials/{id}", Who::AnyRole),
    row("PUT", "/v1/materials/{id}", REFERENCE),
    row("GET", "/v1/parties", Who::AnyRole),
    row("POST", "/v1/parties", REFERENCE),
    row("GET", "/v1/parties/{id}", Who::AnyRole),
    row("PUT", "/v1/parties/{id}", REFERENCE),
    row("GET", "/v1/vessels", Who::AnyRole),
    row("POST", "/v1/vessels", REFERENCE),
    row("GET", "/v1/vessels/{id}", Who::AnyRole),
    row("PUT", "/v1/vessels/{id}", REFERENCE),
    row("GET", "/v1/instruments", Who::AnyRole),
    row("POST", "/v1/instruments", REFERENCE),
    row("GET", "/v1/instruments/{id}", Who::AnyRole),
    row("PUT", "/v1/instruments/{id}", REFERENCE),
    // Lots.
    row("GET", "/v1/lots", Who::AnyRole),
    row("POST", "/v1/lots", CELLAR_AND_UP),
    row("GET", "/v1/lots/{id}", Who::AnyRole),
    row("POST", "/v1/lots/{id}/status", QUALITY),
    // Batches.
    row("GET", "/v1/batches", Who::AnyRole),
    row("POST", "/v1/batches", Who::Roles(&[Lead])),
    row("GET", "/v1/batches/{id}", Who::AnyRole),
    row("GET", "/v1/batches/{id}/readings", Who::AnyRole),
    row("POST", "/v1/batches/{id}/readings", CELLAR_AND_UP),
    row("POST", "/v1/batches/{id}/assessments", CELLAR_AND_UP),
    row("GET", "/v1/batches/{id}/proposals", Who::AnyRole),
    row("POST", "/v1/batches/{id}/proposals", CELLAR_AND_UP),
    row("GET", "/v1/batches/{id}/additions", Who::AnyRole),
    row("POST", "/v1/batches/{id}/additions", CELLAR_AND_UP),
    row("GET", "/v1/batches/{id}/account", Who::AnyRole),
    row("GET", "/v1/batches/{id}/entries", Who::AnyRole),
    row("GET", "/v1/batches/{id}/record", Who::AnyRole),
    row("POST", "/v1/batches/{id}/record", LEAD_OR_QUALITY),
    row("GET", "/v1/records/{id}", Who::AnyRole),
    // Entries.
    row("GET", "/v1/entries/{id}", Who::AnyRole),
    row("POST", "/v1/entries/{id}/amendments", Who::Roles(&[Cellar, Lead, Quality, Admin])),
    row("POST", "/v1/entries/{id}/signoffs", LEAD_OR_QUALITY),
    // Deviations.
    row("GET", "/v1/deviations", Who::AnyRole),
    row("POST", "/v1/deviations", CELLAR_AND_UP),
    row("GET", "/v1/deviations/{id}", Who::AnyRole),
    row("POST", "/v1/deviations/{id}/resolution", QUALITY),
    // Computations that record nothing.
    row("GET", "/v1/calculations", Who::AnyRole),
    row("POST", "/v1/calculations/{name}", Who::AnyRole),
    // The log itself.
    row("GET", "/v1/sites/{site}/ledger/head", Who::AnyRole),
    row("GET", "/v1/sites/{site}/ledger/inclusion", Who::AnyRole),
    row("GET", "/v1/sites/{site}/ledger/consistency", Who::AnyRole),
    row("GET", "/v1/sites/{site}/ledger/entries", Who::AnyRole),
];

const fn row(method: &'static str, path: &'static str, who: Who) -> Row {
    Row { method, path, who }
}

/// What the table says about a method and a matched path, for the roles the caller holds on the site; `None` when
/// nobody is signed in.
pub fn allowed(method: &str, path: &str, roles: Option<&[Role]>) -> Decision {
    let method = if method == "HEAD" { "GET" } else { method };
    let Some(row) = TABLE.iter().find(|row| row.path == path && row.method == method) else {
        return Decision::NoRow;
    };
    let Some(held) = roles else {
        return if row.who == Who::Public { Decision::Allowed } else { Decision::SignIn };
    };
    let lets_in = match row.who {
        Who::Public => true,
        Who::AnyRole => !held.is_empty(),
        Who::Roles(wanted) => held.iter().any(|role| wanted.contains(role)),
    };
    if lets_in { Decision::Allowed } else { Decision::Forbidden }
}

#[cfg(test)]
mod tests {
    use std::collections::HashSet;

    use super::*;

    #[test]
    fn no_row_stands_twice_and_every_row_is_well_formed() {
        let mut seen = HashSet::new();
        for row in TABLE {
            assert!(seen.insert((row.method, row.path)), "{} {}", row.method, row.path);
            assert!(["GET", "POST", "PUT", "PATCH", "DELETE"].contains(&row.method));
            assert!(row.path.starts_with('/') && !row.path.ends_with('/'), "{}", row.path);
            assert_ne!(row.who, Who::Roles(&[]), "{} lets nobody in", row.path);
        }
    }

    #[test]
    fn what_is_not_in_the_table_is_refused_even_to_all_roles_together() {
        for (method, path) in [
            ("DELETE", "/v1/batches/{id}"),
            ("POST", "/v1/nowhere"),
            ("TRACE", "/healthz"),
            ("GET", "/v1/batches/0198"),
            ("get", "/healthz"),
        ] {
            assert_eq!(allowed(method, path, Some(&Role::ALL)), Decision::NoRow, "{method} {path}");
        }
    }

    #[test]
    fn without_signing_in_only_the_doors_are_open() {
        let open: Vec<_> = TABLE
            .iter()
            .filter(|row| allowed(row.method, row.path, None) == Decision::Allowed)
            .map(|row| (row.method, row.path))
            .collect();
        assert_eq!(
            open,
            [
                ("POST", "/v1/sessions"),
                ("GET", "/v1/founding"),
                ("POST", "/v1/founding"),
                ("GET", "/healthz"),
                ("GET", "/readyz"),
                ("GET", "/v1/openapi.json"),
            ]
        );
        assert_eq!(allowed("GET", "/v1/batches", None), Decision::SignIn);
    }

    #[test]
    fn an_auditor_reads_and_writes_nothing() {
        // A computation is asked with a body, but records nothing.
        let computes = ("POST", "/v1/calculations/{name}");
        for row in TABLE.iter().filter(|row| row.who != Who::Public && row.method != "GET") {
            let decision = allowed(row.method, row.path, Some(&[Auditor]));
            let may = (row.method, row.path) == computes;
            let wanted = if may { Decision::Allowed } else { Decision::Forbidden };
            assert_eq!(decision, wanted, "{} {}", row.method, row.path);
        }
        assert_eq!(allowed("GET", "/v1/batches/{id}/record", Some(&[Auditor])), Decision::Allowed);
        assert_eq!(allowed("HEAD", "/v1/people", Some(&[Auditor])), Decision::Allowed);
    }

    #[test]
    fn roles_open_their_own_rows_and_one_of_several_is_enough() {
        let resolve = ("POST", "/v1/deviations/{id}/resolution");
        for role in Role::ALL {
            let wanted = if role == Quality { Decision::Allowed } else { Decision::Forbidden };
            assert_eq!(allowed(resolve.0, resolve.1, Some(&[role])), wanted, "{role:?}");
        }
        assert_eq!(allowed(resolve.0, resolve.1, Some(&[Cellar, Quality])), Decision::Allowed);
        assert_eq!(allowed("POST", "/v1/people", Some(&[Admin])), Decision::Allowed);
        assert_eq!(allowed("POST", "/v1/people", Some(&[Lead, Quality])), Decision::Forbidden);
        assert_eq!(allowed("POST", "/v1/batches", Some(&[Cellar])), Decision::Forbidden);
    }

    #[test]
    fn whoever_lost_every_role_reads_nothing_but_the_doors() {
        for row in TABLE.iter().filter(|row| row.who != Who::Public) {
            assert_eq!(allowed(row.method, row.path, Some(&[])), Decision::Forbidden);
        }
        assert_eq!(allowed("GET", "/healthz", Some(&[])), Decision::Allowed);
    }
}
