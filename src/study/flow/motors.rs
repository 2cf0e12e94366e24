//! Running motors: currents, slip, unbalance and losses.

use serde::Serialize;

use crate::machine::{CannotRun, Running, run};
use crate::network::{Motor, MotorState, Name, Network};
use crate::solver::Solution;

/// One motor, or a group of equal ones, as it runs. Values are of one motor where not said otherwise.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MotorRun {
    /// Motor.
    pub motor: Name,
    /// Node.
    pub node: Name,
    /// Equal motors.
    pub count: u32,
    /// Slip, percent.
    pub slip_percent: f64,
    /// Speed, revolutions per minute.
    pub rpm: f64,
    /// Current of phase a, amperes.
    pub amps_a: f64,
    /// Current of phase b.
    pub amps_b: f64,
    /// Current of phase c.
    pub amps_c: f64,
    /// Active power of all of them, kilowatts.
    pub kw: f64,
    /// Reactive power of all of them, kilovars.
    pub kvar: f64,
    /// Shaft power of all of them, kilowatts.
    pub shaft_kw: f64,
    /// Losses of all of them, kilowatts.
    pub loss_kw: f64,
    /// Rotor losses of the negative sequence, percent of those of the positive.
    pub negative_rotor_loss_percent: f64,
    /// Voltage unbalance, percent: greatest deviation of a line voltage from the mean (NEMA MG 1).
    pub voltage_unbalance_percent: f64,
    /// Current unbalance, percent, likewise.
    pub current_unbalance_percent: f64,
    /// Part of rated output that the unbalance leaves (NEMA MG 1, figure 14-1); none above 5 % unbalance.
    pub derating: Option<f64>,
    /// Greatest phase current, percent of full load.
    pub loading_percent: f64,
    /// Shaft power, percent of what the unbalance leaves of rated output; none where nothing is left.
    pub derated_load_percent: Option<f64>,
}

/// Every running motor at its voltages; none for one that cannot run, which a converged solution has not.
pub(super) fn motors(network: &Network, solution: &Solution) -> Vec<MotorRun> {
    let running = network.motors.iter().filter(|m| m.state == MotorState::Running);
    running.filter_map(|motor| row(network, solution, motor).ok()).collect()
}

fn row(network: &Network, solution: &Solution, motor: &Motor) -> Result<MotorRun, CannotRun> {
    let v = &solution.volts[motor.node.index()];
    let now = run(&motor.machine, &[v[0], v[1], v[2]])?;
    let Running { operation, unbalance, .. } = &now;
    let many = f64::from(motor.count);
    let rated_w = motor.machine.torque_nm * motor.machine.rated_rad_s;
    let share = |part: f64, whole: f64| if whole > 0.0 { 100.0 * part / whole } else { 0.0 };
    Ok(MotorRun {
        motor: motor.name.clone(),
        node: network.node(motor.node).name.clone(),
        count: motor.count,
        slip_percent: 100.0 * now.slip,
        rpm: now.speed_rad_s * 30.0 / std::f64::consts::PI,
        amps_a: operation.amps[0].norm(),
        amps_b: operation.amps[1].norm(),
        amps_c: operation.amps[2].norm(),
        kw: operation.input_w * many / 1e3,
        kvar: operation.input_var * many / 1e3,
        shaft_kw: now.shaft_w * many / 1e3,
        loss_kw: now.loss_w() * many / 1e3,
        negative_rotor_loss_percent: share(operation.negative.rotor_w, operation.positive.rotor_w),
        voltage_unbalance_percent: unbalance.nema_percent,
        current_unbalance_percent: now.current_unbalance_percent,
        derating: unbalance.derating,
        loading_percent: 100.0 * now.greatest_loading,
        derated_load_percent: unbalance.derating.map(|d| share(now.shaft_w, rated_w * d)),
    })
}
