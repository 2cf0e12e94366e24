//! Generated four-wire feeders of any size, for benches and for trying large inputs.
//!
//! A trunk with laterals; every node has a slightly uneven constant-power load a phase, every
//! fourth an electrode of ten ohms. Spans shrink with size so that the lowest voltage
//! stays near 0.93 of nominal. The same size gives the same feeder every time.

use std::fs;
use std::io::{self, Write as _};
use std::path::Path;

use fourwire::math::{Complex64, PhaseMatrix};
use fourwire::network::{
    Conductor, Conductors, Connection, Construction, Draft, LineRecord, LoadModel, LoadRecord, LoadSite,
    NodeRecord, SupplyRecord, SwitchState,
};

/// Load of an average phase of an average node, watts and vars.
const POWER: Complex64 = Complex64::new(2000.0, 800.0);

/// Own and mutual impedance, ohms per kilometre: bare wires on a pole, of a likely size (invented).
fn impedance_ohm_per_km(i: usize, j: usize) -> Complex64 {
    match (i == j, i == 3 || j == 3) {
        (true, false) => Complex64::new(0.25, 0.88),
        (true, true) => Complex64::new(0.43, 0.96),
        (false, false) => Complex64::new(0.059, 0.47),
        (false, true) => Complex64::new(0.059, 0.43),
    }
}

/// Nodes of a trunk node with its lateral: about as many as there are trunk nodes.
fn lateral(nodes: usize) -> usize {
    ((nodes as f64).sqrt() as usize).max(2)
}

/// Parent of node `i`: each trunk node hangs on the one before and carries a lateral.
fn parent(i: usize, lateral: usize) -> usize {
    match (i - 1) % lateral {
        0 => i.saturating_sub(lateral),
        _ => i - 1,
    }
}

fn name(i: usize) -> String {
    format!("n{i}")
}

/// A feeder of `nodes` nodes besides the source.
pub fn feeder(nodes: usize) -> Draft {
    let mut draft = Draft::default();
    draft.study.name = format!("Generated feeder of {nodes} nodes");
    draft.study.frequency_hz = 60.0;
    draft.supplies.push(SupplyRecord {
        node: name(0).into(),
        nominal_volts: 12_470.0,
        held_pu: [1.0; 3],
        angle_rad: 0.0,
        three_phase: None,
        single_phase: None,
        earth_ohm: 0.0,
        origin: None,
    });
    draft.constructions.push(Construction {
        name: "pole".into(),
        conductors: Conductors::ABCN,
        z_per_m: PhaseMatrix::from_fn(impedance_ohm_per_km) / Complex64::from(1000.0),
        y_per_m: PhaseMatrix::zeros(),
        rating_amps: None,
        origin: None,
    });
    let (length_m, lateral) = (span_m(nodes), lateral(nodes));
    for i in 1..=nodes {
        draft.lines.push(LineRecord {
            line: format!("l{i}").into(),
            from: name(parent(i, lateral)).into(),
            to: name(i).into(),
            conductors: Conductors::ABCN,
            length_m,
            construction: "pole".into(),
            sets: 1,
            rating_amps: None,
            state: SwitchState::Closed,
            origin: None,
        });
        if i % 4 == 0 {
            draft.nodes.push(NodeRecord {
                node: name(i).into(),
                xy: None,
                earth_ohm: Some(10.0),
                origin: None,
            });
        }
        for (k, phase) in Conductor::PHASES.into_iter().enumerate() {
            let uneven = 1.0 + 0.1 * (((i * 7 + k * 3) % 5) as f64 - 2.0);
            draft.loads.push(LoadRecord {
                load: format!("d{i}{phase}").into(),
                site: LoadSite::Node(name(i).into()),
                connection: Connection::Star(Conductors::NONE.with(phase)),
                watts: POWER.re * uneven,
                vars: POWER.im * uneven,
                model: LoadModel::Power,
                profile: None,
                origin: None,
            });
        }
    }
    draft
}

/// Length of a span, metres. With `m` trunk nodes and laterals as long, the drop to the far end
/// of the last lateral grows with the load of all nodes times `m`: 7 % is aimed at.
fn span_m(nodes: usize) -> f64 {
    let trunk = (nodes as f64 / lateral(nodes) as f64).max(1.0);
    // A kilometre of trunk drops so much for each kilowatt: R + X tan(phi) over U^2.
    let percent_a_km_and_watt = 100.0 * (0.19 + 0.41 * POWER.im / POWER.re) / 12_470f64.powi(2);
    let watts = 3.0 * POWER.re * nodes as f64;
    1000.0 * 7.0 / (percent_a_km_and_watt * watts * (trunk + 1.0) / 2.0)
}

/// Writes a generated feeder as a network folder.
#[allow(dead_code)] // the bench that only solves does not write
pub fn write_folder(draft: &Draft, folder: &Path) -> io::Result<()> {
    fs::create_dir_all(folder)?;
    let file = |name: &str| fs::File::create(folder.join(name)).map(io::BufWriter::new);
    writeln!(
        file("study.csv")?,
        "setting,value\nname,{}\nfrequency_hz,{}",
        draft.study.name,
        draft.study.frequency_hz
    )?;
    for supply in &draft.supplies {
        writeln!(
            file("source.csv")?,
            "node,kv,pu\n{},{},{}",
            supply.node,
            supply.nominal_volts / 1e3,
            supply.held_pu[0]
        )?;
    }
    let mut matrices = file("matrices.csv")?;
    writeln!(matrices, "construction,row,column,r_ohm_per_km,x_ohm_per_km")?;
    for i in 0..4 {
        for j in i..4 {
            let (z, c) = (impedance_ohm_per_km(i, j), Conductor::ALL);
            writeln!(matrices, "pole,{},{},{},{}", c[i], c[j], z.re, z.im)?;
        }
    }
    let mut nodes = file("nodes.csv")?;
    writeln!(nodes, "node,earth_ohm")?;
    for node in &draft.nodes {
        writeln!(nodes, "{},{}", node.node, node.earth_ohm.unwrap_or_default())?;
    }
    let mut lines = file("lines.csv")?;
    writeln!(lines, "line,from,to,phases,length_m,construction")?;
    for l in &draft.lines {
        writeln!(lines, "{},{},{},{},{},{}", l.line, l.from, l.to, l.conductors, l.length_m, l.construction)?;
    }
    let mut loads = file("loads.csv")?;
    writeln!(loads, "load,node,phases,kw,kvar")?;
    for l in &draft.loads {
        let LoadSite::Node(node) = &l.site else { continue };
        writeln!(loads, "{},{},{},{},{}", l.load, node, l.connection, l.watts / 1e3, l.vars / 1e3)?;
    }
    for mut writer in [matrices, nodes, lines, loads] {
        writer.flush()?;
    }
    Ok(())
}
