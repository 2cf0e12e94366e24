//! Closed rings and parallel paths.

#[path = "support/compare.rs"]
mod compare;
#[path = "support/nodal.rs"]
mod nodal;
#[path = "support/random.rs"]
mod random;

use compare::compare;
use fourwire::import::read_files;
use fourwire::math::Complex64;
use fourwire::network::{Network, build};
use fourwire::solver::{Settings, Solution, Status, solve};

/// Random networks with 1 to 20 rings against the nodal method, which does not know what a tree is.
#[test]
fn random_rings_agree_with_the_nodal_method() {
    let (mut compared, mut worst, mut most, mut rings) = (0, 0.0f64, 0, 0);
    let mut stayed = 0;
    let mut refused = Vec::new();
    for seed in 0..150u64 {
        let built = build(&random::random_ringed_draft(seed, 1 + seed as usize % 40));
        let Some(network) = built.network else {
            let errors = built.diagnostics.items().iter();
            refused.push(format!(
                "{seed}: {}",
                errors.map(|d| d.message.as_str()).collect::<Vec<_>>().join("; ")
            ));
            continue;
        };
        if network.ties.is_empty() {
            continue;
        }
        worst = worst.max(compare(&format!("seed {seed}"), &network).worst_pu);
        compared += 1;
        rings += network.ties.len();
        most = most.max(network.ties.len());
        stayed += usize::from(!network.stays.is_empty());
    }
    println!(
        "{compared} networks with {rings} rings, at most {most}; worst {worst:.1e} of nominal; {stayed} with parts that only a ring holds"
    );
    for reason in &refused {
        println!("refused {reason}");
    }
    assert!(compared >= 100 && most >= 20 && stayed >= 5, "{compared} {most} {stayed}");
}

/// Impedance of the lines below, ohm per km (invented).
const OHM_PER_KM: Complex64 = Complex64::new(0.3, 0.4);

fn network(files: &[(&str, &str)]) -> Network {
    let common = [
        ("source.csv", "node,kv\nS,11\n"),
        (
            "constructions.csv",
            "construction,kind,r1_ohm_per_km,x1_ohm_per_km,r0_ohm_per_km,x0_ohm_per_km\nline,sequence,0.3,0.4,0.5,1.2\n",
        ),
    ];
    let reading = read_files(
        common.iter().chain(files).map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())).collect(),
    );
    let built = build(&reading.draft);
    let told: Vec<_> =
        reading.diagnostics.items().iter().chain(built.diagnostics.items()).map(|d| d.to_string()).collect();
    built.network.unwrap_or_else(|| panic!("{told:#?}"))
}

fn solved(network: &Network) -> Solution {
    let solution = solve(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    solution
}

fn amps(network: &Network, solution: &Solution, name: &str) -> Complex64 {
    let b = network.branches.iter().position(|b| &*b.name == name).expect("a branch");
    solution.from_amps[b][0]
}

const LOADS: &str = "load,node,phases,kw,kvar,model\nmill,B,abcn,600,250,power\n";

/// Two lines side by side share the current as the inverse of their impedances.
#[test]
fn parallel_lines_share_by_their_impedance() {
    let network = network(&[
        ("lines.csv", "line,from,to,phases,length_km,construction\nL1,S,B,abc,2,line\nL2,S,B,abc,5,line\n"),
        ("loads.csv", LOADS),
    ]);
    assert_eq!(network.ties.len(), 1);
    let solution = solved(&network);
    let (one, two) = (amps(&network, &solution, "L1"), amps(&network, &solution, "L2"));
    assert!((one / two - 2.5).norm() < 1e-9, "{one} {two}");
    // Together they are one line of 10/7 km.
    let volts = solution.volts[network.ties[0].far.index()][0];
    let drop = solution.volts[0][0] - volts;
    assert!((drop - OHM_PER_KM * (10.0 / 7.0) * (one + two)).norm() < 1e-6, "{drop}");
}

/// A ring of three equal lines with one load: from both sides, twice as much by the shorter way; as
/// many iterations as without the ring, give or take one.
#[test]
fn a_ring_feeds_its_load_from_both_sides() {
    let lines = "line,from,to,phases,length_km,construction\nL1,S,B,abc,3,line\nL2,S,C,abc,3,line\nL3,C,B,abc,3,line\n";
    let ring = network(&[("lines.csv", lines), ("loads.csv", LOADS)]);
    let solution = solved(&ring);
    let (short, long) = (amps(&ring, &solution, "L1"), amps(&ring, &solution, "L3"));
    assert!((short / long - 2.0).norm() < 1e-9, "{short} {long}");
    let lines = "line,from,to,phases,length_km,construction\nL1,S,B,abc,2,line\n";
    let radial = solved(&network(&[("lines.csv", lines), ("loads.csv", LOADS)]));
    assert!(solution.iterations.abs_diff(radial.iterations) <= 1);
}

const TRANSFORMERS: &str = "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent,earth_ohm_to\n";

/// Two transformers side by side share the load as rating over impedance, whatever their earthing.
#[test]
fn transformers_in_parallel_share_by_rating_over_impedance() {
    for group in ["Dyn11", "Dd0", "Yzn1"] {
        let rows =
            format!("{TRANSFORMERS}T1,S,B,500,11,0.4,{group},1,4,\nT2,S,B,250,11,0.4,{group},1.5,6,\n");
        let loads = "load,node,phases,kw,kvar,model\nmill,B,abc,300,100,power\n";
        let network = network(&[("transformers.csv", &rows), ("loads.csv", loads)]);
        let solution = solved(&network);
        let (one, two) = (amps(&network, &solution, "T1"), amps(&network, &solution, "T2"));
        // 500 kVA at 4 % against 250 kVA at 6 %, the same r to x: three to one.
        assert!((one / two - 3.0).norm() < 1e-6, "{group}: {one} {two}");
    }
}

#[test]
fn rings_whose_phases_or_voltages_do_not_meet_are_refused() {
    for (rows, wanted) in [
        ("T1,S,B,500,11,0.4,Dyn11,1,4,\nT2,S,B,500,11,0.4,Dyn1,1,4,\n", "the phases do not meet"),
        ("T1,S,B,500,11,0.4,Dyn11,1,4,\nT2,S,B,500,11,0.23,Dyn11,1,4,\n", "which is at 0.400 kV"),
    ] {
        let rows = format!("{TRANSFORMERS}{rows}");
        let files = [
            ("source.csv", "node,kv\nS,11\n"),
            ("transformers.csv", &rows),
            ("loads.csv", "load,node,phases,kw,kvar\nmill,B,abc,300,100\n"),
        ];
        let reading =
            read_files(files.iter().map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())).collect());
        let built = build(&reading.draft);
        assert!(built.network.is_none());
        let messages: Vec<_> = built.diagnostics.items().iter().map(|d| d.message.as_str()).collect();
        assert!(messages.len() == 1 && messages[0].contains(wanted), "{messages:?}");
    }
}

/// A side between windings without earth: nothing carries its common current away, so that its
/// phase voltages to earth sum to zero, however large the windings that hang there.
#[test]
fn a_side_that_floats_between_windings_stays_centred() {
    for twins in ["", "T3,B,C,5000,11,0.4,Yyn0,0.5,2,\nT4,B,C,4000,11,0.4,Yyn0,0.5,3,\n"] {
        let rows =
            format!("{TRANSFORMERS}T1,S,B,100,11,11,Dd0,1,4,\nT2,B,C,5000,11,0.4,Yyn0,0.5,2,\n{twins}");
        let loads = "load,node,phases,kw,kvar,model\nmill,C,abc,30,10,impedance\n";
        let network = network(&[("transformers.csv", &rows), ("loads.csv", loads)]);
        let solution = solved(&network);
        let b = network.nodes.iter().position(|n| &*n.name == "B").expect("the node");
        let sum: Complex64 = (0..3).map(|k| solution.volts[b][k]).sum();
        let off = sum.norm() / network.nodes[b].nominal_phase_volts();
        assert!(off < 1e-9, "{off:e} of nominal");
    }
}
