//! Currents of the loads that are not linear, evaluated four conductors at a time.
//!
//! Formulas and their sources stand at [`crate::network::Load`]. Loads of a node are gathered
//! by connection and model first, so the iteration sees at most one record a node.

use super::lanes::{Phasors, Quad, Slots};
use crate::math::Complex64;
use crate::network::{Conductor, Connection, LoadModel, Network, Node};

/// Lowest floor, per unit, even where the floor is turned off: keeps the division defined.
const LEAST_FLOOR_PU: f64 = 1e-6;

/// Constant-power star loads of one node: by far the most common record.
#[derive(Debug, Clone, Copy)]
pub(super) struct StarPower<S = f64> {
    /// Active (re) and reactive (im) power of each phase; the n slot is zero.
    power: Slots<S>,
    /// Floor voltage squared, and its inverse.
    floor2: f64,
    inverse_floor2: f64,
    /// 1 where the star point is the neutral conductor, 0 where it is earth.
    neutral: f64,
}

/// Every kind of load at one node.
#[derive(Debug, Clone, Copy)]
pub(super) struct Mixed<S = f64> {
    star: StarPower<S>,
    /// Power over nominal voltage of constant-current star loads.
    star_current: Slots<S>,
    /// Slots ab, bc, ca; s1 to s2 in the first.
    delta_power: Slots<S>,
    delta_current: Slots<S>,
    delta_floor2: f64,
}

/// `I = conj(S) u g` for each slot.
#[inline(always)]
fn currents<Q: Quad>(power: &Slots<Q::Slot>, u: Phasors<Q>, gain: Q) -> Phasors<Q> {
    let s = Phasors::<Q>::load(power).each(|part| part.times(gain));
    Phasors { re: s.re.times_plus(u.re, s.im.times(u.im)), im: s.im.times_from(u.re, s.re.times(u.im)) }
}

/// `1 / |u|^2` above the floor; below it `(2 - m) / floor^2`, `m = |u|^2 / floor^2`.
#[inline(always)]
fn power_gain<Q: Quad>(square: Q, floor2: f64, inverse_floor2: f64) -> Q {
    let floor = Q::splat(floor2);
    let softened = square.lesser(floor).times_from(Q::splat(inverse_floor2), Q::splat(2.0));
    softened.over(square.greater(floor))
}

/// `1 / |u|`.
#[inline(always)]
fn current_gain<Q: Quad>(square: Q, floor2: f64) -> Q {
    // Far below any floor the direction of u is noise: the current then fades with u.
    let least = Q::splat(floor2 * 1e-6);
    Q::splat(1.0).over(square.greater(least).root())
}

impl<S: Copy> StarPower<S> {
    /// Voltages across the elements; the n slot is of no use.
    #[inline(always)]
    fn across<Q: Quad>(&self, v: Phasors<Q>) -> Phasors<Q> {
        let k = Q::splat(self.neutral);
        v.each(|part| k.times_from(part.neutral(), part))
    }

    /// Sends the sum of the phase currents back through the neutral.
    #[inline(always)]
    fn close<Q: Quad>(&self, current: Phasors<Q>) -> Phasors<Q> {
        let k = Q::splat(-self.neutral);
        current.each(|part| part.with_neutral(part.phase_sum().times(k)))
    }

    /// Current drawn from each conductor at these node voltages.
    #[inline(always)]
    pub fn current<Q: Quad<Slot = S>>(&self, v: Phasors<Q>) -> Phasors<Q> {
        let u = self.across(v);
        let gain = power_gain(u.square(), self.floor2, self.inverse_floor2);
        self.close(currents(&self.power, u, gain))
    }
}

impl<S: Copy> Mixed<S> {
    /// Current drawn from each conductor at these node voltages.
    #[inline(always)]
    pub fn current<Q: Quad<Slot = S>>(&self, v: Phasors<Q>) -> Phasors<Q> {
        let u = self.star.across(v);
        let square = u.square();
        let power =
            currents(&self.star.power, u, power_gain(square, self.star.floor2, self.star.inverse_floor2));
        let steady = currents(&self.star_current, u, current_gain(square, self.star.floor2));
        let star = self.star.close(power.plus(steady));

        let u = v.minus(v.each(Q::next_phase));
        let square = u.square();
        let power =
            currents(&self.delta_power, u, power_gain(square, self.delta_floor2, 1.0 / self.delta_floor2));
        let steady = currents(&self.delta_current, u, current_gain(square, self.delta_floor2));
        let delta = power.plus(steady);
        star.plus(delta.minus(delta.each(Q::phase_before)))
    }
}

/// The loads of one node gathered, or none.
#[derive(Debug, Clone, Copy)]
#[allow(clippy::large_enum_variant)] // moved once into arrays of their own
pub(super) enum Gathered {
    None,
    Star(StarPower),
    Mixed(Mixed),
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

impl Mixed {
    fn nothing(node: &Node, floor_pu: f64) -> Self {
        let floor_pu = floor_pu.max(LEAST_FLOOR_PU);
        let floor2 = (floor_pu * node.nominal_phase_volts()).powi(2);
        let delta_floor2 = (floor_pu * node.nominal_volts).powi(2);
        let neutral = if node.conductors.has(Conductor::N) { 1.0 } else { 0.0 };
        let star = StarPower { power: Slots::ZERO, floor2, inverse_floor2: 1.0 / floor2, neutral };
        let zero = Slots::ZERO;
        Mixed { star, star_current: zero, delta_power: zero, delta_current: zero, delta_floor2 }
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
    for generator in &network.generators {
        let node = network.node(generator.node);
        let drawn = -generator.delivering;
        gathered[generator.node.index()].add(node, floor_pu, generator.connection, LoadModel::Power, drawn);
    }
    gathered
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::{PhaseVector, polar};
    use crate::network::Conductors;
    use crate::solver::lanes::Plain;
    use crate::solver::load_current;

    fn node(conductors: Conductors) -> Node {
        let name = "n".into();
        let reference_on = Conductors::NONE;
        Node {
            name,
            conductors,
            nominal_volts: 400.0,
            earth_ohm: None,
            reference_siemens: 0.0,
            reference_on,
            xy: None,
        }
    }

    fn drawn(gathered: &Gathered, volts: &PhaseVector) -> PhaseVector {
        let volts = Phasors::<Plain>::load(&Slots::from(volts));
        let mut amps = Slots::ZERO;
        match gathered {
            Gathered::None => {}
            Gathered::Star(star) => star.current(volts).store(&mut amps),
            Gathered::Mixed(mixed) => mixed.current(volts).store(&mut amps),
        }
        PhaseVector::from(&amps)
    }

    /// The same by the formula of one element at a time.
    fn expected(
        node: &Node,
        connection: Connection,
        model: LoadModel,
        s: Complex64,
        volts: &PhaseVector,
    ) -> PhaseVector {
        let mut amps = PhaseVector::zeros();
        let each = s / connection.elements() as f64;
        for (p, q) in connection.pairs() {
            let base = if node.conductors.has(q) { volts[q.slot()] } else { Complex64::default() };
            let current =
                load_current(model, each, node.nominal_across(connection), 0.7, volts[p.slot()] - base);
            amps[p.slot()] += current;
            if node.conductors.has(q) {
                amps[q.slot()] -= current;
            }
        }
        amps
    }

    #[test]
    fn gathered_loads_draw_what_their_elements_draw() {
        let s = Complex64::new(9000.0, 4000.0);
        // The second set of voltages lies partly below the floor of 0.7.
        for scale in [1.0, 0.6] {
            let volts = PhaseVector::from_column_slice(&[
                polar(225.0 * scale, 0.1),
                polar(240.0, -2.0),
                polar(210.0 * scale, 2.2),
                polar(12.0, 0.7),
            ]);
            for conductors in [Conductors::ABC, Conductors::ABCN] {
                let node = node(conductors);
                for phases in [Conductors::ABC, Conductors::NONE.with(Conductor::C)] {
                    for connection in [Connection::Star(phases), Connection::Delta(phases)] {
                        for model in [LoadModel::Power, LoadModel::Current] {
                            let mut gathered = Gathered::None;
                            gathered.add(&node, 0.7, connection, model, s);
                            let want = expected(&node, connection, model, s, &volts);
                            let got = drawn(&gathered, &volts);
                            assert!((got - want).norm() < 1e-11, "{connection} {model:?}: {got} {want}");
                        }
                    }
                }
            }
        }
    }

    #[test]
    fn loads_of_a_node_add_up_whatever_their_order() {
        let node = node(Conductors::ABCN);
        let volts = PhaseVector::from_column_slice(&[
            polar(225.0, 0.1),
            polar(240.0, -2.0),
            polar(210.0, 2.2),
            polar(12.0, 0.7),
        ]);
        let all = [
            (Connection::Star(Conductors::ABC), LoadModel::Power, Complex64::new(3000.0, 1000.0)),
            (Connection::Delta(Conductors::ABC), LoadModel::Power, Complex64::new(5000.0, -700.0)),
            (
                Connection::Star(Conductors::NONE.with(Conductor::B)),
                LoadModel::Current,
                Complex64::new(800.0, 90.0),
            ),
        ];
        let want: PhaseVector = all.iter().map(|&(c, m, s)| expected(&node, c, m, s, &volts)).sum();
        for order in [[0, 1, 2], [2, 1, 0], [1, 0, 2]] {
            let mut gathered = Gathered::None;
            order.into_iter().for_each(|i: usize| gathered.add(&node, 0.7, all[i].0, all[i].1, all[i].2));
            assert!((drawn(&gathered, &volts) - want).norm() < 1e-11);
        }
    }
}
