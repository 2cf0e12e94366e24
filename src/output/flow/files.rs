//! Results of `flow` as JSON and as a folder of CSV files, with the same names in both.

use std::io::{self, Write};

use crate::output::allocation::meters_csv;
use crate::output::csv::{Field, write_row};
use crate::output::files::Folder;
use crate::study::flow::FlowReport;

/// Writes the report as one JSON object.
///
/// # Errors
/// What the writer says.
pub fn flow_json(report: &FlowReport, writer: &mut dyn Write) -> io::Result<()> {
    serde_json::to_writer_pretty(&mut *writer, report)?;
    writeln!(writer)
}

/// Writes every list of the report as a CSV file of the folder.
///
/// # Errors
/// What the file system says. The files stand in the folder only after [`Folder::commit`].
pub fn flow_csv(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    voltages(report, folder)?;
    currents(report, folder)?;
    elements(report, folder)?;
    list(
        folder,
        "nodes_summary.csv",
        &["node", "unbalance_percent", "neutral_volts"],
        &report.nodes_summary,
        |r| vec![Field::Text(&r.node), r.unbalance_percent.into(), r.neutral_volts.into()],
    )?;
    list(folder, "source.csv", &["conductor", "kw", "kvar", "amps", "degrees"], &report.source, |r| {
        vec![
            Field::Text(r.conductor),
            Field::Number(r.kw),
            Field::Number(r.kvar),
            Field::Number(r.amps),
            Field::Number(r.degrees),
        ]
    })?;
    list(
        folder,
        "regulators.csv",
        &["regulator", "phase", "tap", "automatic", "at_limit", "state", "why"],
        &report.regulators,
        |r| {
            vec![
                Field::Text(&r.regulator),
                Field::Text(r.phase),
                Field::Whole(i64::from(r.tap)),
                Field::Flag(r.automatic),
                Field::Flag(r.at_limit),
                Field::Text(r.state),
                Field::Text(&r.why),
            ]
        },
    )?;
    capacitors(report, folder)?;
    list(
        folder,
        "loads.csv",
        &["load", "at", "kw", "kvar", "lowest_pu", "below_floor"],
        &report.loads,
        |r| {
            vec![
                Field::Text(&r.load),
                Field::Text(&r.at),
                Field::Number(r.kw),
                Field::Number(r.kvar),
                Field::Number(r.lowest_pu),
                Field::Flag(r.below_floor),
            ]
        },
    )?;
    generators(report, folder)?;
    motors(report, folder)?;
    if !report.meters.is_empty() {
        folder.write("meters.csv", |out| meters_csv(&report.meters, out))?;
    }
    electrodes(report, folder)?;
    findings(report, folder)?;
    totals(report, folder)
}

fn list<T>(
    folder: &mut Folder,
    name: &str,
    columns: &[&str],
    rows: &[T],
    fields: impl Fn(&T) -> Vec<Field<'_>>,
) -> io::Result<()> {
    folder.write(name, |out| {
        let mut writer = csv::Writer::from_writer(out);
        writer.write_record(columns)?;
        for row in rows {
            write_row(&mut writer, &fields(row))?;
        }
        writer.flush()
    })
}

fn voltages(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    list(folder, "nodes.csv", &["node", "conductor", "volts", "degrees", "pu"], &report.nodes, |r| {
        vec![
            Field::Text(&r.node),
            Field::Text(r.conductor),
            Field::Number(r.volts),
            Field::Number(r.degrees),
            r.pu.into(),
        ]
    })
}

fn currents(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns = ["element", "kind", "conductor", "from_amps", "from_degrees", "to_amps", "to_degrees"];
    list(folder, "currents.csv", &columns, &report.currents, |r| {
        vec![
            Field::Text(&r.element),
            Field::Text(r.kind),
            Field::Text(r.conductor),
            Field::Number(r.from_amps),
            Field::Number(r.from_degrees),
            Field::Number(r.to_amps),
            Field::Number(r.to_degrees),
        ]
    })
}

fn elements(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns = ["element", "kind", "loss_kw", "loss_kvar", "rating_percent"];
    list(folder, "elements.csv", &columns, &report.elements, |r| {
        vec![
            Field::Text(&r.element),
            Field::Text(r.kind),
            Field::Number(r.loss_kw),
            Field::Number(r.loss_kvar),
            r.rating_percent.into(),
        ]
    })
}

fn generators(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns =
        ["generator", "node", "kw", "kvar", "available_kw", "kva", "pu", "by_volt_watt", "by_rating"];
    list(folder, "generators_delivering.csv", &columns, &report.generators, |r| {
        vec![
            Field::Text(&r.generator),
            Field::Text(&r.node),
            Field::Number(r.kw),
            Field::Number(r.kvar),
            Field::Number(r.available_kw),
            r.kva.into(),
            Field::Number(r.pu),
            Field::Flag(r.by_volt_watt),
            Field::Flag(r.by_rating),
        ]
    })
}

fn motors(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns = [
        "motor",
        "node",
        "count",
        "slip_percent",
        "rpm",
        "amps_a",
        "amps_b",
        "amps_c",
        "kw",
        "kvar",
        "shaft_kw",
        "loss_kw",
        "negative_rotor_loss_percent",
        "voltage_unbalance_percent",
        "current_unbalance_percent",
        "derating",
        "loading_percent",
        "derated_load_percent",
    ];
    list(folder, "motors_running.csv", &columns, &report.motors, |r| {
        vec![
            Field::Text(&r.motor),
            Field::Text(&r.node),
            Field::Whole(i64::from(r.count)),
            Field::Number(r.slip_percent),
            Field::Number(r.rpm),
            Field::Number(r.amps_a),
            Field::Number(r.amps_b),
            Field::Number(r.amps_c),
            Field::Number(r.kw),
            Field::Number(r.kvar),
            Field::Number(r.shaft_kw),
            Field::Number(r.loss_kw),
            Field::Number(r.negative_rotor_loss_percent),
            Field::Number(r.voltage_unbalance_percent),
            Field::Number(r.current_unbalance_percent),
            r.derating.into(),
            Field::Number(r.loading_percent),
            r.derated_load_percent.into(),
        ]
    })
}

/// Not `capacitors.csv`: a folder with a file of that name is taken for a network.
fn capacitors(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns = ["capacitor", "node", "state", "control", "hunting", "why"];
    list(folder, "capacitor_states.csv", &columns, &report.capacitors, |r| {
        vec![
            Field::Text(&r.capacitor),
            Field::Text(&r.node),
            Field::Text(r.state),
            Field::Text(r.control),
            Field::Flag(r.hunting),
            Field::Text(&r.why),
        ]
    })
}

fn electrodes(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns = ["node", "transformer", "r_ohm", "x_ohm", "amps", "volts"];
    list(folder, "electrodes.csv", &columns, &report.electrodes, |r| {
        vec![
            Field::Text(&r.node),
            Field::Text(r.transformer.as_deref().unwrap_or("")),
            Field::Number(r.r_ohm),
            Field::Number(r.x_ohm),
            Field::Number(r.amps),
            Field::Number(r.volts),
        ]
    })
}

fn findings(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let columns = ["severity", "rule", "where", "value", "limit", "text"];
    list(folder, "findings.csv", &columns, &report.findings, |r| {
        vec![
            Field::Text(r.severity.word()),
            Field::Text(r.rule.text()),
            Field::Text(&r.place),
            Field::Number(r.value),
            r.limit.into(),
            Field::Text(&r.text),
        ]
    })
}

/// Totals, and what identifies the run, as rows of name and value.
fn totals(report: &FlowReport, folder: &mut Folder) -> io::Result<()> {
    let t = &report.totals;
    let rows: Vec<(&str, Field)> = vec![
        ("fourwire", Field::Text(report.fourwire)),
        ("network", Field::Text(&report.network)),
        ("input_sha256", Field::Text(&report.input_sha256)),
        ("at", Field::Text(report.at.as_deref().unwrap_or_default())),
        ("converged", Field::Flag(report.converged)),
        ("controls_settled", Field::Flag(report.controls_settled)),
        ("iterations", Field::Number(report.iterations as f64)),
        ("mismatch_a", Field::Number(report.mismatch_a)),
        ("source_kw", Field::Number(t.source_kw)),
        ("source_kvar", Field::Number(t.source_kvar)),
        ("load_kw", Field::Number(t.load_kw)),
        ("load_kvar", Field::Number(t.load_kvar)),
        ("loss_kw", Field::Number(t.loss_kw)),
        ("loss_kvar", Field::Number(t.loss_kvar)),
        ("line_loss_kw", Field::Number(t.line_loss_kw)),
        ("neutral_loss_kw", Field::Number(t.neutral_loss_kw)),
        ("transformer_loss_kw", Field::Number(t.transformer_loss_kw)),
        ("earth_loss_kw", Field::Number(t.earth_loss_kw)),
        ("generation_kw", Field::Number(t.generation_kw)),
        ("generation_kvar", Field::Number(t.generation_kvar)),
        ("motor_kw", Field::Number(t.motor_kw)),
        ("motor_kvar", Field::Number(t.motor_kvar)),
        ("motor_loss_kw", Field::Number(t.motor_loss_kw)),
        ("capacitor_kvar", Field::Number(t.capacitor_kvar)),
    ];
    folder.write("totals.csv", |out| {
        let mut writer = csv::Writer::from_writer(out);
        writer.write_record(["total", "value"])?;
        for (name, value) in rows {
            write_row(&mut writer, &[Field::Text(name), value])?;
        }
        writer.flush()
    })
}
