//! Where a motor stands in its start: the stage of its starter, what comes next, whether it runs or has stalled.
//!
//! One [`Progress`] a motor serves any solver of run-ups, of one motor or of many on a network.

use serde::Serialize;

use super::circuit::Phases;
use super::running::Motor;
use super::starter::{ChangeOver, Coupling, Seen, Stage, Starter};

/// Torque left over, part of full-load torque, up to which a motor below breakdown counts as stalled.
const STALLED: f64 = 1e-3;

/// What a motor is doing.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Condition {
    /// Not switched on yet.
    Waiting,
    /// On its way up.
    Accelerating,
    /// The load takes more than there is: on its way down.
    Slowing,
    /// On the last stage, beyond breakdown, with hardly any torque left to accelerate.
    Running,
    /// No torque left to accelerate below breakdown, and nothing to come that would change it.
    Stalled,
}

/// A motor in its start.
#[derive(Debug, Clone, PartialEq)]
pub struct Progress {
    stages: Vec<Stage>,
    stage: usize,
    stage_began_s: f64,
    on_s: f64,
    breakdown_slip: f64,
}

impl Progress {
    /// A motor that is switched on at a time, seconds.
    pub fn new(motor: &Motor, starter: &Starter, on_s: f64) -> Progress {
        Progress {
            stages: starter.stages(motor),
            stage: 0,
            stage_began_s: on_s,
            on_s,
            breakdown_slip: motor.circuit.breakdown(motor.volts).slip,
        }
    }

    /// Index of the present stage.
    pub fn stage(&self) -> usize {
        self.stage
    }

    /// How the motor hangs on the line; off before it is switched on.
    pub fn coupling(&self, time_s: f64) -> Coupling {
        if time_s < self.on_s {
            return Coupling::Off;
        }
        self.stages.get(self.stage).map_or(Coupling::Direct, |s| s.coupling)
    }

    /// What feeder and shaft see at a time, speed and phase voltages.
    pub fn seen(&self, motor: &Motor, time_s: f64, speed_rad_s: f64, volts: &Phases) -> Seen {
        self.coupling(time_s).seen(motor, speed_rad_s, time_s - self.stage_began_s, volts)
    }

    fn until(&self) -> Option<ChangeOver> {
        self.stages.get(self.stage).and_then(|s| s.until)
    }

    /// The next time after `now_s` at which the motor has a corner: switching on, change-over, end of a ramp.
    pub fn next_corner(&self, now_s: f64) -> Option<f64> {
        let change = match self.until() {
            Some(ChangeOver::AfterSeconds(s)) => Some(self.stage_began_s + s),
            _ => None,
        };
        let ramp = self.stages.get(self.stage).and_then(|s| s.coupling.corners());
        let all = [Some(self.on_s), change, ramp.map(|s| self.stage_began_s + s)];
        all.into_iter().flatten().filter(|&t| t > now_s).reduce(f64::min)
    }

    /// Speed that ends the present stage, radians per second.
    pub fn change_speed(&self, motor: &Motor) -> Option<f64> {
        match self.until() {
            Some(ChangeOver::AtSpeed(part)) => Some(part * motor.circuit.sync_rad_s),
            _ => None,
        }
    }

    /// Goes on to the next stage if the present one is over at this time and speed.
    ///
    /// Returns true where it went on; the rates must then be computed anew.
    pub fn go_on(&mut self, motor: &Motor, time_s: f64, speed_rad_s: f64) -> bool {
        let due = time_s >= self.on_s
            && match self.until() {
                Some(ChangeOver::AfterSeconds(s)) => time_s >= self.stage_began_s + s,
                Some(ChangeOver::AtSpeed(part)) => speed_rad_s >= part * motor.circuit.sync_rad_s,
                None => false,
            };
        if due {
            self.stage += 1;
            self.stage_began_s = time_s;
        }
        due
    }

    /// True where the speed has passed breakdown on the way up. A drive follows its own ramp: near rated speed.
    pub fn is_beyond_breakdown(&self, motor: &Motor, time_s: f64, speed_rad_s: f64) -> bool {
        let limit = match self.coupling(time_s) {
            Coupling::Drive { .. } => 1.1 * motor.circuit.slip(motor.rated_rad_s),
            _ => self.breakdown_slip,
        };
        motor.circuit.slip(speed_rad_s) < limit
    }

    /// What the motor is doing, from its air-gap torque at this instant; `settled` is the part of full-load torque
    /// that the torque left over of a running motor must not exceed.
    pub fn condition(
        &self,
        motor: &Motor,
        time_s: f64,
        speed_rad_s: f64,
        torque_nm: f64,
        settled: f64,
    ) -> Condition {
        if time_s < self.on_s {
            return Condition::Waiting;
        }
        let timed = matches!(self.until(), Some(ChangeOver::AfterSeconds(_)));
        if timed || self.coupling(time_s).is_ramping(time_s - self.stage_began_s) {
            return Condition::Accelerating;
        }
        let net = net_nm(motor, speed_rad_s, torque_nm) / motor.torque_nm;
        let beyond = self.is_beyond_breakdown(motor, time_s, speed_rad_s);
        let last = self.until().is_none();
        if last && beyond && net.abs() <= settled {
            Condition::Running
        } else if net.abs() <= STALLED && !(last && beyond) {
            Condition::Stalled
        } else if net > 0.0 {
            Condition::Accelerating
        } else {
            Condition::Slowing
        }
    }
}

/// Torque left to accelerate, newton metres; a motor at standstill is not driven backwards by its load.
pub fn net_nm(motor: &Motor, speed_rad_s: f64, torque_nm: f64) -> f64 {
    let net = torque_nm - motor.resisting_nm(speed_rad_s);
    if speed_rad_s <= 0.0 { net.max(0.0) } else { net }
}
