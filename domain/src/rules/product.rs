//! A product as it is judged at its release, and which products a rule is about.

use std::collections::BTreeMap;

use serde::Deserialize;

use super::content::{Content, Liquid};
use super::exact::Exact;

/// The colour of a wine.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Colour {
    /// White.
    White,
    /// Rosé.
    Rose,
    /// Red.
    Red,
}

/// What is to be released, as far as it is known.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Product {
    /// What it is: its class, and every category it is sold under (`fruit_spirit`, `table_wine`).
    pub names: Vec<String>,
    /// What went into it, by substance.
    pub materials: Vec<String>,
    /// Its colour, if it is a wine.
    pub colour: Option<Colour>,
    /// Whether it sparkles.
    pub sparkling: Option<bool>,
    /// Glucose and fructose, g/L.
    pub sugar_g_l: Option<Exact>,
    /// The year of the harvest.
    pub harvest: Option<u16>,
    /// Strength and density.
    pub liquid: Liquid,
    /// What was measured in it, by substance.
    pub analyses: BTreeMap<String, Content>,
}

/// Which products a rule is about; what is left out is not asked.
#[derive(Clone, Debug, Default, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Scope {
    /// It is one of these.
    #[serde(default)]
    pub products: Vec<String>,
    /// It is none of these.
    #[serde(default)]
    pub not_products: Vec<String>,
    /// One of these went into it.
    #[serde(default)]
    pub used: Vec<String>,
    /// It has one of these colours.
    #[serde(default)]
    pub colours: Vec<Colour>,
    /// It sparkles, or does not.
    #[serde(default)]
    pub sparkling: Option<bool>,
    /// It holds at least so much sugar, g/L.
    #[serde(default)]
    pub sugar_at_least: Option<Exact>,
    /// It holds less sugar than this, g/L.
    #[serde(default)]
    pub sugar_below: Option<Exact>,
    /// It was harvested in this year or later.
    #[serde(default)]
    pub harvest_from: Option<u16>,
    /// It was harvested in this year or before.
    #[serde(default)]
    pub harvest_to: Option<u16>,
}

/// Whether a rule is about a product.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Fit {
    /// It is.
    Yes,
    /// It is not.
    No,
    /// That turns on something which is not known.
    Unknown(&'static str),
}

impl Scope {
    /// Whether the product falls under it. What rules it out counts before what is not known.
    pub fn fit(&self, product: &Product) -> Fit {
        let any = |list: &[String], of: &[String]| list.iter().any(|name| of.contains(name));
        let named = self.products.is_empty() || any(&self.products, &product.names);
        let used = self.used.is_empty() || any(&self.used, &product.materials);
        if !named || !used || any(&self.not_products, &product.names) {
            return Fit::No;
        }
        let sweet = |test: &dyn Fn(&Exact) -> bool| product.sugar_g_l.as_ref().map(test);
        let harvested = |test: &dyn Fn(u16) -> bool| product.harvest.map(test);
        let colour = product.colour.map(|colour| self.colours.contains(&colour));
        let tests = [
            (!self.colours.is_empty()).then_some(("the colour", colour)),
            self.sparkling.map(|wanted| {
                ("whether it sparkles", product.sparkling.map(|sparkles| sparkles == wanted))
            }),
            self.sugar_at_least
                .as_ref()
                .map(|least| ("the sugar", sweet(&|sugar| sugar.compare(least).is_ge()))),
            self.sugar_below
                .as_ref()
                .map(|bound| ("the sugar", sweet(&|sugar| sugar.compare(bound).is_lt()))),
            self.harvest_from.map(|year| ("the year of the harvest", harvested(&|it| it >= year))),
            self.harvest_to.map(|year| ("the year of the harvest", harvested(&|it| it <= year))),
        ];
        let asked = || tests.iter().flatten();
        if asked().any(|(_, answer)| *answer == Some(false)) {
            return Fit::No;
        }
        let unknown = asked().find(|(_, answer)| answer.is_none());
        unknown.map_or(Fit::Yes, |(what, _)| Fit::Unknown(what))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn scope(text: &str) -> Scope {
        toml::from_str(text).unwrap()
    }

    #[test]
    fn what_rules_it_out_counts_before_what_is_not_known() {
        let sweet_red = scope("colours = [\"red\"]\nsugar_at_least = \"5\"");
        let mut wine = Product::default();
        assert_eq!(sweet_red.fit(&wine), Fit::Unknown("the colour"));
        wine.colour = Some(Colour::Red);
        assert_eq!(sweet_red.fit(&wine), Fit::Unknown("the sugar"));
        wine.sugar_g_l = Some(Exact::parse("5.0").unwrap());
        assert_eq!(sweet_red.fit(&wine), Fit::Yes);
        wine.sugar_g_l = Some(Exact::parse("4.99").unwrap());
        assert_eq!(sweet_red.fit(&wine), Fit::No);
        wine.colour = None;
        assert_eq!(sweet_red.fit(&wine), Fit::No);
    }

    #[test]
    fn names_include_and_exclude() {
        let rule = scope("products = [\"fruit_spirit\"]\nnot_products = [\"stone_fruit_spirit\"]");
        let named = |names: &[&str]| Product {
            names: names.iter().map(|&name| name.to_owned()).collect(),
            ..Product::default()
        };
        assert_eq!(rule.fit(&named(&["fruit_spirit"])), Fit::Yes);
        assert_eq!(rule.fit(&named(&["fruit_spirit", "stone_fruit_spirit"])), Fit::No);
        assert_eq!(rule.fit(&named(&["whisky"])), Fit::No);
    }

    #[test]
    fn what_is_asked_of_a_treatment_is_asked_only_where_it_was_made() {
        let rule = scope("used = [\"copper_sulfate\"]");
        assert_eq!(rule.fit(&Product::default()), Fit::No);
        let materials = vec!["copper_sulfate".to_owned()];
        assert_eq!(rule.fit(&Product { materials, ..Product::default() }), Fit::Yes);
    }

    #[test]
    fn harvests_have_both_ends() {
        let rule = scope("harvest_from = 2016\nharvest_to = 2021");
        let of = |year| Product { harvest: Some(year), ..Product::default() };
        let fits = [2015, 2016, 2021, 2022].map(|year| rule.fit(&of(year)));
        assert_eq!(fits, [Fit::No, Fit::Yes, Fit::Yes, Fit::No]);
        assert_eq!(rule.fit(&Product::default()), Fit::Unknown("the year of the harvest"));
    }
}
