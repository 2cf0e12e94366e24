//! Running: the slip at which the shaft torque meets the load, on voltages that need not be balanced.

use serde::Serialize;

use super::circuit::{Circuit, Operation, Phases};
use super::full_load::{balanced, full_load_slip};
use super::load::DrivenLoad;
use super::nameplate::Ratings;
use crate::catalog::motors;
use crate::math::{Complex64, sequence_components};

/// A motor with its load, as wanted for running and starting.
#[derive(Debug, Clone, PartialEq)]
pub struct Motor {
    /// The circuit.
    pub circuit: Circuit,
    /// Rated line-to-line voltage, volts.
    pub volts: f64,
    /// Full-load line current, amperes.
    pub amps: f64,
    /// Full-load torque at the shaft, newton metres.
    pub torque_nm: f64,
    /// Full-load speed, radians per second.
    pub rated_rad_s: f64,
    /// Moment of inertia of the rotor, kg m2.
    pub inertia_kgm2: f64,
    /// The driven load.
    pub load: DrivenLoad,
}

impl Motor {
    /// A motor of complete ratings with a circuit and a load.
    pub fn new(ratings: &Ratings, circuit: Circuit, load: DrivenLoad) -> Motor {
        Motor {
            circuit,
            volts: ratings.volts,
            amps: ratings.amps.value,
            torque_nm: ratings.torque_nm(),
            rated_rad_s: ratings.rated_rad_s(),
            inertia_kgm2: ratings.inertia_kgm2.value,
            load,
        }
    }

    /// A motor whose circuit is given directly: full load is where the shaft gives `shaft_w` at rated voltage.
    ///
    /// `None` where the circuit never gives that much, or its values make no sense.
    pub fn of_circuit(
        circuit: Circuit,
        volts: f64,
        shaft_w: f64,
        inertia_kgm2: f64,
        load: DrivenLoad,
    ) -> Option<Motor> {
        let sensible = circuit.faults().is_empty() && volts > 0.0 && shaft_w > 0.0;
        if !sensible {
            return None;
        }
        let slip = full_load_slip(&circuit, volts, shaft_w)?;
        let rated_rad_s = circuit.speed_rad_s(slip);
        let amps = circuit.operation(slip, &balanced(volts)).amps[0].norm();
        Some(Motor {
            circuit,
            volts,
            amps,
            torque_nm: shaft_w / rated_rad_s,
            rated_rad_s,
            inertia_kgm2,
            load,
        })
    }

    /// Moment of inertia of rotor and load, kg m2.
    pub fn total_inertia_kgm2(&self) -> f64 {
        self.inertia_kgm2 + self.load.inertia_kgm2
    }

    /// Torque that load, friction and windage take at a speed, newton metres.
    pub fn resisting_nm(&self, speed_rad_s: f64) -> f64 {
        self.load.torque_nm(speed_rad_s) + self.circuit.mechanical.torque_nm(speed_rad_s)
    }
}

/// Voltages that the motor does not run on.
#[derive(Debug, Clone, PartialEq)]
pub enum CannotRun {
    /// The load asks for more torque than the motor has at any speed from which it could run on.
    Overload {
        /// Greatest part of the resisting torque that the motor covers, at the slip where it does best.
        covered: f64,
        /// That slip.
        slip: f64,
    },
    /// A voltage is not a number.
    NotANumber,
}

/// Voltage unbalance at the terminals.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Unbalance {
    /// Greatest deviation of a line-to-line voltage from their mean, percent of the mean (NEMA MG 1 14.36).
    pub nema_percent: f64,
    /// Negative over positive sequence, percent (IEC 61000-4-30).
    pub factor_percent: f64,
    /// Part of rated output that NEMA MG 1 Figure 14-1 leaves; none above 5 %, where no operation is
    /// recommended.
    pub derating: Option<f64>,
    /// Additional temperature rise by the rule of thumb of twice the square of the percent unbalance, percent
    /// (NEMA MG 1, from memory).
    pub extra_rise_percent: f64,
}

/// A motor running steadily.
#[derive(Debug, Clone, PartialEq)]
pub struct Running {
    /// Slip.
    pub slip: f64,
    /// Speed, radians per second.
    pub speed_rad_s: f64,
    /// Currents, torque and losses.
    pub operation: Operation,
    /// Torque at the shaft, newton metres, after friction and windage.
    pub shaft_nm: f64,
    /// Power at the shaft, watts.
    pub shaft_w: f64,
    /// Friction and windage, watts.
    pub mechanical_w: f64,
    /// Voltage unbalance.
    pub unbalance: Unbalance,
    /// Greatest deviation of a line current from their mean, percent of the mean.
    pub current_unbalance_percent: f64,
    /// Greatest line current over full-load current.
    pub greatest_loading: f64,
}

impl Running {
    /// All losses in the motor, watts.
    pub fn loss_w(&self) -> f64 {
        self.operation.electrical_loss_w() + self.mechanical_w
    }
}

/// Unbalance of three phase voltages to any common point; `None` where there is no voltage.
pub fn unbalance(volts: &Phases) -> Option<Unbalance> {
    let [a, b, c] = *volts;
    let nema_percent = greatest_deviation(&[(a - b).norm(), (b - c).norm(), (c - a).norm()])?;
    let s = sequence_components(a, b, c);
    let factor_percent = 100.0 * s.negative.norm() / s.positive.norm();
    factor_percent.is_finite().then(|| Unbalance {
        nema_percent,
        factor_percent,
        derating: motors::unbalance_derating(nema_percent).map(|row| row.value),
        extra_rise_percent: 2.0 * nema_percent * nema_percent,
    })
}

/// Greatest deviation of a value from the mean, percent of the mean.
fn greatest_deviation(values: &[f64; 3]) -> Option<f64> {
    let mean = values.iter().sum::<f64>() / 3.0;
    let most = values.iter().map(|v| (v - mean).abs()).fold(0.0, f64::max);
    (mean > 0.0 && most.is_finite()).then(|| 100.0 * most / mean)
}

/// Slip at which torque, less friction and windage, meets the load: the first from synchronous speed
/// downwards at which the motor has enough.
///
/// # Errors
/// No such slip up to standstill: the motor slows and stalls. Or voltages that are no numbers.
pub fn running_slip(motor: &Motor, volts: &Phases) -> Result<f64, CannotRun> {
    let v = sequence_components(volts[0], volts[1], volts[2]);
    if !(v.positive.norm().is_finite() && v.negative.norm().is_finite()) {
        return Err(CannotRun::NotANumber);
    }
    let c = &motor.circuit;
    let margin = |slip: f64| c.operation(slip, volts).torque_nm - motor.resisting_nm(c.speed_rad_s(slip));
    // Without load and friction the motor runs at synchronous speed, or a breath below.
    if margin(0.0) >= 0.0 {
        return Ok(0.0);
    }
    let (mut low, mut best) = (0.0, (f64::NEG_INFINITY, 1.0));
    for i in 0..=POINTS {
        let slip = 10f64.powf(-5.0 + 5.0 * f64::from(i) / f64::from(POINTS));
        let over = margin(slip);
        if over >= 0.0 {
            return Ok(crossing(low, slip, &margin));
        }
        let resisting = motor.resisting_nm(c.speed_rad_s(slip));
        let covered = 1.0 + over / resisting;
        if covered > best.0 {
            best = (covered, slip);
        }
        low = slip;
    }
    // The peak may stand between two points.
    let step = 10f64.powf(5.0 / f64::from(POINTS));
    if let Some(peak) =
        highest(best.1 / step, (best.1 * step).min(1.0), &margin).filter(|&s| margin(s) >= 0.0)
    {
        return Ok(crossing(best.1 / step, peak, &margin));
    }
    Err(CannotRun::Overload { covered: best.0.max(0.0), slip: best.1 })
}

/// Points at which the torque is looked at, evenly in the logarithm of slip.
const POINTS: i32 = 120;

/// Where `margin` turns positive between two slips, by bisection.
fn crossing(mut low: f64, mut high: f64, margin: &impl Fn(f64) -> f64) -> f64 {
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        if margin(middle) >= 0.0 { high = middle } else { low = middle }
    }
    0.5 * (low + high)
}

fn highest(mut low: f64, mut high: f64, value: &impl Fn(f64) -> f64) -> Option<f64> {
    for _ in 0..60 {
        let third = (high - low) / 3.0;
        if value(low + third) > value(high - third) { high -= third } else { low += third }
    }
    let middle = 0.5 * (low + high);
    middle.is_finite().then_some(middle)
}

/// Runs a motor on given phase voltages to any common point.
///
/// # Errors
/// As [`running_slip`].
pub fn run(motor: &Motor, volts: &Phases) -> Result<Running, CannotRun> {
    let slip = running_slip(motor, volts)?;
    let operation = motor.circuit.operation(slip, volts);
    let speed_rad_s = motor.circuit.speed_rad_s(slip);
    let mechanical = motor.circuit.mechanical.torque_nm(speed_rad_s);
    let amps = operation.amps.map(Complex64::norm);
    Ok(Running {
        slip,
        speed_rad_s,
        shaft_nm: operation.torque_nm - mechanical,
        shaft_w: (operation.torque_nm - mechanical) * speed_rad_s,
        mechanical_w: mechanical * speed_rad_s,
        unbalance: unbalance(volts).ok_or(CannotRun::Overload { covered: 0.0, slip: 1.0 })?,
        current_unbalance_percent: greatest_deviation(&amps).unwrap_or(0.0),
        greatest_loading: amps.into_iter().fold(0.0, f64::max) / motor.amps,
        operation,
    })
}
