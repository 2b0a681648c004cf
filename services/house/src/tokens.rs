//! Access tokens: JWTs (RFC 7519) of one kind, with one algorithm, for one site, for a quarter of an hour.
//!
//! Header: `typ` `at+jwt` (RFC 9068), `alg` `EdDSA` (RFC 8037), `kid`; nothing else is accepted there, so a token
//! that brings its own key or demands an extension is refused before its signature is looked at (RFC 8725 sections
//! 3.1, 3.10 and 3.11). Claims: `iss`, `aud`, `sub` (the person), `site`, `iat`, `nbf`, `exp`, `jti`; all required,
//! none beside them.
//!
//! Times are judged against the `now` that is handed in, which must be the machine's clock even in a simulation: a
//! driven clock says when a batch was fed, not for how long a door stays open.

use std::collections::HashMap;
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use domain::ids::{PersonId, SiteId};
use domain::stamp::Micros;
use ed25519_dalek::SigningKey;
use jsonwebtoken::{Algorithm, DecodingKey, EncodingKey, Header, Validation};
use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use uuid::Uuid;

use crate::ids::{Ids, NoRandomness};
use crate::secrets::key_to_der;

mod provider;
#[cfg(test)]
mod tests;

/// How long a token is good for, in seconds.
pub const LIFETIME: i64 = 15 * 60;
/// How far the clocks of two instances may differ, in seconds (ours; the checklist allows up to 60).
pub const LEEWAY: i64 = 5;

const AUDIENCE: &str = "tallystave";
const TYPE: &str = "at+jwt";
/// Ours have about 600 bytes; a longer text is not looked at.
const LONGEST: usize = 2048;

/// Good tokens remembered before all are forgotten.
const REMEMBERED: usize = 10_000;

/// What a good token says.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Access {
    /// Who it was issued to.
    pub person: PersonId,
    /// The one site it is for.
    pub site: SiteId,
    /// Its own id, for ending it before its time.
    pub token: Uuid,
    /// When it was issued, to the second: a change of password ends whatever is older.
    pub issued_at: Micros,
}

/// A new token.
#[derive(Clone, Eq, PartialEq)]
pub struct Issued {
    /// The token itself, a secret.
    pub token: String,
    /// Seconds until it expires.
    pub expires_in: i64,
}

impl std::fmt::Debug for Issued {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Issued").field("expires_in", &self.expires_in).finish_non_exhaustive()
    }
}

/// Why a token was not made or not accepted. Callers answer every refusal alike; the difference is for the log.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum TokenError {
    /// Not three parts of base64url, or too long.
    #[error("not a token")]
    Malformed,
    /// Another type, algorithm or key, or a header member that is not ours.
    #[error("not a header of ours")]
    Header,
    /// The signature does not fit, or the claims are not exactly ours.
    #[error("not signed by us for this use")]
    NotOurs,
    /// Its time is over.
    #[error("expired")]
    Expired,
    /// Its time has not begun, or it would last longer than any of ours.
    #[error("not valid yet, or for too long")]
    Untimely,
    /// It could not be signed.
    #[error("a token could not be signed")]
    Unsigned,
    /// There was no randomness for its id.
    #[error("a token could not be numbered")]
    Randomness(#[from] NoRandomness),
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct OurHeader {
    typ: String,
    alg: String,
    kid: String,
}

#[derive(Clone, Deserialize, Serialize)]
#[serde(deny_unknown_fields)]
struct Claims {
    iss: String,
    aud: String,
    sub: PersonId,
    site: SiteId,
    iat: i64,
    nbf: i64,
    exp: i64,
    jti: Uuid,
}

/// Issues and checks access tokens.
#[derive(Clone)]
pub struct Tokens {
    issuer: String,
    kid: String,
    public: [u8; 32],
    signing: EncodingKey,
    checking: DecodingKey,
    validation: Validation,
    /// Claims of tokens that were good, by the SHA-256 of the token: its signature is checked once.
    good: Arc<Mutex<HashMap<[u8; 32], Claims>>>,
}

impl Tokens {
    /// With the installation's token key; `issuer` names the installation and must be the same on all its instances.
    ///
    /// # Errors
    /// [`TokenError::Unsigned`] if the key cannot be written in the form the signer reads.
    pub fn new(key: &SigningKey, issuer: &str) -> Result<Self, TokenError> {
        provider::install();
        let public = key.verifying_key().to_bytes();
        let der = key_to_der(key).ok_or(TokenError::Unsigned)?;
        let mut validation = Validation::new(Algorithm::EdDSA);
        validation.set_issuer(&[issuer]);
        validation.set_audience(&[AUDIENCE]);
        validation.set_required_spec_claims(&["iss", "aud", "sub"]);
        // Times are judged here, against the clock that is handed in.
        validation.validate_exp = false;
        validation.validate_nbf = false;
        Ok(Self {
            issuer: issuer.to_owned(),
            kid: key_id(&public),
            public,
            signing: EncodingKey::from_ed_der(&der),
            checking: DecodingKey::from_ed_der(&public),
            validation,
            good: Arc::default(),
        })
    }

    /// The first 16 hexadecimal digits of SHA-256 of the public key.
    pub fn kid(&self) -> &str {
        &self.kid
    }

    /// The public key, for whoever publishes it.
    pub const fn public_key(&self) -> &[u8; 32] {
        &self.public
    }

    /// Issues a token for one person on one site.
    ///
    /// # Errors
    /// [`TokenError::Unsigned`] or [`TokenError::Randomness`]: faults of ours.
    pub fn issue(&self, person: PersonId, site: SiteId, now: Micros) -> Result<Issued, TokenError> {
        let iat = seconds(now);
        let claims = Claims {
            iss: self.issuer.clone(),
            aud: AUDIENCE.to_owned(),
            sub: person,
            site,
            iat,
            nbf: iat,
            exp: iat + LIFETIME,
            jti: Ids.draw(now)?,
        };
        let mut header = Header::new(Algorithm::EdDSA);
        header.typ = Some(TYPE.to_owned());
        header.kid = Some(self.kid.clone());
        let token = jsonwebtoken::encode(&header, &claims, &self.signing)
            .map_err(|_| TokenError::Unsigned)?;
        Ok(Issued { token, expires_in: LIFETIME })
    }

    /// Checks a token: header, then signature, then claims, then times.
    ///
    /// # Errors
    /// [`TokenError`], which the caller answers with 401 whatever it is.
    pub fn check(&self, token: &str, now: Micros) -> Result<Access, TokenError> {
        let claims = self.claims(token)?;
        check_times(&claims, seconds(now))?;
        Ok(Access {
            person: claims.sub,
            site: claims.site,
            token: claims.jti,
            issued_at: Micros(claims.iat.saturating_mul(1_000_000)),
        })
    }

    /// What a token of ours claims, whatever the time is.
    fn claims(&self, token: &str) -> Result<Claims, TokenError> {
        if token.len() > LONGEST {
            return Err(TokenError::Malformed);
        }
        let digest = Sha256::digest(token).into();
        if let Some(claims) = self.good().get(&digest) {
            return Ok(claims.clone());
        }
        self.check_header(token)?;
        let claims = jsonwebtoken::decode::<Claims>(token, &self.checking, &self.validation)
            .map_err(|_| TokenError::NotOurs)?
            .claims;
        let mut good = self.good();
        if good.len() >= REMEMBERED {
            good.clear();
        }
        good.insert(digest, claims.clone());
        Ok(claims)
    }

    fn good(&self) -> MutexGuard<'_, HashMap<[u8; 32], Claims>> {
        self.good.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn check_header(&self, token: &str) -> Result<(), TokenError> {
        use base64::Engine;
        use base64::engine::general_purpose::URL_SAFE_NO_PAD;

        if token.len() > LONGEST || token.split('.').count() != 3 {
            return Err(TokenError::Malformed);
        }
        let encoded = token.split('.').next().unwrap_or_default();
        let bytes = URL_SAFE_NO_PAD.decode(encoded).map_err(|_| TokenError::Malformed)?;
        let header: OurHeader = serde_json::from_slice(&bytes).map_err(|_| TokenError::Header)?;
        if header.typ == TYPE && header.alg == "EdDSA" && header.kid == self.kid {
            Ok(())
        } else {
            Err(TokenError::Header)
        }
    }
}

impl std::fmt::Debug for Tokens {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Tokens")
            .field("issuer", &self.issuer)
            .field("kid", &self.kid)
            .finish_non_exhaustive()
    }
}

fn check_times(claims: &Claims, now: i64) -> Result<(), TokenError> {
    if now >= claims.exp.saturating_add(LEEWAY) {
        return Err(TokenError::Expired);
    }
    let begins = claims.nbf.max(claims.iat);
    let too_long = claims.exp.saturating_sub(claims.iat) > LIFETIME;
    if begins > now.saturating_add(LEEWAY) || too_long {
        return Err(TokenError::Untimely);
    }
    Ok(())
}

fn key_id(public: &[u8; 32]) -> String {
    let digest = Sha256::digest(public);
    let first = digest.iter().take(8).fold(0_u64, |sum, byte| (sum << 8) | u64::from(*byte));
    format!("{first:016x}")
}

const fn seconds(at: Micros) -> i64 {
    at.0.div_euclid(1_000_000)
}
