//! Currents of the loads that are not linear, evaluated four conductors at a time.
//!
//! Formulas and their sources stand at [`crate::network::Load`]. Loads of a node are gathered
//! by connection and model first, so the iteration sees at most one record a node.

use super::lanes::{Lane, Slots};
use crate::math::{Complex64, SLOTS};
use crate::network::{Conductor, Connection, LoadModel, Network, Node};

const N: usize = 3;

/// Lowest floor, per unit, even where the floor is turned off: keeps the division defined.
const LEAST_FLOOR_PU: f64 = 1e-6;

/// Constant-power star loads of one node: by far the most common record.
#[derive(Debug, Clone, Copy)]
pub(super) struct StarPower<L> {
    /// Active (re) and reactive (im) power of each phase; the n slot is zero.
    power: Slots<L>,
    /// Floor voltage squared, and its inverse.
    floor2: f64,
    inverse_floor2: f64,
    /// 1 where the star point is the neutral conductor, 0 where it is earth.
    neutral: f64,
}

/// Every kind of load at one node.
#[derive(Debug, Clone, Copy)]
pub(super) struct Mixed<L> {
    star: StarPower<L>,
    /// Power over nominal voltage of constant-current star loads.
    star_current: Slots<L>,
    /// Slots ab, bc, ca.
    delta_power: Slots<L>,
    delta_current: Slots<L>,
    delta_floor2: f64,
}

/// `power * u` conjugated for currents: `I = conj(S) u g`.
#[inline(always)]
fn currents<L: Lane, const FUSED: bool>(power: &Slots<L>, u: &Slots<L>, gain: &[L; SLOTS]) -> Slots<L> {
    let mut current = Slots::zero();
    for i in 0..SLOTS {
        let (p, q) = (power.re[i].times(gain[i]), power.im[i].times(gain[i]));
        current.re[i] = p.fused::<FUSED>(u.re[i], q.times(u.im[i]));
        current.im[i] = p.fused::<FUSED>(u.im[i], L::splat(0.0).minus(q.times(u.re[i])));
    }
    current
}

/// Magnitude squared of each slot.
#[inline(always)]
fn squares<L: Lane, const FUSED: bool>(u: &Slots<L>) -> [L; SLOTS] {
    std::array::from_fn(|i| u.re[i].fused::<FUSED>(u.re[i], u.im[i].times(u.im[i])))
}

/// `1 / |u|^2` above the floor; below it `(2 - m) / floor^2`, `m = |u|^2 / floor^2`.
#[inline(always)]
fn power_gain<L: Lane, const FUSED: bool>(
    square: &[L; SLOTS],
    floor2: f64,
    inverse_floor2: f64,
) -> [L; SLOTS] {
    let (floor, inverse) = (L::splat(floor2), L::splat(-inverse_floor2));
    std::array::from_fn(|i| {
        let softened = square[i].lesser(floor).fused::<FUSED>(inverse, L::splat(2.0));
        softened.over(square[i].greater(floor))
    })
}

/// `1 / |u|`.
#[inline(always)]
fn current_gain<L: Lane>(square: &[L; SLOTS], floor2: f64) -> [L; SLOTS] {
    // Far below any floor the direction of u is noise: the current then fades with u.
    let least = L::splat(floor2 * 1e-6);
    std::array::from_fn(|i| L::splat(1.0).over(square[i].greater(least).root()))
}

impl<L: Lane> StarPower<L> {
    #[inline(always)]
    fn across(&self, v: &Slots<L>) -> Slots<L> {
        let k = L::splat(-self.neutral);
        let mut u = *v;
        for i in 0..SLOTS {
            u.re[i] = k.times(v.re[N]).plus(v.re[i]);
            u.im[i] = k.times(v.im[N]).plus(v.im[i]);
        }
        u
    }

    /// Sends the sum of the phase currents back through the neutral.
    #[inline(always)]
    fn close(&self, current: &mut Slots<L>) {
        let k = L::splat(-self.neutral);
        current.re[N] = k.times(current.re[0].plus(current.re[1]).plus(current.re[2]));
        current.im[N] = k.times(current.im[0].plus(current.im[1]).plus(current.im[2]));
    }

    /// Current drawn from each conductor at these node voltages.
    #[inline(always)]
    pub fn current<const FUSED: bool>(&self, v: &Slots<L>) -> Slots<L> {
        let u = self.across(v);
        let gain = power_gain::<L, FUSED>(&squares::<L, FUSED>(&u), self.floor2, self.inverse_floor2);
        let mut current = currents::<L, FUSED>(&self.power, &u, &gain);
        self.close(&mut current);
        current
    }
}

impl<L: Lane> Mixed<L> {
    /// Current drawn from each conductor at these node voltages.
    #[inline(always)]
    pub fn current<const FUSED: bool>(&self, v: &Slots<L>) -> Slots<L> {
        let u = self.star.across(v);
        let square = squares::<L, FUSED>(&u);
        let gain = power_gain::<L, FUSED>(&square, self.star.floor2, self.star.inverse_floor2);
        let star = currents::<L, FUSED>(&self.star.power, &u, &gain);
        let steady = currents::<L, FUSED>(&self.star_current, &u, &current_gain(&square, self.star.floor2));
        let mut total = star.plus(steady);
        self.star.close(&mut total);

        let mut u = Slots::zero();
        for i in 0..N {
            u.re[i] = v.re[i].minus(v.re[(i + 1) % N]);
            u.im[i] = v.im[i].minus(v.im[(i + 1) % N]);
        }
        let square = squares::<L, FUSED>(&u);
        let gain = power_gain::<L, FUSED>(&square, self.delta_floor2, 1.0 / self.delta_floor2);
        let power = currents::<L, FUSED>(&self.delta_power, &u, &gain);
        let steady = currents::<L, FUSED>(&self.delta_current, &u, &current_gain(&square, self.delta_floor2));
        let delta = power.plus(steady);
        for i in 0..N {
            let before = (i + N - 1) % N;
            total.re[i] = total.re[i].plus(delta.re[i].minus(delta.re[before]));
            total.im[i] = total.im[i].plus(delta.im[i].minus(delta.im[before]));
        }
        total
    }
}

/// The loads of one node gathered, or none.
#[derive(Debug, Clone, Copy)]
pub(super) enum Gathered {
    None,
    Star(StarPower<f64>),
    Mixed(Mixed<f64>),
}

impl Gathered {
    /// Adds one load's share at this node; constant-impedance loads belong to the linear part.
    pub fn add(
        &mut self,
        node: &Node,
        floor_pu: f64,
        connection: Connection,
        model: LoadModel,
        power: Complex64,
    ) {
        let each = power / connection.elements().max(1) as f64;
        let star_only = matches!((connection, model), (Connection::Star(_), LoadModel::Power));
        let mut mixed = match *self {
            Gathered::None => Mixed::nothing(node, floor_pu),
            Gathered::Star(star) => Mixed { star, ..Mixed::nothing(node, floor_pu) },
            Gathered::Mixed(mixed) => mixed,
        };
        let current = each / node.nominal_across(connection);
        let (slots, value) = match (connection, model) {
            (_, LoadModel::Impedance) => return,
            (Connection::Star(_), LoadModel::Power) => (&mut mixed.star.power, each),
            (Connection::Star(_), LoadModel::Current) => (&mut mixed.star_current, current),
            (Connection::Delta(_), LoadModel::Power) => (&mut mixed.delta_power, each),
            (Connection::Delta(_), LoadModel::Current) => (&mut mixed.delta_current, current),
        };
        for (start, _) in connection.pairs() {
            slots.re[start.slot()] += value.re;
            slots.im[start.slot()] += value.im;
        }
        let stays_star = star_only && !matches!(self, Gathered::Mixed(_));
        *self = if stays_star { Gathered::Star(mixed.star) } else { Gathered::Mixed(mixed) };
    }
}

impl Mixed<f64> {
    fn nothing(node: &Node, floor_pu: f64) -> Self {
        let floor = floor_pu.max(LEAST_FLOOR_PU) * node.nominal_phase_volts();
        let floor2 = floor * floor;
        let neutral = if node.conductors.has(Conductor::N) { 1.0 } else { 0.0 };
        let star = StarPower { power: Slots::zero(), floor2, inverse_floor2: 1.0 / floor2, neutral };
        let zero = Slots::zero();
        Mixed { star, star_current: zero, delta_power: zero, delta_current: zero, delta_floor2: 3.0 * floor2 }
    }
}

/// Loads of every node, by node index.
pub(super) fn gather(network: &Network) -> Vec<Gathered> {
    let mut gathered = vec![Gathered::None; network.nodes.len()];
    let floor_pu = network.study.constant_power_floor_percent / 100.0;
    for load in &network.loads {
        let power = Complex64::new(load.watts, load.vars);
        for (id, share) in network.load_sites(load) {
            gathered[id.index()].add(network.node(id), floor_pu, load.connection, load.model, power * share);
        }
    }
    gathered
}
