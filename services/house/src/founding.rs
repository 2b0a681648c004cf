//! The first start: a one-time token on the console lets one person found a book and become its administrator.

use base64::Engine as _;
use base64::engine::general_purpose::URL_SAFE_NO_PAD;
use domain::book::body::Premises;
use domain::book::command::{Act, Command, DirectoryPerson, Found, Refusal};
use domain::ids::{CommandId, PersonId, SiteId};
use domain::ledger::entry::{Actor, Via};
use domain::stamp::Stamp;
use sha2::{Digest, Sha256};
use store::{founding, sites};

use crate::error::HouseError;
use crate::house::House;
use crate::passwords::check_policy;

/// What a founder says.
#[derive(Clone, Debug)]
pub struct Founding {
    /// The token from the console.
    pub token: String,
    /// Short code of the site.
    pub code: String,
    /// Its name.
    pub name: String,
    /// Name of its log; the site's own domain name is a good one.
    pub origin: String,
    /// IANA time zone.
    pub time_zone: String,
    /// Licence number.
    pub licence: Option<String>,
    /// Premises.
    pub premises: Vec<Premises>,
    /// A simulation?
    pub simulation: bool,
    /// One person may give both signatures.
    pub single_handed: bool,
    /// The first administrator.
    pub admin: NewPerson,
}

/// A person to be enrolled.
#[derive(Clone, Debug)]
pub struct NewPerson {
    /// What they sign in with.
    pub login: String,
    /// Printed name.
    pub name: String,
    /// Their first password.
    pub password: String,
}

impl House {
    /// A new founding token if no site exists yet; the older one, if any, is void. `None` once there is a site.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn offer_founding(&self) -> Result<Option<String>, HouseError> {
        if self.sites().await?.iter().any(|_| true) {
            return Ok(None);
        }
        self.founding_token().await.map(Some)
    }

    /// A new founding token, for a first or a further site: for the operator's console only.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn founding_token(&self) -> Result<String, HouseError> {
        let mut secret = [0_u8; 32];
        getrandom::fill(&mut secret).map_err(|e| HouseError::Failed(e.to_string()))?;
        let token = URL_SAFE_NO_PAD.encode(secret);
        let mut tx = self.inner.db.begin().await?;
        founding::keep(&mut tx.conn(), &hash(&token)).await?;
        tx.commit().await?;
        Ok(token)
    }

    /// Whether a founding token is waiting to be used.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn awaits_founding(&self) -> Result<bool, HouseError> {
        let mut held = self.inner.db.reader().await?;
        Ok(founding::kept(&mut held.conn()).await?.is_some())
    }

    /// Founds a site. The token is used up only when the book exists.
    ///
    /// # Errors
    /// [`HouseError::FoundingClosed`] for a wrong token, or what is wrong with the rest.
    pub async fn found(
        &self,
        founding: Founding,
        key: CommandId,
        print: [u8; 32],
    ) -> Result<(SiteId, PersonId), HouseError> {
        let token = hash(&founding.token);
        let mut held = self.inner.db.reader().await?;
        let kept = founding::kept(&mut held.conn()).await?;
        let taken = sites::by_code(&mut held.conn(), &founding.code).await?;
        drop(held);
        if kept.as_deref() != Some(&token[..]) {
            return Err(HouseError::FoundingClosed);
        }
        self.fits_the_clock(&founding)?;
        check_policy(
            &founding.admin.password,
            &[&founding.admin.login, &founding.admin.name, &founding.code, &founding.name],
        )?;
        let verifier = self.verifier(&founding.origin).map_err(|_| {
            HouseError::Refused(Refusal::meaningless(
                "/origin",
                "use a name without blanks or plus signs, such as cellar.example/book",
            ))
        })?;
        let site = match taken {
            Some(site) => site,
            None => self.register(&founding).await?,
        };
        let admin = self.directory_person(&founding.admin).await?;
        let person = admin.person;
        let now = self.now();
        let act = Act::Found(Box::new(Found {
            code: founding.code,
            name: founding.name,
            origin: founding.origin,
            public_key: verifier.to_string(),
            offset_minutes: Stamp::in_zone(now, &founding.time_zone).offset_minutes,
            time_zone: founding.time_zone,
            licence: founding.licence,
            premises: founding.premises,
            simulation: founding.simulation,
            single_handed: founding.single_handed,
            admin,
        }));
        let command = Command {
            id: key,
            print,
            actor: Actor::Person(person),
            roles: std::collections::BTreeSet::new(),
            via: Via::Api,
            expects: None,
            act,
        };
        self.inner.writers.submit(site.id, command).await?;
        let mut tx = self.inner.db.begin().await?;
        founding::use_up(&mut tx.conn(), &token).await?;
        tx.commit().await?;
        Ok((site.id, person))
    }

    fn fits_the_clock(&self, founding: &Founding) -> Result<(), HouseError> {
        if self.is_simulated() && !founding.simulation {
            return Err(HouseError::Refused(Refusal::meaningless(
                "/simulation",
                "this program runs on a driven clock: only a simulation can be founded here",
            )));
        }
        if jiff::tz::TimeZone::get(&founding.time_zone).is_err() {
            return Err(HouseError::Refused(Refusal::meaningless(
                "/time_zone",
                "use a name of the IANA time zone database, such as Europe/Vienna",
            )));
        }
        Ok(())
    }

    async fn register(&self, founding: &Founding) -> Result<sites::Site, HouseError> {
        let id: SiteId = self.draw()?;
        let mut tx = self.inner.db.begin().await?;
        let site = sites::register(&mut tx.conn(), id, &founding.code, &founding.origin).await?;
        tx.commit().await?;
        Ok(site)
    }

    /// A directory record with a fresh pseudonym, hash and salt.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn directory_person(&self, new: &NewPerson) -> Result<DirectoryPerson, HouseError> {
        let mut salt = vec![0_u8; 16];
        getrandom::fill(&mut salt).map_err(|e| HouseError::Failed(e.to_string()))?;
        Ok(DirectoryPerson {
            person: self.draw()?,
            login: new.login.clone(),
            name: new.name.clone(),
            password_hash: self.inner.passwords.hash(&new.password).await?,
            salt,
        })
    }
}

fn hash(token: &str) -> [u8; 32] {
    Sha256::digest(token.as_bytes()).into()
}
