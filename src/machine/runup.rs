//! Run-up of one motor in time, on terminal voltages that answer to what it draws.

use serde::Serialize;

use super::circuit::Phases;
use super::ode::{Advance, Ode, OdeFault, Stop, StepControl};
use super::running::Motor;
use super::starter::{ChangeOver, Coupling, Seen, Stage, Starter};

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
        let out = self.stator + self.rotor + self.core + self.starter + self.mechanical + self.load + self.kinetic;
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
    if !(motor.total_inertia_kgm2() > 0.0) {
        faults.push("rotor and load need a moment of inertia above 0".to_string());
    }
    if !(settings.most_s > 0.0 && settings.relative > 0.0 && settings.from_rad_s >= 0.0) {
        faults.push("time and tolerance must be above 0, the first speed 0 or more".to_string());
    }
    if !faults.is_empty() {
        return Err(RunUpFault::Settings(faults));
    }
    let stages = starter.stages(motor);
    let mut climb = Climb { motor, stages: &stages, stage: 0, stage_began_s: 0.0, settings, terminals };
    climb.run()
}

struct Climb<'a, T: Terminals> {
    motor: &'a Motor,
    stages: &'a [Stage],
    stage: usize,
    stage_began_s: f64,
    settings: &'a RunUpSettings,
    terminals: &'a mut T,
}

/// Net torque of an instant; a motor at standstill is not driven backwards.
fn net_nm(instant: &Instant) -> f64 {
    let net = instant.seen.torque_nm - instant.resisting_nm;
    if instant.speed_rad_s <= 0.0 { net.max(0.0) } else { net }
}

impl<T: Terminals> Climb<'_, T> {
    fn run(&mut self) -> Result<RunUp, RunUpFault<T::Fault>> {
        let mut state = vec![0.0; SIZE];
        state[0] = self.settings.from_rad_s;
        let first = self.instant(0.0, state[0]).map_err(RunUpFault::Terminals)?;
        let mut ode = Ode::new(0.0, state, self.control(), &mut |t, y, dy| self.rate(t, y, dy)).map_err(fault)?;
        let mut trace = vec![first];
        let mut changes = Vec::new();
        let outcome = loop {
            if let Some(outcome) = trace.last().and_then(|now| self.ended(now)) {
                break outcome;
            }
            let until = self.next_corner(ode.time_s());
            let corners = self.motor.load.corners();
            let speeds: Vec<f64> = self.stop_speeds().into_iter().chain(corners).collect();
            let stops: Vec<_> = speeds.iter().map(|&s| move |_: f64, y: &[f64]| y[0] - s).collect();
            // Coming to rest is a corner too: below zero the load would drive.
            let rest = |_: f64, y: &[f64]| -y[0];
            let mut all: Vec<Stop<'_>> = vec![&rest];
            all.extend(stops.iter().map(|s| s as Stop<'_>));
            let advance = ode.advance(until, &all, &mut |t, y, dy| self.rate(t, y, dy)).map_err(fault)?;
            if let Advance::Stopped(0) = advance {
                ode.state_mut()[0] = 0.0;
            }
            let (time, speed) = (ode.time_s(), ode.state()[0]);
            trace.push(self.instant(time, speed).map_err(RunUpFault::Terminals)?);
            if self.change_due(time, speed) {
                self.stage += 1;
                self.stage_began_s = time;
                changes.push((time, self.stage));
                trace.push(self.instant(time, speed).map_err(RunUpFault::Terminals)?);
            }
            if advance != Advance::Step || time >= until {
                ode.restart(&mut |t, y, dy| self.rate(t, y, dy)).map_err(fault)?;
            }
        };
        Ok(self.result(outcome, &ode, trace, changes))
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

    fn coupling(&self) -> Coupling {
        self.stages.get(self.stage).map_or(Coupling::Direct, |s| s.coupling)
    }

    fn until(&self) -> Option<ChangeOver> {
        self.stages.get(self.stage).and_then(|s| s.until)
    }

    fn instant(&mut self, time_s: f64, speed_rad_s: f64) -> Result<Instant, T::Fault> {
        let (motor, coupling, stage_s) = (self.motor, self.coupling(), time_s - self.stage_began_s);
        let draws = |volts: &Phases| coupling.seen(motor, speed_rad_s, stage_s, volts);
        let volts = self.terminals.volts(time_s, &draws)?;
        let seen = draws(&volts);
        let resisting_nm = motor.resisting_nm(speed_rad_s);
        Ok(Instant { time_s, speed_rad_s, stage: self.stage, volts, seen, resisting_nm })
    }

    fn rate(&mut self, time_s: f64, state: &[f64], rates: &mut [f64]) -> Result<(), T::Fault> {
        let speed = state.first().copied().unwrap_or(0.0);
        let now = self.instant(time_s, speed)?;
        let seen = &now.seen;
        let all = [
            net_nm(&now) / self.motor.total_inertia_kgm2(),
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
        let change = match self.until() {
            Some(ChangeOver::AfterSeconds(s)) => Some(self.stage_began_s + s),
            _ => None,
        };
        let ramp = self.coupling().corners().map(|s| self.stage_began_s + s);
        let given = self.settings.corners_s.iter().copied();
        let later = given.chain(change).chain(ramp).filter(|&t| t > now_s);
        later.fold(self.settings.most_s, f64::min)
    }

    fn stop_speeds(&self) -> Vec<f64> {
        let change = match self.until() {
            Some(ChangeOver::AtSpeed(part)) => Some(part * self.motor.circuit.sync_rad_s),
            _ => None,
        };
        let finish = match self.settings.finish {
            Finish::AtSpeed(speed) => Some(speed),
            Finish::Settled(_) => None,
        };
        change.into_iter().chain(finish).collect()
    }

    fn change_due(&self, time_s: f64, speed_rad_s: f64) -> bool {
        match self.until() {
            Some(ChangeOver::AfterSeconds(s)) => time_s >= self.stage_began_s + s,
            Some(ChangeOver::AtSpeed(part)) => speed_rad_s >= part * self.motor.circuit.sync_rad_s,
            None => false,
        }
    }

    /// True where a change is to come without the speed rising further.
    fn change_to_come(&self, time_s: f64) -> bool {
        matches!(self.until(), Some(ChangeOver::AfterSeconds(_)))
            || self.coupling().is_ramping(time_s - self.stage_began_s)
            || self.settings.corners_s.iter().any(|&t| t > time_s)
    }

    fn ended(&self, now: &Instant) -> Option<Outcome> {
        if let Finish::AtSpeed(speed) = self.settings.finish
            && now.speed_rad_s >= speed
        {
            return Some(Outcome::Running);
        }
        if now.time_s >= self.settings.most_s {
            return Some(Outcome::TooSlow);
        }
        if self.change_to_come(now.time_s) {
            return None;
        }
        let net = net_nm(now) / self.motor.torque_nm;
        let beyond = self.motor.circuit.slip(now.speed_rad_s) < self.breakdown_slip();
        match self.settings.finish {
            Finish::Settled(part) if self.until().is_none() && beyond && net <= part => Some(Outcome::Running),
            _ if net <= STALLED => Some(Outcome::Stalled),
            _ => None,
        }
    }

    /// Slip below which torque falls with rising speed. A drive follows its own ramp: any speed near rated.
    fn breakdown_slip(&self) -> f64 {
        match self.coupling() {
            Coupling::Drive { .. } => 1.1 * self.motor.circuit.slip(self.motor.rated_rad_s),
            _ => self.motor.circuit.breakdown(self.motor.volts).slip,
        }
    }

    fn result(&self, outcome: Outcome, ode: &Ode, trace: Vec<Instant>, changes: Vec<(f64, usize)>) -> RunUp {
        let speed = ode.state().first().copied().unwrap_or(0.0);
        let joules = |i: usize| ode.state().get(i).copied().unwrap_or(0.0);
        let gained = speed * speed - self.settings.from_rad_s * self.settings.from_rad_s;
        let amps = trace.iter().flat_map(|i| i.seen.amps).map(|a| a.norm()).fold(0.0, f64::max);
        let breakdown = self.motor.circuit.breakdown(self.motor.volts).slip;
        let climbing = trace.iter().filter(|i| {
            let off = self.stages.get(i.stage).is_some_and(|s| s.coupling == Coupling::Off);
            !off && self.motor.circuit.slip(i.speed_rad_s) >= breakdown
        });
        let least = climbing
            .map(|i| ((i.seen.torque_nm - i.resisting_nm) / self.motor.torque_nm, i.speed_rad_s))
            .min_by(|a, b| a.0.total_cmp(&b.0));
        RunUp {
            outcome,
            seconds: ode.time_s(),
            speed_rad_s: speed,
            changes,
            greatest_amps: amps,
            least_margin: least,
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

/// Accelerating torque, part of full-load torque, at which a motor below breakdown counts as stalled.
const STALLED: f64 = 1e-3;

fn fault<E>(fault: OdeFault<E>) -> RunUpFault<E> {
    match fault {
        OdeFault::Rate(e) => RunUpFault::Terminals(e),
        OdeFault::StepTooShort(t) => RunUpFault::StepTooShort(t),
    }
}
