//! Torque of the driven load against speed.

use serde::Serialize;

/// How the torque changes with speed.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Shape {
    /// The same at every speed: conveyors, hoists, piston compressors.
    Constant,
    /// In proportion to speed.
    Linear,
    /// As the square of speed: fans, centrifugal pumps.
    Quadratic,
    /// Straight lines between points (speed, torque), both as parts of the values at rated speed, by rising
    /// speed; beyond the ends the end value.
    Table(Vec<(f64, f64)>),
}

/// A driven load on the motor's shaft.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct DrivenLoad {
    /// How torque changes with speed.
    pub shape: Shape,
    /// Torque at rated speed, newton metres.
    pub torque_nm: f64,
    /// Rated speed, radians per second.
    pub rated_rad_s: f64,
    /// Moment of inertia at the motor's shaft, kg m2, without the rotor's.
    pub inertia_kgm2: f64,
}

impl DrivenLoad {
    /// Torque against rotation at a speed, newton metres. At and below standstill that of standstill.
    pub fn torque_nm(&self, speed_rad_s: f64) -> f64 {
        let part = speed_rad_s.max(0.0) / self.rated_rad_s;
        let share = match &self.shape {
            Shape::Constant => 1.0,
            Shape::Linear => part,
            Shape::Quadratic => part * part,
            Shape::Table(points) => between(points, part),
        };
        share * self.torque_nm
    }

    /// Speeds at which the torque has a corner, radians per second, rising.
    pub fn corners(&self) -> Vec<f64> {
        match &self.shape {
            Shape::Table(points) => points.iter().map(|p| p.0 * self.rated_rad_s).collect(),
            _ => Vec::new(),
        }
    }

    /// What is wrong: one sentence for each fault; empty where all is well.
    pub fn faults(&self) -> Vec<String> {
        let mut faults = Vec::new();
        let mut wants = |fine: bool, sentence: &str| {
            if !fine {
                faults.push(sentence.to_string());
            }
        };
        let finite = |v: f64| v.is_finite() && v >= 0.0;
        wants(finite(self.torque_nm), "load torque must be 0 or more");
        wants(
            self.rated_rad_s.is_finite() && self.rated_rad_s > 0.0,
            "rated speed of the load must be above 0",
        );
        wants(finite(self.inertia_kgm2), "load inertia must be 0 or more");
        if let Shape::Table(points) = &self.shape {
            wants(points.len() >= 2, "the table of speed and torque needs two points or more");
            let rising = points.windows(2).all(|w| matches!(w, [a, b] if b.0 > a.0));
            wants(rising, "speeds in the table of speed and torque must rise from row to row");
            wants(points.iter().all(|p| finite(p.0) && finite(p.1)), "speeds and torques must be 0 or more");
        }
        faults
    }
}

/// Straight between points, the end value beyond them; zero without points.
fn between(points: &[(f64, f64)], at: f64) -> f64 {
    let next = points.partition_point(|p| p.0 <= at);
    let before = next.checked_sub(1).and_then(|i| points.get(i));
    match (before, points.get(next)) {
        (Some(a), Some(b)) => a.1 + (b.1 - a.1) * (at - a.0) / (b.0 - a.0),
        (Some(end), None) | (None, Some(end)) => end.1,
        (None, None) => 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn load(shape: Shape) -> DrivenLoad {
        DrivenLoad { shape, torque_nm: 200.0, rated_rad_s: 180.0, inertia_kgm2: 1.0 }
    }

    #[test]
    fn shapes() {
        assert_eq!(load(Shape::Constant).torque_nm(0.0), 200.0);
        assert_eq!(load(Shape::Linear).torque_nm(90.0), 100.0);
        assert_eq!(load(Shape::Quadratic).torque_nm(90.0), 50.0);
        let pump = load(Shape::Table(vec![(0.0, 0.15), (0.2, 0.05), (1.0, 1.0)]));
        assert_eq!(pump.torque_nm(0.0), 30.0);
        assert!((pump.torque_nm(18.0) - 20.0).abs() < 1e-12);
        assert_eq!(pump.torque_nm(500.0), 200.0);
        assert_eq!(pump.corners(), [0.0, 36.0, 180.0]);
        assert!(pump.faults().is_empty());
    }

    #[test]
    fn faults_are_told_and_nothing_panics() {
        for points in
            [vec![], vec![(0.0, 1.0)], vec![(0.5, 1.0), (0.5, 1.0)], vec![(f64::NAN, 1.0), (1.0, -1.0)]]
        {
            let broken = load(Shape::Table(points));
            assert!(!broken.faults().is_empty());
            let _ = broken.torque_nm(50.0);
        }
    }
}
