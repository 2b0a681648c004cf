//! The first start: a one-time token on the console lets one person found a book and become its administrator.

use std::collections::BTreeSet;

use base64::Engine as _;
use base64::engine::general_purpose::URL_SAFE_NO_PAD;
use domain::book::body::Premises;
use domain::book::command::{Act, Command, DirectoryPerson, Found, Need, Refusal, Stop};
use domain::book::in_force::FoldError;
use domain::book::subject::SubjectKind;
use domain::book::{Desk, Position};
use domain::ids::{CommandId, PersonId, SiteId};
use domain::ledger::entry::{Actor, Via};
use domain::stamp::Stamp;
use sha2::{Digest, Sha256};
use store::sites::{self, Site};
use store::writer::Receipt;
use store::{commands, founding, log};
use uuid::Uuid;

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
    /// A new founding token if no book exists yet; the older one, if any, is void. `None` once there is a book.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn offer_founding(&self) -> Result<Option<String>, HouseError> {
        for site in self.sites().await? {
            if !self.is_empty(&site).await? {
                return Ok(None);
            }
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

    /// Founds a site. What is refused registers nothing and leaves the token good. Sent again with the same key it
    /// gives the first answer, although the token is used up.
    ///
    /// # Errors
    /// [`HouseError::FoundingClosed`] for a wrong token, or what is wrong with the rest.
    pub async fn found(
        &self,
        founding: Founding,
        key: CommandId,
        print: [u8; 32],
    ) -> Result<(SiteId, PersonId), HouseError> {
        let place = self.place_of(&founding, key, &print).await?;
        let token = hash(&founding.token);
        let site = match place {
            Place::Answered(receipt) => return founded(&receipt),
            Place::Taken(why) => {
                self.needs_token(&token).await?;
                return Err(HouseError::Refused(Refusal::conflict(why)));
            }
            Place::Free => None,
            Place::BrokenOff(site) => Some(site),
        };
        self.needs_token(&token).await?;
        let id = match &site {
            Some(site) => site.id,
            None => self.draw()?,
        };
        let (code, origin) = (founding.code.clone(), founding.origin.clone());
        let command = self.founding_command(founding, key, print).await?;
        self.decides_well(id, &command)?;
        let mut tx = self.inner.db.begin().await?;
        if !founding::use_up(&mut tx.conn(), &token).await? {
            return Err(HouseError::FoundingClosed);
        }
        if site.is_none() {
            sites::register(&mut tx.conn(), id, &code, &origin).await?;
        }
        tx.commit().await?;
        founded(&self.inner.writers.submit(id, command).await?)
    }

    /// What stands where a site is to be founded.
    async fn place_of(
        &self,
        founding: &Founding,
        key: CommandId,
        print: &[u8; 32],
    ) -> Result<Place, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let by_code = sites::by_code(&mut held.conn(), &founding.code).await?;
        let by_origin = sites::by_origin(&mut held.conn(), &founding.origin).await?;
        let (site, is_same) = match (by_code, by_origin) {
            (None, None) => return Ok(Place::Free),
            (None, Some(other)) => {
                return Ok(Place::Taken(format!(
                    "the log of site {} has this origin already: each log needs a name of its own",
                    other.code
                )));
            }
            (Some(site), other) => {
                let is_same = other.is_some_and(|other| other.id == site.id);
                (site, is_same)
            }
        };
        let head = log::head(&mut held.conn(), site.number).await?;
        if head.frontier.size() > 0 {
            let answer = commands::answer(&mut held.conn(), site.number, key, print).await?;
            return match answer {
                Some(answer) => Ok(Place::Answered(answer?)),
                None => Ok(Place::Taken("a site with this code has been founded already".into())),
            };
        }
        if is_same {
            return Ok(Place::BrokenOff(site));
        }
        Ok(Place::Taken(format!(
            "the founding of a site with this code broke off: take it up again with its origin, {}, or choose \
             another code and an origin of its own",
            site.origin
        )))
    }

    /// Refuses unless the token is the one that waits to be used.
    async fn needs_token(&self, token: &[u8; 32]) -> Result<(), HouseError> {
        let mut held = self.inner.db.reader().await?;
        let kept = founding::kept(&mut held.conn()).await?;
        if kept.as_deref() == Some(&token[..]) { Ok(()) } else { Err(HouseError::FoundingClosed) }
    }

    /// The command that founds a site, its password hashed.
    async fn founding_command(
        &self,
        founding: Founding,
        key: CommandId,
        print: [u8; 32],
    ) -> Result<Command, HouseError> {
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
        let admin = self.directory_person(&founding.admin).await?;
        let person = admin.person;
        let act = Act::Found(Box::new(Found {
            code: founding.code,
            name: founding.name,
            origin: founding.origin,
            public_key: verifier.to_string(),
            offset_minutes: Stamp::in_zone(self.now(), &founding.time_zone).offset_minutes,
            time_zone: founding.time_zone,
            licence: founding.licence,
            premises: founding.premises,
            simulation: founding.simulation,
            single_handed: founding.single_handed,
            admin,
        }));
        Ok(Command {
            id: key,
            print,
            actor: Actor::Person(person),
            roles: BTreeSet::new(),
            via: Via::Api,
            expects: None,
            act,
        })
    }

    /// Decides the founding on an empty desk and writes it nowhere, so that a refusal comes before anything is
    /// registered.
    fn decides_well(&self, site: SiteId, command: &Command) -> Result<(), HouseError> {
        let failed = |error: FoldError| HouseError::Failed(error.to_string());
        let now = self.now();
        let mut desk = Desk::new(site);
        // The ids of this trial are thrown away with it.
        let mut ids = (1..).map(Uuid::from_u128);
        let decision = loop {
            let mut draw = || ids.next().unwrap_or_default();
            match desk.decide(command, now, &mut draw) {
                Ok(decision) => break decision,
                Err(Stop::Refused(refusal)) => return Err(HouseError::Refused(refusal)),
                Err(Stop::Need(needs)) => {
                    for need in needs {
                        let Need::Subject(subject) = need else {
                            return Err(HouseError::Failed(format!("a founding needs {need:?}")));
                        };
                        desk.put(subject, &[]).map_err(failed)?;
                    }
                }
            }
        };
        desk.append(&mut Position::start(), command, decision, now).map_err(failed)?;
        Ok(())
    }

    async fn is_empty(&self, site: &Site) -> Result<bool, HouseError> {
        let mut held = self.inner.db.reader().await?;
        Ok(log::head(&mut held.conn(), site.number).await?.frontier.size() == 0)
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

/// What stands where a site is to be founded.
enum Place {
    /// Nothing.
    Free,
    /// A registered site without a single entry: its founding broke off and may be taken up again.
    BrokenOff(Site),
    /// What this very command founded.
    Answered(Receipt),
    /// Something else, in words.
    Taken(String),
}

/// The site and its first administrator, as the founding's entries name them: the same for ever.
fn founded(receipt: &Receipt) -> Result<(SiteId, PersonId), HouseError> {
    let mut subjects = receipt.entries.iter().flat_map(|entry| &entry.subjects);
    let admin = subjects.find(|subject| subject.kind == SubjectKind::Person);
    let site = receipt.entries.first().map(|entry| entry.site);
    site.zip(admin.map(|admin| admin.id.into()))
        .ok_or_else(|| HouseError::Failed("the founding's entries name no administrator".into()))
}

fn hash(token: &str) -> [u8; 32] {
    Sha256::digest(token.as_bytes()).into()
}
