//! Constructions by the names of their wires: published configurations from the built-in tables, and the faults
//! that must be told rather than computed.

use fourwire::catalog::{Catalog, Conductor, ConduitKind, Current, Family, Material, Resistance};
use fourwire::impedance::{
    Computed, Conditions, EPSILON_0, Kind, Recipe, RecipeFault, Sequence, Spacing, evaluate,
};
use fourwire::math::Complex64;
use fourwire::units::{METRES_PER_FOOT, METRES_PER_MILE};

const SITE: Conditions =
    Conditions { frequency_hz: 60.0, earth_resistivity_ohm_m: 100.0, permittivity_f_per_m: EPSILON_0 };

fn recipe(kind: Kind, phase: &str) -> Recipe {
    Recipe {
        kind,
        phase: phase.to_string(),
        neutral: None,
        spacing: None,
        conduit: ConduitKind::Steel,
        sequence: None,
        temperature_c: 50.0,
    }
}

/// Places in feet by slot.
fn spacing(places: &[(usize, f64, f64)]) -> Option<Spacing> {
    let places = places.iter().map(|&(s, x, y)| (s, [x * METRES_PER_FOOT, y * METRES_PER_FOOT])).collect();
    Some(Spacing { name: "spacing".to_string(), places })
}

fn computed(recipe: &Recipe, phases: &[usize]) -> Computed {
    evaluate(recipe, Catalog::built_in(), phases, false, &SITE).expect("a sound construction")
}

/// Configurations 601 to 607 from the wires' names. Wires and spacings (IEEE PES, Radial Distribution Test
/// Feeders; spacings from memory, confirmed by the published matrices), at 50 C.
fn configuration(name: &str) -> Computed {
    let overhead = |phase: &str, neutral: &str, places: &[(usize, f64, f64)]| {
        let mut recipe = recipe(Kind::Overhead, phase);
        recipe.neutral = Some(neutral.to_string());
        recipe.spacing = spacing(places);
        let mut phases: Vec<usize> = places.iter().map(|p| p.0).filter(|&s| s != 3).collect();
        phases.sort_unstable();
        computed(&recipe, &phases)
    };
    let n = (3, 4.0, 25.0);
    match name {
        "601" => {
            overhead("556.5 26/7 ACSR", "4/0 6/1 ACSR", &[(1, 0.0, 29.0), (0, 2.5, 29.0), (2, 7.0, 29.0), n])
        }
        "602" => overhead("4/0 6/1 ACSR", "Penguin", &[(2, 0.0, 29.0), (0, 2.5, 29.0), (1, 7.0, 29.0), n]),
        "603" => overhead("1/0 ACSR", "1/0 ACSR", &[(2, 0.0, 29.0), (1, 7.0, 29.0), n]),
        "604" => overhead("1/0 ACSR", "1/0 ACSR", &[(0, 0.0, 29.0), (2, 7.0, 29.0), n]),
        "605" => overhead("1/0 ACSR", "1/0 ACSR", &[(2, 0.5, 29.0), (3, 0.0, 24.0)]),
        "606" => {
            let mut recipe = recipe(Kind::Concentric, "250 AA CN one-third");
            recipe.spacing = spacing(&[(0, 0.0, -4.0), (1, 0.5, -4.0), (2, 1.0, -4.0)]);
            computed(&recipe, &[0, 1, 2])
        }
        _ => {
            let mut recipe = recipe(Kind::Tape, "1/0 AA tape");
            recipe.neutral = Some("1/0 7-strand copper".to_string());
            recipe.spacing = spacing(&[(0, 0.0, -4.0), (3, 1.0 / 12.0, -4.0)]);
            computed(&recipe, &[0])
        }
    }
}

/// Every published impedance within 0.0003 ohm per mile. Charging is compared with a bound as observed, not one that
/// was published: within 0.2 % of the phase's own. Published mutual values are up to 0.16 % of the own ones smaller
/// than potential coefficients give, for no reason that is printed. 607 is 0.7 % off: the textbook's permittivity for
/// cables is rounded by 0.35 %, and its own example 5.2 with the same cable (89.3179) is 0.37 % from the published value.
#[test]
fn published_configurations_from_the_names_of_their_wires() {
    let text = include_str!("../networks/ieee-13-node/matrices.csv");
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let mut checked = 0;
    for row in reader.records().map(|r| r.expect("a row")) {
        let slot = |cell: &str| "abcn".find(cell).expect("a conductor");
        let number = |k: usize| row[k].parse::<f64>().expect("a number");
        let at = (slot(&row[1]), slot(&row[2]));
        let line = configuration(&row[0]);
        let z = line.z_per_m[at] * METRES_PER_MILE;
        let off = (z.re - number(3)).abs().max((z.im - number(4)).abs());
        assert!(off <= 0.0003, "{row:?}: {z}");
        let own = line.y_per_m[(at.0, at.0)].im * METRES_PER_MILE * 1e6;
        let b = line.y_per_m[at].im * METRES_PER_MILE * 1e6;
        let allowed = if &row[0] == "607" { 0.008 } else { 0.002 };
        assert!((b - number(5)).abs() <= allowed * own, "{row:?}: {b} microsiemens");
        checked += 1;
    }
    assert_eq!(checked, 26, "rows of the published matrices");
}

/// Sizes in mm2 and bare wires must not be read as the AWG or kcmil size of the same number.
#[test]
fn conduit_has_building_wire_only() {
    for wire in ["10 mm2 copper", "300 mm2 copper", "4/0 6/1 ACSR", "1 AWG 7-strand copper"] {
        let faults = evaluate(&recipe(Kind::Conduit, wire), Catalog::built_in(), &[0, 1, 2], false, &SITE);
        let Err(faults) = faults else { panic!("{wire} was taken") };
        assert!(matches!(faults.as_slice(), [RecipeFault::NotInConduit { .. }]), "{wire}: {faults:?}");
    }
}

/// NEC Chapter 9 Table 9 gives 4/0 copper in steel 0.063 and 0.051 ohm per kft, at 75 C and 60 Hz; loops through two
/// wires are twice that whatever earth return is assumed. The rating is that of Table 310.16, 230 A at 75 C.
#[test]
fn conduit_loops_are_those_of_the_table() {
    let recipe = Recipe { temperature_c: 75.0, ..recipe(Kind::Conduit, "4/0 copper") };
    let line = evaluate(&recipe, Catalog::built_in(), &[0, 1, 2], true, &SITE).expect("in the table");
    let z = line.z_per_m;
    for (i, j) in [(0, 1), (1, 2), (0, 3)] {
        let one = (z[(i, i)] + z[(j, j)] - z[(i, j)] - z[(j, i)]) / 2.0 * 304.8;
        assert!((one - Complex64::new(0.063, 0.051)).norm() < 1e-9, "({i}, {j}): {one}");
    }
    assert_eq!(line.rating_amps, Some(230.0));
}

/// Sequence values with a neutral: any balanced set sees Z1, three equal currents back through the neutral see Z0.
/// The values are arbitrary.
#[test]
fn sequence_values_come_back_out_of_the_four_wires() {
    let (z1, z0) = (Complex64::new(0.4e-3, 0.1e-3), Complex64::new(1.5e-3, 0.4e-3));
    let mut recipe = recipe(Kind::Sequence, "");
    recipe.sequence = Some(Sequence { z1, z0, b1: 0.0, b0: 0.0 });
    let z = evaluate(&recipe, Catalog::built_in(), &[0, 1, 2], true, &SITE).expect("sound").z_per_m;
    // Drop from phase a to neutral for currents 1, 1, 1 and -3, and for a balanced set.
    let drop = |amps: [Complex64; 4]| (0..4).map(|k| (z[(0, k)] - z[(3, k)]) * amps[k]).sum::<Complex64>();
    let one = Complex64::from(1.0);
    assert!((drop([one, one, one, one * -3.0]) - z0).norm() < 1e-15);
    let h = Complex64::from_polar(1.0, 2.0 * std::f64::consts::PI / 3.0);
    assert!((drop([one, h * h, h, one * 0.0]) - z1).norm() < 1e-15);
    recipe.sequence = Some(Sequence { z1, z0: Complex64::new(0.3e-3, 0.4e-3), b1: 0.0, b0: 0.0 });
    let fault = evaluate(&recipe, Catalog::built_in(), &[0, 1, 2], true, &SITE);
    assert_eq!(fault, Err(vec![RecipeFault::NegativeReturn]));
    assert!(evaluate(&recipe, Catalog::built_in(), &[0, 1, 2], false, &SITE).is_ok());
}

/// A spacing for other phases is taken in order, and says so.
#[test]
fn places_taken_in_order_are_told() {
    let mut recipe = recipe(Kind::Overhead, "1/0 ACSR");
    recipe.spacing = spacing(&[(0, 0.0, 29.0), (1, 7.0, 29.0)]);
    let told =
        |phases: &[usize]| computed(&recipe, phases).assumptions.iter().any(|a| a.contains("in order"));
    assert!(told(&[1, 2]) && !told(&[0, 1]));
}

/// The user's own wire that overrides one of the table is the one that is used, however the construction spells it.
#[test]
fn own_wires_are_used_by_constructions() {
    let r = Resistance { ohm_per_m: 1e-3, temperature_c: 50.0, current: Current::Alternating };
    let mut own = Conductor::own("1/0 AWG 6/1 ACSR", Material::Aluminium, r);
    own.gmr_m = Some(1e-3);
    let catalog = Catalog::with(vec![own]);
    assert_eq!(catalog.find("1/0 ACSR").expect("a wire").family, Family::Own);
    let mut recipe = recipe(Kind::Overhead, "Raven");
    recipe.spacing = spacing(&[(0, 0.0, 29.0)]);
    let line = evaluate(&recipe, &catalog, &[0], false, &SITE).expect("sound");
    let primitive = line.constants.expect("computed").primitive[(0, 0)];
    // 1 ohm per km of the wire and pi^2 f 1e-7 ohm per m of the earth.
    let earth = std::f64::consts::PI.powi(2) * 60.0 * 1e-7;
    assert!((primitive.re - 1e-3 - earth).abs() < 1e-12, "{primitive}");
}

/// Brine below high wires: the series does not hold there, and no difference is stated; at 100 ohm m it is small.
#[test]
fn the_series_is_compared_only_where_it_holds() {
    let mut recipe = recipe(Kind::Overhead, "1/0 ACSR");
    recipe.spacing = spacing(&[(0, 0.0, 90.0)]);
    let difference = |rho: f64| {
        let site = Conditions { earth_resistivity_ohm_m: rho, ..SITE };
        let line = evaluate(&recipe, Catalog::built_in(), &[0], false, &site).expect("sound");
        line.constants.expect("computed").series_difference_percent
    };
    assert_eq!(difference(0.1), None);
    assert!(difference(100.0).is_some_and(|percent| percent < 2.0));
}
