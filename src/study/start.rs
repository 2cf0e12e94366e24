//! Starting a motor on the feeder: the dip at every node at the first instant and on the way, the
//! run-up of its speed while all running motors respond with their own slip and inertia.
//!
//! Phasors throughout: electrical transients of the first cycles are left out. Regulators and
//! switched capacitors stay where they stood before the start.

use nalgebra::Matrix3;
use serde::Serialize;

use crate::machine::{
    Advance, Condition, Coupling, Motor, Ode, OdeFault, Phases, Progress, Seen, Starter, StepControl, Stop,
    net_nm, unbalance,
};
use crate::math::{Complex64, PhaseVector};
use crate::network::{MotorState, Name, Network, NodeId};
use crate::solver::{Machines, Settings, Solution, Status, solve_controlled};

/// Longest start that is followed, seconds.
const LONGEST_S: f64 = 60.0;
/// Accelerating torque, part of full-load torque, below which a motor beyond breakdown is up to speed.
const SETTLED: f64 = 0.01;
/// Voltage at which contactors of running motors may drop out, percent of nominal (common practice, no source).
const DROP_OUT_PERCENT: f64 = 70.0;

/// How a start ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum StartOutcome {
    /// Up to speed.
    Runs,
    /// It has no torque left to accelerate.
    Stalls,
    /// Still accelerating after the longest time that is followed.
    Slow,
    /// The feeder has no solution on the way.
    Collapses,
}

/// One instant of the run-up.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct StartInstant {
    /// Time since switching on, seconds.
    pub seconds: f64,
    /// Speed, revolutions per minute.
    pub rpm: f64,
    /// Air-gap torque, newton metres.
    pub torque_nm: f64,
    /// Torque of load and friction, newton metres.
    pub load_nm: f64,
    /// Largest line current of one motor, amperes.
    pub amps: f64,
    /// Lowest line-to-line voltage at its node, per unit of nominal.
    pub pu: f64,
}

/// How far the voltage dips at a node.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Dip {
    /// Node.
    pub node: Name,
    /// Conductor letter of the phase that dips most.
    pub conductor: &'static str,
    /// Voltage before, per unit of nominal.
    pub before_pu: f64,
    /// At the instant of starting.
    pub start_pu: f64,
    /// Lowest on the way.
    pub lowest_pu: f64,
    /// From before to the lowest, percent of nominal.
    pub dip_percent: f64,
}

/// What must hold, and whether it does.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Judgement {
    /// What is judged.
    pub what: &'static str,
    /// Where.
    pub place: String,
    /// Value found.
    pub value: f64,
    /// Limit.
    pub limit: f64,
    /// Unit of both.
    pub unit: &'static str,
    /// True where it holds.
    pub holds: bool,
}

/// Result of [`start`].
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct StartReport {
    /// Version of the program.
    pub fourwire: &'static str,
    /// Name of the network.
    pub network: String,
    /// SHA-256 of the input files.
    pub input_sha256: String,
    /// Motor.
    pub motor: Name,
    /// Its node.
    pub node: Name,
    /// Its starter in words.
    pub starter: String,
    /// How it ended.
    pub outcome: StartOutcome,
    /// Seconds until then.
    pub seconds: f64,
    /// Largest line current of one motor at the instant of starting, amperes.
    pub inrush_amps: f64,
    /// The same over full-load current.
    pub inrush_multiple: f64,
    /// Electrical energy taken in by one motor and its starter, kilojoules.
    pub energy_kj: f64,
    /// Largest current mismatch found by the independent check at any instant shown, amperes.
    pub mismatch_a: f64,
    /// Judgements, those that fail first.
    pub judgements: Vec<Judgement>,
    /// Dips at every node, deepest first.
    pub dips: Vec<Dip>,
    /// The run-up.
    pub trace: Vec<StartInstant>,
}

impl StartReport {
    /// True where the motor runs and every judgement holds.
    pub fn passes(&self) -> bool {
        self.outcome == StartOutcome::Runs && self.judgements.iter().all(|j| j.holds)
    }
}

/// Why a start could not be computed.
#[derive(Debug, Clone)]
pub enum CannotStart {
    /// The feeder has no solution before the start.
    Before(Box<Solution>),
    /// No moment of inertia is known.
    NoInertia,
    /// The feeder has no solution at the instant of starting.
    AtOnce,
    /// A number failed the independent check, at this time.
    Unchecked(f64),
}

/// A starter in words.
pub fn starter_words(starter: &Starter) -> String {
    match starter {
        Starter::Direct => "direct on line".to_string(),
        Starter::StarDelta { .. } => "star-delta".to_string(),
        Starter::Autotransformer { tap, .. } => format!("autotransformer {:.0} %", 100.0 * tap),
        Starter::PartWinding { .. } => "part winding".to_string(),
        Starter::Soft { limit_amps, .. } => format!("soft starter, limit {limit_amps:.0} A"),
        Starter::Drive { limit_amps, .. } => format!("drive, limit {limit_amps:.0} A"),
        Starter::Capacitor { var, .. } => format!("direct with {:.0} kvar", var / 1e3),
    }
}

/// Starts the motor of that index on a feeder in which the other motors run as given.
///
/// # Errors
/// Why the start could not be computed.
pub fn start(
    network: &Network,
    motor: usize,
    starter: &Starter,
    input_sha256: &str,
) -> Result<StartReport, CannotStart> {
    let mut before = network.clone();
    before.motors[motor].state = MotorState::Off;
    let (solution, _) = solve_controlled(&mut before, &Settings::default());
    if solution.status != Status::Converged {
        return Err(CannotStart::Before(Box::new(solution)));
    }
    if before.motors[motor].machine.total_inertia_kgm2() <= 0.0 {
        return Err(CannotStart::NoInertia);
    }
    // The one that starts first, then those that run; the feeder itself has none of them.
    let running = (0..before.motors.len()).filter(|&i| before.motors[i].state == MotorState::Running);
    let indices: Vec<usize> = std::iter::once(motor).chain(running).collect();
    let mut feeder = before.clone();
    feeder.motors.iter_mut().for_each(|m| m.state = MotorState::Off);
    let opened = feeder.opened();
    let nodes = indices.iter().map(|&i| before.motors[i].node).collect();
    let machines = Machines::new(&feeder, &opened, nodes).map_err(|_| CannotStart::AtOnce)?;
    let speeds = indices.iter().map(|&i| {
        let m = &before.motors[i];
        if i == motor { 0.0 } else { m.machine.circuit.speed_rad_s(m.slip) }
    });
    let speeds: Vec<f64> = speeds.collect();
    let progress = Progress::new(&before.motors[motor].machine, starter, 0.0);
    let mut run = Run {
        before: &before,
        solution: &solution,
        indices,
        machines,
        progress,
        lowest: Vec::new(),
        at_start: Vec::new(),
        mismatch: 0.0,
    };
    run.go(speeds, starter, input_sha256)
}

struct Run<'a> {
    before: &'a Network,
    solution: &'a Solution,
    indices: Vec<usize>,
    machines: Machines<'a>,
    progress: Progress,
    /// Lowest voltage of every node and slot so far, and that of the first instant, volts.
    lowest: Vec<[f64; 3]>,
    at_start: Vec<[f64; 3]>,
    mismatch: f64,
}

/// The feeder has no solution.
struct Collapsed;

/// What the feeder sees of a machine: of the first, which starts, behind its starter; the others run.
fn shown(progress: &Progress, machine: &Motor, k: usize, time_s: f64, speed: f64, volts: &Phases) -> Seen {
    match k {
        0 => progress.seen(machine, time_s, speed, volts),
        _ => Coupling::Direct.seen(machine, speed, 0.0, volts),
    }
}

impl Run<'_> {
    fn seen(&self, k: usize, time_s: f64, speed: f64, volts: &Phases) -> Seen {
        let machine = &self.before.motors[self.indices[k]].machine;
        shown(&self.progress, machine, k, time_s, speed, volts)
    }

    /// Solves the feeder at these speeds.
    fn solve(&mut self, time_s: f64, speeds: &[f64]) -> Result<(), Collapsed> {
        let (before, progress, indices) = (self.before, &self.progress, &self.indices);
        let seen = |k: usize, volts: &Phases| -> Matrix3<Complex64> {
            let motor = &before.motors[indices[k]];
            let seen = shown(progress, &motor.machine, k, time_s, speeds[k], volts);
            seen.admittance * Complex64::from(f64::from(motor.count))
        };
        if self.machines.solve(&seen) { Ok(()) } else { Err(Collapsed) }
    }

    /// Accelerations of all motors, and the power that the starting one takes in.
    fn rates(&mut self, time_s: f64, state: &[f64], rates: &mut [f64]) -> Result<(), Collapsed> {
        let count = self.indices.len();
        self.solve(time_s, &state[..count])?;
        for k in 0..count {
            let seen = self.seen(k, time_s, state[k], &self.machines.volts(k));
            let machine = &self.before.motors[self.indices[k]].machine;
            rates[k] = net_nm(machine, state[k], seen.torque_nm) / machine.total_inertia_kgm2().max(1e-9);
            if k == 0 {
                rates[count] = seen.input_w;
            }
        }
        Ok(())
    }

    /// Notes voltages of a solved instant, checked.
    fn note(&mut self, time_s: f64, speeds: &[f64]) -> Result<StartInstant, CannotStart> {
        self.solve(time_s, speeds).map_err(|_| CannotStart::Unchecked(time_s))?;
        let (before, progress, indices) = (self.before, &self.progress, &self.indices);
        let drawn = |k: usize, volts: &Phases| -> Phases {
            let motor = &before.motors[indices[k]];
            let seen = shown(progress, &motor.machine, k, time_s, speeds[k], volts);
            seen.amps.map(|i| i * f64::from(motor.count))
        };
        let solution = self.machines.solution(&drawn);
        if solution.status != Status::Converged {
            return Err(CannotStart::Unchecked(time_s));
        }
        self.mismatch = self.mismatch.max(solution.mismatch_amps);
        let now: Vec<[f64; 3]> =
            (0..before.nodes.len()).map(|i| phase_magnitudes(before, &solution.volts[i], i)).collect();
        if self.at_start.is_empty() {
            (self.at_start, self.lowest) = (now.clone(), now.clone());
        }
        for (low, v) in self.lowest.iter_mut().zip(&now) {
            *low = std::array::from_fn(|k| low[k].min(v[k]));
        }
        let motor = &before.motors[indices[0]];
        let volts = self.machines.volts(0);
        let seen = self.seen(0, time_s, speeds[0], &volts);
        let node = before.node(motor.node);
        let lines = [(0, 1), (1, 2), (2, 0)].map(|(i, j)| (volts[i] - volts[j]).norm());
        Ok(StartInstant {
            seconds: time_s,
            rpm: speeds[0] * 30.0 / std::f64::consts::PI,
            torque_nm: seen.torque_nm,
            load_nm: motor.machine.resisting_nm(speeds[0]),
            amps: seen.amps.iter().map(|a| a.norm()).fold(0.0, f64::max),
            pu: lines.into_iter().fold(f64::INFINITY, f64::min) / node.nominal_volts,
        })
    }

    fn go(
        &mut self,
        speeds: Vec<f64>,
        starter: &Starter,
        input_sha256: &str,
    ) -> Result<StartReport, CannotStart> {
        let count = self.indices.len();
        let machine = self.before.motors[self.indices[0]].machine.clone();
        let sync = machine.circuit.sync_rad_s;
        let first = self.note(0.0, &speeds).map_err(|_| CannotStart::AtOnce)?;
        let inrush_amps = first.amps;
        let mut trace = vec![first];
        let scale_s = machine.total_inertia_kgm2() * sync / machine.torque_nm.max(1e-9);
        let mut absolute = vec![1e-6 * sync; count];
        absolute.push(1e-5 * machine.total_inertia_kgm2() * sync * sync);
        let control = StepControl {
            relative: 1e-6,
            absolute,
            longest_s: (0.1 * scale_s).clamp(1e-3, 0.5),
            shortest_s: 1e-9,
        };
        let mut state = speeds;
        state.push(0.0);
        let began = Ode::new(0.0, state, control, &mut |t, y, dy| self.rates(t, y, dy));
        let Ok(mut ode) = began else {
            return Ok(self.report(
                starter,
                input_sha256,
                StartOutcome::Collapses,
                0.0,
                inrush_amps,
                0.0,
                trace,
            ));
        };
        let outcome = loop {
            let (time, speed) = (ode.time_s(), ode.state()[0]);
            let torque = trace.last().map_or(0.0, |i| i.torque_nm);
            match self.progress.condition(&machine, time, speed, torque, SETTLED) {
                Condition::Running => break StartOutcome::Runs,
                Condition::Stalled => break StartOutcome::Stalls,
                _ if time >= LONGEST_S => break StartOutcome::Slow,
                _ => {}
            }
            let until = self.progress.next_corner(time).map_or(LONGEST_S, |t| t.min(LONGEST_S));
            let change = self.progress.change_speed(&machine);
            let stop = move |_: f64, y: &[f64]| y[0] - change.unwrap_or(f64::INFINITY);
            let stops: Vec<Stop<'_>> = if change.is_some() { vec![&stop] } else { Vec::new() };
            let advance = match ode.advance(until, &stops, &mut |t, y, dy| self.rates(t, y, dy)) {
                Ok(advance) => advance,
                Err(OdeFault::Rate(Collapsed)) | Err(OdeFault::StepTooShort(_)) => {
                    break StartOutcome::Collapses;
                }
            };
            let (time, now) = (ode.time_s(), ode.state()[..count].to_vec());
            trace.push(self.note(time, &now)?);
            let went_on = self.progress.go_on(&machine, time, now[0]);
            if went_on {
                trace.push(self.note(time, &now)?);
            }
            let jumps = went_on || advance != Advance::Step || time >= until;
            if jumps && ode.restart(&mut |t, y, dy| self.rates(t, y, dy)).is_err() {
                break StartOutcome::Collapses;
            }
        };
        let energy_kj = ode.state()[count] / 1e3;
        Ok(self.report(starter, input_sha256, outcome, ode.time_s(), inrush_amps, energy_kj, trace))
    }

    #[allow(clippy::too_many_arguments)] // gathered in one place, at the end
    fn report(
        &self,
        starter: &Starter,
        input_sha256: &str,
        outcome: StartOutcome,
        seconds: f64,
        inrush_amps: f64,
        energy_kj: f64,
        trace: Vec<StartInstant>,
    ) -> StartReport {
        let motor = &self.before.motors[self.indices[0]];
        let mut report = StartReport {
            fourwire: env!("CARGO_PKG_VERSION"),
            network: self.before.study.name.clone(),
            input_sha256: input_sha256.to_owned(),
            motor: motor.name.clone(),
            node: self.before.node(motor.node).name.clone(),
            starter: starter_words(starter),
            outcome,
            seconds,
            inrush_amps,
            inrush_multiple: inrush_amps / motor.machine.amps,
            energy_kj,
            mismatch_a: self.mismatch,
            judgements: Vec::new(),
            dips: self.dips(),
            trace,
        };
        report.judgements = self.judgements(&report);
        report
    }

    /// The phase of each node that dips most.
    fn dips(&self) -> Vec<Dip> {
        let mut dips = Vec::new();
        for (i, node) in self.before.nodes.iter().enumerate() {
            let before = phase_magnitudes(self.before, &self.solution.volts[i], i);
            let nominal = node.nominal_phase_volts();
            let of = |c: crate::network::Conductor| {
                let k = c.slot();
                Dip {
                    node: node.name.clone(),
                    conductor: c.letter(),
                    before_pu: before[k] / nominal,
                    start_pu: self.at_start[i][k] / nominal,
                    lowest_pu: self.lowest[i][k] / nominal,
                    dip_percent: 100.0 * (before[k] - self.lowest[i][k]) / nominal,
                }
            };
            let most = node.conductors.phases().iter().map(of);
            dips.extend(most.max_by(|a, b| a.dip_percent.total_cmp(&b.dip_percent)));
        }
        dips.sort_by(|a, b| b.dip_percent.total_cmp(&a.dip_percent));
        dips
    }

    fn judgements(&self, report: &StartReport) -> Vec<Judgement> {
        let motor = &self.before.motors[self.indices[0]];
        let limit = self.before.study.start_dip_limit_percent;
        let loaded: Vec<NodeId> = self
            .before
            .loads
            .iter()
            .flat_map(|l| self.before.load_sites(l).map(|(id, _)| id).collect::<Vec<_>>())
            .chain(self.indices[1..].iter().map(|&i| self.before.motors[i].node))
            .collect();
        let is_other =
            |d: &&Dip| d.node != report.node && loaded.iter().any(|id| self.before.node(*id).name == d.node);
        let mut all = Vec::new();
        let judge = |what, place: String, value: f64, limit: f64, unit, holds| Judgement {
            what,
            place,
            value,
            limit,
            unit,
            holds,
        };
        if let Some(dip) = report.dips.iter().find(|d| d.node == report.node) {
            let holds = dip.dip_percent <= limit;
            all.push(judge(
                "dip at the motor",
                format!("node {}, {}", dip.node, dip.conductor),
                dip.dip_percent,
                limit,
                "%",
                holds,
            ));
        }
        if let Some(dip) = report.dips.iter().find(is_other) {
            let holds = dip.dip_percent <= limit;
            all.push(judge(
                "dip at other loads",
                format!("node {}, {}", dip.node, dip.conductor),
                dip.dip_percent,
                limit,
                "%",
                holds,
            ));
        }
        for &i in &self.indices[1..] {
            let other = &self.before.motors[i];
            let low = self.lowest[other.node.index()].iter().copied().fold(f64::INFINITY, f64::min);
            let percent = 100.0 * low / self.before.node(other.node).nominal_phase_volts();
            let holds = percent >= DROP_OUT_PERCENT;
            all.push(judge(
                "contactor of a running motor",
                format!("motor {}", other.name),
                percent,
                DROP_OUT_PERCENT,
                "% of nominal",
                holds,
            ));
        }
        if let Some(limit_s) = motor.locked_rotor_limit_s {
            // Full voltage heats most; time is counted as if the rotor stood still.
            all.push(judge(
                "start time",
                format!("motor {}", motor.name),
                report.seconds,
                limit_s,
                "s",
                report.seconds <= limit_s,
            ));
        }
        if let Some(unbalance) = unbalance(&self.machines.volts(0)) {
            all.push(judge(
                "voltage unbalance at its end",
                format!("node {}", report.node),
                unbalance.nema_percent,
                5.0,
                "%",
                unbalance.nema_percent <= 5.0,
            ));
        }
        all.sort_by_key(|j| j.holds);
        all
    }
}

/// Magnitudes of the phase voltages of a node, to n where that is carried, volts.
fn phase_magnitudes(network: &Network, volts: &PhaseVector, node: usize) -> [f64; 3] {
    let n = if network.nodes[node].conductors.has_neutral() { volts[3] } else { Complex64::default() };
    std::array::from_fn(|k| (volts[k] - n).norm())
}
