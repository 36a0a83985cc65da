//! Ordinary differential equations: an adaptive Runge-Kutta pair of order 5(4)
//! with a continuous extension.
//!
//! The step is limited by the tolerance and never by the moments that are asked
//! for: those are interpolated within the step, so a slow model costs next to
//! nothing and its course does not depend on who looks at it.
//! Coefficients: J. R. Dormand, P. J. Prince, "A family of embedded Runge-Kutta
//! formulae" (1980); continuous extension as in Hairer, Norsett, Wanner, "Solving
//! Ordinary Differential Equations I" (from memory; the tests hold their orders).

/// How far a step may stray.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tolerance {
    /// Error allowed per step, in the state's own unit.
    pub absolute: f64,
    /// Longest step, s.
    pub longest: f64,
}

/// One solution followed through time: the present step and its interpolation.
#[derive(Debug, Clone, PartialEq)]
pub struct Solver<const N: usize> {
    tolerance: Tolerance,
    from: f64,
    to: f64,
    /// Coefficients of the continuous extension over `from..=to`.
    dense: [[f64; N]; 5],
    /// Step to try next, s.
    next: f64,
}

/// Shortest step, s. It is taken as it is, and the state stays where it was if the
/// step leads nowhere: better a coarse answer than none, whatever the model says.
const SHORTEST: f64 = 1e-3;

const A: [[f64; 6]; 6] = [
    [1.0 / 5.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [3.0 / 40.0, 9.0 / 40.0, 0.0, 0.0, 0.0, 0.0],
    [44.0 / 45.0, -56.0 / 15.0, 32.0 / 9.0, 0.0, 0.0, 0.0],
    [
        19372.0 / 6561.0,
        -25360.0 / 2187.0,
        64448.0 / 6561.0,
        -212.0 / 729.0,
        0.0,
        0.0,
    ],
    [
        9017.0 / 3168.0,
        -355.0 / 33.0,
        46732.0 / 5247.0,
        49.0 / 176.0,
        -5103.0 / 18656.0,
        0.0,
    ],
    [
        35.0 / 384.0,
        0.0,
        500.0 / 1113.0,
        125.0 / 192.0,
        -2187.0 / 6784.0,
        11.0 / 84.0,
    ],
];
const C: [f64; 6] = [1.0 / 5.0, 3.0 / 10.0, 4.0 / 5.0, 8.0 / 9.0, 1.0, 1.0];
/// Fifth-order minus fourth-order weights.
const E: [f64; 7] = [
    71.0 / 57600.0,
    0.0,
    -71.0 / 16695.0,
    71.0 / 1920.0,
    -17253.0 / 339_200.0,
    22.0 / 525.0,
    -1.0 / 40.0,
];
/// Weights of the continuous extension's last term.
const D: [f64; 7] = [
    -12_715_105_075.0 / 11_282_082_432.0,
    0.0,
    87_487_479_700.0 / 32_700_410_799.0,
    -10_690_763_975.0 / 1_880_347_072.0,
    701_980_252_875.0 / 199_316_789_632.0,
    -1_453_857_185.0 / 822_651_844.0,
    69_997_945.0 / 29_380_423.0,
];

impl<const N: usize> Solver<N> {
    /// A solution that stands at `state` at time `t`.
    pub fn new(tolerance: Tolerance, t: f64, state: [f64; N]) -> Self {
        let mut solver = Self {
            tolerance,
            from: t,
            to: t,
            dense: [[0.0; N]; 5],
            next: 0.0,
        };
        solver.restart(t, state);
        solver
    }

    /// Begins anew at `t`: after an event the course has a kink, which no step
    /// may cross.
    pub fn restart(&mut self, t: f64, state: [f64; N]) {
        (self.from, self.to) = (t, t);
        self.dense = [[0.0; N]; 5];
        self.dense[0] = state;
        self.next = (self.tolerance.longest * 1e-3).max(1e-3);
    }

    /// Where the present step ends, s.
    pub fn end(&self) -> f64 {
        self.to
    }

    /// Where the present step began, s.
    pub fn begin(&self) -> f64 {
        self.from
    }

    /// The state at `t`, which is held within the present step.
    pub fn at(&self, t: f64) -> [f64; N] {
        let length = self.to - self.from;
        let theta = if length > 0.0 {
            ((t - self.from) / length).clamp(0.0, 1.0)
        } else {
            0.0
        };
        let back = 1.0 - theta;
        let [r1, r2, r3, r4, r5] = &self.dense;
        std::array::from_fn(|i| {
            r1[i] + theta * (r2[i] + back * (r3[i] + theta * (r4[i] + back * r5[i])))
        })
    }

    /// Goes one step on from the present step's end.
    pub fn step(&mut self, slope: impl Fn(f64, &[f64; N]) -> [f64; N]) {
        let start = self.at(self.to);
        let t = self.to;
        let first = slope(t, &start);
        let mut h = self.next.min(self.tolerance.longest);
        loop {
            let trial = try_step(t, &start, first, h, &slope);
            let ratio = trial.error / self.tolerance.absolute;
            if ratio <= 1.0 || h <= SHORTEST {
                self.next = (h * growth(ratio)).max(SHORTEST);
                self.accept(t, h, start, &trial);
                return;
            }
            h = (h * growth(ratio).min(0.9)).max(SHORTEST);
        }
    }

    fn accept(&mut self, t: f64, h: f64, start: [f64; N], trial: &Trial<N>) {
        let k = &trial.slopes;
        (self.from, self.to) = (t, t + h);
        for i in 0..N {
            let change = trial.end[i] - start[i];
            let bend = h * k[0][i] - change;
            self.dense[0][i] = start[i];
            self.dense[1][i] = change;
            self.dense[2][i] = bend;
            self.dense[3][i] = change - h * k[6][i] - bend;
            self.dense[4][i] = h * (0..7).map(|s| D[s] * k[s][i]).sum::<f64>();
        }
        if !self.dense.iter().flatten().all(|value| value.is_finite()) {
            self.dense = [[0.0; N]; 5];
            self.dense[0] = start;
        }
    }
}

struct Trial<const N: usize> {
    slopes: [[f64; N]; 7],
    end: [f64; N],
    error: f64,
}

fn try_step<const N: usize>(
    t: f64,
    start: &[f64; N],
    first: [f64; N],
    h: f64,
    slope: &impl Fn(f64, &[f64; N]) -> [f64; N],
) -> Trial<N> {
    let mut slopes = [[0.0; N]; 7];
    slopes[0] = first;
    let mut end = *start;
    for stage in 0..6 {
        for i in 0..N {
            let sum: f64 = (0..=stage).map(|s| A[stage][s] * slopes[s][i]).sum();
            end[i] = start[i] + h * sum;
        }
        slopes[stage + 1] = slope(t + C[stage] * h, &end);
    }
    let error = (0..N)
        .map(|i| (h * (0..7).map(|s| E[s] * slopes[s][i]).sum::<f64>()).abs())
        // `max` would drop a NaN, and with it a step that must be refused.
        .fold(0.0, |worst, e| if e <= worst { worst } else { e });
    Trial { slopes, end, error }
}

/// Factor on the step for an error of `ratio` tolerances.
fn growth(ratio: f64) -> f64 {
    if ratio.is_finite() {
        (0.9 * libm::pow(ratio.max(1e-10), -0.2)).clamp(0.2, 5.0)
    } else {
        0.2
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::cell::Cell;

    const FINE: Tolerance = Tolerance {
        absolute: 1e-9,
        longest: 60.0,
    };

    #[test]
    fn a_cooling_body_follows_its_exact_solution_at_every_moment() {
        // y' = -(y - 25)/300 from 125: y = 25 + 100 exp(-t/300).
        let mut solver = Solver::new(FINE, 0.0, [125.0]);
        let mut t = 0.0;
        while t < 3000.0 {
            while solver.end() < t {
                solver.step(|_, y| [-(y[0] - 25.0) / 300.0]);
            }
            let exact = 25.0 + 100.0 * libm::exp(-t / 300.0);
            assert!((solver.at(t)[0] - exact).abs() < 1e-6, "at {t}");
            t += 0.7;
        }
    }

    #[test]
    fn an_oscillation_keeps_its_phase() {
        // y'' = -y: after ten periods cos and -sin are back at 1 and 0.
        let mut solver = Solver::new(FINE, 0.0, [1.0, 0.0]);
        let end = 20.0 * std::f64::consts::PI;
        while solver.end() < end {
            solver.step(|_, y| [y[1], -y[0]]);
        }
        let [cos, sin] = solver.at(end);
        assert!((cos - 1.0).abs() < 1e-6 && sin.abs() < 1e-6, "{cos} {sin}");
    }

    #[test]
    fn the_order_is_five_at_the_ends_and_four_between() {
        // y' = y cos t: y = exp(sin t), over one step of a fixed length.
        let errors = |h: f64| {
            let slope = |t: f64, y: &[f64; 1]| [y[0] * t.cos()];
            let start = [libm::exp(libm::sin(1.0))];
            let trial = try_step(1.0, &start, slope(1.0, &start), h, &slope);
            let mut solver = Solver::new(FINE, 1.0, start);
            solver.accept(1.0, h, start, &trial);
            let off = |t: f64| (solver.at(t)[0] - libm::exp(libm::sin(t))).abs();
            (off(1.0 + h), off(1.0 + 0.37 * h))
        };
        let ((end, between), (end2, between2)) = (errors(0.2), errors(0.1));
        assert!(
            (end / end2).log2() > 5.5,
            "local order {}",
            (end / end2).log2()
        );
        assert!((between / between2).log2() > 4.5);
    }

    #[test]
    fn steps_are_few_where_little_happens() {
        let calls = Cell::new(0);
        let tolerance = Tolerance {
            absolute: 1e-5,
            longest: 60.0,
        };
        let mut solver = Solver::new(tolerance, 0.0, [25.0]);
        while solver.end() < 3600.0 {
            solver.step(|_, y| {
                calls.set(calls.get() + 1);
                [-(y[0] - 80.0) / 300.0]
            });
        }
        assert!(calls.get() < 900, "{} evaluations", calls.get());
    }

    #[test]
    fn a_course_that_runs_away_still_goes_on_and_stays_finite() {
        for slope in [|y: f64| y * y, |y: f64| -1e9 * y, |_: f64| f64::NAN] {
            let mut solver = Solver::new(FINE, 0.0, [1.0]);
            while solver.end() < 10.0 {
                solver.step(|_, y| [slope(y[0])]);
            }
            assert!(solver.at(10.0)[0].is_finite());
        }
    }
}
