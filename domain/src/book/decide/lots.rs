//! Receipts, and whether a lot may be used.

use sha2::{Digest, Sha256};

use super::Deciding;
use crate::book::body::{Direction, Leg, LotReceived, LotStatus, LotStatusChanged};
use crate::book::command::{Decision, Receive, Refusal, Stop, not_ahead};
use crate::book::subject::{Subject, SubjectKind};
use crate::ids::{HoldingId, LotId};
use crate::units::Dimension;

pub(super) fn receive(it: &mut Deciding<'_>, act: &Receive) -> Result<Decision, Stop> {
    if it.desk.subject(act.lot.into())?.n > 0 {
        return Err(Refusal::conflict("this lot has been received already").into());
    }
    let body = receipt(it, act)?;
    let subjects = [act.lot.into(), body.holding.into()];
    let draft = it.draft(act.received_at, subjects, body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

/// The receipt as an entry says it; also what an amendment puts in its place.
pub(super) fn receipt(it: &Deciding<'_>, act: &Receive) -> Result<LotReceived, Stop> {
    not_ahead("/received_at", act.received_at, it.now)?;
    it.desk.code_is_free(SubjectKind::Lot, &act.code, act.lot.0)?;
    let material = it.desk.material(act.material)?;
    if let Some(party) = act.supplier {
        it.desk.party(party)?;
    }
    let dimension = act.amount.dimension().map_or("", Dimension::name);
    if let Some((_, material)) = &material.current
        && material.dimension != dimension
    {
        return Err(Refusal::meaningless(
            "/amount",
            format!(
                "{} is counted by {}, but {} is a {dimension}: give it in a unit of {}",
                material.name, material.dimension, act.amount, material.dimension
            ),
        )
        .into());
    }
    let holding = derived(act.lot, "stock");
    let leg = Leg { holding, direction: Direction::In, amount: act.amount.clone() };
    Ok(LotReceived {
        lot: act.lot,
        code: act.code.clone(),
        material: act.material,
        holding,
        supplier: act.supplier,
        supplier_lot: act.supplier_lot.clone(),
        amount: act.amount.clone(),
        expires_at: act.expires_at,
        document: act.document.clone(),
        composition: act.composition.clone(),
        status: act.status,
        late: it.late(act.received_at, None, None)?,
        legs: vec![leg],
    })
}

/// A holding that belongs to a lot once and for all: the same lot always has the same one.
///
/// The id is a version 8 UUID (RFC 9562) of SHA-256 over the lot's id and the purpose.
pub(super) fn derived(lot: LotId, purpose: &str) -> HoldingId {
    let digest = Sha256::new().chain_update(lot.0.as_bytes()).chain_update(purpose).finalize();
    let mut bytes = [0; 16];
    bytes.copy_from_slice(&digest[..16]);
    HoldingId(uuid::Builder::from_custom_bytes(bytes).into_uuid())
}

pub(super) fn change_status(
    it: &mut Deciding<'_>,
    lot: LotId,
    status: LotStatus,
    reason: &str,
) -> Result<Decision, Stop> {
    let state = it.desk.lot(lot)?;
    if state.status == status {
        return Err(Refusal::conflict(format!("the lot is {} already", status.name())).into());
    }
    let at = it.now_at_the_end_of(lot.into())?;
    let body = LotStatusChanged { lot, status, reason: reason.to_owned() };
    let draft = it.draft(at, [Subject::from(lot)], body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

/// The site's time zone.
pub(super) fn zone(it: &Deciding<'_>) -> Result<String, Stop> {
    Ok(it.desk.site()?.founded.as_ref().map_or_else(|| "UTC".to_owned(), |f| f.time_zone.clone()))
}
