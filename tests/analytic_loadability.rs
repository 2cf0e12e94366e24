//! Loadability against the closed form of one line and one load.

use fourwire::import::read_files;
use fourwire::network::build;
use fourwire::solver::Settings;
use fourwire::study::loadability::loadability;

/// A load of unity power factor at the end of a reactance X: the greatest power is E^2 / (2 X), at
/// E / sqrt(2) (maximum power transfer, textbook).
#[test]
fn one_line_one_load_gives_way_at_maximum_power_transfer() {
    let (volts, ohm) = (400.0 / 3f64.sqrt(), 0.5);
    let files = [
        ("source.csv", "node,kv\nS,0.4\n".to_string()),
        ("lines.csv", "line,from,to,phases,length_m,construction\nL,S,A,a,1000,x\n".to_string()),
        (
            "matrices.csv",
            "construction,row,column,r_ohm_per_km,x_ohm_per_km\nx,a,a,0.0000001,0.5\n".to_string(),
        ),
        ("loads.csv", "load,node,phases,kw,kvar\nD,A,an,10,0\n".to_string()),
    ];
    let reading = read_files(files.iter().map(|(n, t)| (n.to_string(), t.clone().into_bytes())).collect());
    assert!(!reading.diagnostics.has_errors(), "{:?}", reading.diagnostics.items());
    let network = build(&reading.draft).network.expect("a network");
    let found = loadability(&network, &Settings::default());
    let expected = volts * volts / (2.0 * ohm) / 10e3;
    let factor = found.factor.expect("a limit");
    assert!((factor / expected - 1.0).abs() < 3e-3, "{factor} {expected}");
    assert_eq!(found.weakest_node.as_deref(), Some("A"));
    assert!((found.weakest_pu.expect("a voltage") - 0.5f64.sqrt()).abs() < 0.05);
}
