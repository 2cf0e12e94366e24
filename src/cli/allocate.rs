//! `fourwire allocate`.

use std::io;

use super::args::{Allocate, FlowFormat};
use super::check::{Time, load_sound};
use super::{Outcome, Screen};
use crate::network::Network;
use crate::output::{Folder, allocation_json, allocation_text, loads_csv, meters_csv, unmet_text};
use crate::solver::Settings;
use crate::study::allocation::{AllocatedLoad, Allocation, allocate as share, allocated_loads};

/// Reads, shares the loads, prints them and writes them where asked.
pub(super) fn allocate(options: &Allocate, screen: &mut Screen) -> Outcome {
    let time = Time::Full;
    let Some((mut network, _)) = load_sound(&options.folder, time, screen) else {
        return Outcome::WrongInput;
    };
    if network.meters.is_empty() {
        screen.tell("error: the network has no meter, so there is nothing to share; add meters.csv\n");
        return Outcome::WrongInput;
    }
    screen.doing("sharing loads");
    let allocation = match share(&mut network, &Settings::default()) {
        Ok(allocation) => allocation,
        Err(unmet) => {
            screen.tell(&unmet_text(&network, &unmet));
            return Outcome::NoSolution;
        }
    };
    let loads = allocated_loads(&network);
    if let Err(error) = deliver(options, &network, &allocation, &loads, screen) {
        screen.tell(&format!("error: the results cannot be written: {error}\n"));
        return Outcome::WrongInput;
    }
    Outcome::Done
}

fn deliver(
    options: &Allocate,
    network: &Network,
    allocation: &Allocation,
    loads: &[AllocatedLoad],
    screen: &mut Screen,
) -> io::Result<()> {
    if let Some(out) = &options.out {
        let mut folder = Folder::new(out, &options.folder)?;
        folder.write("loads.csv", |writer| loads_csv(loads, writer))?;
        folder.write("meters.csv", |writer| meters_csv(&allocation.meters, writer))?;
        folder.commit()?;
    }
    match options.format {
        FlowFormat::Text => screen.print(&allocation_text(network, allocation, loads)),
        FlowFormat::Json => screen.print_with(|writer| allocation_json(network, allocation, loads, writer)),
        FlowFormat::Csv => screen.print_with(|writer| loads_csv(loads, writer)),
    }
    if let Some(out) = &options.out {
        screen.tell(&format!("loads and readings written to {}\n", out.display()));
    }
    Ok(())
}
