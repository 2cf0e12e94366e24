//! Ordinary differential equations by an embedded Runge-Kutta pair of orders 5 and 4 with adaptive step, and
//! stops where a function of the state passes zero.
//!
//! Coefficients: Dormand and Prince, J. Comp. Appl. Math. 6 (1980) 19-26, table 2. Step control: Hairer,
//! Norsett, Wanner, Solving Ordinary Differential Equations I, section II.4.

/// Nodes of the pair.
const NODES: [f64; 6] = [1.0 / 5.0, 3.0 / 10.0, 4.0 / 5.0, 8.0 / 9.0, 1.0, 1.0];
/// Weights of the stages; the last row is the solution of order 5.
const WEIGHTS: [[f64; 6]; 6] = [
    [1.0 / 5.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [3.0 / 40.0, 9.0 / 40.0, 0.0, 0.0, 0.0, 0.0],
    [44.0 / 45.0, -56.0 / 15.0, 32.0 / 9.0, 0.0, 0.0, 0.0],
    [19372.0 / 6561.0, -25360.0 / 2187.0, 64448.0 / 6561.0, -212.0 / 729.0, 0.0, 0.0],
    [9017.0 / 3168.0, -355.0 / 33.0, 46732.0 / 5247.0, 49.0 / 176.0, -5103.0 / 18656.0, 0.0],
    [35.0 / 384.0, 0.0, 500.0 / 1113.0, 125.0 / 192.0, -2187.0 / 6784.0, 11.0 / 84.0],
];
/// Order 5 less order 4.
const ERROR: [f64; 7] =
    [71.0 / 57600.0, 0.0, -71.0 / 16695.0, 71.0 / 1920.0, -17253.0 / 339200.0, 22.0 / 525.0, -1.0 / 40.0];

/// How exact, and how far a step may go.
#[derive(Debug, Clone, PartialEq)]
pub struct StepControl {
    /// Error a step, part of the value.
    pub relative: f64,
    /// Error a step below which each value does not matter, in its unit.
    pub absolute: Vec<f64>,
    /// Longest step, seconds.
    pub longest_s: f64,
    /// Shortest step, seconds.
    pub shortest_s: f64,
}

/// What one advance did.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Advance {
    /// An ordinary step.
    Step,
    /// The step ended where the stop of this index passes from below to above zero.
    Stopped(usize),
}

/// Why the solution cannot go on.
#[derive(Debug, Clone, PartialEq)]
pub enum OdeFault<E> {
    /// The rate could not be computed.
    Rate(E),
    /// The step became shorter than allowed, at this time.
    StepTooShort(f64),
}

/// A function of time and state that ends a step where it passes from below zero to zero or above.
pub type Stop<'a> = &'a dyn Fn(f64, &[f64]) -> f64;

/// A solution on its way.
#[derive(Debug, Clone)]
pub struct Ode {
    time_s: f64,
    state: Vec<f64>,
    rate: Vec<f64>,
    next_s: f64,
    control: StepControl,
    evaluations: u64,
}

/// A trial step: state, rate there, and weighted error (up to 1 is good).
struct Trial {
    state: Vec<f64>,
    rate: Vec<f64>,
    error: f64,
}

impl Ode {
    /// Begins at a time and state. `rate(t, y, dy)` writes the rates of the state.
    ///
    /// # Errors
    /// The rate cannot be computed.
    pub fn new<E>(
        time_s: f64,
        state: Vec<f64>,
        control: StepControl,
        rate: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<Ode, OdeFault<E>> {
        let next_s = (control.longest_s * 0.01).max(control.shortest_s * 4.0);
        let zeros = vec![0.0; state.len()];
        let mut ode = Ode { time_s, state, rate: zeros, next_s, control, evaluations: 0 };
        ode.restart(rate)?;
        Ok(ode)
    }

    /// Time, seconds.
    pub fn time_s(&self) -> f64 {
        self.time_s
    }

    /// State.
    pub fn state(&self) -> &[f64] {
        &self.state
    }

    /// Rates at the present time.
    pub fn rate(&self) -> &[f64] {
        &self.rate
    }

    /// Number of times the rate was computed.
    pub fn evaluations(&self) -> u64 {
        self.evaluations
    }

    /// Changes the state by hand; call [`Ode::restart`] afterwards.
    pub fn state_mut(&mut self) -> &mut [f64] {
        &mut self.state
    }

    /// Computes the rate anew, as wanted after a jump of the rate or of the state.
    ///
    /// # Errors
    /// The rate cannot be computed.
    pub fn restart<E>(
        &mut self,
        rate: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<(), OdeFault<E>> {
        self.evaluations += 1;
        rate(self.time_s, &self.state, &mut self.rate).map_err(OdeFault::Rate)
    }

    /// One accepted step, no further than `until_s`, no further than the first stop.
    ///
    /// The rate may jump at `until_s`: it is asked for just before it. Call [`Ode::restart`] after reaching it.
    ///
    /// # Errors
    /// The rate cannot be computed, or the step became too short.
    pub fn advance<E>(
        &mut self,
        until_s: f64,
        stops: &[Stop<'_>],
        rate: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<Advance, OdeFault<E>> {
        let mut wanted = self.next_s;
        loop {
            let left = until_s - self.time_s;
            // A sliver before the end is taken along.
            let step = if wanted > left || left - wanted < self.control.shortest_s { left } else { wanted };
            let trial = self.trial(step, until_s, rate)?;
            if trial.error <= 1.0 {
                let growth = (0.9 * trial.error.max(1e-10).powf(-0.2)).clamp(0.2, 5.0);
                // A step cut short by the end says nothing against the longer one.
                let grown = if step < wanted { wanted.max(step * growth) } else { step * growth };
                self.next_s = grown.clamp(self.control.shortest_s, self.control.longest_s);
                return self.accept((step, until_s), trial, stops, rate);
            }
            let shrink =
                if trial.error.is_finite() { (0.9 * trial.error.powf(-0.2)).clamp(0.1, 0.9) } else { 0.1 };
            wanted = step * shrink;
            if wanted < self.control.shortest_s {
                return Err(OdeFault::StepTooShort(self.time_s));
            }
        }
    }

    /// A step, with no rate asked for at or beyond `until_s`: what jumps there belongs to the next step.
    fn trial<E>(
        &mut self,
        step: f64,
        until_s: f64,
        rate: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<Trial, OdeFault<E>> {
        let size = self.state.len();
        let mut slopes: Vec<Vec<f64>> = vec![self.rate.clone()];
        let mut state = self.state.clone();
        for (node, weights) in NODES.iter().zip(&WEIGHTS) {
            for (i, y) in state.iter_mut().enumerate() {
                let slope: f64 = slopes.iter().zip(weights).map(|(s, w)| s[i] * w).sum();
                *y = self.state[i] + step * slope;
            }
            let mut slope = vec![0.0; size];
            self.evaluations += 1;
            let time_s = (self.time_s + node * step).min(until_s.next_down());
            rate(time_s, &state, &mut slope).map_err(OdeFault::Rate)?;
            slopes.push(slope);
        }
        let mut sum = 0.0;
        for i in 0..size {
            let error: f64 = slopes.iter().zip(&ERROR).map(|(s, e)| s[i] * e).sum::<f64>() * step;
            let floor = self.control.absolute.get(i).copied().unwrap_or(1e-9);
            let scale = floor + self.control.relative * self.state[i].abs().max(state[i].abs());
            sum += (error / scale).powi(2);
        }
        let error = (sum / size.max(1) as f64).sqrt();
        let error = if error.is_nan() { f64::INFINITY } else { error };
        Ok(Trial { state, rate: slopes.pop().unwrap_or_default(), error })
    }

    /// Takes a good step, cut at the first stop that it passes.
    fn accept<E>(
        &mut self,
        (step, until_s): (f64, f64),
        trial: Trial,
        stops: &[Stop<'_>],
        rate: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<Advance, OdeFault<E>> {
        let mut found: Option<(f64, Trial, usize)> = None;
        for (index, stop) in stops.iter().enumerate() {
            let reach = found.as_ref().map_or((step, &trial), |(s, t, _)| (*s, t));
            let before = stop(self.time_s, &self.state);
            let after = stop(self.time_s + reach.0, &reach.1.state);
            if before < 0.0 && after >= 0.0 {
                let (at, there) = self.root(*stop, until_s, (0.0, before), (reach.0, after), rate)?;
                found = Some((at, there, index));
            }
        }
        let (step, trial, advance) = match found {
            Some((at, there, index)) => (at, there, Advance::Stopped(index)),
            None => (step, trial, Advance::Step),
        };
        self.time_s += step;
        self.state = trial.state;
        self.rate = trial.rate;
        Ok(advance)
    }

    /// Step at whose end a stop is zero, found by false position with halving (Illinois), each try a step of its
    /// own; the end taken is the one at or beyond zero.
    fn root<E>(
        &mut self,
        stop: Stop<'_>,
        until_s: f64,
        mut low: (f64, f64),
        mut high: (f64, f64),
        rate: &mut impl FnMut(f64, &[f64], &mut [f64]) -> Result<(), E>,
    ) -> Result<(f64, Trial), OdeFault<E>> {
        let scale = low.1.abs().max(high.1.abs());
        let mut last_side = 0;
        for _ in 0..60 {
            if high.1 <= 1e-13 * scale || high.0 - low.0 <= 1e-12 * (1.0 + self.time_s.abs()) {
                break;
            }
            let middle = high.0 - high.1 * (high.0 - low.0) / (high.1 - low.1);
            let middle = if middle > low.0 && middle < high.0 { middle } else { 0.5 * (low.0 + high.0) };
            let trial = self.trial(middle, until_s, rate)?;
            let value = stop(self.time_s + middle, &trial.state);
            if value >= 0.0 {
                high = (middle, value);
                if last_side == 1 {
                    low.1 *= 0.5;
                }
                last_side = 1;
            } else {
                low = (middle, value);
                if last_side == -1 {
                    high.1 *= 0.5;
                }
                last_side = -1;
            }
        }
        let trial = self.trial(high.0, until_s, rate)?;
        Ok((high.0, trial))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn control() -> StepControl {
        StepControl { relative: 1e-9, absolute: vec![1e-12; 2], longest_s: 1.0, shortest_s: 1e-10 }
    }

    fn swing(_: f64, y: &[f64], dy: &mut [f64]) -> Result<(), ()> {
        (dy[0], dy[1]) = (y[1], -y[0]);
        Ok(())
    }

    #[test]
    fn swings_as_the_sine() {
        let mut ode = Ode::new(0.0, vec![0.0, 1.0], control(), &mut swing).unwrap();
        while ode.time_s() < 10.0 {
            ode.advance(10.0, &[], &mut swing).unwrap();
        }
        assert!((ode.state()[0] - 10f64.sin()).abs() < 1e-7 && ode.evaluations() < 3000, "{ode:?}");
    }

    /// Halving the step divides the error of one step by 2^6.
    #[test]
    fn order_of_the_pair() {
        let error = |step: f64| {
            let mut ode = Ode::new(0.3, vec![0.3f64.sin(), 0.3f64.cos()], control(), &mut swing).unwrap();
            let trial = ode.trial(step, 9.0, &mut swing).unwrap();
            (trial.state[0] - (0.3 + step).sin()).hypot(trial.state[1] - (0.3 + step).cos())
        };
        let ratio = error(0.4) / error(0.2);
        assert!((50.0..85.0).contains(&ratio), "{ratio}");
    }

    #[test]
    fn stops_at_the_first_zero() {
        let mut ode = Ode::new(0.0, vec![0.0, 1.0], control(), &mut swing).unwrap();
        let late = |_: f64, y: &[f64]| y[0] - 0.9;
        let early = |_: f64, y: &[f64]| y[0] - 0.5;
        let mut hits = Vec::new();
        while hits.len() < 2 {
            if let Advance::Stopped(i) = ode.advance(3.0, &[&late, &early], &mut swing).unwrap() {
                hits.push((i, ode.time_s()));
            }
        }
        assert_eq!((hits[0].0, hits[1].0), (1, 0));
        assert!(
            (hits[0].1 - 0.5f64.asin()).abs() < 1e-8 && (hits[1].1 - 0.9f64.asin()).abs() < 1e-8,
            "{hits:?}"
        );
    }

    /// A rate that jumps at the end of a step does not reach into the step.
    #[test]
    fn a_jump_at_the_end_is_kept_out() {
        let mut jump = |t: f64, _: &[f64], dy: &mut [f64]| -> Result<(), ()> {
            dy[0] = if t < 1.0 { 1.0 } else { 1e6 };
            Ok(())
        };
        let mut ode = Ode::new(0.0, vec![0.0], control(), &mut jump).unwrap();
        while ode.time_s() < 1.0 {
            ode.advance(1.0, &[], &mut jump).unwrap();
        }
        assert!((ode.state()[0] - 1.0).abs() < 1e-12 && ode.evaluations() < 200);
    }

    #[test]
    fn a_rate_without_bound_is_told() {
        let mut blow = |_: f64, y: &[f64], dy: &mut [f64]| -> Result<(), ()> {
            dy[0] = y[0] * y[0];
            Ok(())
        };
        let mut ode = Ode::new(0.0, vec![1.0], control(), &mut blow).unwrap();
        let fault = loop {
            if let Err(fault) = ode.advance(2.0, &[], &mut blow) {
                break fault;
            }
            assert!(ode.time_s() < 1.01);
        };
        assert!(matches!(fault, OdeFault::StepTooShort(t) if (t - 1.0).abs() < 1e-6));
    }
}
