//! From a request to something the house can be asked: the key, the fingerprint, the caller.

use domain::book::command::Act;
use domain::book::subject::Subject;
use domain::ids::CommandId;
use domain::ledger::canonical::{NotCanonical, digest};
use house::Asked;
use serde_json::{Value, json};

use crate::caller::Caller;
use crate::problem::{Kind, Problem};

/// SHA-256 over what was asked: method, path and body in canonical form, secrets left out.
///
/// # Errors
/// [`Kind::NotReadable`] with the place, if the body holds what the ledger's form forbids.
pub(crate) fn print(method: &str, path: &str, body: &Value) -> Result<[u8; 32], Problem> {
    let asked = json!({"method": method, "path": path, "body": body});
    let digest = digest(&asked).map_err(|error| match &error {
        NotCanonical::Refused { pointer, why } => {
            let within = pointer.strip_prefix("/body").unwrap_or_default();
            Problem::at(Kind::NotReadable, within, why.to_string())
        }
        _ => Problem::at(Kind::NotReadable, "", error.to_string()),
    })?;
    Ok(*digest.as_bytes())
}

/// The body without these members, named by JSON pointers.
pub(crate) fn without(mut body: Value, secrets: &[&str]) -> Value {
    for secret in secrets {
        let Some((within, member)) = secret.rsplit_once('/') else { continue };
        if let Some(members) = body.pointer_mut(within).and_then(Value::as_object_mut) {
            members.remove(member);
        }
    }
    body
}

/// Something asked by a caller under a key.
pub(crate) fn asked(caller: &Caller, key: CommandId, print: [u8; 32], act: Act) -> Asked {
    Asked { caller: caller.into(), key, print, expects: None, act }
}

/// The same, only if the subject has not moved on.
pub(crate) fn expecting(asked: Asked, subject: impl Into<Subject>, n: u64) -> Asked {
    Asked { expects: Some((subject.into(), n)), ..asked }
}

impl From<&Caller> for house::Caller {
    fn from(caller: &Caller) -> Self {
        Self {
            person: caller.person,
            site: caller.site,
            roles: caller.roles.iter().copied().collect(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_has_no_canonical_form_is_pointed_at_within_the_body() {
        let body = json!({"lines": [{"note": "a\tb"}]});
        let problem = print("POST", "/v1/lots", &body).unwrap_err();
        assert_eq!(problem.kind(), Kind::NotReadable);
        assert_eq!(problem.errors()[0].pointer, "/lines/0/note");
        let in_path = print("POST", "/v1/\t", &json!({})).unwrap_err();
        assert_eq!(in_path.errors()[0].pointer, "");
    }

    #[test]
    fn secrets_are_left_out_of_the_print_wherever_they_stand() {
        let body = json!({"token": "t", "code": "EXW", "admin": {"login": "dov", "password": "p"}});
        let left = without(body, &["/token", "/admin/password", "/absent/secret"]);
        assert_eq!(left, json!({"code": "EXW", "admin": {"login": "dov"}}));
    }
}
