//! Names of the kinds of element a network has, to see that random ones leave none out.

use std::collections::BTreeSet;

use fourwire::network::{
    Across, BranchKind, Conductors, Connection, End, LoadPlace, Network, NeutralPoint, VectorGroup, Winding,
};

/// Every name that [`features`] can give and a set of random networks must have.
pub const WANTED: &[&str] = &[
    "1-wire line",
    "2-wire line",
    "3-wire line",
    "4-wire line",
    "line with charging",
    "line of two sets",
    "line against the flow",
    "switch",
    "switch against the flow",
    "regulator to neutral",
    "regulator to earth",
    "regulator phase to phase",
    "regulator against the flow",
    "bank against the flow",
    "bank YNyn",
    "bank YNy",
    "bank YNd",
    "bank Yyn",
    "bank Yy",
    "bank Yd",
    "bank Dyn",
    "bank Dy",
    "bank Dd",
    "bank Yz",
    "bank Yzn",
    "bank YNzn",
    "bank Dz",
    "bank Dzn",
    "bank Zy",
    "bank Zyn",
    "bank Zd",
    "bank ZNyn",
    "bank ZNd",
    "bank YNa0",
    "bank of unequal units",
    "unit Iin0 an to s1ns2",
    "unit Iin0 ab to s1ns2",
    "unit Iin6 an to s1ns2",
    "unit Ia0 an",
    "unit Ii0 an to ab",
    "unit Ii0 ab to an",
    "tap on the from side",
    "star earthed by a reactor",
    "neutral of an autotransformer shared",
    "load power split",
    "load current split",
    "load impedance split",
    "load between s1 and s2",
    "line s1ns2",
    "unit Ii0 an",
    "unit Ii6 an",
    "unit Ii0 ab",
    "unit Ii6 ab",
    "no-load shunt",
    "no no-load shunt",
    "tap",
    "star earthed by ohms",
    "star earthed solidly",
    "star on n",
    "star floating",
    "stiff source",
    "source with impedance",
    "source earthed by ohms",
    "electrode",
    "reference",
    "load power star",
    "load power delta",
    "load current star",
    "load current delta",
    "load impedance star",
    "load impedance delta",
    "load to earth",
    "load along a line",
    "capacitor star",
    "capacitor delta",
];

/// The kinds of element of one network.
pub fn features(network: &Network) -> BTreeSet<String> {
    let mut found = BTreeSet::new();
    source_and_nodes(network, &mut found);
    for (b, branch) in network.branches.iter().enumerate() {
        let against = network.feeds.iter().flatten().any(|f| f.branch.index() == b && f.upstream == End::To);
        let kind = match &branch.kind {
            BranchKind::Transformer(_) => "bank",
            other => other.word(),
        };
        let bank = !matches!(&branch.kind, BranchKind::Transformer(t) if t.terminals.is_some());
        if against && bank {
            found.insert(format!("{kind} against the flow"));
        }
        branch_features(network, &branch.kind, branch.from_conductors, &mut found);
    }
    shunt_features(network, &mut found);
    found
}

fn source_and_nodes(network: &Network, found: &mut BTreeSet<String>) {
    let mut note = |yes: bool, name: &str| {
        if yes {
            found.insert(name.to_string());
        }
    };
    let stiff = network.supply.impedance.norm() == 0.0;
    note(stiff, "stiff source");
    note(!stiff, "source with impedance");
    note(network.supply.earth_ohm > 0.0, "source earthed by ohms");
    note(network.nodes.iter().any(|n| n.earth_ohm.is_some()), "electrode");
    note(network.nodes.iter().any(|n| n.reference_siemens > 0.0), "reference");
}

fn branch_features(
    network: &Network,
    kind: &BranchKind,
    conductors: Conductors,
    found: &mut BTreeSet<String>,
) {
    let (wires, neutral, split) = (conductors.count(), conductors.has_neutral(), conductors.is_split());
    let mut note = |yes: bool, name: String| {
        if yes {
            found.insert(name);
        }
    };
    match kind {
        BranchKind::Line(line) => {
            note(true, format!("{wires}-wire line"));
            note(split, "line s1ns2".into());
            note(network.line_shunt(line).norm() > 0.0, "line with charging".into());
            note(line.sets == 2, "line of two sets".into());
        }
        BranchKind::Switch => note(true, "switch".into()),
        BranchKind::Regulator(bank) => {
            for unit in bank.units.iter().filter(|u| u.tap != 0) {
                let across = match unit.across {
                    Across::Neutral if neutral => "to neutral",
                    Across::Neutral => "to earth",
                    Across::Phase(_) => "phase to phase",
                };
                note(true, format!("regulator {across}"));
            }
        }
        BranchKind::Transformer(t) => {
            note(
                true,
                match (t.group, t.terminals) {
                    (VectorGroup::Three { from, to, .. }, _) => {
                        let letters = |w: Winding| match w {
                            Winding::Star => "y",
                            Winding::StarNeutral => "yn",
                            Winding::Delta => "d",
                            Winding::Zigzag => "z",
                            Winding::ZigzagNeutral => "zn",
                        };
                        format!("bank {}{}", letters(from).to_uppercase(), letters(to))
                    }
                    (group, Some([from, to])) => {
                        let letters = |c: Connection| match c {
                            Connection::Star(set) if set.is_split() => "s1ns2",
                            Connection::Star(_) => "an",
                            Connection::Delta(_) => "ab",
                        };
                        match (letters(from), letters(to)) {
                            (from, to) if from == to => format!("unit {group} {from}"),
                            (from, to) => format!("unit {group} {from} to {to}"),
                        }
                    }
                    (group, None) => format!("bank {group}"),
                },
            );
            let shunt = t.no_load_watts > 0.0 || t.magnetizing_pu > 0.0;
            note(true, if shunt { "no-load shunt" } else { "no no-load shunt" }.into());
            note(t.tap_pu != 0.0, "tap".into());
            note(t.from_tap_pu != 0.0, "tap on the from side".into());
            note(!t.mates.is_empty(), "bank of unequal units".into());
            for point in [t.from_neutral, t.to_neutral] {
                note(matches!(point, NeutralPoint::Earthed(z) if z.re > 0.0), "star earthed by ohms".into());
                note(
                    matches!(point, NeutralPoint::Earthed(z) if z.im > 0.0),
                    "star earthed by a reactor".into(),
                );
                note(
                    matches!(point, NeutralPoint::Earthed(z) if z.norm() == 0.0),
                    "star earthed solidly".into(),
                );
                note(point == NeutralPoint::Shared, "neutral of an autotransformer shared".into());
                note(point == NeutralPoint::Conductor, "star on n".into());
                note(point == NeutralPoint::Floating, "star floating".into());
            }
        }
    }
}

fn shunt_features(network: &Network, found: &mut BTreeSet<String>) {
    let joined = |connection: Connection| match connection {
        Connection::Star(_) => "star",
        Connection::Delta(_) => "delta",
    };
    for load in &network.loads {
        if load.connection.phases().is_split() {
            found.insert(format!("load {} split", load.model.word()));
            if let Connection::Delta(_) = load.connection {
                found.insert("load between s1 and s2".into());
            }
            continue;
        }
        found.insert(format!("load {} {}", load.model.word(), joined(load.connection)));
        if let LoadPlace::Line(_) = load.place {
            found.insert("load along a line".into());
        }
        let to_earth = |(id, _)| !network.node(id).conductors.has_neutral();
        if matches!(load.connection, Connection::Star(_)) && network.load_sites(load).any(to_earth) {
            found.insert("load to earth".into());
        }
    }
    for capacitor in &network.capacitors {
        found.insert(format!("capacitor {}", joined(capacitor.connection)));
    }
}
