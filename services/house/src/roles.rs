//! What a person may be on a site: the book's own roles.

pub use domain::book::role::Role;
