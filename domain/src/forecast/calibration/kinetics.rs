//! Simulated ferments: published fermentation models, solved. Test code; nothing here reaches a verdict.
//!
//! Coleman, Fish and Block, Appl. Environ. Microbiol. 73 (2007) 5875, eqs 1 to 8; Cramer, Vlassides and Block,
//! Biotechnol. Bioeng. 77 (2002) 49. The constants were READ in two programs each; the intercept of the fermentation
//! speed of the first, −2.30 or −2.98, is unconfirmed, so both are used.

/// Hours of one step.
const STEP_H: f64 = 0.25;

#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Model {
    /// Coleman with the intercept −2.30.
    ColemanFast,
    /// Coleman with the intercept −2.98.
    ColemanSlow,
    /// Cramer: of one temperature.
    Cramer,
}

/// What happens on the way.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Change {
    /// Nitrogen is added, mg N/L.
    Feed(f64),
    /// From here on it is so warm, °C.
    Degrees(f64),
}

/// A ferment before it starts.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Ferment {
    pub(super) model: Model,
    pub(super) degrees: f64,
    pub(super) nitrogen_mg_l: f64,
    pub(super) sugar_g_l: f64,
    pub(super) cells_g_l: f64,
    /// Changes with their hour, in order.
    pub(super) changes: Vec<(f64, Change)>,
}

/// Fractions of the sugar used, evenly spaced from pitching on.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Trajectory {
    hours: Vec<f64>,
    used: Vec<f64>,
}

struct Constants {
    growth: f64,
    nitrogen_half: f64,
    death: f64,
    speed: f64,
    sugar_half: f64,
    cells_per_nitrogen: f64,
    ethanol_per_sugar: f64,
}

/// Active cells, nitrogen, ethanol, sugar, all in g/L.
type State = [f64; 4];

impl Ferment {
    fn constants(&self, degrees: f64) -> Constants {
        let intercept = match self.model {
            Model::ColemanFast => -2.30,
            Model::ColemanSlow => -2.98,
            Model::Cramer => {
                return Constants {
                    growth: 0.16,
                    nitrogen_half: 0.010,
                    death: 1.0e-4,
                    speed: 0.3,
                    sugar_half: 10.0,
                    cells_per_nitrogen: 31.0,
                    ethanol_per_sugar: 0.47,
                };
            }
        };
        Constants {
            growth: (-3.92 + 0.0782 * degrees).exp(),
            nitrogen_half: (-4.73_f64).exp(),
            death: (-9.81 - 0.108 * degrees + 0.004_78 * degrees.powi(2)).exp(),
            speed: (intercept + 0.0771 * degrees).exp(),
            sugar_half: 2.33_f64.exp(),
            // Of the nitrogen at pitching, as in the reference trajectories.
            cells_per_nitrogen: (3.50 - 0.003_61 * self.nitrogen_mg_l).exp(),
            ethanol_per_sugar: (-0.598_f64).exp(),
        }
    }

    /// The first `hours`, by the classical Runge-Kutta method of fourth order.
    pub(super) fn run(&self, hours: f64) -> Trajectory {
        let mut state = [self.cells_g_l, self.nitrogen_mg_l / 1_000.0, 0.0, self.sugar_g_l];
        let mut constants = self.constants(self.degrees);
        let mut changes = self.changes.iter().peekable();
        let (mut hours_at, mut used) = (Vec::new(), Vec::new());
        for at_h in (0_u32..).map(|step| f64::from(step) * STEP_H).take_while(|&at| at <= hours) {
            while let Some((_, change)) = changes.next_if(|(due_h, _)| *due_h <= at_h) {
                match change {
                    Change::Feed(mg_l) => state[1] += mg_l / 1_000.0,
                    Change::Degrees(degrees) => constants = self.constants(*degrees),
                }
            }
            hours_at.push(at_h);
            used.push(1.0 - state[3] / self.sugar_g_l);
            state = constants.step(state);
        }
        Trajectory { hours: hours_at, used }
    }
}

impl Constants {
    fn rates(&self, [cells, nitrogen, ethanol, sugar]: State) -> State {
        let growth = self.growth * nitrogen / (self.nitrogen_half + nitrogen);
        let speed = self.speed * sugar / (self.sugar_half + sugar);
        [
            (growth - self.death * ethanol) * cells,
            -growth * cells / self.cells_per_nitrogen,
            speed * cells,
            -speed * cells / self.ethanol_per_sugar,
        ]
    }

    fn step(&self, from: State) -> State {
        let ahead = |rates: State, hours: f64| {
            let mut to = from;
            to.iter_mut().zip(rates).for_each(|(value, rate)| *value += hours * rate);
            to
        };
        let first = self.rates(from);
        let second = self.rates(ahead(first, STEP_H / 2.0));
        let third = self.rates(ahead(second, STEP_H / 2.0));
        let fourth = self.rates(ahead(third, STEP_H));
        let mean = [0, 1, 2, 3]
            .map(|at| (first[at] + 2.0 * second[at] + 2.0 * third[at] + fourth[at]) / 6.0);
        ahead(mean, STEP_H)
    }
}

impl Trajectory {
    /// From sugar left at even steps.
    pub(super) fn of_sugar(step_h: f64, sugar: &[f64]) -> Self {
        let used: Vec<f64> = sugar.iter().map(|left| 1.0 - left / sugar[0]).collect();
        let hours = (0_u32..).map(|step| f64::from(step) * step_h).take(used.len()).collect();
        Self { hours, used }
    }

    /// The fraction used at an hour since pitching: the cubic through four neighbours (Catmull and Rom); held at the
    /// ends.
    pub(super) fn at(&self, hour: f64) -> f64 {
        let last = self.used.len() - 1;
        let cell = self.hours.partition_point(|&at| at <= hour).clamp(1, last) - 1;
        let step_h = self.hours[1] - self.hours[0];
        let part = ((hour - self.hours[cell]) / step_h).clamp(0.0, 1.0);
        let of = |at: usize| self.used[at.min(last)];
        let (from, to) = (of(cell), of(cell + 1));
        let (rise_from, rise_to) =
            (0.5 * (to - of(cell.saturating_sub(1))), 0.5 * (of(cell + 2) - from));
        let bend = 3.0 * (to - from) - 2.0 * rise_from - rise_to;
        let twist = rise_from + rise_to - 2.0 * (to - from);
        from + part * (rise_from + part * (bend + part * twist))
    }

    /// The first hour at which so much is used, to seconds; `None` if it never is.
    pub(super) fn hour_of(&self, fraction: f64) -> Option<f64> {
        let above = self.used.iter().position(|&used| fraction <= used)?;
        let (mut early, mut late) = (self.hours[above.saturating_sub(1)], self.hours[above]);
        for _ in 0..20 {
            let middle = early.midpoint(late);
            if self.at(middle) < fraction { early = middle } else { late = middle }
        }
        Some(early.midpoint(late))
    }
}
