//! The best lm/W at each level of a rendering metric, and what each requirement and each emitter costs.

use super::{Aim, Basis, Refusal, asked, number, title, whole};
use crate::jobs::Token;
use crate::solving;
use optimiser::{Control, Grade, Levels, Outcome, Range, Requirement, Solution, Values};
use project::{EmitterId, Limit, Metric, Project, SetId};

/// Points of a curve.
const POINTS: usize = 24;
/// lm/W below which a price counts as nothing.
const NOTHING: f64 = 0.005;

/// One point of the curve.
#[derive(Debug, Clone, PartialEq)]
pub struct Point {
    /// The metric is at least this.
    pub level: f64,
    /// The most lm/W found.
    pub objective: f64,
    /// No blend at this level gives more than this.
    pub bound: Option<f64>,
    /// What the answer is worth.
    pub grade: Grade,
    /// The blend's numbers.
    pub values: Values,
    /// Radiant shares of the whole set, in row order.
    pub shares: Vec<f64>,
}

impl Point {
    fn of(level: f64, solution: &Solution, shares: Vec<f64>) -> Self {
        Self {
            level,
            objective: solution.objective,
            bound: solution.upper_bound,
            grade: solution.grade,
            values: solution.values,
            shares,
        }
    }

    /// (bound − objective) / objective, percent.
    pub fn gap_percent(&self) -> Option<f64> {
        self.bound.map(|bound| ((bound - self.objective) / self.objective * 100.0).max(0.0))
    }

    /// What the answer is worth, in a word or two.
    pub fn worth(&self) -> &'static str {
        match self.grade {
            Grade::Proven => "proven",
            Grade::Bounded => "bounded",
            Grade::BestFound => "best found",
        }
    }
}

/// The white spec as it stands, with lm/W made as large as it can be.
#[derive(Debug, Clone, PartialEq)]
pub enum Spec {
    /// The best blend within all limits.
    Met(Box<Point>),
    /// There is none.
    Refused(Refusal),
    /// It makes no question the optimiser could be asked.
    Unclear(String),
}

/// What one step of a requirement costs, by differences of problems solved again.
#[derive(Debug, Clone, PartialEq)]
pub struct PriceLine {
    /// What is moved.
    pub of: Requirement,
    /// lm/W given up for one step; negative when a step gains.
    pub cost: f64,
    /// The same on the easier and on the harder side, where those could be solved.
    pub sides: [Option<f64>; 2],
    /// The sentence.
    pub words: String,
}

/// What leaving one emitter out costs.
#[derive(Debug, Clone, PartialEq)]
pub struct DropLine {
    /// Which emitter.
    pub emitter: EmitterId,
    /// Its name.
    pub name: String,
    /// lm/W given up; `None` when no blend is left without it.
    pub price: Option<f64>,
}

/// The trade-off of a set.
#[derive(Debug, Clone, PartialEq)]
pub struct Trade {
    /// What it holds for.
    pub basis: Basis,
    /// The metric along the curve.
    pub metric: Metric,
    /// What is made as large as possible.
    pub aim: Aim,
    /// The spec as it stands.
    pub spec: Spec,
    /// The curve by ascending level; the floor of the metric and the limits of lm/W are left out, all others kept.
    pub curve: Vec<Point>,
    /// Why there is no curve.
    pub no_curve: Option<Refusal>,
    /// The limits of the metric and of lm/W, drawn as lines.
    pub limits: [Limit; 2],
    /// What each requirement costs, dearest first; empty when the spec is refused.
    pub prices: Vec<PriceLine>,
    /// What leaving each emitter out costs, dearest first; empty when the spec is refused.
    pub dropped: Vec<DropLine>,
}

/// Works out the trade-off of a set; `None` without such a set.
pub fn trade(project: &Project, set: SetId, metric: Metric, aim: Aim, token: &Token) -> Option<Trade> {
    let current = project.set(set)?;
    let limits = [*current.white.limits.of(metric), *current.white.limits.of(aim.metric())];
    let mut trade = Trade {
        basis: Basis::of_set(project, current),
        metric,
        aim,
        spec: Spec::Unclear(String::new()),
        curve: Vec::new(),
        no_curve: None,
        limits,
        prices: Vec::new(),
        dropped: Vec::new(),
    };
    let asked = match asked(project, set, aim) {
        Ok(asked) => asked,
        Err(sentence) => {
            trade.spec = Spec::Unclear(sentence);
            return Some(trade);
        }
    };
    let (problem, members) = (&asked.problem, &asked.members);
    let cancelled = token.flag();
    let done = |from: f64, to: f64| move |part: f32| token.progress(from + (to - from) * f64::from(part));
    let mut unclear = |error: optimiser::ProblemError| trade.spec = Spec::Unclear(error.to_string());

    token.note("the curve");
    let along = solving::metric(metric);
    let mut open = problem.clone();
    let mut range = open.limits.get(along);
    range.low = None;
    open.limits.set(along, range);
    // Either kind of lm/W follows from the curve: a floor under one of them is a line, not a constraint.
    for own in [Metric::Ler, Metric::Efficacy] {
        open.limits.set(solving::metric(own), Range::OPEN);
    }
    let step = done(0.0, 0.5);
    let control = Control { progress: &step, cancelled: &cancelled };
    let points = match optimiser::frontier(&open, along, &Levels::Adaptive(POINTS), &control) {
        Ok(points) => points,
        Err(error) => {
            unclear(error);
            return Some(trade);
        }
    };
    for point in &points {
        match &point.outcome {
            Outcome::Optimal(solution) => {
                let shares = whole(current, members, &solution.shares);
                trade.curve.push(Point::of(point.level, solution, shares));
            }
            Outcome::Infeasible(infeasible) if points.len() == 1 => {
                trade.no_curve = Some(Refusal::of(infeasible, current, members));
            }
            Outcome::Infeasible(_) => {}
        }
    }

    token.note("each emitter left out");
    let step = done(0.5, 0.8);
    let control = Control { progress: &step, cancelled: &cancelled };
    step(0.0);
    let (spec, dropped) = match optimiser::drop_each(problem, &control) {
        Ok(both) => both,
        Err(error) => {
            trade.spec = Spec::Unclear(error.to_string());
            return Some(trade);
        }
    };
    let best = match &spec {
        Outcome::Infeasible(infeasible) => {
            trade.spec = Spec::Refused(Refusal::of(infeasible, current, members));
            return Some(trade);
        }
        Outcome::Optimal(solution) => solution,
    };
    let level = best.values.get(along);
    trade.spec = Spec::Met(Box::new(Point::of(level, best, whole(current, members, &best.shares))));
    trade.dropped = dropped
        .iter()
        .map(|one| DropLine {
            emitter: current.members[members[one.emitter]].emitter,
            name: asked.sources.names[one.emitter].clone(),
            // What is smaller than the two proofs can tell apart is nothing.
            price: one.price.map(|price| price.max(0.0)),
        })
        .collect();
    trade.dropped.sort_by(|a, b| dear(b.price).total_cmp(&dear(a.price)));

    token.note("the price of each requirement");
    let step = done(0.8, 1.0);
    let control = Control { progress: &step, cancelled: &cancelled };
    step(0.0);
    if let Ok(prices) = optimiser::prices(problem, &control) {
        let own = solving::metric(aim.metric());
        trade.prices = prices
            .iter()
            .filter(|price| !matches!(price.of, Requirement::Low(m) | Requirement::High(m) if m == own))
            .map(|price| {
                let cost = -price.per_step;
                let sides = [price.easier_side.map(|side| -side), price.harder_side.map(|side| -side)];
                let words = price_words(price.of, cost, sides, current.white.cct_k);
                PriceLine { of: price.of, cost, sides, words }
            })
            .collect();
        // Limits before moves of the white, each dearest first.
        let of_white = |line: &PriceLine| matches!(line.of, Requirement::Duv | Requirement::Cct);
        trade
            .prices
            .sort_by(|a, b| of_white(a).cmp(&of_white(b)).then(b.cost.abs().total_cmp(&a.cost.abs())));
    }
    Some(trade)
}

fn dear(price: Option<f64>) -> f64 {
    price.unwrap_or(f64::INFINITY)
}

/// A price as a sentence. `sides` are the costs measured towards the easier and the harder side.
pub(super) fn price_words(of: Requirement, cost: f64, sides: [Option<f64>; 2], cct_k: f64) -> String {
    let amount = |cost: f64| format!("{} lm/W", number(cost.abs(), if cost.abs() < 0.095 { 2 } else { 1 }));
    let direction = |cost: f64| if cost < 0.0 { "gains" } else { "costs" };
    let (step, harder) = match of {
        Requirement::Low(metric) => (format!("One more point of {}", metric.title()), true),
        Requirement::High(metric) => (format!("One point of {} less at the top", metric.title()), true),
        Requirement::Duv => ("A white 0.001 of Duv higher".to_owned(), false),
        Requirement::Cct => (format!("A white {} K higher", number(cct_k / 100.0, 0)), false),
    };
    let unsolved = match sides {
        [_, None] if harder => " The next step leaves no blend.",
        [_, None] => " It leaves no blend there.",
        [None, _] if !harder => " The other way leaves no blend.",
        _ => "",
    };
    if cost.abs() < NOTHING {
        let why = if harder { "that limit does not hold the blend" } else { "the answer stays" };
        return format!("{step} costs nothing: {why}.{unsolved}");
    }
    let mut words = format!("{step} {} {}", direction(cost), amount(cost));
    if let [Some(easy), Some(hard)] = sides
        && (easy - hard).abs() > 0.2 * cost.abs().max(0.1)
    {
        words.push_str(&match (easy.abs() < NOTHING, hard.abs() < NOTHING) {
            (true, _) => format!(", and one less gives nothing back ({} ahead)", amount(hard)),
            (_, true) => format!(" behind and nothing ahead ({})", amount(easy)),
            _ => format!(" ({} behind, {} ahead)", number(easy, 1), number(hard, 1)),
        });
    }
    words.push('.');
    words.push_str(unsolved);
    words
}

impl Trade {
    /// The point of the curve nearest a level.
    pub fn nearest(&self, level: f64) -> Option<usize> {
        let far = |k: &usize| (self.curve[*k].level - level).abs();
        (0..self.curve.len()).min_by(|a, b| far(a).total_cmp(&far(b)))
    }

    /// The greatest gap of a point, percent; `None` when a point has no bound.
    pub fn greatest_gap_percent(&self) -> Option<f64> {
        self.curve.iter().map(Point::gap_percent).try_fold(0.0, |most: f64, gap| Some(most.max(gap?)))
    }

    /// The curve in words.
    pub fn words(&self) -> String {
        let (Some(first), Some(last)) = (self.curve.first(), self.curve.last()) else {
            return "There is no curve.".to_owned();
        };
        let proven = self.curve.iter().filter(|point| point.grade == Grade::Proven).count();
        format!(
            "{} against {}: {} point{}, from {} at {} {} to {} at {} {}; {proven} of them proven.",
            self.aim.words(),
            title(self.metric),
            self.curve.len(),
            if self.curve.len() == 1 { "" } else { "s" },
            number(first.objective, 1),
            title(self.metric),
            number(first.level, 1),
            number(last.objective, 1),
            title(self.metric),
            number(last.level, 1),
        )
    }

    /// The points as a table with tabs between the columns, for a spreadsheet; `names` are those of the set's rows.
    pub fn table(&self, names: &[String]) -> String {
        let mut head = vec![
            format!("{} at least", title(self.metric)),
            format!("{} (lm/W)", self.aim.words()),
            "no blend above (lm/W)".to_owned(),
            "gap (%)".to_owned(),
            "worth".to_owned(),
        ];
        head.extend(["Ra", "R9", "Rf", "Rg", "LER (lm/W)"].map(str::to_owned));
        head.extend(names.iter().map(|name| format!("{name} (radiant share)")));
        let mut lines = vec![head.join("\t")];
        for point in &self.curve {
            let v = &point.values;
            let mut cells = vec![
                format!("{:.3}", point.level),
                format!("{:.3}", point.objective),
                point.bound.map_or_else(String::new, |bound| format!("{bound:.3}")),
                point.gap_percent().map_or_else(String::new, |gap| format!("{gap:.4}")),
                point.worth().to_owned(),
            ];
            cells.extend([v.ra, v.r9, v.rf, v.rg].map(|value| format!("{value:.2}")));
            cells.push(format!("{:.2}", v.ler));
            cells.extend(point.shares.iter().map(|share| format!("{share:.6}")));
            lines.push(cells.join("\t"));
        }
        lines.join("\n") + "\n"
    }
}
