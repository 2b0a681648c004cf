//! A record to test with: an invented white wine with the turns of real ones. Shared by the
//! tests and the example, so that all look at the same pages.

use records::{
    Absent, AccountRow, Addition, Batch, BatchRecord, Caution, Chart, ChartDose, ChartPoint,
    Deviation, DoseLine, Finding, Head, Issued, MaterialLot, Person, ProposalRef, Reading, RuleSet,
    Signature, Site, Struck, Verdict,
};

/// The record, handed out, in a simulated book.
pub(crate) fn record() -> BatchRecord {
    BatchRecord {
        site: Site {
            name: "Example Works".into(),
            code: "EXW".into(),
            licence: "BWC-EX-0001 (invented)".into(),
            premises: "bonded wine premises".into(),
            time_zone: "America/Los_Angeles".into(),
        },
        simulation: true,
        drawn_up: "2025-10-07T09:00:00-07:00".into(),
        issued: Some(Issued {
            at: "2025-10-07 09:00".into(),
            to: "Inspector Example, case 25-118".into(),
            log_size: 412,
            entries_n: 58,
        }),
        batch: batch(),
        entries_n: 58,
        materials: materials(),
        readings: readings(),
        chart: chart(),
        additions: additions(),
        proposals: proposals(),
        deviations: vec![deviation()],
        account: account(),
        rule_sets: rule_sets(),
        head: Head {
            origin: "exw.example/ledger".into(),
            size: 412,
            root: "3f9a1c0b77d2e4865a10c9ef0d3b6a4415e2c8d7f6905b3a2e1c4d8f7a6b5c90".into(),
            note: vec![
                "exw.example/ledger".into(),
                "412".into(),
                "P5ocC3fS5IZaEMnvDTtqRBXiyNf2kFs6LhxNj3prXJA=".into(),
                "— exw.example/ledger Az3grk9mQ0V0bXhYc2FtcGxlU2lnbmF0dXJlTm90UmVhbA==".into(),
            ],
            key_fingerprint: "7c1e 09b2 55aa d3f0 8c44 1b6e 92d7 0f38".into(),
        },
        people: ["Ana Example, cellar", "Ben Example, lead", "Caro Example, quality"]
            .iter()
            .filter_map(|line| line.split_once(", "))
            .map(|(name, role)| Person { name: name.into(), role: role.into() })
            .collect(),
        engine: "0.1.0".into(),
        cautions: cautions(),
        absent: vec![Absent {
            what: "Movements, gauges and lineage".into(),
            why: "drawn up as records of their own; this batch was racked once, from T-12 to T-07"
                .into(),
        }],
    }
}

/// A wash of molasses and cane sugar: a preview, with an addition entered after the fact.
pub(crate) fn wash() -> BatchRecord {
    let mut record = BatchRecord { issued: None, entries_n: 31, proposals: Vec::new(), ..record() };
    record.batch = Batch {
        code: "EXW-25-A1".into(),
        product_class: "distilling wash, molasses and cane sugar".into(),
        claims: "none: crystal sugar in the wash, so no claim of “rum” in the EU".into(),
        destinations: vec!["US: open".into()],
        vessel: "F-3 (2,400 L)".into(),
        volume: "2,000 L at 20 °C".into(),
        liquid_basis: "2,000 L, all liquid".into(),
        opened_at: "2025-09-22 10:00".into(),
        expected_final_gravity: "SG 1.0155 (3.95 °P), from composition".into(),
        fermentable_sugar: "119.3 g/L from composition, not the 178 g/L that gravity suggests"
            .into(),
        demand: "140 mg N/L, the floor; 0.90 × sugar gives 107.4".into(),
    };
    record.readings = wash_readings();
    record.chart = Chart {
        points: vec![
            ChartPoint { hours: 0.0, gravity: 1.0685, temperature: Some(28.5) },
            ChartPoint { hours: 20.0, gravity: 1.0570, temperature: Some(30.8) },
            ChartPoint { hours: 40.5, gravity: 1.0370, temperature: Some(35.4) },
            ChartPoint { hours: 106.0, gravity: 1.0155, temperature: Some(29.0) },
        ],
        doses: vec![
            ChartDose { hours: 20.5, label: "DAP 400 g".into(), verdict: Verdict::Clear },
            ChartDose { hours: 40.7, label: "DAP 300 g".into(), verdict: Verdict::Refer },
        ],
        expected_final: Some(1.0155),
    };
    record.additions = vec![thrown_in()];
    record.deviations[0].code = "EXW-D-25-04".into();
    record.deviations[0].findings = vec![
        "ammonium after half of the sugar".into(),
        "supply 31.0 mg N/L over need".into(),
        "powder into an active ferment".into(),
    ];
    record.deviations[0].resolved_at = String::new();
    record.deviations[0].signature = None;
    record
}

fn wash_readings() -> Vec<Reading> {
    vec![Reading {
        n: 4,
        at: "2025-09-22 10:00".into(),
        kind: "gravity".into(),
        entered: "1.0665 SG at 27.0 °C".into(),
        corrected: "1.0685".into(),
        method: "hydrometer, 20 °C scale; corrected for temperature of the sample".into(),
        instrument: "HY-1".into(),
        by: "Ana Example".into(),
        ..Reading::default()
    }]
}

fn thrown_in() -> Addition {
    Addition {
        n: 19,
        at: "2025-09-24 02:40".into(),
        lines: vec![dose("DP-0412", "diammonium phosphate", "300 g")],
        preparation: "powder, no slurry".into(),
        by: "Ana Example".into(),
        verdict: Verdict::Refer,
        findings: vec![
            finding(
                Verdict::Refer,
                "0.583 of the sugar is used: late for ammonium.",
                "common practice",
                "half of fermentable sugar",
                "",
            ),
            finding(
                Verdict::Clear,
                "No legal dose check was made here: no adopted set limits nutrients at this premises.",
                "",
                "",
                "",
            ),
        ],
        already_done: Some("night shift, cooling pump tripped".into()),
        late: "entered 2025-09-24 09:05, 6 h 25 min after the act".into(),
        ..Addition::default()
    }
}

fn batch() -> Batch {
    Batch {
        code: "EXW-25-B1".into(),
        product_class: "grape wine, white, still, dry".into(),
        claims: "none".into(),
        destinations: vec![
            "US: open".into(),
            "EU: open".into(),
            "CA: open; total SO₂ 92 mg/L, judged at release".into(),
        ],
        vessel: "T-12 (3,500 L)".into(),
        volume: "3,000 L at 18.0 °C".into(),
        liquid_basis: "3,000 L of racked juice: no solids, so liquid and fill are the same".into(),
        opened_at: "2025-09-08 15:00".into(),
        expected_final_gravity: "SG 0.9920 (apparent extract -2.09 °P), earlier batches".into(),
        fermentable_sugar:
            "246.1 g/L from 22.46 °Bx; the laboratory's glucose + fructose is 220 g/L".into(),
        demand: "236.4 mg N/L: 200 + 25 × (Brix - 21); 0.90 × sugar gives 221.5, the floor is 140"
            .into(),
    }
}

fn materials() -> Vec<MaterialLot> {
    let rows = [
        (2, "potassium metabisulfite", "KM-0033", "S-7781", "2025-05-12", "2028-05", "180 g"),
        (7, "dry yeast", "YW-0001", "Lot n° 24Ž19", "2025-09-08", "2027-03", "750 g"),
        (
            7,
            "rehydration product (autolysed yeast with thiamine hydrochloride)",
            "RH-0091",
            "RH/88",
            "2025-09-08",
            "2026-12",
            "900 g",
        ),
        (11, "yeast autolysate", "AU-0208", "AU-5", "2025-09-08", "2027-01", "900 g"),
        (15, "diammonium phosphate", "DP-0387", "P-1033", "2025-06-02", "2028-01", "500 g"),
        (15, "diammonium phosphate", "DP-0412", "P-1077", "2025-09-08", "2028-06", "551 g"),
    ];
    rows.iter()
        .map(|&(n, material, lot, theirs, received, expiry, used)| MaterialLot {
            material: material.into(),
            lot: lot.into(),
            supplier: "Example Nutrient Supplier".into(),
            supplier_lot: theirs.into(),
            received: received.into(),
            expiry: expiry.into(),
            used: used.into(),
            n,
            ..MaterialLot::default()
        })
        .collect()
}

/// Day of September, gravity, temperature; read at 08:00, the first at 09:00.
const RUN: [(u8, &str, &str); 21] = [
    (9, "1.0940", "15.0"),
    (10, "1.0930", "15.2"),
    (11, "1.0885", "15.8"),
    (12, "1.0790", "16.4"),
    (13, "1.0685", "16.8"),
    (14, "1.0585", "17.0"),
    (15, "1.0490", "16.4"),
    (16, "1.0420", "14.1"),
    (17, "1.0370", "12.4"),
    (18, "1.0325", "12.9"),
    (19, "1.0260", "16.0"),
    (20, "1.0195", "17.0"),
    (21, "1.0130", "17.2"),
    (22, "1.0070", "17.4"),
    (23, "1.0025", "17.5"),
    (24, "0.9985", "17.6"),
    (25, "0.9960", "17.8"),
    (26, "0.9935", "18.0"),
    (27, "0.9925", "18.0"),
    (28, "0.9920", "18.0"),
    (29, "0.9920", "18.0"),
];

fn readings() -> Vec<Reading> {
    let mut readings: Vec<Reading> = (8_u64..)
        .zip(RUN)
        .map(|(n, (day, gravity, temperature))| Reading {
            n,
            at: format!("2025-09-{day:02} 08:00"),
            kind: "gravity".into(),
            entered: format!("{gravity} SG, {temperature} °C"),
            corrected: gravity.into(),
            method: "hydrometer, 20 °C scale".into(),
            instrument: "HY-2".into(),
            by: "Ana Example".into(),
            ..Reading::default()
        })
        .collect();
    readings[10].struck = vec![Struck {
        was: "1.0620 SG".into(),
        now: "1.0260 SG, 16.0 °C".into(),
        by: "Ana Example".into(),
        at: "2025-09-19 08:48".into(),
        why: "slip shows 1.0260; digits swapped".into(),
    }];
    readings[15].late =
        "entered 2025-09-24 14:25, 6 h 25 min after the reading: Ana's tablet had no network"
            .into();
    for (n, kind, entered) in [
        (55, "residual sugar", "1.6 g/L"),
        (55, "urea", "1.1 mg/L"),
        (55, "ethyl carbamate", "< 5 µg/L"),
        (55, "total SO₂", "92 mg/L"),
    ] {
        readings.push(Reading {
            n,
            at: "2025-10-03 10:00".into(),
            kind: kind.into(),
            entered: entered.into(),
            method: "as the laboratory states: enzymatic, GC-MS".into(),
            instrument: "Labor Müller & Großmann, report č. 88/25".into(),
            by: "Caro Example".into(),
            ..Reading::default()
        });
    }
    readings
}

fn chart() -> Chart {
    let points = RUN
        .iter()
        .map(|(day, gravity, temperature)| ChartPoint {
            hours: (f32::from(*day - 9) * 24.0 - 1.0).max(0.0),
            gravity: gravity.parse().expect("a number"),
            temperature: Some(temperature.parse().expect("a number")),
        })
        .collect();
    let doses = [
        (0.0, "rehydrated yeast", Verdict::Clear),
        (49.0, "autolysate 900 g", Verdict::Clear),
        (98.0, "DAP 900 g", Verdict::Clear),
        (225.0, "DAP 151 g", Verdict::Refer),
    ];
    Chart {
        points,
        doses: doses
            .iter()
            .map(|&(hours, label, verdict)| ChartDose { hours, label: label.into(), verdict })
            .collect(),
        expected_final: Some(0.9920),
    }
}

fn dose(lot: &str, material: &str, amount: &str) -> DoseLine {
    DoseLine { lot: lot.into(), material: material.into(), amount: amount.into() }
}

fn finding(verdict: Verdict, sentence: &str, basis: &str, citation: &str, remedy: &str) -> Finding {
    Finding {
        verdict,
        sentence: sentence.into(),
        basis: basis.into(),
        citation: citation.into(),
        remedy: remedy.into(),
    }
}

fn additions() -> Vec<Addition> {
    vec![
        Addition {
            n: 7,
            at: "2025-09-09 09:00".into(),
            lines: vec![
                dose("YW-0001", "dry yeast", "750 g"),
                dose("RH-0091", "rehydration product", "900 g"),
            ],
            preparation: "rehydrated at 38 °C for 20 min".into(),
            carrier_water: "water 8 L of 30 L".into(),
            by: "Ana Example".into(),
            findings: vec![finding(
                Verdict::Clear,
                "Thiamine hydrochloride 0.30 mg/L of 0.60 mg/L.",
                "law",
                "27 CFR 24.246, 0.005 lb per 1,000 US gal",
                "",
            )],
            ..Addition::default()
        },
        Addition {
            n: 15,
            at: "2025-09-13 11:00".into(),
            lines: vec![
                dose("DP-0387", "diammonium phosphate", "500 g"),
                dose("DP-0412", "diammonium phosphate", "400 g"),
            ],
            preparation: "slurry".into(),
            carrier_water: "water 6 L".into(),
            by: "Ana Example".into(),
            findings: vec![finding(
                Verdict::Clear,
                "Total 0.300 g/L of 0.9586 g/L; supply 227.8 of 236.4 mg N/L.",
                "law",
                "27 CFR 24.246, 8 lb per 1,000 US gal",
                "",
            )],
            proposal: Some(ProposalRef { n: 14, proposed: "900 g".into(), done: "900 g".into() }),
            ..Addition::default()
        },
        signed_addition(),
    ]
}

fn signed_addition() -> Addition {
    Addition {
        n: 33,
        at: "2025-09-18 18:05".into(),
        lines: vec![dose("DP-0412", "diammonium phosphate", "151 g")],
        preparation: "slurry".into(),
        carrier_water: "water 2 L, 22 L of 30 L in all".into(),
        by: "Ana Example".into(),
        verdict: Verdict::Refer,
        findings: vec![
            finding(
                Verdict::Refer,
                "At 18:00 more than half of the sugar is used (0.58 to 0.63): ammonium this late is taken up slowly and favours urea.",
                "common practice",
                "half of fermentable sugar as the latest ammonium; site setting: called late from P ≥ 0.5",
                "warm to 17 °C first; yeast cell walls up to 1,078 g carry no ammonium",
            ),
            finding(
                Verdict::Advise,
                "Supply 238.4 mg N/L is 2.0 over the need named.",
                "site setting",
                "over need: above 0 advise, above 50 refer",
                "121 g",
            ),
        ],
        signatures: vec![Signature {
            name: "Ben Example".into(),
            role: "lead".into(),
            at: "2025-09-18 14:20".into(),
            meaning: "approved the exception".into(),
            reason: "strong hydrogen sulfide; cooling repaired; amino lot on hold; urea to be measured before bottling".into(),
            binds: "sha256 9d0c1f6e2b7a48350f1e6d5c4b3a29187766554433221100ffeeddccbbaa9988".into(),
        }],
        already_done: Some("pump trip".into()),
        late: "entered 2025-09-18 21:30, 3 h 25 min after the act".into(),
        proposal: Some(ProposalRef { n: 31, proposed: "150 g".into(), done: "151 g (+0.7 %)".into() }),
        ..Addition::default()
    }
}

fn proposals() -> Vec<Addition> {
    vec![
        Addition {
            n: 20,
            at: "2025-09-15 09:30".into(),
            lines: vec![dose("DP-0412", "diammonium phosphate", "2,100 g")],
            by: "Ana Example".into(),
            verdict: Verdict::Refuse,
            findings: vec![finding(
                Verdict::Refuse,
                "Total would be 1.000 g/L; 0.9586 g/L is the most that may be added to this wine.",
                "law",
                "27 CFR 24.246, 8 lb per 1,000 US gal = 958.611 mg/L",
                "121 g (need); the legal rest would be 1,975 g",
            )],
            outcome: "refused; not done".into(),
            ..Addition::default()
        },
        Addition {
            n: 21,
            at: "2025-09-15 09:32".into(),
            lines: vec![dose("DP-0412", "diammonium phosphate", "210 g")],
            by: "Ana Example".into(),
            verdict: Verdict::Advise,
            findings: vec![finding(
                Verdict::Advise,
                "Supply 242.7 mg N/L is 6.3 over the need named.",
                "site setting",
                "over need: above 0 advise, above 50 refer",
                "121 g",
            )],
            outcome: "withdrawn by Ana Example, 2025-09-15 09:40".into(),
            ..Addition::default()
        },
    ]
}

fn deviation() -> Deviation {
    Deviation {
        code: "EXW-D-25-03".into(),
        opened: "2025-09-16 08:10".into(),
        by: "temperature below the strain's range".into(),
        findings: vec!["Speed fell from 0.095 to 0.045 of the sugar per day; the likely reason is temperature, not nitrogen.".into()],
        cause: "cooling valve stuck open since the night of 2025-09-15".into(),
        action: "valve freed 2025-09-18 12:00; warmed to 17 °C in 24 h".into(),
        resolved_at: "2025-10-06 10:15".into(),
        resolved_by: "Caro Example".into(),
        signature: Some(Signature {
            name: "Caro Example".into(),
            role: "quality".into(),
            at: "2025-10-06 10:15".into(),
            meaning: "reviewed and closed".into(),
            reason: "ran dry; no off-odour after racking".into(),
            binds: "sha256 41aa0c9df0".into(),
        }),
        ..Deviation::default()
    }
}

fn account() -> Vec<AccountRow> {
    [
        (
            "2025-09-08 15:00",
            "laboratory: NH₄⁺ 52 mg/L, primary amino N 98 mg/L",
            "40.4",
            "98.0",
            "138.4",
        ),
        ("2025-09-09 09:00", "RH-0091 900 g", "40.4", "110.0", "150.4"),
        ("2025-09-11 10:00", "AU-0208 900 g", "40.4", "123.8", "164.2"),
        ("2025-09-13 11:00", "DP-0387 500 g, DP-0412 400 g", "104.0", "123.8", "227.8"),
        ("2025-09-18 18:05", "DP-0412 151 g", "114.7", "123.8", "238.5"),
    ]
    .iter()
    .map(|&(at, what, ammonium, amino, supply)| AccountRow {
        at: at.into(),
        what: what.into(),
        ammonium_n: ammonium.into(),
        amino_n: amino.into(),
        supply: supply.into(),
        need: "236.4".into(),
    })
    .collect()
}

fn rule_sets() -> Vec<RuleSet> {
    [
        ("us-wine-24.246", "production"),
        ("eu-wine-2019-934", "market EU"),
        ("common-practice", "good practice"),
    ]
    .iter()
    .map(|&(id, standing)| RuleSet {
        id: id.into(),
        version: "1".into(),
        effective: "since 2025-09-01".into(),
        digest: "sha256 77c2a0b1e9d84f6350a1b2c3d4e5f60718293a4b5c6d7e8f9001122334455667".into(),
        standing: standing.into(),
    })
    .collect()
}

fn cautions() -> Vec<Caution> {
    vec![
        Caution {
            topic: "Carbon dioxide".into(),
            text: "Heavier than air, without smell, pools in pits and tanks. Measure CO₂ itself at low level before entry; ventilate; never lean into a tank.".into(),
            source: "NIOSH criteria document 1976; 29 CFR 1910.146".into(),
        },
        Caution {
            topic: "Foam on powder".into(),
            text: "Powder into a ferment full of CO₂ foams over: slurry first, add slowly, leave headspace.".into(),
            source: "common practice".into(),
        },
    ]
}
