//! Equivalent circuit out of ratings: bounded least squares.
//!
//! Nine unknowns (stator resistance and leakage, magnetising reactance, resistances of two cages, leakage of
//! the inner one, fixed losses, full-load slip, leakage left at standstill by saturation) meet eight ratings:
//! shaft power at that slip, slip, power factor, efficiency, locked-rotor current, torque and power factor,
//! breakdown torque; the ninth wish is little saturation. Each is weighted by how
//! well it is known: what stands on the nameplate firmly, what was filled in from tables loosely.

use nalgebra::{SMatrix, SVector};
use serde::Serialize;

use super::circuit::{Cage, Circuit, MechanicalLoss};
use super::full_load::{balanced, check, shaft_w};
use super::nameplate::{Origin, Rated, Ratings};
use crate::units::SQRT_3;

const SIZE: usize = 9;
/// Place of breakdown torque among the ratings.
const BREAKDOWN: usize = 7;
/// Slips at which torque is looked at for its maximum.
const SLIPS: usize = 48;
type Vector = SVector<f64, SIZE>;

/// Part of the rotor's leakage that both cages share, as a part of the stator's leakage.
const SHARED_LEAKAGE: f64 = 0.5;
/// Part of the fixed losses that is core loss; the rest is friction and windage.
const CORE_SHARE: f64 = 0.5;

/// Weight of a breakdown torque above that of a table: 20 % more counts as one tolerance.
const EXCESS_WEIGHT: f64 = 5.0;
/// Tolerance of leakage left at standstill, logarithmic: it saturates only as far as the ratings ask for.
const SATURATION: f64 = 0.5;
/// Sum of squared weighted errors at which no further start is tried.
const GOOD_ENOUGH: f64 = 0.05;
/// Most rounds of descent from one start.
const ROUNDS: u32 = 8;

/// Bounds of the unknowns in per unit of rated volts over full-load amperes, in the order of [`circuit_of`].
/// The sixth is outer over inner resistance, the seventh a part of rated power, the eighth of rated slip, the
/// ninth of running leakage.
const LOW: [f64; SIZE] = [0.002, 0.01, 0.8, 0.002, 0.001, 1.0, 0.002, 0.4, 0.35];
const HIGH: [f64; SIZE] = [0.25, 0.30, 20.0, 0.4, 2.0, 300.0, 0.12, 2.5, 1.0];

/// A rating, and what the fitted circuit does.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FitItem {
    /// Name of the rating.
    pub quantity: &'static str,
    /// What the nameplate or the tables say.
    pub wanted: f64,
    /// What the circuit gives.
    pub obtained: f64,
    /// True where the value is on the nameplate or follows from it; false where a table filled it in.
    pub firm: bool,
}

impl FitItem {
    /// Error in percent of what was wanted.
    pub fn error_percent(&self) -> f64 {
        100.0 * (self.obtained / self.wanted - 1.0)
    }

    /// True where the error is greater than some percent, or no number.
    fn is_beyond(&self, percent: f64) -> bool {
        let error = self.error_percent().abs();
        error > percent || error.is_nan()
    }
}

/// A fitted circuit with the error of each rating.
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// The circuit.
    pub circuit: Circuit,
    /// Each rating against what the circuit does at rated voltage: full load at rated shaft power, standstill,
    /// greatest torque.
    pub items: Vec<FitItem>,
    /// Steps that the least squares took, all starts together.
    pub steps: u32,
}

impl Fit {
    /// The largest error, percent, among the ratings that stand on the nameplate.
    pub fn worst_firm(&self) -> Option<&FitItem> {
        let firm = self.items.iter().filter(|i| i.firm);
        firm.max_by(|a, b| a.error_percent().abs().total_cmp(&b.error_percent().abs()))
    }

    /// The largest error of full-load current and of what stands on the nameplate, percent.
    fn worst_running(&self) -> f64 {
        let counts = |i: &&FitItem| i.firm || i.quantity == "amps";
        self.items.iter().filter(counts).map(|i| i.error_percent().abs()).fold(0.0, f64::max)
    }

    /// The item of a name.
    pub fn item(&self, quantity: &str) -> Option<&FitItem> {
        self.items.iter().find(|i| i.quantity == quantity)
    }
}

/// Why no circuit was found.
#[derive(Debug, Clone, PartialEq)]
pub struct FitFault {
    /// The rating that the circuit misses most, where one stands out.
    pub worst: Option<FitItem>,
    /// What is wrong, with the numbers.
    pub message: String,
    /// How to mend it.
    pub mend: String,
}

/// Largest error of a rating on the nameplate that is still taken for a fit, percent.
pub const REFUSED_ABOVE_PERCENT: f64 = 20.0;

/// Error of full-load current or of a rating on the nameplate above which values of tables give way, percent.
const LOOSEN_ABOVE_PERCENT: f64 = 4.0;

/// Fits the double-cage circuit to ratings.
///
/// # Errors
/// No circuit within bounds that comes within [`REFUSED_ABOVE_PERCENT`] of every rating on the nameplate, or
/// carries the rated power: the ratings contradict each other.
pub fn fit(ratings: &Ratings) -> Result<Fit, FitFault> {
    let first = fit_with(ratings, Trust::Tables);
    let tabled = [&ratings.locked_rotor_amps, &ratings.locked_rotor_torque, &ratings.breakdown_torque];
    let fine = first.as_ref().is_ok_and(|f| f.worst_running() <= LOOSEN_ABOVE_PERCENT);
    if fine || !tabled.iter().any(|r| r.is_filled()) {
        return first;
    }
    // Tables hold least torques and greatest currents, which not every motor can have together.
    let second = fit_with(ratings, Trust::Plate);
    match (&first, &second) {
        (Ok(a), Ok(b)) if a.worst_running() < b.worst_running() => first,
        (Ok(_), Err(_)) => first,
        _ => second,
    }
}

fn fit_with(ratings: &Ratings, trust: Trust) -> Result<Fit, FitFault> {
    let problem = Problem::new(ratings, trust);
    let refused = |worst: Option<FitItem>, message: String| FitFault {
        worst,
        message,
        mend: "check locked-rotor current and torque, breakdown torque, power factor, efficiency and speed; \
               leave blank the one you trust least"
            .to_string(),
    };
    let (unknowns, steps) = problem
        .solve()
        .ok_or_else(|| refused(None, "no equivalent circuit fits these ratings".to_string()))?;
    let circuit = problem.circuit_of(&unknowns);
    let items = check(&circuit, ratings).ok_or_else(|| {
        refused(None, "the circuit that fits best does not carry the rated power".to_string())
    })?;
    let fit = Fit { circuit, items, steps };
    match fit.worst_firm() {
        Some(worst) if worst.is_beyond(REFUSED_ABOVE_PERCENT) => {
            let message = format!(
                "no motor can have all these ratings: the nearest circuit has a {} of {:.3} instead of {:.3}",
                worst.quantity, worst.obtained, worst.wanted
            );
            Err(refused(Some(worst.clone()), message))
        }
        _ => Ok(fit),
    }
}

/// How firmly values out of tables are held.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Trust {
    /// Standstill and breakdown as in the tables.
    Tables,
    /// They give way to the nameplate and to running well.
    Plate,
}

/// A smooth stand-in for the greatest torque, newton metres: a high power mean over slips. The true maximum
/// jumps between the humps of two cages, where a descent by slopes would stick.
fn smooth_peak(circuit: &Circuit, volts: f64, slips: &[f64; SLIPS]) -> f64 {
    let torques = slips.map(|slip| circuit.balanced_torque_nm(slip, volts));
    let most = torques.iter().copied().fold(f64::MIN_POSITIVE, f64::max);
    let mean: f64 = torques.iter().map(|t| (t / most).max(0.0).powi(40)).sum();
    most * mean.powf(1.0 / 40.0)
}

struct Problem<'a> {
    ratings: &'a Ratings,
    /// Rated phase volts over full-load amperes.
    base_ohm: f64,
    /// One over the tolerance of each rating.
    weights: [f64; SIZE],
    /// Slips of [`smooth_peak`], from 0.3 % to standstill.
    slips: [f64; SLIPS],
}

impl<'a> Problem<'a> {
    fn new(ratings: &'a Ratings, trust: Trust) -> Self {
        let table = if trust == Trust::Tables { 0.01 } else { 0.10 };
        let weight = |rated: &Rated, given: f64, derived: f64, filled: f64| {
            1.0 / match rated.origin {
                Origin::Given => given,
                Origin::Derived(_) => derived,
                Origin::Filled(_) => filled,
            }
        };
        let weights = [
            1.0 / 0.005,
            weight(&ratings.slip, 0.02, 0.02, 0.25),
            weight(&ratings.pf, 0.01, 0.01, 0.05),
            weight(&ratings.efficiency, 0.05, 0.05, 0.25),
            // A code letter is a range.
            weight(&ratings.locked_rotor_amps, 0.005, 0.02, table),
            weight(&ratings.locked_rotor_torque, 0.005, 0.01, table),
            weight(&ratings.locked_rotor_pf, 0.03, 0.03, 0.20),
            weight(&ratings.breakdown_torque, 0.005, 0.01, table),
            1.0 / SATURATION,
        ];
        let base_ohm = ratings.volts / SQRT_3 / ratings.amps.value;
        let slips = std::array::from_fn(|i| 10f64.powf(-2.5 * i as f64 / (SLIPS - 1) as f64));
        Problem { ratings, base_ohm, weights, slips }
    }

    /// The best unknowns from all starts, and the steps taken; none where nothing finite was found.
    fn solve(&self) -> Option<(Vector, u32)> {
        let mut best: Option<(f64, Vector)> = None;
        let mut steps = 0;
        for start in self.starts() {
            let (cost, found, taken) = self.search(start);
            steps += taken;
            if best.as_ref().is_none_or(|(b, _)| cost < *b) {
                best = Some((cost, found));
            }
            if cost < GOOD_ENOUGH {
                break;
            }
        }
        best.map(|(_, x)| (x, steps)).filter(|(x, _)| x.iter().all(|v| v.is_finite()))
    }

    /// The circuit of unknowns, which are logarithms.
    fn circuit_of(&self, unknowns: &Vector) -> Circuit {
        let [r1, x1, xm, inner_r, inner_x, ratio, fixed, _, saturated] = (*unknowns).map(f64::exp).into();
        let z = self.base_ohm;
        let fixed_w = fixed * self.ratings.shaft_w.value;
        Circuit {
            r1_ohm: r1 * z,
            x1_ohm: x1 * z,
            xm_ohm: xm * z,
            core_siemens: CORE_SHARE * fixed_w / (self.ratings.volts * self.ratings.volts),
            rotor_x_ohm: SHARED_LEAKAGE * x1 * z,
            standstill_leakage: saturated.min(1.0),
            inner: Cage { r_ohm: inner_r * z, x_ohm: inner_x * z },
            outer: Some(Cage { r_ohm: ratio * inner_r * z, x_ohm: 0.0 }),
            mechanical: MechanicalLoss {
                watts: (1.0 - CORE_SHARE) * fixed_w,
                at_rad_s: self.ratings.rated_rad_s(),
            },
            sync_rad_s: self.ratings.sync_rad_s(),
        }
    }

    /// Weighted errors of the ratings, logarithmic.
    ///
    /// `shift` corrects the smooth maximum of [`smooth_peak`] to the true one.
    fn errors(&self, unknowns: &Vector, shift: f64) -> Vector {
        let r = self.ratings;
        let circuit = self.circuit_of(unknowns);
        let slip_error = unknowns[7];
        let slip = r.slip.value * slip_error.exp();
        let volts = balanced(r.volts);
        let full = circuit.operation(slip, &volts);
        let locked = circuit.operation(1.0, &volts);
        let shaft = shaft_w(&circuit, slip, r.volts);
        let torque = r.torque_nm();
        // Logarithm that stays defined where a trial goes astray.
        let log = |a: f64, b: f64| (a / b).max(1e-6).ln();
        let efficiency = (shaft / full.input_w).clamp(-1.0, 0.9999);
        let peak =
            log(smooth_peak(&circuit, r.volts, &self.slips) / torque, r.breakdown_torque.value) - shift;
        // A table's breakdown torque is the least that a motor must have.
        let excess = r.breakdown_torque.is_filled() && peak > 0.0;
        let peak = if excess { peak * EXCESS_WEIGHT / self.weights[BREAKDOWN] } else { peak };
        let raw = [
            log(shaft, r.shaft_w.value),
            slip_error,
            log(full.pf().unwrap_or(0.0), r.pf.value),
            log(1.0 - efficiency, 1.0 - r.efficiency.value),
            log(locked.amps[0].norm(), r.locked_rotor_amps.value),
            log(locked.torque_nm / torque, r.locked_rotor_torque.value),
            log(locked.pf().unwrap_or(0.0), r.locked_rotor_pf.value),
            peak,
            unknowns[8],
        ];
        Vector::from_fn(|i, _| raw[i] * self.weights[i])
    }

    fn bounds(&self) -> (Vector, Vector) {
        (Vector::from(LOW.map(f64::ln)), Vector::from(HIGH.map(f64::ln)))
    }

    /// Starting values: leakage out of locked-rotor current, running resistance out of slip, and several
    /// splits between the cages.
    fn starts(&self) -> Vec<Vector> {
        let r = self.ratings;
        let z = r.amps.value / r.locked_rotor_amps.value;
        let (low, high) = self.bounds();
        let mut starts = Vec::new();
        for (ratio, inner_x) in [(4.0, 0.1), (10.0, 0.1), (3.0, 0.3), (30.0, 0.2), (10.0, 0.5), (1.5, 0.05)] {
            let values = [
                0.25 * z,
                0.6 * z,
                2.5,
                0.9 * r.slip.value,
                inner_x,
                ratio,
                0.25 * (1.0 - r.efficiency.value),
                1.0,
                0.8,
            ];
            let start = Vector::from(values.map(f64::ln));
            starts.push(start.zip_zip_map(&low, &high, |v, l, h| v.clamp(l, h)));
        }
        starts
    }

    /// Rounds of descent, each with the smooth maximum corrected anew: cost, unknowns, steps.
    fn search(&self, start: Vector) -> (f64, Vector, u32) {
        let (mut x, mut cost, mut steps) = (start, f64::INFINITY, 0);
        for _ in 0..ROUNDS {
            let shift = self.shift(&x);
            let (_, found, taken) = self.descend(x, shift);
            steps += taken;
            let now = self.errors(&found, self.shift(&found)).norm_squared();
            let gain = cost - now;
            if now < cost {
                (x, cost) = (found, now);
            }
            let worthwhile = gain > 1e-4 * cost + 1e-9;
            if !worthwhile {
                break;
            }
        }
        (cost, x, steps)
    }

    /// Logarithm of the smooth over the true maximum of torque.
    fn shift(&self, unknowns: &Vector) -> f64 {
        let circuit = self.circuit_of(unknowns);
        (smooth_peak(&circuit, self.ratings.volts, &self.slips)
            / circuit.breakdown(self.ratings.volts).torque_nm)
            .ln()
    }

    /// Damped Gauss-Newton (Levenberg-Marquardt) held within bounds: cost, unknowns, steps.
    fn descend(&self, start: Vector, shift: f64) -> (f64, Vector, u32) {
        let (low, high) = self.bounds();
        let (mut x, mut damping) = (start, 1e-2);
        let mut errors = self.errors(&x, shift);
        let mut cost = errors.norm_squared();
        let mut steps = 0;
        while steps < 60 && cost > 1e-12 && damping < 1e8 {
            steps += 1;
            let jacobian = self.jacobian(&x, &errors, shift);
            let gradient = jacobian.transpose() * errors;
            let mut normal = jacobian.transpose() * jacobian;
            for i in 0..SIZE {
                // An unknown at its bound that wants out is held.
                let held = (x[i] <= low[i] && gradient[i] > 0.0) || (x[i] >= high[i] && gradient[i] < 0.0);
                if held {
                    normal.row_mut(i).fill(0.0);
                    normal.column_mut(i).fill(0.0);
                    normal[(i, i)] = 1.0;
                } else {
                    normal[(i, i)] = normal[(i, i)] * (1.0 + damping) + 1e-9;
                }
            }
            let held =
                |i: usize| (x[i] <= low[i] && gradient[i] > 0.0) || (x[i] >= high[i] && gradient[i] < 0.0);
            let right = Vector::from_fn(|i, _| if held(i) { 0.0 } else { -gradient[i] });
            let Some(step) = normal.cholesky().map(|c| c.solve(&right)) else {
                damping *= 10.0;
                continue;
            };
            let longest = step.amax().max(1.0);
            let trial = (x + step / longest).zip_zip_map(&low, &high, |v, l, h| v.clamp(l, h));
            let trial_errors = self.errors(&trial, shift);
            let trial_cost = trial_errors.norm_squared();
            if trial_cost < cost {
                let gain = 1.0 - trial_cost / cost;
                (x, errors, cost) = (trial, trial_errors, trial_cost);
                damping = (damping * 0.3).max(1e-9);
                if gain < 1e-7 {
                    break;
                }
            } else {
                damping *= 4.0;
            }
        }
        (cost, x, steps)
    }

    fn jacobian(&self, x: &Vector, errors: &Vector, shift: f64) -> SMatrix<f64, SIZE, SIZE> {
        let step = 1e-6;
        let mut jacobian = SMatrix::<f64, SIZE, SIZE>::zeros();
        for i in 0..SIZE {
            let mut moved = *x;
            moved[i] += step;
            jacobian.set_column(i, &((self.errors(&moved, shift) - errors) / step));
        }
        jacobian
    }
}
