//! Automatic taps and switched capacitors against closed forms and against every tap tried.

use fourwire::import::read_files;
use fourwire::math::Complex64;
use fourwire::network::{BranchKind, Network, SwitchState, build};
use fourwire::output::{Colour, Length, flow_text};
use fourwire::solver::{
    CapacitorState, Controls, Settings, Solution, Status, TapState, solve, solve_controlled,
};
use fourwire::study::flow::FlowReport;

type Files<'a> = Vec<(&'a str, String)>;

/// A 12.47 kV source, 120 V at the relay with a ratio of 60 (phase to earth).
const KV: f64 = 12.470_765_814_495_916;
/// `short` is used a metre long: a tenth of a milliohm.
const MATRICES: &str = "construction,row,column,r_ohm_per_km,x_ohm_per_km\n\
    short,a,a,0.1,0\nshort,a,b,0,0\nshort,a,c,0,0\nshort,b,b,0.1,0\nshort,b,c,0,0\nshort,c,c,0.1,0\n\
    one,a,a,0.4,0.6\n";

fn network(files: &Files) -> Network {
    let mut files: Vec<_> =
        files.iter().map(|(name, text)| ((*name).to_string(), text.as_bytes().to_vec())).collect();
    files.push(("matrices.csv".to_string(), MATRICES.as_bytes().to_vec()));
    let reading = read_files(files);
    assert!(!reading.diagnostics.has_errors(), "{:?}", reading.diagnostics.items());
    let built = build(&reading.draft);
    built.network.unwrap_or_else(|| panic!("{:?}", built.diagnostics.items()))
}

fn controlled(network: &mut Network) -> (Solution, Controls) {
    let (solution, controls) = solve_controlled(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    (solution, controls)
}

fn taps(network: &Network) -> Vec<i32> {
    let units = network.branches.iter().filter_map(|b| match &b.kind {
        BranchKind::Regulator(bank) => Some(bank.units.iter().map(|u| u.tap)),
        _ => None,
    });
    units.flatten().collect()
}

fn source(pu: [f64; 3]) -> (&'static str, String) {
    ("source.csv", format!("node,kv,pu_a,pu_b,pu_c\nS,{KV},{},{},{}\n", pu[0], pu[1], pu[2]))
}

/// Source, one regulator bank, a line of no matter, a load: `kw` at the far end, constant current.
fn two_bus(pu: [f64; 3], regulators: &str, kw: f64) -> Network {
    network(&vec![
        source(pu),
        ("regulators.csv", regulators.to_string()),
        ("lines.csv", "line,from,to,phases,length_m,construction\nL,R,F,abc,1,short\n".to_string()),
        ("loads.csv", format!("load,node,phases,kw,kvar,model\nD,F,abcn,{kw},0,current\n")),
    ])
}

const STAR: &str = "regulator,from,to,phases,set_v,band_v,pt_ratio,ct_a,r_v,x_v,limit_v,mode,gang_phase,reverse,reverse_set_v";

/// 114, 120 and 126 V at the relay: 6 V are 8 steps of 0.75 V, and 114 (1 + 8/160) = 119.7.
#[test]
fn each_phase_finds_its_own_tap_and_a_gang_follows_one() {
    let pu = [0.95, 1.0, 1.05];
    for (mode, expected) in
        [("each,", [8, 0, -8]), ("gang,a", [8, 8, 8]), ("gang,b", [0, 0, 0]), ("gang,c", [-8, -8, -8])]
    {
        let mut network = two_bus(pu, &format!("{STAR}\nV,S,R,abc,120,2,60,,,,,{mode},,\n"), 300.0);
        let (solution, controls) = controlled(&mut network);
        assert_eq!(taps(&network), expected, "{mode}");
        assert!(controls.units.iter().all(|u| u.state == TapState::Settled));
        assert_eq!(controls.units.len(), if mode == "each," { 3 } else { 1 });
        let report = FlowReport::controlled(&network, &solution, &controls, "").expect("converged");
        assert_eq!(report.regulators.len(), 3);
        assert!(report.regulators.iter().all(|r| r.automatic && r.state == "settled"));
        if let Some(phase) = mode.strip_prefix("gang,") {
            let follows = format!("follows phase {phase}: ");
            assert_eq!(report.regulators.iter().filter(|r| r.why.starts_with(&follows)).count(), 2);
        }
    }
}

/// 100 A at unity through a rating of 100 A and 6 V: the relay sees 6 V less than the terminals.
/// It wants 126 V there (tap 8); below a limit of 124.6 V is tap 6 (124.5 V), and not tap 7.
#[test]
fn the_first_customer_limit_stops_the_compensator() {
    let kw = 3.0 * 7.2 * 100.0;
    let row = |limit: &str| format!("{STAR}\nV,S,R,abc,120,2,60,100,6,0,{limit},,,,\n");
    let mut free = two_bus([1.0; 3], &row(""), kw);
    controlled(&mut free);
    assert_eq!(taps(&free), [8, 8, 8]);
    let mut limited = two_bus([1.0; 3], &row("124.6"), kw);
    let (solution, controls) = controlled(&mut limited);
    assert_eq!(taps(&limited), [6, 6, 6]);
    for unit in &controls.units {
        assert_eq!(unit.state, TapState::VoltageLimit);
        assert!((unit.terminal_volts - 124.5).abs() < 1e-3, "{}", unit.terminal_volts);
        assert!((unit.relay_volts - 118.5).abs() < 1e-3, "{}", unit.relay_volts);
    }
    let report = FlowReport::controlled(&limited, &solution, &controls, "").expect("converged");
    let told = report.findings.iter().filter(|f| f.text.contains("first customer's limit of 124.6 V"));
    assert_eq!(told.count(), 3);
    // A limit that the band's top just meets is in nobody's way.
    let mut wide = two_bus([1.0; 3], &row("126.5"), kw);
    assert!(controlled(&mut wide).1.units.iter().all(|u| u.state == TapState::Settled));
}

/// Voltages behind a bank by its definition, from those of the source: `V_k + d tap (V_k - V_m)`.
fn behind(from: [Complex64; 3], pairs: &[(usize, usize)], taps: &[i32]) -> [Complex64; 3] {
    let mut to = from;
    for (&(k, m), &tap) in pairs.iter().zip(taps) {
        to[k] += (from[k] - from[m]) * (0.00625 * f64::from(tap));
    }
    to
}

fn supply(pu: [f64; 3]) -> [Complex64; 3] {
    let third = 2.0 * std::f64::consts::PI / 3.0;
    [0, 1, 2].map(|k| Complex64::from_polar(7200.0 * pu[k], -third * k as f64))
}

/// Two line-to-line units: each voltage is its source voltage times its own ratio.
#[test]
fn open_delta_regulates_the_voltage_across() {
    let pu = [0.94, 1.0, 1.03];
    let rows = "regulator,from,to,phases,across,set_v,band_v,pt_ratio\n\
        VA,S,R,a,b,120,2,104\nVC,S,R,c,b,120,2,104\n";
    let mut network = two_bus(pu, rows, 300.0);
    let (_, controls) = controlled(&mut network);
    let from = supply(pu);
    for ((k, unit), tap) in [0, 2].into_iter().zip(&controls.units).zip(taps(&network)) {
        let at_neutral = (from[k] - from[1]).norm() / 104.0;
        // The first move counts steps of 0.75 V; what is left is less than the band here.
        let steps = ((120.0 - at_neutral) / 0.75).round() as i32;
        assert_eq!((tap, unit.state), (steps, TapState::Settled));
        let closed_form = at_neutral * (1.0 + 0.00625 * f64::from(tap));
        assert!((unit.relay_volts - closed_form).abs() < 1e-3, "{} {closed_form}", unit.relay_volts);
    }
    assert_ne!(taps(&network)[0], 0);
}

/// Three line-to-line units work on each other; every combination of taps is tried by formula.
#[test]
fn closed_delta_settles_where_some_combination_of_all_does() {
    let pairs = [(0, 1), (1, 2), (2, 0)];
    for pu in [[0.94, 0.97, 1.0], [1.04, 1.02, 1.05], [0.9, 0.9, 0.9], [0.98, 1.03, 0.99]] {
        let rows = "regulator,from,to,phases,across,set_v,band_v,pt_ratio\n\
            VA,S,R,a,b,120,2,104\nVB,S,R,b,c,120,2,104\nVC,S,R,c,a,120,2,104\n";
        let mut network = two_bus(pu, rows, 300.0);
        let (_, controls) = controlled(&mut network);
        let from = supply(pu);
        let relays = |taps: &[i32]| {
            let to = behind(from, &pairs, taps);
            pairs.map(|(k, m)| (to[k] - to[m]).norm() / 104.0)
        };
        let good = |taps: &[i32]| relays(taps).iter().all(|v| (v - 120.0).abs() <= 1.0);
        let range = -16..=16;
        let reachable = range
            .clone()
            .flat_map(|a| range.clone().map(move |b| (a, b)))
            .flat_map(|(a, b)| range.clone().map(move |c| [a, b, c]))
            .filter(|taps| good(taps))
            .count();
        let found = taps(&network);
        for (unit, volts) in controls.units.iter().zip(relays(&found)) {
            assert!((unit.relay_volts - volts).abs() < 1e-3, "{pu:?}");
        }
        let settled = controls.units.iter().all(|u| u.state == TapState::Settled);
        assert_eq!(settled, good(&found), "{pu:?}: {found:?}");
        assert!(settled && reachable > 0, "{pu:?}: {found:?}, {reachable} combinations would do");
    }
}

/// Power from the regulated side back: the load feeds in.
#[test]
fn reverse_flow_is_handled_as_asked() {
    let run = |reverse: &str, kw: f64| {
        let mut network = two_bus([0.95; 3], &format!("{STAR}\nV,S,R,abc,120,2,60,,,,,,,{reverse}\n"), kw);
        let (_, controls) = controlled(&mut network);
        (taps(&network)[0], controls.units[0].state)
    };
    assert_eq!(run("hold,", 300.0), (8, TapState::Settled));
    assert_eq!(run(",", -300.0), (0, TapState::Reversed));
    assert_eq!(run("hold,", -300.0), (0, TapState::Reversed));
    assert_eq!(run("neutral,", -300.0), (0, TapState::ReversedNeutral));
    assert_eq!(run("ignore,", -300.0), (8, TapState::Settled));
    // The stiff source is on the side it tries to regulate: it runs to its end, and says so.
    assert_eq!(run("reverse,120", -300.0), (-16, TapState::AtLimit));
}

/// Fed at its `to` side at 114 V, `V_from = V_to / (1 + tap/160)`: tap -8 gives 120 V.
#[test]
fn fed_backwards_the_other_side_is_regulated() {
    let mut network = network(&vec![
        source([0.95; 3]),
        ("regulators.csv", format!("{STAR}\nV,R,S,abc,119,2,60,,,,,,,reverse,120\n")),
        ("loads.csv", "load,node,phases,kw,kvar\nD,R,abcn,300,0\n".to_string()),
    ]);
    let (_, controls) = controlled(&mut network);
    assert_eq!(taps(&network), [-8, -8, -8]);
    for unit in &controls.units {
        assert_eq!(unit.state, TapState::Settled);
        assert!((unit.relay_volts - 120.0).abs() < 1e-6);
    }
}

/// Two regulators in a row on a single-phase feeder, each of 33 x 33 pairs of taps solved.
#[test]
fn cascade_meets_every_band_as_near_as_any_tap_does() {
    let files = |band: f64| {
        vec![
            source([1.0; 3]),
            (
                "regulators.csv",
                format!("{STAR}\nV1,B,C,a,122,{band},60,,,,,,,,\nV2,D,E,a,121,{band},60,50,2,1,,,,,\n"),
            ),
            (
                "lines.csv",
                "line,from,to,phases,length_km,construction\nL1,S,B,a,9,one\nL2,C,D,a,8,one\nL3,E,F,a,5,one\n"
                    .to_string(),
            ),
            ("loads.csv", "load,node,phases,kw,kvar\nD1,D,an,200,80\nD2,F,an,250,100\n".to_string()),
        ]
    };
    let mut found = network(&files(2.0));
    let (_, controls) = controlled(&mut found);
    assert!(controls.units.iter().all(|u| u.state == TapState::Settled), "{controls:?}");
    let ended = taps(&found);
    assert!(ended.iter().all(|t| *t > 0), "{ended:?}: the feeder needs raising");
    let sets = [122.0, 121.0];
    // Off the set points with taps held so, by a circuit that has no control.
    let off = |pair: [i32; 2]| {
        let mut held = found.clone();
        let mut next = pair.into_iter();
        for branch in &mut held.branches {
            if let BranchKind::Regulator(bank) = &mut branch.kind {
                bank.units[0].tap = next.next().expect("two banks");
            }
        }
        let solution = solve(&held, &Settings::default());
        if solution.status != Status::Converged {
            return [f64::INFINITY; 2];
        }
        let at = |name: &str| {
            solution.volts[held.nodes.iter().position(|n| &*n.name == name).expect("a node")][0] / 60.0
        };
        let amps = held.branches.iter().position(|b| &*b.name == "V2").map(|b| solution.to_amps[b][0]);
        let drop = Complex64::new(2.0, 1.0) * amps.expect("a bank") / 50.0;
        [at("C").norm() - sets[0], (at("E") - drop).norm() - sets[1]]
    };
    let good = |off: [f64; 2]| off.iter().all(|d| d.abs() <= 1.0);
    let all: Vec<([i32; 2], [f64; 2])> =
        (-16..=16).flat_map(|a| (-16..=16).map(move |b| [a, b])).map(|pair| (pair, off(pair))).collect();
    let within: Vec<_> = all.iter().filter(|(_, off)| good(*off)).collect();
    assert!(within.len() > 1 && within.len() < all.len() / 20, "{}", within.len());
    assert!(within.iter().any(|(pair, _)| pair[..] == ended[..]), "{ended:?}");
    // No tap lies nearer its set point by a whole step (0.75 V).
    let own = off([ended[0], ended[1]]);
    for unit in 0..2 {
        let best = all.iter().filter(|(pair, _)| pair[1 - unit] == ended[1 - unit]);
        let best = best.map(|(_, off)| off[unit].abs()).fold(f64::INFINITY, f64::min);
        assert!(own[unit].abs() <= best + 0.75, "unit {unit}: {own:?}, best {best}");
    }
    // A band that none of all pairs meets cannot be told as met.
    let narrow = 0.02;
    assert!(!all.iter().any(|(_, off)| off.iter().all(|d| d.abs() <= narrow / 2.0)));
    let mut hunting = network(&files(narrow));
    let (solution, controls) = controlled(&mut hunting);
    assert!(controls.units.iter().any(|u| u.state == TapState::Hunting), "{controls:?}");
    let report = FlowReport::controlled(&hunting, &solution, &controls, "").expect("converged");
    assert!(!report.controls_settled);
    let page = flow_text(&hunting, &solution, &report, Length::Short, Colour::Plain);
    assert!(page.contains("NOT SETTLED, hunting: regulator V1, a"), "{page}");
}

/// A load of `kvar` and a capacitor of 10 kvar at the end of a line of no impedance to speak of.
fn compensated(kvar: f64, found: &str, control: &str) -> Network {
    network(&vec![
        ("source.csv", "node,kv\nS,0.4\n".to_string()),
        ("lines.csv", "line,from,to,phases,length_m,construction\nL,S,A,abc,1,short\n".to_string()),
        ("loads.csv", format!("load,node,phases,kw,kvar\nD,A,abcn,0,{kvar}\n")),
        (
            "capacitors.csv",
            format!(
                "capacitor,node,phases,kvar,state,control,on_kvar,off_kvar,on_a,off_a,sense_line,sense_phase\n\
                 C,A,abcn,10,{found},{control}\n"
            ),
        ),
    ])
}

fn switched(network: &mut Network) -> (SwitchState, CapacitorState, f64) {
    let (_, controls) = controlled(network);
    let ended = &controls.capacitors[0];
    (network.capacitor_banks[0].state, ended.state, ended.reading)
}

/// The line carries the load's kvar less the capacitor's: on above 15, off below 5.
#[test]
fn kvar_control_switches_beyond_the_dead_band_and_stays_within() {
    let (on, off) = (SwitchState::Closed, SwitchState::Open);
    for (kvar, found, expected, reading) in [
        (20.0, "open", on, 10.0),
        (20.0, "closed", on, 10.0),
        (10.0, "open", off, 10.0),
        (10.0, "closed", off, 10.0),
        (17.0, "open", on, 7.0),
        (14.0, "open", off, 14.0),
        (17.0, "closed", on, 7.0),
        (14.0, "closed", off, 14.0),
    ] {
        let mut network = compensated(kvar, found, "kvar,15,5,,,L,");
        let (state, settled, read) = switched(&mut network);
        assert_eq!((state, settled), (expected, CapacitorState::Settled), "{kvar} kvar, found {found}");
        assert!((read / 1e3 - reading).abs() < 0.01, "{read}");
        let closed = network.capacitors.len();
        assert_eq!(closed, usize::from(state == on), "in service only where closed");
    }
    // In a wider band both states are at rest, and it keeps the one it was found in.
    for (found, state, reading) in [("open", off, 14.0), ("closed", on, 4.0)] {
        let mut network = compensated(14.0, found, "kvar,15,2,,,L,");
        let (kept, settled, read) = switched(&mut network);
        assert_eq!((kept, settled), (state, CapacitorState::Settled));
        assert!((read / 1e3 - reading).abs() < 0.01, "{read}");
    }
}

/// 20 kvar are 28.9 A a phase at 400 V, 10 kvar 14.4 A.
#[test]
fn current_control_measures_one_phase() {
    let amps = |kvar: f64| kvar * 1e3 / (3.0f64.sqrt() * 400.0);
    let mut network = compensated(20.0, "open", "current,,,25,10,L,b");
    let (state, settled, read) = switched(&mut network);
    assert_eq!((state, settled), (SwitchState::Closed, CapacitorState::Settled));
    assert!((read - amps(10.0)).abs() < 0.01, "{read}");
    let mut network = compensated(15.0, "closed", "current,,,25,10,L,b");
    let (state, _, read) = switched(&mut network);
    assert_eq!(state, SwitchState::Open);
    assert!((read - amps(15.0)).abs() < 0.01, "{read}");
}

/// A dead band narrower than the capacitor: 8 kvar without it, -2 with it.
#[test]
fn a_capacitor_at_odds_with_itself_is_told_to_hunt() {
    let mut network = compensated(8.0, "open", "kvar,6,4,,,L,");
    let (solution, controls) = controlled(&mut network);
    assert_eq!(controls.capacitors[0].state, CapacitorState::Hunting);
    assert!(controls.capacitors[0].against.is_empty());
    let report = FlowReport::controlled(&network, &solution, &controls, "").expect("converged");
    assert!(!report.controls_settled && report.capacitors[0].hunting);
    assert!(report.findings.iter().any(|f| f.place == "capacitor C" && f.text.starts_with("hunts")));
    let page = flow_text(&network, &solution, &report, Length::Short, Colour::Plain);
    assert!(page.contains("NOT SETTLED, hunting: capacitor C"), "{page}");
}

/// Line, regulator, line, capacitor: the regulator's delay is the shorter, so it goes first.
fn with_regulator(x_v: f64, kvar: f64, thresholds: &str) -> Network {
    network(&vec![
        source([1.0; 3]),
        ("regulators.csv", format!("{STAR}\nV,B,C,a,120,2,60,50,0,{x_v},,,,,\n")),
        (
            "lines.csv",
            "line,from,to,phases,length_km,construction\nL1,S,B,a,4,one\nL2,C,F,a,4,one\n".to_string(),
        ),
        ("loads.csv", "load,node,phases,kw,kvar\nD,F,an,400,250\n".to_string()),
        (
            "capacitors.csv",
            format!(
                "capacitor,node,phases,kvar,state,control,on_v,off_v,pt_ratio,delay_s\n\
                 K,F,an,{kvar},open,voltage,{thresholds},60,60\n"
            ),
        ),
    ])
}

#[test]
fn voltage_control_and_regulator_settle_together() {
    let mut network = with_regulator(0.0, 300.0, "118,123");
    let (_, controls) = controlled(&mut network);
    assert_eq!(controls.units[0].state, TapState::Settled);
    assert_eq!(controls.capacitors[0].state, CapacitorState::Settled);
    assert_eq!(network.capacitor_banks[0].state, SwitchState::Closed);
    assert!((118.0..=123.0).contains(&controls.capacitors[0].reading), "{controls:?}");
}

/// A negative compensator reactance raises the tap as the capacitor closes: each undoes the other.
#[test]
fn capacitor_and_regulator_that_work_against_each_other_are_named() {
    let mut network = with_regulator(-12.0, 500.0, "114,123");
    let (solution, controls) = controlled(&mut network);
    let ended = &controls.capacitors[0];
    assert_eq!(ended.state, CapacitorState::Hunting, "{controls:?}");
    assert_eq!(ended.against.iter().map(|n| &**n).collect::<Vec<_>>(), ["V"]);
    let report = FlowReport::controlled(&network, &solution, &controls, "").expect("converged");
    assert!(!report.controls_settled);
    assert!(
        report.findings.iter().any(|f| f.place == "capacitor K" && f.text.starts_with("hunts against V"))
    );
}

/// Two capacitors of 10 kvar that would both switch at 20 kvar: after the first, 10 kvar lie in the
/// dead band of the other.
#[test]
fn the_shorter_delay_switches_first() {
    for (delays, closed) in [([30, 60], "K1"), ([60, 30], "K2"), ([30, 30], "K1")] {
        let rows = format!(
            "capacitor,node,phases,kvar,state,control,on_kvar,off_kvar,sense_line,delay_s\n\
             K1,A,abcn,10,open,kvar,15,2,L,{}\nK2,A,abcn,10,open,kvar,15,2,L,{}\n",
            delays[0], delays[1]
        );
        let mut network = network(&vec![
            ("source.csv", "node,kv\nS,0.4\n".to_string()),
            ("lines.csv", "line,from,to,phases,length_m,construction\nL,S,A,abc,1,short\n".to_string()),
            ("loads.csv", "load,node,phases,kw,kvar\nD,A,abcn,0,20\n".to_string()),
            ("capacitors.csv", rows),
        ]);
        let (solution, controls) = controlled(&mut network);
        assert!(controls.capacitors.iter().all(|c| c.state == CapacitorState::Settled));
        let in_service: Vec<&str> = network.capacitors.iter().map(|c| &*c.name).collect();
        assert_eq!(in_service, [closed], "{delays:?}");
        let report = FlowReport::controlled(&network, &solution, &controls, "").expect("converged");
        assert_eq!(report.capacitors.len(), 2, "open ones are told too");
    }
}
