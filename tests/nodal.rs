//! The sweep against an independent nodal method on random networks: every voltage within 1e-8 of
//! nominal, losses and source currents within 1e-8.

#[path = "support/compare.rs"]
mod compare;
#[path = "support/features.rs"]
mod features;
#[path = "support/nodal.rs"]
mod nodal;
#[path = "support/random.rs"]
mod random;

use std::collections::BTreeMap;

use compare::compare;
use fourwire::network::{Draft, Network, build};

const NETWORKS: u64 = 240;

/// The network of a draft, or the first reason why it is none.
fn built(draft: &Draft) -> Result<Network, String> {
    let built = build(draft);
    built.network.ok_or_else(|| {
        let mut items = built.diagnostics.items().iter();
        let first = items.find(|d| d.severity == fourwire::diagnostic::Severity::Error);
        first.map_or(String::new(), |d| d.message.clone())
    })
}

#[test]
fn random_networks_agree_with_the_nodal_method() {
    let (mut compared, mut refused, mut dipped, mut below_floor) = (0u64, Vec::new(), 0, 0);
    let mut worst = 0.0f64;
    let mut seen = BTreeMap::<String, u32>::new();
    for seed in 0..NETWORKS {
        let network = match built(&random::random_draft(seed)) {
            Ok(network) => network,
            Err(reason) => {
                refused.push(format!("seed {seed}: {reason}"));
                continue;
            }
        };
        let found = compare(&format!("seed {seed}"), &network);
        worst = worst.max(found.worst_pu);
        dipped += u64::from(found.lowest_pu < 0.75);
        below_floor += u64::from(found.lowest_pu < 0.7);
        for feature in features::features(&network) {
            *seen.entry(feature).or_default() += 1;
        }
        compared += 1;
    }
    println!(
        "{compared} networks, worst {worst:.1e} of nominal, {dipped} below 0.75, {below_floor} with loads below the floor, refused {}",
        refused.len()
    );
    println!("{seen:?}");
    assert!(refused.len() <= 5, "{refused:#?}");
    assert!(compared >= 200 && below_floor >= 3);
    assert!(dipped * 2 < compared, "{dipped} of {compared} networks are too heavy");
    let rare: Vec<_> =
        features::WANTED.iter().filter(|f| seen.get(**f).is_none_or(|times| *times < 3)).collect();
    assert!(rare.is_empty(), "hardly any network has {rare:?}");
}

/// Where a constant-power load turns into an impedance is a setting: other settings agree as well.
#[test]
fn any_floor_of_constant_power_agrees() {
    let (mut turned, mut compared) = (0, 0);
    for (seed, percent) in (1000..1060).zip([95.0, 85.0, 50.0].into_iter().cycle()) {
        let mut draft = random::random_draft(seed);
        draft.study.constant_power_floor_percent = percent;
        let Ok(network) = built(&draft) else { continue };
        let found = compare(&format!("seed {seed}, floor {percent} percent"), &network);
        turned += u32::from(found.lowest_pu < percent / 100.0);
        compared += 1;
    }
    assert!(compared >= 55 && turned >= 10, "{compared} compared, {turned} with loads below the floor");
}
