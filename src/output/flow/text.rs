//! The terminal page of `flow`: the answer at a glance, findings, then tables.

use std::fmt::Write as _;

use super::findings::findings;
use crate::math::{SLOTS, degrees};
use crate::network::{BranchKind, Conductor, Network, NodeId};
use crate::output::allocation::meters_text;
use crate::output::table::{Cell, Colour, Column, Table, folded, number, printable};
use crate::solver::Solution;
use crate::study::flow::{Electrode, Extreme, FlowReport, RegulatorTap, lowest_judged};

/// How much of the tables is shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Length {
    /// The worst twenty rows of a long table, the first few findings of a rule.
    Short,
    /// Everything.
    Full,
}

/// Which columns the outer conductors of a centre tap take.
const SPLIT_NOTE: &str = "Behind a centre tap, columns a and b hold s1 and s2.";

/// Rows of a long table that are shown.
const WORST: usize = 20;
/// A table of no more rows than this is shown whole: cutting it would hide a row or two only.
const WHOLE: usize = 24;
/// Rows of the table of electrodes.
const WORST_ELECTRODES: usize = 10;

/// The page as text, at most 100 columns wide.
pub fn flow_text(
    network: &Network,
    solution: &Solution,
    report: &FlowReport,
    length: Length,
    colour: Colour,
) -> String {
    let mut text = String::new();
    head(&mut text, report);
    text.push_str(&meters_text(&report.meters));
    totals(&mut text, report);
    glance(&mut text, network, report);
    findings(&mut text, &report.findings, length, colour);
    nodes(&mut text, network, solution, report, length);
    branches(&mut text, network, solution, report, length);
    regulators(&mut text, report);
    generators(&mut text, report);
    motors(&mut text, report);
    capacitors(&mut text, report);
    electrodes(&mut text, report, length);
    text
}

/// Generators in service.
fn generators(text: &mut String, report: &FlowReport) {
    if report.generators.is_empty() {
        return;
    }
    let mut table = Table::new(&[
        Column::text("generator"),
        Column::text("node"),
        Column::number("delivers", "kW", 2),
        Column::number("of", "kW", 2),
        Column::number("delivers", "kvar", 2),
        Column::number("voltage", "pu", 4),
        Column::text("held back by"),
    ]);
    for g in &report.generators {
        let by = match (g.by_volt_watt, g.by_rating) {
            (true, true) => "volt-watt, rating",
            (true, false) => "volt-watt",
            (false, true) => "rating",
            (false, false) => "",
        };
        table.rows.push(vec![
            Cell::Text(g.generator.to_string()),
            Cell::Text(g.node.to_string()),
            Cell::Number(g.kw),
            Cell::Number(g.available_kw),
            Cell::Number(g.kvar),
            Cell::Number(g.pu),
            Cell::Text(by.to_string()),
        ]);
    }
    let _ = writeln!(text, "Generators\n{}", table.text());
}

/// Running motors.
fn motors(text: &mut String, report: &FlowReport) {
    if report.motors.is_empty() {
        return;
    }
    let mut table = Table::new(&[
        Column::text("motor"),
        Column::number("slip", "%", 2),
        Column::number("a", "A", 1),
        Column::number("b", "A", 1),
        Column::number("c", "A", 1),
        Column::number("of full load", "%", 1),
        Column::number("in", "kW", 2),
        Column::number("loss", "kW", 2),
        Column::number("volt unb.", "%", 2),
        Column::number("derated to", "%", 0),
    ]);
    for m in &report.motors {
        let many = if m.count > 1 { format!("{} x {}", m.count, m.motor) } else { m.motor.to_string() };
        table.rows.push(vec![
            Cell::Text(many),
            Cell::Number(m.slip_percent),
            Cell::Number(m.amps_a),
            Cell::Number(m.amps_b),
            Cell::Number(m.amps_c),
            Cell::Number(m.loading_percent),
            Cell::Number(m.kw),
            Cell::Number(m.loss_kw),
            Cell::Number(m.voltage_unbalance_percent),
            m.derating.map(|d| 100.0 * d).into(),
        ]);
    }
    let _ = writeln!(text, "Running motors\n{}", table.text());
    let _ = writeln!(
        text,
        "  Currents of one motor, power of all of a row. Unbalance and derating by NEMA MG 1.\n"
    );
}

/// Electrodes, those of the highest voltage first.
fn electrodes(text: &mut String, report: &FlowReport, length: Length) {
    let mut order: Vec<&Electrode> = report.electrodes.iter().collect();
    if order.is_empty() {
        return;
    }
    order.sort_by(|a, b| b.volts.total_cmp(&a.volts));
    let all = order.len();
    if length == Length::Short && all > WORST_ELECTRODES + 4 {
        order.truncate(WORST_ELECTRODES);
    }
    let heading = match order.len() == all {
        true => "Earth electrodes, highest voltage first".to_string(),
        false => format!("Earth electrodes: the {} of highest voltage of {all} (--all for all)", order.len()),
    };
    let mut table = Table::new(&[
        Column::text("node"),
        Column::text("earths"),
        Column::number("electrode", "ohm", 2),
        Column::number("into earth", "A", 3),
        Column::number("to remote earth", "V", 2),
    ]);
    for electrode in order {
        let what = match &electrode.transformer {
            Some(name) => format!("neutral point of {name}"),
            None => "neutral".to_string(),
        };
        table.rows.push(vec![
            Cell::Text(electrode.node.to_string()),
            Cell::Text(what),
            Cell::Number(electrode.r_ohm.hypot(electrode.x_ohm)),
            Cell::Number(electrode.amps),
            Cell::Number(electrode.volts),
        ]);
    }
    let _ = writeln!(text, "{heading}\n{}", table.text());
}

fn head(text: &mut String, report: &FlowReport) {
    let name = if report.network.is_empty() { "Network without a name" } else { &report.network };
    let at = report.at.as_ref().map_or(String::new(), |time| format!(", at {time}"));
    text.push_str(&folded("", &format!("{name}{at}")));
    let _ = writeln!(
        text,
        "Converged in {} iteration{}; largest current mismatch {:.1e} A by an independent check.\n",
        report.iterations,
        if report.iterations == 1 { "" } else { "s" },
        report.mismatch_a
    );
    if !report.controls_settled {
        let hunts = report.regulators.iter().filter(|r| r.state == "hunting");
        let regulators = hunts.map(|r| format!("regulator {}, {}", r.regulator, r.phase));
        let hunts = report.capacitors.iter().filter(|c| c.hunting);
        let names: Vec<String> =
            regulators.chain(hunts.map(|c| format!("capacitor {}", c.capacitor))).collect();
        let warning = format!(
            "NOT SETTLED, hunting: {}. The numbers are of one state among several passed through without end.",
            names.join("; ")
        );
        text.push_str(&folded("", &warning));
        text.push('\n');
    }
}

fn totals(text: &mut String, report: &FlowReport) {
    let t = &report.totals;
    let share =
        |kw: f64| if t.source_kw.abs() > 0.0 { Cell::Number(100.0 * kw / t.source_kw) } else { Cell::Blank };
    let mut table = Table::new(&[
        Column::text("Power"),
        Column::number("active", "kW", 3),
        Column::number("reactive", "kvar", 3),
        Column::number("of source", "%", 2),
    ]);
    let mut row = |name: &str, kw: f64, kvar: Option<f64>| {
        table.rows.push(vec![Cell::Text(name.to_string()), Cell::Number(kw), kvar.into(), share(kw)]);
    };
    row("source", t.source_kw, Some(t.source_kvar));
    row("loads and capacitors", t.load_kw, Some(t.load_kvar));
    if !report.motors.is_empty() {
        row("  of them motors", t.motor_kw, Some(t.motor_kvar));
        row("    lost in the motors", t.motor_loss_kw, None);
    }
    if !report.generators.is_empty() {
        row("generators", t.generation_kw, Some(t.generation_kvar));
    }
    row("losses", t.loss_kw, Some(t.loss_kvar));
    row("  phase conductors", t.line_loss_kw, None);
    if report.glance.neutral_volts.is_some() {
        row("  neutral conductors", t.neutral_loss_kw, None);
    }
    if report.glance.neutral_volts.is_some() || !report.electrodes.is_empty() {
        row("  earth electrodes", t.earth_loss_kw, None);
    }
    row("  transformers", t.transformer_loss_kw, None);
    let _ = writeln!(text, "{}", table.text());
    if report.loads.is_empty() {
        let _ = writeln!(text, "  No loads: nothing draws power but losses and capacitors.\n");
    }
}

fn glance(text: &mut String, network: &Network, report: &FlowReport) {
    let study = &network.study;
    let g = &report.glance;
    let mut table = Table::new(&[
        Column::text("At a glance"),
        Column::number("value", "", 0),
        Column::text("where"),
        Column::text("limit"),
    ]);
    let mut row =
        |name: &str, extreme: &Option<Extreme>, decimals: usize, unit: &str, limit: String, none: &str| {
            let (value, place) = match extreme {
                Some(e) => (format!("{} {unit}", number(e.value, decimals)), e.place.clone()),
                None => ("-".to_string(), none.to_string()),
            };
            table.rows.push(vec![
                Cell::Text(name.to_string()),
                Cell::Text(value),
                Cell::Text(place),
                Cell::Text(limit),
            ]);
        };
    let pu = |percent: f64| format!("{} pu", number(percent / 100.0, 3));
    row("lowest voltage", &g.lowest_pu, 4, "pu", pu(study.voltage_low_percent), "no phases");
    row("highest voltage", &g.highest_pu, 4, "pu", pu(study.voltage_high_percent), "no phases");
    let drop = format!("{} %", study.drop_limit_percent);
    row("largest voltage drop", &g.drop_percent, 2, "%", drop, "no lines");
    let unbalance = format!("{} %", study.unbalance_limit_percent);
    row("largest unbalance factor", &g.unbalance_percent, 2, "%", unbalance, "no three-phase node");
    row("highest neutral current", &g.neutral_amps, 2, "A", String::new(), "no line carries a neutral");
    let neutral = study.neutral_limit_v.map_or("none given".to_string(), |v| format!("{v} V"));
    row("highest neutral to earth", &g.neutral_volts, 2, "V", neutral, "no node carries a neutral");
    row("most loaded element", &g.rating_percent, 1, "%", "100 %".to_string(), "no ratings given");
    let _ = writeln!(text, "{}", table.text());
    let _ = writeln!(
        text,
        "  Voltages are phase to neutral where the neutral is carried, else to earth. The drop is counted\n  from the source, transformer or regulator that last set the voltage.\n"
    );
    if network.nodes.iter().any(|n| !n.reference_on.phases().is_empty()) {
        let _ = writeln!(
            text,
            "  Where no earth holds a side, its phases are judged against each other (ab, bc, ca).\n"
        );
    }
}

fn nodes(text: &mut String, network: &Network, solution: &Solution, report: &FlowReport, length: Length) {
    let mut order = network.order.clone();
    let (shown, heading) = if length == Length::Short && order.len() > WHOLE {
        let lowest = lowest_judged(network, solution);
        order.sort_by(|a, b| lowest[a.index()].total_cmp(&lowest[b.index()]));
        (WORST, format!("Nodes: the {WORST} lowest of {} (--all for all)", network.nodes.len()))
    } else {
        (order.len(), "Nodes, from the source outwards".to_string())
    };
    let mut table = Table::new(&[
        Column::text("node"),
        Column::number("nominal", "kV", 3),
        Column::number("a", "pu", 4),
        Column::number("a", "deg", 2),
        Column::number("b", "pu", 4),
        Column::number("b", "deg", 2),
        Column::number("c", "pu", 4),
        Column::number("c", "deg", 2),
        Column::number("n", "V", 2),
        Column::number("unb.", "%", 2),
    ]);
    for &id in order.iter().take(shown) {
        let node = network.node(id);
        let mut row = vec![Cell::Text(node.name.to_string()), Cell::Number(node.nominal_volts / 1e3)];
        for (slot, value) in phase_pu(network, solution, id).into_iter().enumerate() {
            let carried = node.conductors.has_slot(slot);
            row.push(if carried { Cell::Number(value.0) } else { Cell::Blank });
            row.push(if carried { Cell::Number(value.1) } else { Cell::Blank });
        }
        let summary = &report.nodes_summary[id.index()];
        row.push(summary.neutral_volts.into());
        row.push(summary.unbalance_percent.into());
        table.rows.push(row);
    }
    let _ = writeln!(text, "{heading}\n{}", table.text());
    if order.iter().take(shown).any(|&id| network.node(id).conductors.is_split()) {
        let _ = writeln!(text, "{SPLIT_NOTE}\n");
    }
}

/// Voltage of each phase, per unit and degrees, to neutral where it is carried.
fn phase_pu(network: &Network, solution: &Solution, id: NodeId) -> [(f64, f64); 3] {
    let node = network.node(id);
    let volts = &solution.volts[id.index()];
    let n = if node.conductors.has_neutral() { volts[Conductor::N.slot()] } else { Default::default() };
    std::array::from_fn(|k| ((volts[k] - n).norm() / node.nominal_phase_volts(), degrees(volts[k] - n)))
}

fn branches(text: &mut String, network: &Network, solution: &Solution, report: &FlowReport, length: Length) {
    if network.branches.is_empty() {
        return;
    }
    let mut order: Vec<usize> = (0..network.branches.len()).collect();
    let (shown, heading) = if length == Length::Short && order.len() > WHOLE {
        let key = |b: usize| (report.elements[b].rating_percent.unwrap_or(0.0), report.elements[b].loss_kw);
        order.sort_by(|&a, &b| key(b).0.total_cmp(&key(a).0).then(key(b).1.total_cmp(&key(a).1)));
        (
            WORST,
            format!(
                "Branches: the {WORST} most loaded of {} (--all for all), currents at the from end",
                network.branches.len()
            ),
        )
    } else {
        (order.len(), "Branches, currents at the from end".to_string())
    };
    let mut table = Table::new(&[
        Column::text("branch"),
        Column::text("kind"),
        Column::number("a", "A", 2),
        Column::number("b", "A", 2),
        Column::number("c", "A", 2),
        Column::number("n", "A", 2),
        Column::number("loss", "kW", 3),
        Column::number("rating", "%", 1),
    ]);
    for &b in order.iter().take(shown) {
        let branch = &network.branches[b];
        let kind = match &branch.kind {
            BranchKind::Transformer(t) => t.group.to_string(),
            other => other.word().to_string(),
        };
        let mut row = vec![Cell::Text(branch.name.to_string()), Cell::Text(kind)];
        for slot in 0..SLOTS {
            let amps = solution.from_amps[b][slot].norm();
            row.push(if branch.from_conductors.has_slot(slot) { Cell::Number(amps) } else { Cell::Blank });
        }
        row.push(Cell::Number(report.elements[b].loss_kw));
        row.push(report.elements[b].rating_percent.into());
        table.rows.push(row);
    }
    let _ = writeln!(text, "{heading}\n{}", table.text());
    if order.iter().take(shown).any(|&b| network.branches[b].from_conductors.is_split()) {
        let _ = writeln!(text, "{SPLIT_NOTE}\n");
    }
}

fn regulators(text: &mut String, report: &FlowReport) {
    if report.regulators.is_empty() {
        return;
    }
    let _ = writeln!(text, "Regulator taps");
    let mut last: Option<&RegulatorTap> = None;
    let mut line = String::new();
    for r in &report.regulators {
        if r.state == "held" {
            // Held taps of one regulator on one line.
            match last.filter(|l| l.regulator == r.regulator && l.state == "held") {
                Some(_) => {}
                None => {
                    flush(text, &mut line);
                    let _ = write!(line, "{}:", printable(&r.regulator));
                }
            }
            let _ = write!(line, "  {} {:+} (held)", r.phase, r.tap);
        } else {
            flush(text, &mut line);
            let name = printable(&r.regulator);
            let _ = write!(line, "{name}, {}: {:+}, {}; {}", r.phase, r.tap, r.state, r.why);
        }
        last = Some(r);
    }
    flush(text, &mut line);
    text.push('\n');
}

/// Capacitors with a control, and those that are open.
fn capacitors(text: &mut String, report: &FlowReport) {
    let told = || report.capacitors.iter().filter(|c| c.control != "fixed" || c.state == "open");
    if told().next().is_none() {
        return;
    }
    let fixed = report.capacitors.len() - told().count();
    let _ = writeln!(
        text,
        "Capacitors{}",
        if fixed > 0 { format!(", besides {fixed} closed and fixed") } else { String::new() }
    );
    for c in told() {
        let line = format!("{} at {}: {} ({} control); {}", c.capacitor, c.node, c.state, c.control, c.why);
        text.push_str(&folded("  ", &line));
    }
    text.push('\n');
}

fn flush(text: &mut String, line: &mut String) {
    if !line.is_empty() {
        text.push_str(&folded("  ", line));
        line.clear();
    }
}
