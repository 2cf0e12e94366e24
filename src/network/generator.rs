//! Generators and inverters: what they deliver at the voltage they see.

use super::conductor::Connection;
use super::draft::Name;
use super::model::NodeId;
use crate::math::Complex64;

/// A point of a [`Curve`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CurvePoint {
    /// Voltage, per unit of nominal.
    pub pu: f64,
    /// Output, per cent of the rating.
    pub percent: f64,
}

/// A curve of output against voltage: straight between its points, flat outside them.
///
/// Points rise strictly in voltage and never rise in output: a curve that gave more at a higher
/// voltage would drive the voltage away instead of holding it.
#[derive(Debug, Clone, PartialEq)]
pub struct Curve {
    /// Name.
    pub name: Name,
    points: Vec<CurvePoint>,
}

impl Curve {
    /// A curve; `None` where it has no point, or the points break the rules above.
    pub fn new(name: Name, points: Vec<CurvePoint>) -> Option<Curve> {
        let finite = points.iter().all(|p| p.pu.is_finite() && p.percent.is_finite());
        let in_order = points.windows(2).all(|w| w[0].pu < w[1].pu && w[0].percent >= w[1].percent);
        (finite && in_order && !points.is_empty()).then_some(Curve { name, points })
    }

    /// Its points.
    pub fn points(&self) -> &[CurvePoint] {
        &self.points
    }

    /// Output at a voltage, per cent.
    pub fn percent(&self, pu: f64) -> f64 {
        let after = self.points.iter().position(|p| p.pu > pu).unwrap_or(self.points.len());
        let before = after.checked_sub(1).and_then(|i| self.points.get(i));
        match (before, self.points.get(after)) {
            (Some(a), Some(b)) => a.percent + (b.percent - a.percent) * (pu - a.pu) / (b.pu - a.pu),
            (Some(only), None) | (None, Some(only)) => only.percent,
            (None, None) => 0.0,
        }
    }

    /// Greatest fall of output with voltage between two voltages, per cent per unit; not negative.
    pub fn steepest(&self, low_pu: f64, high_pu: f64) -> f64 {
        let within = self.points.windows(2).filter(|w| w[1].pu >= low_pu && w[0].pu <= high_pu);
        within.map(|w| (w[0].percent - w[1].percent) / (w[1].pu - w[0].pu)).fold(0.0, f64::max)
    }
}

/// What sets the reactive power.
#[derive(Debug, Clone, PartialEq)]
pub enum Reactive {
    /// Constant, vars, positive where delivered.
    Held(f64),
    /// In proportion to the active power: vars delivered a watt, negative where taken in.
    PerWatt(f64),
    /// A volt-var curve, per cent of the rating; positive where delivered.
    VoltVar(Curve),
}

/// What gives way at the rating.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Priority {
    /// Active power is kept, reactive power gives way.
    #[default]
    Watts,
    /// Reactive power is kept, active power gives way.
    Vars,
}

/// What keeps a generator from what it would give.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limited {
    /// The volt-watt curve holds active power back.
    pub by_volt_watt: bool,
    /// The rating is reached.
    pub by_rating: bool,
}

/// Delivered power of a generator, and what limits it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Output {
    /// Active (re) and reactive (im) power delivered, volt-amperes.
    pub power: Complex64,
    /// What limits it.
    pub limited: Limited,
}

/// A generator or inverter in service: equal single-phase elements between pairs of conductors.
///
/// It sees `v`, the mean of the voltages across its elements, per unit of nominal, and delivers
///
/// - active power `P`: its output, or where less the share of its rating that the volt-watt curve
///   gives at `v`;
/// - reactive power `Q`: constant, in proportion to `P`, or the share of its rating that the
///   volt-var curve gives at `v`;
/// - within the rating `S`: where `P^2 + Q^2 > S^2`, `Q` gives way, or `P` with
///   [`Priority::Vars`]; at constant power factor both do, in proportion.
///
/// Each element delivers its equal share as constant power; below the floor voltage of the study its current
/// falls by the law of a constant-power load ([`super::Load`]) of negative power.
#[derive(Debug, Clone)]
pub struct Generator {
    /// Name.
    pub name: Name,
    /// Node.
    pub node: NodeId,
    /// Between which conductors.
    pub connection: Connection,
    /// Active power it could deliver, watts.
    pub watts: f64,
    /// What sets the reactive power.
    pub reactive: Reactive,
    /// Volt-watt curve, per cent of the rating.
    pub volt_watt: Option<Curve>,
    /// Rating, volt-amperes; infinite where not given.
    pub rated_va: f64,
    /// What gives way at the rating.
    pub priority: Priority,
    /// Power it delivers in the state that is solved, volt-amperes.
    pub delivering: Complex64,
}

impl Generator {
    /// True where what it delivers depends on the voltage.
    pub fn follows_voltage(&self) -> bool {
        self.volt_watt.is_some() || matches!(self.reactive, Reactive::VoltVar(_))
    }

    /// What it delivers where it sees `pu`.
    pub fn output(&self, pu: f64) -> Output {
        let mut p = self.watts;
        let mut limited = Limited { by_volt_watt: false, by_rating: false };
        if let Some(curve) = &self.volt_watt {
            let most = curve.percent(pu) / 100.0 * self.rated_va;
            limited.by_volt_watt = most < p;
            p = p.min(most);
        }
        let q = match &self.reactive {
            Reactive::Held(vars) => *vars,
            Reactive::PerWatt(ratio) => p * ratio,
            Reactive::VoltVar(curve) => curve.percent(pu) / 100.0 * self.rated_va,
        };
        let s = self.rated_va;
        limited.by_rating = p.hypot(q) > s;
        let power = match (&self.reactive, self.priority) {
            _ if !limited.by_rating => Complex64::new(p, q),
            (Reactive::PerWatt(_), _) => Complex64::new(p, q) * (s / p.hypot(q)),
            (_, Priority::Watts) => {
                let p = p.min(s);
                let most = (s * s - p * p).max(0.0).sqrt();
                Complex64::new(p, q.clamp(-most, most))
            }
            (_, Priority::Vars) => {
                let q = q.clamp(-s, s);
                Complex64::new(p.min((s * s - q * q).max(0.0).sqrt()), q)
            }
        };
        Output { power, limited }
    }

    /// Greatest fall of active (re) and reactive (im) power with voltage between two voltages, by the
    /// curves alone, volt-amperes per unit.
    pub fn steepest(&self, low_pu: f64, high_pu: f64) -> Complex64 {
        let of = |curve: &Curve| curve.steepest(low_pu, high_pu) / 100.0 * self.rated_va;
        let watts = self.volt_watt.as_ref().map_or(0.0, of);
        let vars = match &self.reactive {
            Reactive::Held(_) => 0.0,
            Reactive::PerWatt(ratio) => (watts * ratio).max(0.0),
            Reactive::VoltVar(curve) => of(curve),
        };
        Complex64::new(watts, vars)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::network::Conductors;

    fn curve(points: &[(f64, f64)]) -> Curve {
        let points = points.iter().map(|&(pu, percent)| CurvePoint { pu, percent }).collect();
        Curve::new("c".into(), points).expect("a good curve")
    }

    fn generator(kw: f64, reactive: Reactive) -> Generator {
        Generator {
            name: "G".into(),
            node: NodeId(0),
            connection: Connection::Star(Conductors::ABC),
            watts: kw * 1e3,
            reactive,
            volt_watt: None,
            rated_va: 10e3,
            priority: Priority::Watts,
            delivering: Complex64::new(0.0, 0.0),
        }
    }

    /// Points of the kind in IEEE 1547-2018, category B (from memory); values by hand.
    #[test]
    fn a_curve_is_straight_between_its_points_and_flat_outside() {
        let c = curve(&[(0.92, 44.0), (0.98, 0.0), (1.02, 0.0), (1.08, -44.0)]);
        for (pu, percent) in
            [(0.5, 44.0), (0.92, 44.0), (0.95, 22.0), (1.0, 0.0), (1.05, -22.0), (1.08, -44.0), (2.0, -44.0)]
        {
            assert!((c.percent(pu) - percent).abs() < 1e-9, "{pu}");
        }
        assert!((c.steepest(0.99, 1.05) - 44.0 / 0.06).abs() < 1e-9);
        assert_eq!(c.steepest(0.99, 1.01), 0.0);
        assert_eq!(c.steepest(1.2, 1.3), 0.0);
    }

    #[test]
    fn points_out_of_order_make_no_curve() {
        let made = |points: &[(f64, f64)]| {
            Curve::new("c".into(), points.iter().map(|&(pu, percent)| CurvePoint { pu, percent }).collect())
        };
        assert!(made(&[]).is_none());
        assert!(made(&[(1.0, 5.0), (1.0, 0.0)]).is_none());
        assert!(made(&[(1.0, 0.0), (1.1, 5.0)]).is_none());
        assert!(made(&[(1.0, f64::NAN)]).is_none());
    }

    /// 6-8-10 triangles.
    #[test]
    fn at_the_rating_the_one_without_priority_gives_way() {
        let mut g = generator(8.0, Reactive::Held(9e3));
        let out = g.output(1.0);
        assert!((out.power - Complex64::new(8e3, 6e3)).norm() < 1e-9 && out.limited.by_rating);
        g.priority = Priority::Vars;
        g.reactive = Reactive::Held(-6e3);
        assert!((g.output(1.0).power - Complex64::new(8e3, -6e3)).norm() < 1e-9);
        g.watts = 9e3;
        let out = g.output(1.0);
        assert!((out.power - Complex64::new(8e3, -6e3)).norm() < 1e-9 && out.limited.by_rating);
        g.watts = 12e3;
        g.priority = Priority::Watts;
        assert!((g.output(1.0).power - Complex64::new(10e3, 0.0)).norm() < 1e-9);
        let both = generator(16.0, Reactive::PerWatt(-0.75)).output(1.0).power;
        assert!((both - Complex64::new(8e3, -6e3)).norm() < 1e-9, "{both}");
    }

    #[test]
    fn volt_watt_holds_active_power_back_and_the_power_factor_stays() {
        let mut g = generator(8.0, Reactive::PerWatt(0.5));
        g.volt_watt = Some(curve(&[(1.06, 100.0), (1.10, 0.0)]));
        let out = g.output(1.08);
        assert!((out.power - Complex64::new(5e3, 2.5e3)).norm() < 1e-9);
        assert_eq!(out.limited, Limited { by_volt_watt: true, by_rating: false });
        assert!(!g.output(1.06).limited.by_volt_watt);
        assert!((g.steepest(1.0, 1.2) - Complex64::new(250e3, 125e3)).norm() < 1e-6);
    }
}
