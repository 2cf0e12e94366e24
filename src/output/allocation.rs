//! Meters and the loads shared to meet them: text, JSON, CSV, and why a meter cannot be met.

use std::fmt::Write as _;
use std::io::{self, Write};

use super::csv::{Field, write_row};
use super::flow::no_solution_text;
use super::table::{Cell, Column, Table, folded, number};
use crate::network::Network;
use crate::study::allocation::{AllocatedLoad, Allocation, MeterRead, Unmet};

/// Name of a reading: the meter, with its phase where it reads one.
fn called(meter: &MeterRead) -> String {
    match meter.phase {
        Some(phase) => format!("{}, phase {phase}", meter.meter),
        None => meter.meter.clone(),
    }
}

/// A sentence and a table of the readings; nothing where there are no meters.
pub fn meters_text(meters: &[MeterRead]) -> String {
    if meters.is_empty() {
        return String::new();
    }
    let asked = |m: &MeterRead| match (m.metered_kw, m.metered_amps) {
        (Some(kw), _) => format!("meter {} {} kW", called(m), number(kw, 1)),
        (None, Some(amps)) => format!("meter {} {} A", called(m), number(amps, 1)),
        (None, None) => called(m),
    };
    let list: Vec<String> = meters.iter().map(asked).collect();
    let mut text = folded("", &format!("Loads shared to meet {}, losses included.", list.join("; ")));
    let mut table = Table::new(&[
        Column::text("Meter"),
        Column::number("read", "kW", 2),
        Column::number("flow", "kW", 2),
        Column::number("read", "kvar", 2),
        Column::number("flow", "kvar", 2),
        Column::number("read", "A", 2),
        Column::number("flow", "A", 2),
        Column::number("shared", "kW", 2),
        Column::number("loads", "", 0),
    ]);
    for m in meters {
        table.rows.push(vec![
            Cell::Text(called(m)),
            m.metered_kw.into(),
            Cell::Number(m.kw),
            m.metered_kvar.into(),
            Cell::Number(m.kvar),
            m.metered_amps.into(),
            Cell::Number(m.amps),
            Cell::Number(m.shared_kw),
            Cell::Number(m.loads as f64),
        ]);
    }
    let _ = writeln!(text, "\n{}", table.text());
    text
}

/// The page of `allocate`: readings, then every load.
pub fn allocation_text(network: &Network, allocation: &Allocation, loads: &[AllocatedLoad]) -> String {
    let name = &network.study.name;
    let mut text = folded("", if name.is_empty() { "Network without a name" } else { name });
    let _ = writeln!(
        text,
        "Every meter is met after {} solves; largest current mismatch {:.1e} A by an independent check.\n",
        allocation.solves, allocation.solution.mismatch_amps
    );
    text.push_str(&meters_text(&allocation.meters));
    let mut table = Table::new(&[
        Column::text("load"),
        Column::text("at"),
        Column::text("phases"),
        Column::number("active", "kW", 3),
        Column::number("reactive", "kvar", 3),
        Column::text("meter"),
        Column::number("share", "%", 2),
    ]);
    for load in loads {
        let at = load.node.as_ref().or(load.line.as_ref()).map_or("", |n| n);
        table.rows.push(vec![
            Cell::Text(load.load.to_string()),
            Cell::Text(at.to_string()),
            Cell::Text(load.phases.clone()),
            Cell::Number(load.kw),
            Cell::Number(load.kvar),
            load.meter.as_ref().map_or(Cell::Text("known".to_string()), |m| Cell::Text(m.to_string())),
            load.share_percent.into(),
        ]);
    }
    let _ = writeln!(text, "Loads, power at nominal voltage\n{}", table.text());
    text
}

/// Readings and loads as one JSON object.
///
/// # Errors
/// What the writer says.
pub fn allocation_json(
    network: &Network,
    allocation: &Allocation,
    loads: &[AllocatedLoad],
    writer: &mut dyn Write,
) -> io::Result<()> {
    let object = serde_json::json!({
        "fourwire": env!("CARGO_PKG_VERSION"),
        "network": network.study.name,
        "solves": allocation.solves,
        "mismatch_a": allocation.solution.mismatch_amps,
        "meters": allocation.meters,
        "loads": loads,
    });
    serde_json::to_writer_pretty(&mut *writer, &object)?;
    writeln!(writer)
}

/// The loads as a `loads.csv` that a network can take; meter and share stand in note columns.
///
/// # Errors
/// What the writer says.
pub fn loads_csv(loads: &[AllocatedLoad], out: &mut dyn Write) -> io::Result<()> {
    let mut writer = csv::Writer::from_writer(out);
    writer.write_record([
        "load",
        "node",
        "line",
        "phases",
        "kw",
        "kvar",
        "model",
        "note_meter",
        "note_share_percent",
    ])?;
    for load in loads {
        let name =
            |name: &Option<crate::network::Name>| name.as_ref().map_or(String::new(), |n| n.to_string());
        let (node, line, meter) = (name(&load.node), name(&load.line), name(&load.meter));
        let fields = [
            Field::Text(&load.load),
            Field::Text(&node),
            Field::Text(&line),
            Field::Text(&load.phases),
            Field::Number(load.kw),
            Field::Number(load.kvar),
            Field::Text(load.model),
            Field::Text(&meter),
            load.share_percent.into(),
        ];
        write_row(&mut writer, &fields)?;
    }
    writer.flush()
}

/// The readings as CSV.
///
/// # Errors
/// What the writer says.
pub fn meters_csv(meters: &[MeterRead], out: &mut dyn Write) -> io::Result<()> {
    let mut writer = csv::Writer::from_writer(out);
    writer.write_record([
        "meter",
        "phase",
        "metered_kw",
        "kw",
        "metered_kvar",
        "kvar",
        "metered_amps",
        "amps",
        "shared_kw",
        "loads",
        "met",
    ])?;
    for m in meters {
        let fields = [
            Field::Text(&m.meter),
            Field::Text(m.phase.unwrap_or("")),
            m.metered_kw.into(),
            Field::Number(m.kw),
            m.metered_kvar.into(),
            Field::Number(m.kvar),
            m.metered_amps.into(),
            Field::Number(m.amps),
            Field::Number(m.shared_kw),
            Field::Number(m.loads as f64),
            Field::Flag(m.met),
        ];
        write_row(&mut writer, &fields)?;
    }
    writer.flush()
}

/// Why the meters cannot be met, without any result.
pub fn unmet_text(network: &Network, unmet: &Unmet) -> String {
    let mut text = match unmet {
        Unmet::NoSolution(solution) => {
            let mut text = folded(
                "",
                "error[meter-not-met]: while loads were shared to meet the meters, the flow lost its solution:",
            );
            text.push_str(&no_solution_text(network, solution));
            return text;
        }
        Unmet::Collapsed => folded(
            "",
            "error[meter-not-met]: what the meters read is beyond what the feeder can carry: only a solution of collapsed voltages would give it.",
        ),
        Unmet::NegativeRemainder { meters, loads } => {
            let mut text = String::new();
            for m in meters {
                let kw = m.metered_kw.unwrap_or(m.kw);
                text.push_str(&folded("", &format!(
                    "error[negative-remainder]: meter {} reads {} kW, but loads that are known, meters behind it and losses take {} kW more: nothing is left to share.",
                    called(m), number(kw, 3), number(-m.shared_kw, 3)
                )));
            }
            let shown: Vec<&str> = loads.iter().take(8).map(String::as_str).collect();
            let more = if loads.len() > shown.len() { ", ..." } else { "" };
            text.push_str(&folded(
                "  ",
                &format!("Less than nothing would go to: {}{more}.", shown.join(", ")),
            ));
            text.push_str(
                "  Check that all readings are of the same time, and the kw of loads without a share.\n",
            );
            text
        }
        Unmet::Off(meters) => {
            let mut text = String::new();
            for m in meters {
                text.push_str(&folded("", &format!("error[meter-not-met]: {}", off(m))));
            }
            text.push_str(&folded("  ", "Look at: a reading in the wrong unit, meters that contradict each other, a phase none of whose power the loads behind the meter can change, kW and kvar of every phase where all loads are behind delta windings (their phase currents sum to nothing, so six readings cannot be free), a power factor that no load can give."));
            text
        }
        Unmet::TapsMove => folded(
            "",
            "error[meter-not-met]: taps of automatic regulators do not come to rest while loads are shared; hold them (tap_a, tap_b, tap_c) where they stood when the meters were read.",
        ),
    };
    text.push_str("  No results are shown, since none are good.\n");
    text
}

/// How far off a reading the search ended.
fn off(m: &MeterRead) -> String {
    let mut parts = Vec::new();
    if let Some(kw) = m.metered_kw {
        parts.push(format!("reads {} kW, the flow comes to {} kW", number(kw, 3), number(m.kw, 3)));
    }
    if let Some(amps) = m.metered_amps {
        parts.push(format!("reads {} A, the flow comes to {} A", number(amps, 3), number(m.amps, 3)));
    }
    if let Some(kvar) = m.metered_kvar {
        parts.push(format!("asks {} kvar, the flow comes to {} kvar", number(kvar, 3), number(m.kvar, 3)));
    }
    format!("meter {} {}.", called(m), parts.join("; "))
}
