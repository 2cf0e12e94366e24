//! `fourwire start`.

use std::io;

use super::args::{FlowFormat, Start, StarterChoice};
use super::check::{Time, load_sound};
use super::{Outcome, Screen};
use crate::machine::{ChangeOver, Motor, Starter};
use crate::network::Network;
use crate::output::{
    Folder, cannot_start_text, start_csv, start_json, start_text, starters_text, unmet_text,
};
use crate::solver::Settings;
use crate::study::allocation::allocate;
use crate::study::start::{StartReport, start as run, starter_words};

/// Reads, starts the motor and prints or writes what came of it.
pub(super) fn start(options: &Start, screen: &mut Screen) -> Outcome {
    if options.format == FlowFormat::Csv && options.out.is_none() {
        screen.tell("error: --format csv writes several files; say where with --out DIR\n");
        return Outcome::WrongInput;
    }
    let time = Time::Full;
    let Some((mut network, input_sha256)) = load_sound(&options.folder, time, screen) else {
        return Outcome::WrongInput;
    };
    let Some(index) = network.motors.iter().position(|m| *m.name == *options.motor) else {
        screen.tell(&no_such_motor(&network, &options.motor));
        return Outcome::WrongInput;
    };
    // Loads that share a meter's reading draw nothing until they do.
    if !network.meters.is_empty()
        && let Err(unmet) = allocate(&mut network, &Settings::default())
    {
        screen.tell(&unmet_text(&network, &unmet));
        return Outcome::NoSolution;
    }
    let motor = &network.motors[index];
    if options.compare {
        let starters = all_starters(motor.starter, &motor.machine);
        let mut rows = Vec::new();
        for (i, starter) in starters.iter().enumerate() {
            screen.advance("starting", i as u32, starters.len() as u32);
            let report = run(&network, index, starter, &input_sha256);
            rows.push((starter_words(starter), report.map_err(|why| cannot_start_text(&why))));
        }
        let head = format!("Motor {} at node {}\n\n", motor.name, network.node(motor.node).name);
        screen.print(&(head + &starters_text(&rows)));
        return Outcome::Done;
    }
    let starter = options.starter.map_or(motor.starter, |choice| default_starter(choice, &motor.machine));
    screen.doing("starting");
    let report = match run(&network, index, &starter, &input_sha256) {
        Ok(report) => report,
        Err(why) => {
            screen.tell(&format!("error[no-solution]: {}.\n", cannot_start_text(&why)));
            return Outcome::NoSolution;
        }
    };
    if let Err(error) = deliver(options, &report, screen) {
        screen.tell(&format!("error: the results cannot be written: {error}\n"));
        return Outcome::WrongInput;
    }
    if options.strict && !report.passes() { Outcome::LimitExceeded } else { Outcome::Done }
}

fn deliver(options: &Start, report: &StartReport, screen: &mut Screen) -> io::Result<()> {
    let Some(out) = &options.out else {
        match options.format {
            FlowFormat::Json => screen.print_with(|writer| start_json(report, writer)),
            FlowFormat::Text | FlowFormat::Csv => screen.print(&start_text(report)),
        }
        return Ok(());
    };
    let mut folder = Folder::new(out, &options.folder)?;
    match options.format {
        FlowFormat::Json => folder.write("start.json", |writer| start_json(report, writer))?,
        FlowFormat::Text => {
            folder.write("start.txt", |writer| writer.write_all(start_text(report).as_bytes()))?
        }
        FlowFormat::Csv => start_csv(report, &mut folder)?,
    }
    folder.commit()?;
    screen.tell(&format!("results written to {}\n", out.display()));
    Ok(())
}

fn no_such_motor(network: &Network, name: &str) -> String {
    let names = || network.motors.iter().map(|m| &*m.name);
    if network.motors.is_empty() {
        return "error: the network has no motors; give them in motors.csv\n".to_string();
    }
    let cure = match crate::diagnostic::nearest(name, names()) {
        Some(near) => format!("did you mean `{near}`?"),
        None => format!("the motors are {}", names().take(10).collect::<Vec<_>>().join(", ")),
    };
    format!("error: there is no motor `{name}`; {cure}\n")
}

/// A starter with settings of common practice.
fn default_starter(choice: StarterChoice, machine: &Motor) -> Starter {
    let change = ChangeOver::AtSpeed(0.9);
    match choice {
        StarterChoice::Direct => Starter::Direct,
        StarterChoice::StarDelta => Starter::StarDelta { change, pause_s: 0.05 },
        StarterChoice::Auto50 => Starter::Autotransformer { tap: 0.5, change },
        StarterChoice::Auto65 => Starter::Autotransformer { tap: 0.65, change },
        StarterChoice::Auto80 => Starter::Autotransformer { tap: 0.8, change },
        StarterChoice::PartWinding => Starter::PartWinding { change },
        StarterChoice::Soft => Starter::Soft { limit_amps: 3.5 * machine.amps, initial: 0.35, ramp_s: 10.0 },
        StarterChoice::Drive => {
            Starter::Drive { limit_amps: 1.5 * machine.amps, ramp_s: 10.0, efficiency: 0.97, pf: 0.95 }
        }
    }
}

/// The motor's own starter and all others.
fn all_starters(own: Starter, machine: &Motor) -> Vec<Starter> {
    use StarterChoice::{Auto50, Auto65, Auto80, Direct, Drive, PartWinding, Soft, StarDelta};
    let mut all: Vec<Starter> = [Direct, StarDelta, Auto50, Auto65, Auto80, PartWinding, Soft, Drive]
        .into_iter()
        .map(|choice| default_starter(choice, machine))
        .collect();
    if !all.contains(&own) {
        all.insert(0, own);
    }
    all
}
