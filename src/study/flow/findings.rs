//! Findings: limits of the study that are exceeded, and what a reader must know to trust the numbers.

use serde::Serialize;

use super::controls::{why, why_switched};
use super::losses::Totals;
use super::places::{drop_percent, floating_nodes, judged, set_points};
use super::{Electrode, ElementLoss, GeneratorRun, LoadDraw, MotorRun, NodeSummary};
use crate::network::{BranchKind, Network, weak_star_points};
use crate::solver::{CapacitorState, Controls, Path, Solution, TapState};

/// Conventional limit of touch voltage in normal dry conditions, volts AC (IEC 60364-4-41; from memory).
const TOUCH_VOLTAGE_V: f64 = 50.0;

/// Said wherever ratings or touch voltages are in question.
const CAUTION: &str =
    "Ratings and touch voltages: the local code and a licensed engineer decide, not this table.";
/// Source power may differ from loads and losses by this share.
const BALANCE_SHARE: f64 = 1e-6;
/// And by this much, kilovolt-amperes: rounding, where nothing is drawn to take a share of.
const BALANCE_FLOOR_KVA: f64 = 1e-7;

/// How much a finding matters.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum FindingSeverity {
    /// Worth knowing.
    Note,
    /// A limit is exceeded, or a number needs care.
    Warning,
    /// The results are not to be relied on.
    Error,
}

impl FindingSeverity {
    /// Lower-case word.
    pub fn word(self) -> &'static str {
        match self {
            FindingSeverity::Note => "note",
            FindingSeverity::Warning => "warning",
            FindingSeverity::Error => "error",
        }
    }
}

/// What a finding is about. The text of each is stable.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize)]
pub enum Rule {
    /// Source power and the sum of loads and losses differ.
    #[serde(rename = "power balance")]
    Balance,
    /// Voltage below the study's lower limit.
    #[serde(rename = "low voltage")]
    LowVoltage,
    /// Voltage above the study's upper limit.
    #[serde(rename = "high voltage")]
    HighVoltage,
    /// Drop beyond the study's limit.
    #[serde(rename = "voltage drop")]
    VoltageDrop,
    /// Unbalance factor beyond the study's limit.
    #[serde(rename = "unbalance")]
    Unbalance,
    /// Neutral-to-earth voltage beyond the study's limit, or beyond the conventional touch voltage.
    #[serde(rename = "neutral voltage")]
    NeutralVoltage,
    /// Current above rating.
    #[serde(rename = "overload")]
    Overload,
    /// Constant-power load below the floor voltage.
    #[serde(rename = "load below floor")]
    BelowFloor,
    /// Regulator outside its band: at a limit, hunting, or fed backwards.
    #[serde(rename = "regulator")]
    Regulator,
    /// Generator held back, or power that flows out at the source.
    #[serde(rename = "generation")]
    Generation,
    /// Motor beyond what unbalance leaves of its rating, or beyond its full-load current.
    #[serde(rename = "motor")]
    Motor,
    /// Switched capacitor that hunts.
    #[serde(rename = "capacitor")]
    Capacitor,
    /// Voltages that are those after a collapse.
    #[serde(rename = "voltage collapse")]
    Collapse,
    /// A side that nothing but a stated reference holds to earth.
    #[serde(rename = "no earth")]
    NoEarth,
    /// A star point earthed through a large impedance that single-phase loads return through.
    #[serde(rename = "weak star point")]
    StarPoint,
    /// What the numbers cannot decide: the local code and a licensed engineer do.
    #[serde(rename = "caution")]
    Caution,
}

impl Rule {
    /// The rule as printed.
    pub fn text(self) -> &'static str {
        match self {
            Rule::Balance => "power balance",
            Rule::LowVoltage => "low voltage",
            Rule::HighVoltage => "high voltage",
            Rule::VoltageDrop => "voltage drop",
            Rule::Unbalance => "unbalance",
            Rule::NeutralVoltage => "neutral voltage",
            Rule::Overload => "overload",
            Rule::BelowFloor => "load below floor",
            Rule::Regulator => "regulator",
            Rule::Generation => "generation",
            Rule::Motor => "motor",
            Rule::Capacitor => "capacitor",
            Rule::Collapse => "voltage collapse",
            Rule::NoEarth => "no earth",
            Rule::StarPoint => "weak star point",
            Rule::Caution => "caution",
        }
    }
}

/// One finding.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Finding {
    /// How much it matters.
    pub severity: FindingSeverity,
    /// What it is about.
    pub rule: Rule,
    /// Where.
    #[serde(rename = "where")]
    pub place: String,
    /// The value found, in the unit the text names.
    pub value: f64,
    /// The limit it exceeds; none for a remark.
    pub limit: Option<f64>,
    /// In words, with unit.
    pub text: String,
}

/// What findings are drawn from.
pub(super) struct Seen<'a> {
    pub electrodes: &'a [Electrode],
    pub motors: &'a [MotorRun],
    pub generators: &'a [GeneratorRun],
    pub network: &'a Network,
    pub solution: &'a Solution,
    pub elements: &'a [ElementLoss],
    pub nodes: &'a [NodeSummary],
    pub loads: &'a [LoadDraw],
    pub controls: &'a Controls,
    pub totals: &'a Totals,
}

/// All findings, by rule, worst first.
pub(super) fn all(seen: &Seen) -> Vec<Finding> {
    let mut found = Vec::new();
    voltages(seen, &mut found);
    nodes(seen, &mut found);
    overloads(seen, &mut found);
    below_floor(seen, &mut found);
    regulators(seen, &mut found);
    capacitors(seen, &mut found);
    unearthed(seen, &mut found);
    star_points(seen, &mut found);
    generation(seen, &mut found);
    motors(seen, &mut found);
    collapse(seen, &mut found);
    balance(seen, &mut found);
    caution(seen, &mut found);
    let excess = |f: &Finding| match (f.rule, f.limit) {
        (Rule::LowVoltage | Rule::BelowFloor, _) => -f.value,
        _ => f.value,
    };
    found.sort_by(|a, b| a.rule.cmp(&b.rule).then(excess(b).total_cmp(&excess(a))));
    found
}

fn warning(rule: Rule, place: String, value: f64, limit: Option<f64>, text: String) -> Finding {
    Finding { severity: FindingSeverity::Warning, rule, place, value, limit, text }
}

fn voltages(seen: &Seen, found: &mut Vec<Finding>) {
    let study = &seen.network.study;
    let (low, high) = (study.voltage_low_percent / 100.0, study.voltage_high_percent / 100.0);
    let (floating, set_at) = (floating_nodes(seen.network), set_points(seen.network));
    for &id in &seen.network.order {
        let name = &seen.network.node(id).name;
        for (across, pu) in judged(seen.network, seen.solution, &floating, id) {
            let place = || format!("node {name}, {across}");
            if pu < low {
                let text = format!("{:.2} % of nominal, limit {} %", 100.0 * pu, study.voltage_low_percent);
                found.push(warning(Rule::LowVoltage, place(), pu, Some(low), text));
            } else if pu > high {
                let text = format!("{:.2} % of nominal, limit {} %", 100.0 * pu, study.voltage_high_percent);
                found.push(warning(Rule::HighVoltage, place(), pu, Some(high), text));
            }
        }
        if let Some((percent, across)) = drop_percent(seen.network, seen.solution, &floating, &set_at, id)
            && percent > study.drop_limit_percent
        {
            let from = &seen.network.node(set_at[id.index()]).name;
            let text = format!("{percent:.2} % below node {from}, limit {} %", study.drop_limit_percent);
            found.push(warning(
                Rule::VoltageDrop,
                format!("node {name}, {across}"),
                percent,
                Some(study.drop_limit_percent),
                text,
            ));
        }
    }
}

fn nodes(seen: &Seen, found: &mut Vec<Finding>) {
    let study = &seen.network.study;
    for node in seen.nodes {
        let place = || format!("node {}", node.node);
        if let Some(percent) = node.unbalance_percent
            && percent > study.unbalance_limit_percent
        {
            let text = format!("unbalance factor {percent:.2} %, limit {} %", study.unbalance_limit_percent);
            found.push(warning(Rule::Unbalance, place(), percent, Some(study.unbalance_limit_percent), text));
        }
        if let Some(volts) = node.neutral_volts {
            found.extend(to_earth("neutral", place, volts, study.neutral_limit_v));
        }
    }
    for electrode in seen.electrodes {
        let Some(transformer) = &electrode.transformer else { continue };
        let place = || format!("transformer {transformer} at node {}", electrode.node);
        found.extend(to_earth("star point", place, electrode.volts, study.neutral_limit_v));
    }
}

/// A neutral or star point too far from earth.
fn to_earth(what: &str, place: impl Fn() -> String, volts: f64, limit: Option<f64>) -> Option<Finding> {
    match limit {
        Some(limit) if volts > limit => {
            let text = format!("{what} {volts:.2} V above remote earth, limit {limit} V");
            Some(warning(Rule::NeutralVoltage, place(), volts, Some(limit), text))
        }
        _ if volts > TOUCH_VOLTAGE_V => {
            let text = format!(
                "{what} {volts:.2} V above remote earth; {TOUCH_VOLTAGE_V} V is the conventional touch limit"
            );
            Some(warning(Rule::NeutralVoltage, place(), volts, None, text))
        }
        _ => None,
    }
}

/// Generators that curves or ratings hold back, and a feeder that delivers at its source.
fn generation(seen: &Seen, found: &mut Vec<Finding>) {
    let mut note = |place: String, value: f64, text: String| {
        found.push(Finding {
            severity: FindingSeverity::Note,
            rule: Rule::Generation,
            place,
            value,
            limit: None,
            text,
        });
    };
    for g in seen.generators {
        let place = || format!("generator {}", g.generator);
        let why = match (g.by_volt_watt, g.by_rating) {
            (true, _) => "its volt-watt curve holds it back",
            (false, true) => "its rating is reached",
            (false, false) => continue,
        };
        let text = format!(
            "{:.2} kW of {:.2} kW and {:.2} kvar at {:.2} % of nominal voltage: {why}",
            g.kw,
            g.available_kw,
            g.kvar,
            100.0 * g.pu
        );
        note(place(), g.kw, text);
    }
    if seen.totals.source_kw < 0.0 && !seen.generators.is_empty() {
        let kw = -seen.totals.source_kw;
        note("source".to_string(), kw, format!("the feeder delivers {kw:.2} kW at its source"));
    }
}

/// Motors that unbalance or load takes beyond what they are made for.
fn motors(seen: &Seen, found: &mut Vec<Finding>) {
    for m in seen.motors {
        let place = || format!("motor {}", m.motor);
        let unbalance = m.voltage_unbalance_percent;
        match (m.derating, m.derated_load_percent) {
            (None, _) => {
                let text = format!(
                    "{unbalance:.2} % voltage unbalance; above 5 % no operation is recommended (NEMA MG 1, figure 14-1)"
                );
                found.push(warning(Rule::Motor, place(), unbalance, Some(5.0), text));
            }
            (Some(derating), Some(percent)) if percent > 100.0 && derating < 1.0 => {
                let text = format!(
                    "{unbalance:.2} % voltage unbalance leaves {:.0} % of rated output (NEMA MG 1, figure 14-1); it gives {percent:.1} % of that",
                    100.0 * derating
                );
                found.push(warning(Rule::Motor, place(), percent, Some(100.0), text));
            }
            _ => {}
        }
        if m.loading_percent > 100.5 {
            let text = format!("greatest phase current {:.1} % of full load", m.loading_percent);
            found.push(warning(Rule::Motor, place(), m.loading_percent, Some(100.0), text));
        }
    }
}

/// A solution that the unloaded state does not lead to.
fn collapse(seen: &Seen, found: &mut Vec<Finding>) {
    let Path::Folds { share } = seen.solution.path else { return };
    let text = format!(
        "raised from nothing, the loads can be fed up to {:.1} % only; what is shown is the state after the voltage has collapsed, with loads below their floor",
        100.0 * share
    );
    found.push(warning(Rule::Collapse, "network".to_string(), 100.0 * share, Some(100.0), text));
}

fn overloads(seen: &Seen, found: &mut Vec<Finding>) {
    for element in seen.elements {
        if let Some(percent) = element.rating_percent
            && percent > 100.0
        {
            let text = format!("{percent:.1} % of rating");
            found.push(warning(
                Rule::Overload,
                format!("{} {}", element.kind, element.element),
                percent,
                Some(100.0),
                text,
            ));
        }
    }
}

/// Loads whose voltage is below the floor of constant power.
fn below_floor(seen: &Seen, found: &mut Vec<Finding>) {
    let floor = seen.network.study.constant_power_floor_percent;
    for load in seen.loads.iter().filter(|l| l.below_floor) {
        let text = format!(
            "{:.1} % of nominal, below {floor} %: taken between constant power and constant impedance, draws {:.2} kW",
            100.0 * load.lowest_pu,
            load.kw
        );
        found.push(warning(Rule::BelowFloor, format!("load {}", load.load), load.lowest_pu, None, text));
    }
}

/// Regulators that could not hold their band.
fn regulators(seen: &Seen, found: &mut Vec<Finding>) {
    for ended in seen.controls.units.iter().filter(|u| u.state != TapState::Settled) {
        let branch = seen.network.branch(ended.branch);
        let BranchKind::Regulator(bank) = &branch.kind else { continue };
        let Some(unit) = bank.units.get(ended.unit) else { continue };
        let place = format!("regulator {}, {}", unit.name, unit.phase.letter());
        found.push(warning(Rule::Regulator, place, ended.relay_volts, None, why(unit, ended)));
    }
}

/// Capacitors that switch on and off without end.
fn capacitors(seen: &Seen, found: &mut Vec<Finding>) {
    for ended in seen.controls.capacitors.iter().filter(|c| c.state == CapacitorState::Hunting) {
        let Some(bank) = seen.network.capacitor_banks.get(ended.bank) else { continue };
        let place = format!("capacitor {}", bank.capacitor.name);
        let text = why_switched(seen.network, bank, Some(ended));
        found.push(warning(Rule::Capacitor, place, ended.reading, None, text));
    }
}

/// Sides that only a stated reference holds near earth, one finding a side.
fn unearthed(seen: &Seen, found: &mut Vec<Finding>) {
    for (i, node) in seen.network.nodes.iter().enumerate().filter(|(_, n)| n.reference_siemens > 0.0) {
        let fed = seen.network.feeds[i]
            .map_or(String::new(), |f| format!(" fed by {}", seen.network.branch(f.branch).name));
        let what = if node.reference_on.phases().is_empty() { "neutral" } else { "side" };
        let text = format!(
            "{what}{fed} is earthed nowhere; held near earth by {:.3} microsiemens, voltages to earth are not to be relied on",
            node.reference_siemens * 1e6
        );
        found.push(Finding {
            severity: FindingSeverity::Note,
            rule: Rule::NoEarth,
            place: format!("node {}", node.name),
            value: node.reference_siemens,
            limit: None,
            text,
        });
    }
}

/// Star points that single-phase loads to earth shift; the value is the ohms.
fn star_points(seen: &Seen, found: &mut Vec<Finding>) {
    for weak in weak_star_points(seen.network) {
        let name = &seen.network.branch(weak.branch).name;
        let volts = seen
            .electrodes
            .iter()
            .find(|e| e.transformer.as_ref() == Some(name))
            .map_or(f64::NAN, |e| e.volts);
        let shifted =
            if volts.is_finite() { format!(", now {volts:.1} V from earth") } else { String::new() };
        let text = format!(
            "star point earthed through {:.1} ohm{shifted}, with {} single-phase load{} behind it that return{} through earth ({}): check the earthing, or carry n to them",
            weak.ohm,
            weak.loads,
            if weak.loads == 1 { "" } else { "s" },
            if weak.loads == 1 { "s" } else { "" },
            weak.first,
        );
        found.push(warning(Rule::StarPoint, format!("transformer {name}"), weak.ohm, None, text));
    }
}

/// Source power against loads and losses; what is not a number counts as a difference.
fn balance(seen: &Seen, found: &mut Vec<Finding>) {
    let t = seen.totals;
    let off = (t.source_kw + t.generation_kw - t.load_kw - t.loss_kw)
        .hypot(t.source_kvar + t.generation_kvar - t.load_kvar - t.loss_kvar);
    let size = t.source_kw.hypot(t.source_kvar).max(t.load_kw.hypot(t.load_kvar));
    let limit = (BALANCE_SHARE * size).max(BALANCE_FLOOR_KVA);
    if off.is_finite() && off <= limit {
        return;
    }
    found.push(Finding {
        severity: FindingSeverity::Error,
        rule: Rule::Balance,
        place: "network".to_string(),
        value: off,
        limit: Some(limit),
        text: format!("source, loads and losses differ by {off:.6} kVA: do not rely on these results"),
    });
}

/// The caution, once, where an overload or a neutral's voltage is in question; its value is their number.
fn caution(seen: &Seen, found: &mut Vec<Finding>) {
    let risky = |f: &&Finding| matches!(f.rule, Rule::Overload | Rule::NeutralVoltage | Rule::StarPoint);
    let questions = found.iter().filter(risky).count();
    let limited =
        seen.network.study.neutral_limit_v.is_some() && seen.nodes.iter().any(|n| n.neutral_volts.is_some());
    if questions > 0 || limited {
        found.push(Finding {
            severity: FindingSeverity::Note,
            rule: Rule::Caution,
            place: "network".to_string(),
            value: questions as f64,
            limit: None,
            text: CAUTION.to_string(),
        });
    }
}
