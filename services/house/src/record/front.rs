//! The first page: what the batch is, what went in, how it ran.

use std::collections::BTreeMap;

use domain::book::body::{AdditionRecorded, BatchOpened, Body, LotReceived, Reading, ReadingTaken};
use domain::book::in_force::InForce;
use domain::densimetry::{Scale, at_calibration};
use domain::ids::LotId;
use domain::stamp::Micros;
use domain::units::Quantity;
use records::{Batch, Chart, ChartDose, ChartPoint, MaterialLot, Site};

use super::evidence::{Evidence, Told};
use super::struck::struck;
use super::words;

/// One use of a lot in the batch.
pub(crate) struct Use<'a> {
    pub(crate) n: u64,
    pub(crate) material: &'a str,
    pub(crate) lot_code: &'a str,
    pub(crate) amount: &'a Quantity,
}

impl Evidence {
    pub(super) fn printed_site(&self) -> Site {
        let founded = &self.founded;
        let opened = self.opening().map(|(_, body)| body.premises.as_str());
        let premises = founded.premises.iter().find(|p| Some(p.code.as_str()) == opened);
        let begun = self.opening().map_or(self.drawn_up, |(told, _)| told.read.occurred_at.at);
        let offsets = [begun, self.drawn_up].map(|at| words::offset(at, self.zone()));
        let offset = match &offsets {
            [one, other] if one == other => one.clone(),
            [one, other] => format!("{one} when opened, {other} at the end"),
        };
        Site {
            name: founded.name.clone(),
            code: founded.code.clone(),
            licence: founded.licence.clone().unwrap_or_default(),
            premises: premises
                .map(|p| format!("{} ({}, {})", p.name, p.code, words::plain(&p.kind)))
                .unwrap_or_default(),
            time_zone: format!("{} ({offset})", founded.time_zone),
        }
    }

    pub(super) fn printed_batch(&self) -> Batch {
        let Some((told, opened)) = self.opening() else { return Batch::default() };
        let named = opened.name.as_ref().map(|name| format!("{name}: ")).unwrap_or_default();
        Batch {
            code: opened.code.clone(),
            product_class: format!("{named}{}", words::plain(&opened.product_class)),
            claims: or_none(&opened.claims.iter().map(|c| words::plain(c)).collect::<Vec<_>>()),
            destinations: opened.destinations.clone(),
            vessel: self.vessel(opened),
            volume: format!("{} filled ({})", words::amount(&opened.volume), opened.volume_basis),
            liquid_basis: liquid(opened),
            opened_at: self.opened_at(told),
            expected_final_gravity: opened.expected_final.as_ref().map_or_else(
                String::new,
                |end| {
                    let value = words::on_scale(&end.value, &end.scale);
                    format!(
                        "{value} (apparent extract {} % by mass), {}",
                        end.apparent_extract_percent, end.basis
                    )
                },
            ),
            fermentable_sugar: self.sugar(opened),
            demand: self.demand(opened),
        }
    }

    fn vessel(&self, opened: &BatchOpened) -> String {
        let described = self.desk.vessel(opened.vessel).ok().and_then(|v| v.current.as_ref());
        described.map_or_else(
            || opened.vessel.to_string(),
            |(_, vessel)| {
                format!("{} {} ({})", vessel.code, vessel.name, words::amount(&vessel.capacity))
            },
        )
    }

    fn opened_at(&self, told: &Told) -> String {
        let at = self.clock(told.read.occurred_at.at);
        match told.read.amendments.last() {
            Some(by) if told.read.void => format!(
                "{at}, voided {} by {}: “{}”",
                self.clock(by.at.at),
                self.name(by.actor),
                by.reason
            ),
            _ => at,
        }
    }

    /// The sugar that need was judged on, as the newest assessment has it.
    fn sugar(&self, opened: &BatchOpened) -> String {
        if let Some((_, found)) = self.assessments().last() {
            let account = &found.account_after;
            let other = account.other_sugar_g_l.iter().zip(&account.other_sugar_basis);
            let other = other.map(|(g_l, basis)| format!("; {g_l} g/L by {basis}"));
            let other = other.collect::<String>();
            return format!("{} g/L by {}{other}", account.sugar_g_l, account.sugar_basis);
        }
        let stated = opened.fermentable_sugar.as_ref();
        stated.map_or_else(String::new, |sugar| format!("{} g/L by {}", sugar.g_per_l, sugar.basis))
    }

    /// The need as the newest assessment has it.
    fn demand(&self, opened: &BatchOpened) -> String {
        let demand = &opened.demand;
        let Some((_, found)) = self.assessments().pop() else {
            return format!("{demand} demand; nothing was assessed yet");
        };
        let account = &found.account_after;
        let line = account.line_mg_l.as_ref().map(|line| format!("; published line {line}"));
        format!(
            "{} mg N/L: {demand} demand, {} mg N per g × {} g/L sugar, at least {}{}",
            account.need_mg_l,
            account.factor_mg_g,
            account.sugar_g_l,
            account.floor_mg_l,
            line.unwrap_or_default()
        )
    }

    /// Every use of every lot, by lot, the lots in the order of their first use.
    pub(crate) fn uses(&self) -> Vec<(LotId, Vec<Use<'_>>)> {
        let mut order = Vec::new();
        let mut uses: BTreeMap<LotId, Vec<Use<'_>>> = BTreeMap::new();
        for told in self.told.iter().filter(|told| told.is_in_force()) {
            for (lot, one) in uses_in(told) {
                if !uses.contains_key(&lot) {
                    order.push(lot);
                }
                uses.entry(lot).or_default().push(one);
            }
        }
        order.into_iter().filter_map(|lot| Some((lot, uses.remove(&lot)?))).collect()
    }

    /// The receipt of a lot as it reads in the end.
    pub(crate) fn receipt(&self, lot: LotId) -> Option<(&InForce, &LotReceived)> {
        let loaded = self.desk.loaded(&lot.into())?;
        loaded.entries.iter().find_map(|entry| match entry.body.as_ref() {
            Body::LotReceived(body) if body.lot == lot => Some((entry.as_ref(), body)),
            _ => None,
        })
    }

    pub(super) fn printed_materials(&self) -> Vec<MaterialLot> {
        self.uses().into_iter().map(|(lot, uses)| self.material_lot(lot, &uses)).collect()
    }

    fn material_lot(&self, lot: LotId, uses: &[Use<'_>]) -> MaterialLot {
        let mut row = MaterialLot {
            used: words::sum(uses.iter().map(|one| one.amount)),
            n: uses.iter().map(|one| one.n).min().unwrap_or_default(),
            ..MaterialLot::default()
        };
        if let Some(first) = uses.first() {
            first.material.clone_into(&mut row.material);
            first.lot_code.clone_into(&mut row.lot);
        }
        let Some((entry, receipt)) = self.receipt(lot) else { return row };
        row.supplier = receipt.supplier.map_or_else(
            || "none: own make, or not stated".to_owned(),
            |party| self.supplier(party),
        );
        row.supplier_lot = supplier_lot(receipt);
        row.received = words::date(entry.occurred_at.at, self.zone());
        row.expiry = receipt.expires_at.map_or_else(|| "not stated".to_owned(), words::stated_date);
        row.struck = struck(self, entry, |body| match body {
            Body::LotReceived(body) => self.receipt_in_words(body),
            _ => String::new(),
        });
        row
    }

    fn supplier(&self, party: domain::ids::PartyId) -> String {
        let described = self.desk.party(party).ok().and_then(|state| state.current.as_ref());
        described.map_or_else(
            || party.to_string(),
            |(_, party)| match &party.address {
                Some(address) => format!("{}, {}", party.name, address.replace('\n', ", ")),
                None => party.name.clone(),
            },
        )
    }

    fn receipt_in_words(&self, receipt: &LotReceived) -> String {
        let supplier = receipt.supplier.and_then(|party| {
            let described = self.desk.party(party).ok()?.current.as_ref();
            described.map(|(_, party)| party.name.clone())
        });
        let expiry = receipt.expires_at.map(words::stated_date);
        [
            format!("lot {}", receipt.code),
            words::amount(&receipt.amount),
            supplier.unwrap_or_default(),
            supplier_lot(receipt),
            expiry.map(|date| format!("expiry {date}")).unwrap_or_default(),
        ]
        .into_iter()
        .filter(|part| !part.is_empty())
        .collect::<Vec<_>>()
        .join(", ")
    }

    pub(super) fn chart(&self) -> Chart {
        let begun = self.opening().map_or(Micros(0), |(told, _)| told.read.occurred_at.at);
        let mut chart = Chart::default();
        for told in self.told.iter().filter(|told| told.is_in_force()) {
            let hours = narrow(told.read.occurred_at.at.hours_since(begun));
            match told.read.body.as_ref() {
                Body::ReadingTaken(body) => chart.points.extend(points(body, hours)),
                Body::AdditionRecorded(body) => chart.doses.push(ChartDose {
                    hours,
                    label: words::dose(&body.lines),
                    verdict: words::verdict(body.assessment.verdict),
                }),
                _ => {}
            }
        }
        let end = self.opening().and_then(|(_, opened)| opened.expected_final.as_ref());
        chart.expected_final = end.and_then(|end| gravity_of(&end.value, &end.scale));
        chart
    }
}

fn or_none(list: &[String]) -> String {
    if list.is_empty() { "none".to_owned() } else { list.join(", ") }
}

fn liquid(opened: &BatchOpened) -> String {
    let now = words::amount(&opened.liquid);
    match &opened.liquid_planned {
        Some(planned) => {
            format!("{now} liquid when opened, {} planned: solids left out", words::amount(planned))
        }
        None if opened.liquid.base() == opened.volume.base() => format!("{now}, all liquid"),
        None => format!("{now} liquid: solids left out"),
    }
}

fn supplier_lot(receipt: &LotReceived) -> String {
    let lot = receipt.supplier_lot.as_ref().map(|lot| format!("its lot {lot}"));
    let document = receipt.document.as_ref().map(|document| format!("document {document}"));
    [lot, document].into_iter().flatten().collect::<Vec<_>>().join("; ")
}

fn uses_in(told: &Told) -> Vec<(LotId, Use<'_>)> {
    let n = told.n;
    match told.read.body.as_ref() {
        Body::BatchOpened(BatchOpened { ingredients, .. }) => ingredients
            .iter()
            .map(|one| {
                let (material, lot_code) = (one.material.as_str(), one.lot_code.as_str());
                (one.lot, Use { n, material, lot_code, amount: &one.amount })
            })
            .collect(),
        Body::AdditionRecorded(AdditionRecorded { lines, .. }) => lines
            .iter()
            .map(|line| {
                let (material, lot_code) = (line.material_name.as_str(), line.lot_code.as_str());
                (line.lot, Use { n, material, lot_code, amount: &line.amount })
            })
            .collect(),
        _ => Vec::new(),
    }
}

/// The gravities of one reading, each with its temperature: that of the liquid, else that of the sample.
fn points(body: &ReadingTaken, hours: f32) -> Vec<ChartPoint> {
    let liquid = body.values.iter().find(|value| value.quantity == "temperature");
    let point = |value: &Reading| {
        let gravity = value.corrected.as_ref()?.sg_20_20.parse().ok()?;
        let sample = value
            .sample_temperature
            .as_ref()
            .and_then(|given| format!("{:.1}", given.celsius()?).parse().ok());
        Some(ChartPoint { hours, gravity, temperature: liquid.and_then(celsius).or(sample) })
    };
    body.values.iter().filter_map(point).collect()
}

fn celsius(value: &Reading) -> Option<f32> {
    let number: f32 = value.value.parse().ok()?;
    Some(if value.unit == "[degF]" { (number - 32.0) / 1.8 } else { number })
}

/// A gravity on the chart's scale; only drawn, never decided on.
fn gravity_of(value: &str, scale: &str) -> Option<f32> {
    let found = at_calibration(value.parse().ok()?, Scale::parse(scale).ok()?).ok()?;
    Some(narrow(found.sg_20_20))
}

#[expect(clippy::cast_possible_truncation, reason = "a place on paper needs no more digits")]
const fn narrow(value: f64) -> f32 {
    value as f32
}
