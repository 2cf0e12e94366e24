//! `fourwire flow`.

use std::io;

use super::args::{Flow, FlowFormat};
use super::check::{Time, load_sound};
use super::{Outcome, Screen};
use crate::network::{LoadModel, Network};
use crate::output::{
    Colour, Folder, Length, flow_csv, flow_json, flow_text, loadability_text, no_solution_text, unmet_text,
};
use crate::solver::{Controls, Settings, Solution, solve_controlled};
use crate::study::allocation::{Allocation, MeterRead, Unmet, allocate};
use crate::study::flow::FlowReport;
use crate::study::loadability::loadability_with;

/// Reads, solves and prints or writes the results.
pub(super) fn flow(options: &Flow, screen: &mut Screen) -> Outcome {
    if options.format == FlowFormat::Csv && options.out.is_none() {
        screen.tell("error: --format csv writes several files; say where with --out DIR\n");
        return Outcome::WrongInput;
    }
    let time = options.at.as_deref().map_or(Time::Full, Time::At);
    let Some((mut network, input_sha256)) = load_sound(&options.folder, time, screen) else {
        return Outcome::WrongInput;
    };
    screen.doing("solving");
    let settings = Settings::default();
    let (solution, controls, meters) = match solved(&mut network, &settings) {
        Ok(solved) => solved,
        Err(unmet) => {
            screen.tell(&unmet_text(&network, &unmet));
            return Outcome::NoSolution;
        }
    };
    let Some(report) = FlowReport::controlled(&network, &solution, &controls, &input_sha256) else {
        screen.tell(&no_solution_text(&network, &solution));
        if options.loadability {
            let text = look_for_loadability(&network, &settings, screen);
            screen.tell(&text);
        }
        return Outcome::NoSolution;
    };
    let report = report.with_meters(meters);
    screen.doing("writing");
    if let Err(error) = deliver(options, &network, &solution, &report, screen) {
        screen.tell(&format!("error: the results cannot be written: {error}\n"));
        return Outcome::WrongInput;
    }
    if options.loadability {
        let text = look_for_loadability(&network, &settings, screen);
        if options.format == FlowFormat::Text { screen.print(&text) } else { screen.tell(&text) }
    }
    if options.strict && (report.exceeds_a_limit() || !report.controls_settled) {
        Outcome::LimitExceeded
    } else {
        Outcome::Done
    }
}

type Solved = (Solution, Controls, Vec<MeterRead>);

/// The flow; where there are meters, with the loads shared to meet them.
fn solved(network: &mut Network, settings: &Settings) -> Result<Solved, Unmet> {
    if network.meters.is_empty() {
        let (solution, controls) = solve_controlled(network, settings);
        return Ok((solution, controls, Vec::new()));
    }
    let Allocation { solution, controls, meters, .. } = allocate(network, settings)?;
    Ok((solution, controls, meters))
}

fn deliver(
    options: &Flow,
    network: &Network,
    solution: &Solution,
    report: &FlowReport,
    screen: &mut Screen,
) -> io::Result<()> {
    let length = if options.all { Length::Full } else { Length::Short };
    let page = |colour: Colour| flow_text(network, solution, report, length, colour);
    let Some(out) = &options.out else {
        match options.format {
            FlowFormat::Json => screen.print_with(|writer| flow_json(report, writer)),
            FlowFormat::Text | FlowFormat::Csv => screen.print(&page(screen.colour_on_stdout())),
        }
        return Ok(());
    };
    let mut folder = Folder::new(out, &options.folder)?;
    match options.format {
        FlowFormat::Json => folder.write("flow.json", |writer| flow_json(report, writer))?,
        FlowFormat::Text => {
            folder.write("flow.txt", |writer| writer.write_all(page(Colour::Plain).as_bytes()))?
        }
        FlowFormat::Csv => flow_csv(report, &mut folder)?,
    }
    folder.commit()?;
    screen.tell(&format!("results written to {}\n", out.display()));
    Ok(())
}

/// Finds how far the loads can grow, with a sign of progress, and puts it in words.
fn look_for_loadability(network: &Network, settings: &Settings, screen: &mut Screen) -> String {
    if network.loads.iter().all(|l| l.watts == 0.0 && l.vars == 0.0) {
        return "Loadability: there are no loads to grow.\n".to_string();
    }
    let found = loadability_with(network, settings, |at| {
        screen.advance("looking for the loadability limit", at.solved, at.expected);
    });
    let floor = network.study.constant_power_floor_percent;
    let constant = network.loads.iter().any(|l| l.model == LoadModel::Power);
    loadability_text(&found, if constant { floor } else { 0.0 })
}
