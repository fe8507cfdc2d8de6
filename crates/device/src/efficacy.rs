//! Best device lm/W over blends AND the form's freedoms, with a bound that covers every current.
//!
//! Knows no solver: the caller brings one that answers a linear question about blends ([`BlendSolver`]). Around
//! it runs the outer search: over intervals of the common current or voltage, best bound first, or over the
//! price of area for own currents. For own currents the least power is convex in the blend and concave in the
//! price, so with linear limits the best price closes the gap; rendering limits can leave some of it open, and
//! the bound says how much.

use crate::error::DeviceError;
use crate::power::{Cell, LeastPower, PowerModel, Row};

/// A linear question: over blends of one lumen that meet the white spec and these rows, the least
/// `Σ watts_per_radiant_w·p`, p in radiant watts per lumen.
#[derive(Debug, Clone, PartialEq)]
pub struct Question {
    /// Electrical watts per radiant watt of each emitter. All zero: any blend that meets the rows will do.
    pub watts_per_radiant_w: Vec<f64>,
    /// Linear limits on p.
    pub rows: Vec<Row>,
}

/// The answer to a [`Question`].
#[derive(Debug, Clone, PartialEq)]
pub struct Reply {
    /// Radiant shares of the best blend found, in set order.
    pub shares: Vec<f64>,
    /// A proven lower bound on the asked sum, electrical watts per lumen; `None` where nothing is proven.
    pub bound: Option<f64>,
}

/// What the outer search needs of a solver.
pub trait BlendSolver {
    /// Answers a question; `None` where no blend meets the spec and the rows.
    fn least(&mut self, question: &Question) -> Option<Reply>;
    /// Whether a blend (radiant shares) meets the white spec.
    fn meets(&mut self, shares: &[f64]) -> bool;
}

/// The best blend found for a device.
#[derive(Debug, Clone, PartialEq)]
pub struct BestEfficacy {
    /// Radiant shares.
    pub shares: Vec<f64>,
    /// Its least power and the freedoms that reach it.
    pub least: LeastPower,
    /// Lumens per electrical watt.
    pub efficacy_lm_per_w: f64,
    /// No blend of this set in this form gives more, at any current the sheets cover; `None` where the solver
    /// proved too little.
    pub bound_lm_per_w: Option<f64>,
    /// Linear questions asked.
    pub questions: usize,
}

/// How hard to try.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Effort {
    /// Stop at this relative gap between bound and blend.
    pub gap: f64,
    /// Most questions to the solver.
    pub questions: usize,
}

impl Default for Effort {
    fn default() -> Effort {
        Effort { gap: 1e-3, questions: 400 }
    }
}

/// Points tried on the chord between two blends.
const CHORD: u32 = 24;

struct Search<'a, S> {
    model: &'a PowerModel,
    solver: &'a mut S,
    lumens: f64,
    asked: usize,
    lumens_per_w: &'a [f64],
    best: Option<(Vec<f64>, LeastPower)>,
}

impl<S: BlendSolver> Search<'_, S> {
    /// Asks for one plane of a cell; returns the bound on the power in watts and the blend.
    fn ask(&mut self, cell: &Cell, plane: usize) -> Option<(Option<f64>, Vec<f64>)> {
        self.asked += 1;
        let plane = &cell.planes[plane];
        let scaled =
            |row: &Row| Row { per_radiant_w: row.per_radiant_w.clone(), at_most: row.at_most / self.lumens };
        let question = Question {
            watts_per_radiant_w: plane.per_radiant_w.clone(),
            rows: cell.rows.iter().map(scaled).collect(),
        };
        let reply = self.solver.least(&question)?;
        let constant = plane.per_radiant_w.iter().all(|c| *c == 0.0);
        let bound = if constant {
            Some(plane.constant_w)
        } else {
            reply.bound.map(|bound| plane.constant_w + bound * self.lumens)
        };
        self.offer(&reply.shares);
        Some((bound, reply.shares))
    }

    fn radiant(&self, shares: &[f64]) -> Vec<f64> {
        let lumens_per_w: f64 = shares.iter().zip(self.lumens_per_w).map(|(s, l)| s * l).sum();
        shares.iter().map(|share| share * self.lumens / lumens_per_w).collect()
    }

    /// Keeps a blend if it is the best so far; returns its power.
    fn offer(&mut self, shares: &[f64]) -> Option<f64> {
        let least = self.model.least_power(&self.radiant(shares)).ok()?;
        let watts = least.watts;
        if self.best.as_ref().is_none_or(|best| watts < best.1.watts) {
            self.best = Some((shares.to_vec(), least));
        }
        Some(watts)
    }

    /// Tries blends between two blends; those between are offered only where they meet the spec.
    fn along(&mut self, a: &[f64], b: &[f64]) {
        let between = |t: f64| -> Vec<f64> { a.iter().zip(b).map(|(a, b)| a + (b - a) * t).collect() };
        let (mut low, mut high) = (0.0, 1.0);
        for _ in 0..3 {
            let mut best = (f64::INFINITY, low);
            let step = (high - low) / f64::from(CHORD);
            for k in 0..=CHORD {
                let t = low + step * f64::from(k);
                let shares = between(t);
                if !self.solver.meets(&shares) {
                    continue;
                }
                if let Some(watts) = self.offer(&shares).filter(|watts| *watts < best.0) {
                    best = (watts, t);
                }
            }
            (low, high) = ((best.1 - step).max(0.0), (best.1 + step).min(1.0));
        }
    }

    fn watts(&self) -> f64 {
        self.best.as_ref().map_or(f64::INFINITY, |best| best.1.watts)
    }

    fn finish(self, bound_w: Option<f64>) -> Result<BestEfficacy, DeviceError> {
        let (shares, least) = self.best.ok_or_else(|| DeviceError::Unreachable {
            reason:
                "no blend that meets the white can be made at this level with the currents of the sheets: \
                     ask for less light, more lit area or other emitters"
                    .to_owned(),
        })?;
        Ok(BestEfficacy {
            shares,
            efficacy_lm_per_w: self.lumens / least.watts,
            // A bound of no power at all says nothing.
            bound_lm_per_w: bound_w
                .filter(|watts| *watts > 0.0)
                .map(|watts| self.lumens / watts.min(least.watts)),
            least,
            questions: self.asked,
        })
    }
}

/// The most lumens per electrical watt at a level, over every blend the solver admits and every freedom of the
/// form. `lumens` is the level in the model's basis (lm/m² of panel; lm for packages); `ler_lm_per_w` the
/// emitters' luminous efficacies.
///
/// # Errors
/// [`DeviceError::Unreachable`] where no admitted blend can be made at this level.
pub fn best_efficacy(
    model: &PowerModel,
    ler_lm_per_w: &[f64],
    lumens: f64,
    solver: &mut impl BlendSolver,
    effort: Effort,
) -> Result<BestEfficacy, DeviceError> {
    if ler_lm_per_w.len() != model.emitters() {
        let (expected, found) = (model.emitters(), ler_lm_per_w.len());
        return Err(DeviceError::LengthMismatch { what: "luminous efficacies", expected, found });
    }
    let mut search = Search { model, solver, lumens, asked: 0, lumens_per_w: ler_lm_per_w, best: None };
    let bound = if model.is_priced() {
        over_prices(&mut search, effort)
    } else {
        over_intervals(&mut search, effort)
    };
    search.finish(bound)
}

/// Best bound first over intervals of the common current or voltage.
fn over_intervals<S: BlendSolver>(search: &mut Search<'_, S>, effort: Effort) -> Option<f64> {
    // Intervals that may still hold something better: bound in watts and cell.
    let mut open: Vec<(f64, Cell)> = Vec::new();
    let mut proven = true;
    let mut consider = |search: &mut Search<'_, S>, cell: Cell, open: &mut Vec<(f64, Cell)>| {
        let mut bound = 0.0f64;
        for plane in 0..cell.planes.len() {
            match search.ask(&cell, plane) {
                None => return,
                Some((Some(value), _)) => bound = bound.max(value),
                Some((None, _)) => proven = false,
            }
        }
        open.push((bound, cell));
    };
    for cell in search.model.cells(12) {
        consider(search, cell, &mut open);
    }
    let mut closed = f64::INFINITY;
    loop {
        let lowest = (0..open.len()).min_by(|&a, &b| open[a].0.total_cmp(&open[b].0));
        let Some(index) = lowest else { break };
        let (bound, cell) = open.swap_remove(index);
        let enough = bound >= search.watts() * (1.0 - effort.gap);
        if enough || search.asked >= effort.questions || cell.high <= cell.low * (1.0 + 1e-7) {
            closed = closed.min(bound);
            if enough || search.asked >= effort.questions {
                break;
            }
            continue;
        }
        for half in search.model.split(&cell) {
            consider(search, half, &mut open);
        }
    }
    let bound = open.iter().map(|entry| entry.0).fold(closed, f64::min);
    (proven && bound.is_finite()).then_some(bound)
}

/// Over the price of area: the bound is concave in it.
fn over_prices<S: BlendSolver>(search: &mut Search<'_, S>, effort: Effort) -> Option<f64> {
    let (least, most) = search.model.price_range();
    let mut best_bound: Option<f64> = None;
    let mut unproven = false;
    let mut blends: Vec<(f64, Vec<f64>)> = Vec::new();
    let mut value = |search: &mut Search<'_, S>, price: f64, blends: &mut Vec<(f64, Vec<f64>)>| -> f64 {
        let cell = search.model.priced(price);
        match search.ask(&cell, 0) {
            // No blend fits even the tightest area: every price says the same.
            None => f64::NEG_INFINITY,
            Some((bound, shares)) => {
                blends.push((price, shares));
                unproven |= bound.is_none();
                let bound = bound.unwrap_or(f64::NEG_INFINITY);
                if best_bound.is_none_or(|best| bound > best) {
                    best_bound = Some(bound);
                }
                bound
            }
        }
    };
    value(search, 0.0, &mut blends);
    let golden = (5f64.sqrt() - 1.0) / 2.0;
    let (mut a, mut b) = (least.ln(), most.ln());
    let (mut c, mut d) = (b - golden * (b - a), a + golden * (b - a));
    let (mut fc, mut fd) = (value(search, c.exp(), &mut blends), value(search, d.exp(), &mut blends));
    while b - a > 1e-4 && search.asked + 1 < effort.questions {
        if fc >= fd {
            (b, d, fd) = (d, c, fc);
            c = b - golden * (b - a);
            fc = value(search, c.exp(), &mut blends);
        } else {
            (a, c, fc) = (c, d, fd);
            d = a + golden * (b - a);
            fd = value(search, d.exp(), &mut blends);
        }
    }
    // Where the best blend jumps with the price, the optimum lies between the two sides of the jump.
    blends.sort_by(|x, y| x.0.total_cmp(&y.0));
    let centre = (0.5 * (a + b)).exp();
    let above = blends.partition_point(|blend| blend.0 < centre);
    if above > 0 && above < blends.len() {
        let (left, right) = (blends[above - 1].1.clone(), blends[above].1.clone());
        search.along(&left, &right);
    }
    if let (Some(first), Some(best)) = (blends.first(), search.best.as_ref().map(|best| best.0.clone())) {
        let first = first.1.clone();
        search.along(&first, &best);
    }
    best_bound.filter(|bound| bound.is_finite() && !unproven)
}
