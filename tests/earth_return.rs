//! Earth as a conductor: single-wire lines with earth return, isolating transformers, and the
//! ladder of a neutral earthed at every pole.

use fourwire::import::read_files;
use fourwire::math::{Complex64, PhaseMatrix};
use fourwire::network::{
    Conductor, Conductors, Connection, Construction, Draft, LineRecord, LoadModel, LoadRecord, LoadSite,
    Network, NodeRecord, SupplyRecord, SwitchState, TransformerRecord, VectorGroup, build,
};
use fourwire::solver::{Settings, Solution, Status, solve};
use fourwire::study::flow::FlowReport;

const HERTZ: f64 = 50.0;
const EARTH_OHM_M: f64 = 250.0;
/// Wire of the line: resistance at its temperature, geometric mean radius (invented).
const WIRE_OHM_PER_KM: f64 = 6.1;
const WIRE_GMR_MM: f64 = 1.2;
const LENGTH_KM: f64 = 30.0;

/// Self impedance of a wire with earth return, ohm per km: resistance plus `pi^2 f 1e-4`, reactance
/// `4 pi f 1e-4 ln(De / GMR)` with `De = 658.5 sqrt(rho / f)` metres: Carson's first terms (Carson, Bell
/// System Technical Journal 5 (1926), 539-554; the rounded constant of `De` from memory).
fn carson_ohm_per_km() -> Complex64 {
    let pi = std::f64::consts::PI;
    let depth_m = 658.5 * (EARTH_OHM_M / HERTZ).sqrt();
    Complex64::new(
        WIRE_OHM_PER_KM + pi * pi * HERTZ * 1e-4,
        4.0 * pi * HERTZ * 1e-4 * (depth_m / (WIRE_GMR_MM / 1e3)).ln(),
    )
}

fn solved(network: &Network) -> Solution {
    let solution = solve(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    solution
}

/// A 22 kV line, an isolating transformer to 12.7 kV, a single wire with earth return, a customer.
/// Every electrode and the wire against the circuit solved by hand.
#[test]
fn a_single_wire_line_with_earth_return_is_the_closed_form() {
    let files = [
        ("study.csv", format!("setting,value\nfrequency_hz,{HERTZ}\nearth_resistivity_ohm_m,{EARTH_OHM_M}\nconductor_temperature_c,20\n")),
        ("source.csv", "node,kv\nS,22\n".into()),
        (
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,phases,phases_to,r_percent,x_percent,earth_ohm_from,earth_ohm_to\n\
             Isolating,S,I,100,22,12.7,Ii0,ab,an,1.5,3.5,,2\n\
             House,C,H,25,12.7,0.25,Ii0,an,an,2,3,8,0\n"
                .into(),
        ),
        (
            "conductors.csv",
            format!("conductor,material,r_ohm_per_km,r_at_c,gmr_mm,diameter_mm\nsteel,aluminium,{WIRE_OHM_PER_KM},20,{WIRE_GMR_MM},8\n"),
        ),
        ("spacings.csv", "spacing,position,x_m,y_m\none,a,0,8\n".into()),
        ("constructions.csv", "construction,kind,phase_conductor,spacing,temperature_c\nswer,overhead,steel,one,20\n".into()),
        ("lines.csv", format!("line,from,to,phases,length_km,construction\nWire,I,C,a,{LENGTH_KM},swer\n")),
        ("loads.csv", "load,node,phases,kw,kvar,model\nhouse,H,an,10,4,impedance\n".into()),
    ];
    let reading = read_files(files.iter().map(|(n, t)| ((*n).to_owned(), t.clone().into_bytes())).collect());
    let built = build(&reading.draft);
    let faults: Vec<_> = reading.diagnostics.items().iter().chain(built.diagnostics.items()).collect();
    let told: Vec<_> = faults.iter().map(|d| d.to_string()).collect();
    assert!(!reading.diagnostics.has_errors(), "{told:#?}");
    let mut network = built.network.unwrap_or_else(|| panic!("{told:#?}"));
    // The closed form has no charging.
    network.constructions.iter_mut().for_each(|c| c.y_per_m = PhaseMatrix::zeros());
    let solution = solved(&network);

    // The line's own impedance: the library keeps the height's correction terms out by default.
    let z_line = carson_ohm_per_km() * LENGTH_KM;
    let own = network.constructions[0].z_per_m[(0, 0)] * 1e3 * LENGTH_KM;
    assert!((own - z_line).norm() < 2e-4 * z_line.norm(), "{own} and {z_line}");

    // All on the 12.7 kV side: source 22 kV across a-b turned to 12.7 kV, leakages, electrodes, wire, load.
    let e = (Complex64::from_polar(22e3, 0.0)
        - Complex64::from_polar(22e3, -2.0 * std::f64::consts::PI / 3.0))
        / 3f64.sqrt()
        * (12.7 / 22.0);
    let leakage = |r: f64, x: f64, volts: f64, va: f64| Complex64::new(r, x) * volts * volts / va;
    let turns2 = (12.7f64 / 0.25).powi(2);
    // The load takes its power at the nominal voltage of its winding.
    let load = 250.0f64.powi(2) / Complex64::new(10e3, -4e3) * turns2;
    let total = leakage(0.015, 0.035, 12.7e3, 100e3)
        + 2.0
        + own
        + 8.0
        + leakage(0.02, 0.03, 250.0, 25e3) * turns2
        + load;
    let amps = e / total;
    let index = |name: &str| network.nodes.iter().position(|n| &*n.name == name).expect("a node");
    let wire = network.branches.iter().position(|b| &*b.name == "Wire").expect("a line");
    let near = |found: Complex64, expected: Complex64| {
        assert!((found - expected).norm() < 1e-8 * expected.norm(), "{found} instead of {expected}");
    };
    near(solution.from_amps[wire][0], amps);
    near(solution.volts[index("I")][0], e - amps * (leakage(0.015, 0.035, 12.7e3, 100e3) + 2.0));
    near(solution.volts[index("H")][0], amps * load * (0.25 / 12.7));

    let report = FlowReport::new(&network, &solution, &[], "").expect("a report");
    let electrode = |of: &str| {
        report.electrodes.iter().find(|e| e.transformer.as_deref() == Some(of)).expect("an electrode")
    };
    for (of, ohm) in [("Isolating", 2.0), ("House", 8.0)] {
        let found = electrode(of);
        assert!((found.amps - amps.norm()).abs() < 1e-8 * amps.norm());
        assert!((found.volts - amps.norm() * ohm).abs() < 1e-8 * amps.norm() * ohm, "{of}: {}", found.volts);
    }
}

/// Input impedance of a long neutral earthed at every pole: `Z = z/2 + sqrt(z^2/4 + z R)`
/// (Endrenyi, IEEE Transactions PAS-86 (1967); from memory), z a span, R an electrode.
#[test]
fn a_multi_earthed_neutral_is_the_ladder_of_the_closed_form() {
    let (span, electrode) = (Complex64::new(0.04, 0.08), 25.0);
    let network = build(&ladder(span, electrode, 400)).network.expect("a network");
    let solution = solved(&network);
    let index = |name: &str| network.nodes.iter().position(|n| &*n.name == name).expect("a node");
    let lateral = network.branches.iter().position(|b| &*b.name == "lateral").expect("a line");
    // The lateral's load returns through earth, and finds its way to the winding by the ladder alone.
    let amps = solution.from_amps[lateral][0];
    let found = -solution.volts[index("p0")][3] / amps;
    let expected = span / 2.0 + (span * span / 4.0 + span * electrode).sqrt();
    println!("{found} against {expected}");
    assert!((found - expected).norm() < 1e-7 * expected.norm(), "{found} instead of {expected}");
    // The value computed beside the formula in the handbook notes: 1.2920 + j0.8268 ohm.
    assert!((found - Complex64::new(1.2920, 0.8268)).norm() < 1e-4);
}

/// A single-phase winding whose neutral goes out over `spans` poles, and a load that returns by earth.
fn ladder(span: Complex64, electrode_ohm: f64, spans: usize) -> Draft {
    let mut draft = Draft::default();
    draft.supplies.push(SupplyRecord {
        node: "S".into(),
        nominal_volts: 12_470.0,
        held_pu: [1.0; 3],
        angle_rad: 0.0,
        three_phase: None,
        single_phase: None,
        earth_ohm: 0.0,
        origin: None,
    });
    draft.transformers.push(TransformerRecord {
        transformer: "T".into(),
        from: "S".into(),
        to: "p0".into(),
        rated_va: 50e3,
        from_volts: 12_470.0,
        to_volts: 2400.0,
        group: VectorGroup::Single { clock: 0 },
        terminals: Some([
            Connection::Delta(Conductors::NONE.with(Conductor::A)),
            Connection::Star(Conductors::NONE.with(Conductor::A)),
        ]),
        r_pu: 0.01,
        x_pu: 0.02,
        no_load_watts: 0.0,
        magnetizing_pu: 0.0,
        tap_pu: 0.0,
        from_tap_pu: 0.0,
        from_earth_ohm: None,
        to_earth_ohm: None,
        origin: None,
    });
    let conductors = Conductors::NONE.with(Conductor::A).with(Conductor::N);
    let matrix = |n: Complex64| {
        let mut z = PhaseMatrix::zeros();
        (z[(0, 0)], z[(3, 3)]) = (Complex64::new(3e-4, 4e-4), n / 1e3);
        z
    };
    for (name, conductors, n) in
        [("span", conductors, span), ("wire", conductors.phases(), Complex64::default())]
    {
        draft.constructions.push(Construction {
            name: name.into(),
            conductors,
            z_per_m: matrix(n),
            y_per_m: PhaseMatrix::zeros(),
            rating_amps: None,
            origin: None,
        });
    }
    let mut line = |name: String, from: String, to: String, conductors, construction: &str| {
        draft.lines.push(LineRecord {
            line: name.into(),
            from: from.into(),
            to: to.into(),
            conductors,
            length_m: 1e3,
            construction: construction.into(),
            sets: 1,
            rating_amps: None,
            state: SwitchState::Closed,
            origin: None,
        });
    };
    for i in 0..spans {
        line(format!("l{i}"), format!("p{i}"), format!("p{}", i + 1), conductors, "span");
    }
    line("lateral".into(), "p0".into(), "house".into(), conductors.phases(), "wire");
    for i in 1..=spans {
        draft.nodes.push(NodeRecord {
            node: format!("p{i}").into(),
            xy: None,
            earth_ohm: Some(electrode_ohm),
            origin: None,
        });
    }
    draft.loads.push(LoadRecord {
        load: "house".into(),
        site: LoadSite::Node("house".into()),
        connection: Connection::Star(Conductors::NONE.with(Conductor::A)),
        watts: 5e3,
        vars: 1e3,
        model: LoadModel::Impedance,
        profile: None,
        origin: None,
    });
    draft
}
