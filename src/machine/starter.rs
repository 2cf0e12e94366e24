//! Starters: what the feeder sees of a motor behind one, and what is left for the motor.
//!
//! A start is a row of [`Stage`]s; each couples the motor to the line in one way and ends after a time or at a
//! speed. Line current and torque of the stages follow from the motor's circuit: in star a third of both, on a
//! tap `a` its square of both (ideal transformer, no magnetising current), as NEMA and EASA tables say.

use serde::Serialize;

use super::circuit::{Matrix3, Operation, Phases, phases, sequence_matrix};
use super::full_load::balanced;
use super::running::Motor;
use crate::math::{Complex64, ZERO, sequence_components};

/// When a stage ends.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum ChangeOver {
    /// So many seconds after the stage began.
    AfterSeconds(f64),
    /// When speed reaches this part of synchronous speed.
    AtSpeed(f64),
}

/// How a motor is started.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Starter {
    /// Straight on the line.
    Direct,
    /// Windings in star first, in delta afterwards, without current for `pause_s` in between.
    StarDelta {
        /// When star ends.
        change: ChangeOver,
        /// Seconds without current while the contactors change over.
        pause_s: f64,
    },
    /// On the tap of a transformer first, closed change-over to the line.
    Autotransformer {
        /// Part of line voltage at the motor: 0.5, 0.65, 0.8.
        tap: f64,
        /// When the tap is left.
        change: ChangeOver,
    },
    /// On half of the winding first.
    PartWinding {
        /// When the second half joins.
        change: ChangeOver,
    },
    /// Voltage raised by thyristors, held to a current limit.
    Soft {
        /// Most line current, amperes.
        limit_amps: f64,
        /// Part of line voltage at the beginning.
        initial: f64,
        /// Seconds until full voltage, unless the limit holds it back.
        ramp_s: f64,
    },
    /// Frequency and voltage raised together by a drive with a rectifier.
    Drive {
        /// Most motor current, amperes.
        limit_amps: f64,
        /// Seconds from standstill to rated speed, unless the limit holds it back.
        ramp_s: f64,
        /// Efficiency of the drive, a fraction.
        efficiency: f64,
        /// Power factor at the line, a fraction.
        pf: f64,
    },
    /// Straight on the line, with capacitors beside the motor during the start.
    Capacitor {
        /// Reactive power of the bank at the motor's rated voltage, vars.
        var: f64,
        /// When the bank is switched off.
        change: ChangeOver,
    },
}

/// How the motor hangs on the line during a stage.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Coupling {
    /// No current.
    Off,
    /// Straight on the line.
    Direct,
    /// Delta windings in star.
    Star,
    /// On a tap, part of line voltage.
    Tap(f64),
    /// On half of the winding.
    HalfWinding,
    /// Behind thyristors, as in [`Starter::Soft`].
    Soft {
        /// Most line current, amperes.
        limit_amps: f64,
        /// Part of line voltage at the beginning of the stage.
        initial: f64,
        /// Seconds to full voltage.
        ramp_s: f64,
    },
    /// Behind a drive that accelerates, as in [`Starter::Drive`]; seconds of the ramp 0 to hold the speed.
    Drive {
        /// Most motor current, amperes.
        limit_amps: f64,
        /// Seconds from standstill to rated speed; 0 holds the speed.
        ramp_s: f64,
        /// Efficiency of the drive.
        efficiency: f64,
        /// Power factor at the line.
        pf: f64,
    },
    /// Straight on the line beside capacitors of this susceptance a phase of a star, siemens.
    Capacitor(f64),
}

/// One stage of a start.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Stage {
    /// How the motor hangs on the line.
    pub coupling: Coupling,
    /// When the stage ends; the last one does not.
    pub until: Option<ChangeOver>,
}

/// Line current and torque on half the winding, parts of those on the whole (EASA handbook, starting
/// characteristics of cage motors, part winding half-half, 2 to 12 poles).
const HALF_WINDING: (f64, f64) = (0.70, 0.50);

/// What feeder and shaft see at one instant.
#[derive(Debug, Clone, PartialEq)]
pub struct Seen {
    /// Admittance of the three phases at the present voltages, siemens: `I = Y V`.
    pub admittance: Matrix3,
    /// Line currents, amperes.
    pub amps: Phases,
    /// Torque of the air gap, newton metres.
    pub torque_nm: f64,
    /// Power in from the line, watts.
    pub input_w: f64,
    /// Loss in the stator winding, watts.
    pub stator_w: f64,
    /// Loss in the rotor, watts.
    pub rotor_w: f64,
    /// Loss in the core, watts.
    pub core_w: f64,
    /// Loss in the starter, watts.
    pub starter_w: f64,
}

impl Starter {
    /// The stages in order; the last one stays.
    pub fn stages(&self, motor: &Motor) -> Vec<Stage> {
        let last = |coupling| Stage { coupling, until: None };
        let first = |coupling, change| Stage { coupling, until: Some(change) };
        match *self {
            Starter::Direct => vec![last(Coupling::Direct)],
            Starter::StarDelta { change, pause_s } => {
                let mut stages = vec![first(Coupling::Star, change)];
                if pause_s > 0.0 {
                    stages.push(first(Coupling::Off, ChangeOver::AfterSeconds(pause_s)));
                }
                stages.push(last(Coupling::Direct));
                stages
            }
            Starter::Autotransformer { tap, change } => {
                vec![first(Coupling::Tap(tap), change), last(Coupling::Direct)]
            }
            Starter::PartWinding { change } => {
                vec![first(Coupling::HalfWinding, change), last(Coupling::Direct)]
            }
            Starter::Soft { limit_amps, initial, ramp_s } => {
                vec![last(Coupling::Soft { limit_amps, initial, ramp_s })]
            }
            Starter::Drive { limit_amps, ramp_s, efficiency, pf } => {
                let at = |ramp_s| Coupling::Drive { limit_amps, ramp_s, efficiency, pf };
                let full = ChangeOver::AtSpeed(motor.rated_rad_s / motor.circuit.sync_rad_s);
                vec![first(at(ramp_s), full), last(at(0.0))]
            }
            Starter::Capacitor { var, change } => {
                vec![
                    first(Coupling::Capacitor(var / (motor.volts * motor.volts)), change),
                    last(Coupling::Direct),
                ]
            }
        }
    }

    /// What is wrong with the settings: one sentence for each fault; empty where all is well.
    pub fn faults(&self) -> Vec<String> {
        let mut faults = Vec::new();
        let mut wants = |fine: bool, sentence: &str| {
            if !fine {
                faults.push(sentence.to_string());
            }
        };
        let part = |v: f64| v > 0.0 && v <= 1.0;
        let change = match *self {
            Starter::StarDelta { change, pause_s } => {
                wants((0.0..=10.0).contains(&pause_s), "the pause must be 0 to 10 seconds");
                Some(change)
            }
            Starter::Autotransformer { tap, change } => {
                wants(part(tap), "the tap must be above 0 and up to 100 percent of line voltage");
                Some(change)
            }
            Starter::PartWinding { change } => Some(change),
            Starter::Capacitor { var, change } => {
                wants(var >= 0.0 && var.is_finite(), "reactive power of the capacitors must be 0 or more");
                Some(change)
            }
            Starter::Soft { limit_amps, initial, ramp_s } => {
                wants(limit_amps > 0.0, "the current limit must be above 0");
                wants((0.0..=1.0).contains(&initial), "initial voltage must be 0 to 100 percent");
                wants(ramp_s >= 0.0 && ramp_s.is_finite(), "the ramp must be 0 seconds or more");
                None
            }
            Starter::Drive { limit_amps, ramp_s, efficiency, pf } => {
                wants(limit_amps > 0.0, "the current limit must be above 0");
                wants(ramp_s > 0.0 && ramp_s.is_finite(), "the ramp must be above 0 seconds");
                wants(
                    part(efficiency) && part(pf),
                    "efficiency and power factor must be above 0 and up to 1",
                );
                None
            }
            Starter::Direct => None,
        };
        match change {
            Some(ChangeOver::AfterSeconds(s)) => {
                wants(s > 0.0 && s.is_finite(), "the change-over time must be above 0")
            }
            Some(ChangeOver::AtSpeed(p)) => {
                wants(p > 0.0 && p < 1.0, "the change-over speed must be below synchronous speed")
            }
            None => {}
        }
        faults
    }
}

impl Coupling {
    /// True until the coupling no longer changes with time, seconds into the stage.
    pub fn is_ramping(&self, stage_s: f64) -> bool {
        matches!(*self, Coupling::Soft { ramp_s, .. } if stage_s < ramp_s)
    }

    /// Times at which the coupling has a corner, seconds into the stage.
    pub fn corners(&self) -> Option<f64> {
        match *self {
            Coupling::Soft { ramp_s, .. } if ramp_s > 0.0 => Some(ramp_s),
            _ => None,
        }
    }

    /// What feeder and shaft see at a speed, `stage_s` seconds into the stage, under phase voltages at the line
    /// terminals of the starter to any common point.
    pub fn seen(&self, motor: &Motor, speed_rad_s: f64, stage_s: f64, volts: &Phases) -> Seen {
        let slip = motor.circuit.slip(speed_rad_s);
        let direct = motor.circuit.operation(slip, volts);
        match *self {
            Coupling::Off => scaled(motor, slip, &direct, 0.0),
            Coupling::Direct => scaled(motor, slip, &direct, 1.0),
            Coupling::Star => scaled(motor, slip, &direct, 1.0 / 3.0),
            Coupling::Tap(tap) => scaled(motor, slip, &direct, tap * tap),
            Coupling::HalfWinding => half_winding(motor, slip, &direct),
            Coupling::Soft { limit_amps, initial, ramp_s } => {
                let most = direct.amps.iter().map(|a| a.norm()).fold(0.0, f64::max);
                let part = if stage_s < ramp_s { initial + (1.0 - initial) * stage_s / ramp_s } else { 1.0 };
                let part = if part * most > limit_amps { limit_amps / most } else { part };
                soft(motor, slip, &direct, volts, part)
            }
            Coupling::Drive { limit_amps, ramp_s, efficiency, pf } => {
                drive(motor, speed_rad_s, volts, DriveLimits { limit_amps, ramp_s, efficiency, pf })
            }
            Coupling::Capacitor(siemens) => {
                let bank = sequence_matrix(Complex64::new(0.0, siemens), Complex64::new(0.0, siemens));
                let mut seen = scaled(motor, slip, &direct, 1.0);
                let drawn = bank * nalgebra::Vector3::from(*volts);
                seen.admittance += bank;
                seen.amps = [0, 1, 2].map(|i| seen.amps[i] + drawn[i]);
                seen
            }
        }
    }
}

/// Currents, torque and losses all in the same proportion to those on the line.
fn scaled(motor: &Motor, slip: f64, direct: &Operation, part: f64) -> Seen {
    let sum =
        |of: fn(&super::circuit::SequencePart) -> f64| part * (of(&direct.positive) + of(&direct.negative));
    Seen {
        admittance: motor.circuit.phase_matrix(slip) * Complex64::from(part),
        amps: direct.amps.map(|a| a * part),
        torque_nm: part * direct.torque_nm,
        input_w: part * direct.input_w,
        stator_w: sum(|p| p.stator_w),
        rotor_w: sum(|p| p.rotor_w),
        core_w: sum(|p| p.core_w),
        starter_w: 0.0,
    }
}

/// Less torque than current: what is missing is lost in the half that carries the current.
fn half_winding(motor: &Motor, slip: f64, direct: &Operation) -> Seen {
    let (current, torque) = HALF_WINDING;
    let inside = scaled(motor, slip, direct, torque);
    let outside = scaled(motor, slip, direct, current);
    let stator_w = inside.stator_w + outside.input_w - inside.input_w;
    Seen { torque_nm: inside.torque_nm, rotor_w: inside.rotor_w, core_w: inside.core_w, stator_w, ..outside }
}

/// Motor on a part of the voltage: its current flows in the line, its power comes from the line, so the line's
/// power factor is lower than the motor's (thyristors turned on late).
fn soft(motor: &Motor, slip: f64, direct: &Operation, volts: &Phases, part: f64) -> Seen {
    let line = |motor_side: Complex64| {
        let conductance = part * part * motor_side.re;
        let whole = part * motor_side.norm();
        let susceptance = (whole * whole - conductance * conductance).max(0.0).sqrt();
        Complex64::new(conductance, susceptance.copysign(motor_side.im))
    };
    let positive = line(motor.circuit.admittance(slip));
    let negative = line(motor.circuit.admittance(2.0 - slip));
    let v = sequence_components(volts[0], volts[1], volts[2]);
    Seen {
        admittance: sequence_matrix(positive, negative),
        amps: phases(positive * v.positive, negative * v.negative),
        ..scaled(motor, slip, direct, part * part)
    }
}

struct DriveLimits {
    limit_amps: f64,
    ramp_s: f64,
    efficiency: f64,
    pf: f64,
}

/// Torque in proportion to current at rated flux; copper losses as its square, core loss as speed.
fn drive(motor: &Motor, speed_rad_s: f64, volts: &Phases, limits: DriveLimits) -> Seen {
    let most = motor.torque_nm * limits.limit_amps / motor.amps;
    let accelerating = if limits.ramp_s > 0.0 {
        motor.total_inertia_kgm2() * motor.rated_rad_s / limits.ramp_s
    } else {
        0.0
    };
    let v = sequence_components(volts[0], volts[1], volts[2]);
    let square = 3.0 * (v.positive.norm_sqr() + v.negative.norm_sqr());
    let alive = square > 0.0;
    let torque_nm = if alive { (motor.resisting_nm(speed_rad_s) + accelerating).min(most) } else { 0.0 };
    let rated = motor.circuit.operation(motor.circuit.slip(motor.rated_rad_s), &balanced(motor.volts));
    let square_torque = (torque_nm / rated.torque_nm).powi(2);
    let stator_w = rated.positive.stator_w * square_torque;
    let rotor_w = rated.positive.rotor_w * square_torque;
    let core_w = if alive { rated.positive.core_w * speed_rad_s.max(0.0) / motor.rated_rad_s } else { 0.0 };
    let motor_w = torque_nm * speed_rad_s + stator_w + rotor_w + core_w;
    let input_w = motor_w / limits.efficiency;
    let tangent = (1.0 / (limits.pf * limits.pf) - 1.0).max(0.0).sqrt();
    let siemens = if alive { Complex64::new(input_w, -input_w * tangent) / square } else { ZERO };
    Seen {
        admittance: sequence_matrix(siemens, siemens),
        amps: phases(siemens * v.positive, siemens * v.negative),
        torque_nm,
        input_w,
        stator_w,
        rotor_w,
        core_w,
        starter_w: input_w - motor_w,
    }
}
