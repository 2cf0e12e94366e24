//! Run-up of one motor in time, on terminal voltages that answer to what it draws.

use serde::Serialize;

use super::circuit::Phases;
use super::ode::{Advance, Ode, OdeFault, StepControl, Stop};
use super::progress::{Condition, Progress, net_nm};
use super::running::Motor;
use super::starter::{Seen, Starter};

/// When a run-up counts as done.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Finish {
    /// On the last stage, beyond breakdown, with the accelerating torque down to this part of full-load torque.
    Settled(f64),
    /// At this speed, radians per second.
    AtSpeed(f64),
}

/// How a run-up is computed.
#[derive(Debug, Clone, PartialEq)]
pub struct RunUpSettings {
    /// Speed at the beginning, radians per second.
    pub from_rad_s: f64,
    /// When it counts as done.
    pub finish: Finish,
    /// Longest time looked at, seconds.
    pub most_s: f64,
    /// Error of a step, part of the value.
    pub relative: f64,
    /// Times at which the terminal voltages jump or have a corner, rising, seconds.
    pub corners_s: Vec<f64>,
}

impl Default for RunUpSettings {
    /// From standstill until the accelerating torque is down to 1 %, at most 120 s, error 1e-7.
    fn default() -> Self {
        RunUpSettings {
            from_rad_s: 0.0,
            finish: Finish::Settled(0.01),
            most_s: 120.0,
            relative: 1e-7,
            corners_s: Vec::new(),
        }
    }
}

/// How a run-up ended.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Outcome {
    /// Up to speed.
    Running,
    /// No torque left to accelerate, and nothing to come that would change it.
    Stalled,
    /// Still accelerating when the time was over.
    TooSlow,
}

/// One instant of a run-up.
#[derive(Debug, Clone, PartialEq)]
pub struct Instant {
    /// Time, seconds.
    pub time_s: f64,
    /// Speed, radians per second.
    pub speed_rad_s: f64,
    /// Index of the stage of the starter.
    pub stage: usize,
    /// Phase voltages at the line terminals, volts.
    pub volts: Phases,
    /// What feeder and shaft see.
    pub seen: Seen,
    /// Torque that load, friction and windage take, newton metres.
    pub resisting_nm: f64,
}

/// Energies of a run-up, joules.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct Energies {
    /// In from the line.
    pub input: f64,
    /// Lost in the stator winding.
    pub stator: f64,
    /// Lost in the rotor.
    pub rotor: f64,
    /// Lost in the core.
    pub core: f64,
    /// Lost in the starter.
    pub starter: f64,
    /// Lost by friction and windage.
    pub mechanical: f64,
    /// Work done on the load.
    pub load: f64,
    /// Gained as motion of rotor and load.
    pub kinetic: f64,
}

impl Energies {
    /// What does not add up: in, less losses, work and motion; a part of what came in.
    pub fn imbalance(&self) -> f64 {
        let out =
            self.stator + self.rotor + self.core + self.starter + self.mechanical + self.load + self.kinetic;
        (self.input - out) / self.input.abs().max(f64::MIN_POSITIVE)
    }
}

/// A run-up.
#[derive(Debug, Clone, PartialEq)]
pub struct RunUp {
    /// How it ended.
    pub outcome: Outcome,
    /// Time at the end, seconds: up to speed, or when the stall was recognised.
    pub seconds: f64,
    /// Speed at the end, radians per second.
    pub speed_rad_s: f64,
    /// Every step, and both sides of every change-over.
    pub trace: Vec<Instant>,
    /// Time and new stage of every change-over.
    pub changes: Vec<(f64, usize)>,
    /// Greatest line current, amperes.
    pub greatest_amps: f64,
    /// Least accelerating torque before breakdown, part of full-load torque, with its speed in radians per
    /// second; not counted while the starter pauses.
    pub least_margin: Option<(f64, f64)>,
    /// Energies.
    pub energies: Energies,
    /// Times the terminal voltages were asked for.
    pub evaluations: u64,
}

/// Why a run-up could not be computed.
#[derive(Debug, Clone, PartialEq)]
pub enum RunUpFault<E> {
    /// The terminal voltages could not be computed.
    Terminals(E),
    /// The step became too short at this time.
    StepTooShort(f64),
    /// Settings that make no sense: one sentence each.
    Settings(Vec<String>),
}

/// Speed, then the energies in the order of [`Energies`] without the last.
const SIZE: usize = 8;

/// Terminal voltages at a time, as an answer to what the motor draws at given voltages.
pub trait Terminals {
    /// What can go wrong.
    type Fault;
    /// Phase voltages to any common point, volts. `draws` gives what the motor draws at trial voltages.
    ///
    /// # Errors
    /// The voltages cannot be computed.
    fn volts(&mut self, time_s: f64, draws: &dyn Fn(&Phases) -> Seen) -> Result<Phases, Self::Fault>;
}

/// A supply that does not give way.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StiffBus(pub Phases);

impl Terminals for StiffBus {
    type Fault = std::convert::Infallible;
    fn volts(&mut self, _: f64, _: &dyn Fn(&Phases) -> Seen) -> Result<Phases, Self::Fault> {
        Ok(self.0)
    }
}

/// Runs a motor up to speed.
///
/// # Errors
/// Terminal voltages that cannot be computed, a step that became too short, settings that make no sense.
pub fn run_up<T: Terminals>(
    motor: &Motor,
    starter: &Starter,
    terminals: &mut T,
    settings: &RunUpSettings,
) -> Result<RunUp, RunUpFault<T::Fault>> {
    let mut faults = [starter.faults(), motor.circuit.faults(), motor.load.faults()].concat();
    let turns = motor.total_inertia_kgm2() > 0.0;
    if !turns {
        faults.push("rotor and load need a moment of inertia above 0".to_string());
    }
    let sensible = settings.most_s > 0.0 && settings.relative > 0.0 && settings.from_rad_s >= 0.0;
    if !sensible {
        faults.push("time and tolerance must be above 0, the first speed 0 or more".to_string());
    }
    if !faults.is_empty() {
        return Err(RunUpFault::Settings(faults));
    }
    let progress = Progress::new(motor, starter, 0.0);
    Climb { motor, progress, settings, terminals }.run()
}

struct Climb<'a, T: Terminals> {
    motor: &'a Motor,
    progress: Progress,
    settings: &'a RunUpSettings,
    terminals: &'a mut T,
}

impl<T: Terminals> Climb<'_, T> {
    fn run(&mut self) -> Result<RunUp, RunUpFault<T::Fault>> {
        let mut state = vec![0.0; SIZE];
        state[0] = self.settings.from_rad_s;
        let first = self.instant(0.0, state[0]).map_err(RunUpFault::Terminals)?;
        let mut ode =
            Ode::new(0.0, state, self.control(), &mut |t, y, dy| self.rate(t, y, dy)).map_err(fault)?;
        let mut trace = vec![first];
        let mut changes = Vec::new();
        let outcome = loop {
            if let Some(outcome) = trace.last().and_then(|now| self.ended(now)) {
                break outcome;
            }
            if ode.evaluations() > MOST_EVALUATIONS {
                return Err(RunUpFault::StepTooShort(ode.time_s()));
            }
            let until = self.next_corner(ode.time_s());
            let advance = self.advance(&mut ode, until)?;
            let (time, speed) = (ode.time_s(), ode.state()[0]);
            trace.push(self.instant(time, speed).map_err(RunUpFault::Terminals)?);
            if self.progress.go_on(self.motor, time, speed) {
                changes.push((time, self.progress.stage()));
                trace.push(self.instant(time, speed).map_err(RunUpFault::Terminals)?);
            }
            if advance != Advance::Step || time >= until {
                ode.restart(&mut |t, y, dy| self.rate(t, y, dy)).map_err(fault)?;
            }
        };
        Ok(self.result(outcome, &ode, trace, changes))
    }

    /// One step, ended at rest and at every speed where something changes.
    fn advance(&mut self, ode: &mut Ode, until: f64) -> Result<Advance, RunUpFault<T::Fault>> {
        let finish = match self.settings.finish {
            Finish::AtSpeed(speed) => Some(speed),
            Finish::Settled(_) => None,
        };
        let change = self.progress.change_speed(self.motor);
        let speeds = change.into_iter().chain(finish).chain(self.motor.load.corners());
        let stops: Vec<_> = speeds.map(|s| move |_: f64, y: &[f64]| y[0] - s).collect();
        // Coming to rest is a corner too: below zero the load would drive.
        let rest = |_: f64, y: &[f64]| -y[0];
        let mut all: Vec<Stop<'_>> = vec![&rest];
        all.extend(stops.iter().map(|s| s as Stop<'_>));
        let advance = ode.advance(until, &all, &mut |t, y, dy| self.rate(t, y, dy)).map_err(fault)?;
        if advance == Advance::Stopped(0) {
            ode.state_mut()[0] = 0.0;
        }
        Ok(advance)
    }

    fn control(&self) -> StepControl {
        let sync = self.motor.circuit.sync_rad_s;
        let inertia = self.motor.total_inertia_kgm2();
        // Time to speed with full-load torque: the scale of everything here.
        let scale_s = inertia * sync / self.motor.torque_nm.max(f64::MIN_POSITIVE);
        let joules = inertia * sync * sync * self.settings.relative;
        let mut absolute = vec![joules; SIZE];
        absolute[0] = sync * self.settings.relative;
        StepControl {
            relative: self.settings.relative,
            absolute,
            longest_s: (0.1 * scale_s).clamp(1e-3, 1.0),
            shortest_s: 1e-9 * (1.0 + scale_s),
        }
    }

    fn instant(&mut self, time_s: f64, speed_rad_s: f64) -> Result<Instant, T::Fault> {
        let (motor, progress) = (self.motor, &self.progress);
        let draws = |volts: &Phases| progress.seen(motor, time_s, speed_rad_s, volts);
        let volts = self.terminals.volts(time_s, &draws)?;
        let seen = draws(&volts);
        let resisting_nm = motor.resisting_nm(speed_rad_s);
        Ok(Instant { time_s, speed_rad_s, stage: progress.stage(), volts, seen, resisting_nm })
    }

    fn rate(&mut self, time_s: f64, state: &[f64], rates: &mut [f64]) -> Result<(), T::Fault> {
        let speed = state.first().copied().unwrap_or(0.0);
        let seen = self.instant(time_s, speed)?.seen;
        let all = [
            net_nm(self.motor, speed, seen.torque_nm) / self.motor.total_inertia_kgm2(),
            seen.input_w,
            seen.stator_w,
            seen.rotor_w,
            seen.core_w,
            seen.starter_w,
            self.motor.circuit.mechanical.torque_nm(speed) * speed,
            self.motor.load.torque_nm(speed) * speed,
        ];
        rates.iter_mut().zip(all).for_each(|(r, v)| *r = v);
        Ok(())
    }

    /// The next time at which something has a corner, or the end.
    fn next_corner(&self, now_s: f64) -> f64 {
        let given = self.settings.corners_s.iter().copied().filter(|&t| t > now_s);
        given.chain(self.progress.next_corner(now_s)).fold(self.settings.most_s, f64::min)
    }

    fn ended(&self, now: &Instant) -> Option<Outcome> {
        let settled = match self.settings.finish {
            Finish::AtSpeed(speed) if now.speed_rad_s >= speed => return Some(Outcome::Running),
            Finish::AtSpeed(_) => None,
            Finish::Settled(part) => Some(part),
        };
        if now.time_s >= self.settings.most_s {
            return Some(Outcome::TooSlow);
        }
        if self.settings.corners_s.iter().any(|&t| t > now.time_s) {
            return None;
        }
        let torque = now.seen.torque_nm;
        // With a speed to reach, settling below it is a stall.
        let part = settled.unwrap_or(SETTLED_BELOW);
        match self.progress.condition(self.motor, now.time_s, now.speed_rad_s, torque, part) {
            Condition::Running if settled.is_some() => Some(Outcome::Running),
            Condition::Running | Condition::Stalled => Some(Outcome::Stalled),
            Condition::Waiting | Condition::Accelerating | Condition::Slowing => None,
        }
    }

    fn result(&self, outcome: Outcome, ode: &Ode, trace: Vec<Instant>, changes: Vec<(f64, usize)>) -> RunUp {
        let speed = ode.state().first().copied().unwrap_or(0.0);
        let joules = |i: usize| ode.state().get(i).copied().unwrap_or(0.0);
        let gained = speed * speed - self.settings.from_rad_s * self.settings.from_rad_s;
        let amps = trace.iter().flat_map(|i| i.seen.amps).map(|a| a.norm()).fold(0.0, f64::max);
        RunUp {
            outcome,
            seconds: ode.time_s(),
            speed_rad_s: speed,
            changes,
            greatest_amps: amps,
            least_margin: least_margin(self.motor, &trace),
            energies: Energies {
                input: joules(1),
                stator: joules(2),
                rotor: joules(3),
                core: joules(4),
                starter: joules(5),
                mechanical: joules(6),
                load: joules(7),
                kinetic: 0.5 * self.motor.total_inertia_kgm2() * gained,
            },
            evaluations: ode.evaluations(),
            trace,
        }
    }
}

/// Torque left over, part of full-load torque, at which a motor has settled below the speed that was to be reached.
const SETTLED_BELOW: f64 = 1e-4;

/// Rates asked for in one run-up before it is given up; a usual one takes hundreds.
const MOST_EVALUATIONS: u64 = 1_000_000;

/// Least accelerating torque before breakdown, part of full-load torque, and its speed; pauses left out.
fn least_margin(motor: &Motor, trace: &[Instant]) -> Option<(f64, f64)> {
    let breakdown = motor.circuit.breakdown(motor.volts).slip;
    let climbing = |i: &&Instant| i.seen.torque_nm > 0.0 && motor.circuit.slip(i.speed_rad_s) >= breakdown;
    let margin = |i: &Instant| ((i.seen.torque_nm - i.resisting_nm) / motor.torque_nm, i.speed_rad_s);
    trace.iter().filter(climbing).map(margin).min_by(|a, b| a.0.total_cmp(&b.0))
}

fn fault<E>(fault: OdeFault<E>) -> RunUpFault<E> {
    match fault {
        OdeFault::Rate(e) => RunUpFault::Terminals(e),
        OdeFault::StepTooShort(t) => RunUpFault::StepTooShort(t),
    }
}
