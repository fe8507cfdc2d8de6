//! The blend with the most lumens per electrical watt of the device itself: the optimiser's blends, the build form's
//! own power, currents and areas searched together.

use super::{Devices, MakingError, level};
use crate::solving::{SetProblem, measure_blend, set_problem, value_of};
use crate::state::derived::WhiteRegion;
use device::efficacy::{BlendSolver, Effort, Question, Reply, best_efficacy};
use device::{Build, Level};
use optimiser::{Budget, Control, Grade, LinearRow, Objective, Outcome, Problem};
use project::{EmitterSet, Metric, Project, RecipePlan, WhiteSpec};

/// Boxes the proof of one question may examine.
const BOXES_PER_QUESTION: u64 = 4000;
/// Questions asked at most.
const QUESTIONS: usize = 90;
/// How far a limit may be missed by rounding.
const SLACK: f64 = 1e-6;

/// The best blend found for a device.
#[derive(Debug, Clone, PartialEq)]
pub struct DeviceBest {
    /// Radiant shares in the order of the set's members.
    pub shares: Vec<f64>,
    /// Lumens per electrical watt of the device, driver not counted.
    pub efficacy_lm_per_w: f64,
    /// No blend in this form gives more at any current the sheets cover; `None` where nothing is proven.
    pub bound_lm_per_w: Option<f64>,
    /// (bound − efficacy)/efficacy.
    pub gap: Option<f64>,
    /// What the answer is worth.
    pub grade: Grade,
    /// The same in a sentence.
    pub sentence: String,
    /// Blends asked of the optimiser.
    pub questions: usize,
}

/// The best blend of a set for a plan's device, at the wanted amount of light.
///
/// # Errors
/// Sheets that lack what power needs; a white spec no blend meets at this level.
pub fn best_for_device(
    project: &Project,
    set: &EmitterSet,
    plan: &RecipePlan,
    control: &Control<'_>,
) -> Result<DeviceBest, MakingError> {
    let devices = Devices::of(project, set, plan)?;
    let mut build = plan.build.clone();
    let level = level(set, &mut build, &devices, &mut Vec::new());
    let model = build.power_model(&devices.emitters)?;
    let mut base = set_problem_without_efficacy(project, set)?;
    base.problem.emitters = devices.tensors.subset(&places(set, &base, &devices));
    let mut solver = Solver {
        places: places(set, &base, &devices),
        emitters: devices.emitters.len(),
        devices: &devices,
        white: &set.white,
        region: WhiteRegion::of(&set.white),
        problem: base.problem,
        control,
        unproven: false,
    };
    let ler: Vec<f64> = devices.emitters.iter().map(|e| e.light.ler_lm_per_w).collect();
    let lumens = lumens(&build, &devices, level)?;
    let effort = Effort { gap: 1e-3, questions: QUESTIONS };
    let best = best_efficacy(&model, &ler, lumens, &mut solver, effort)?;
    let bound = best.bound_lm_per_w.filter(|_| !solver.unproven);
    let gap = bound.map(|bound| (bound / best.efficacy_lm_per_w - 1.0).max(0.0));
    let grade = Grade::of(gap);
    let share_of = |id| {
        let place = devices.ids.iter().position(|other| *other == id);
        place.map_or(0.0, |place| best.shares[place])
    };
    Ok(DeviceBest {
        shares: set.members.iter().map(|m| share_of(m.emitter)).collect(),
        efficacy_lm_per_w: best.efficacy_lm_per_w,
        bound_lm_per_w: bound,
        gap,
        grade,
        sentence: sentence(best.efficacy_lm_per_w, bound, gap, grade),
        questions: best.questions,
    })
}

fn sentence(efficacy: f64, bound: Option<f64>, gap: Option<f64>, grade: Grade) -> String {
    match (grade, bound, gap) {
        (Grade::Proven, Some(bound), _) => format!(
            "{efficacy:.2} lm/W, proven: no blend of these emitters in this build form exceeds {bound:.2} lm/W at any current \
             of the sheets"
        ),
        (_, Some(bound), Some(gap)) => format!(
            "{efficacy:.2} lm/W at these working currents; over all currents of the sheets no blend exceeds {bound:.2} lm/W \
             (gap {:.1} %)",
            100.0 * gap
        ),
        _ => format!(
            "{efficacy:.2} lm/W, the best found at these working currents; nothing is proven over others"
        ),
    }
}

/// The set's problem with what the device decides left out.
fn set_problem_without_efficacy(project: &Project, set: &EmitterSet) -> Result<SetProblem, MakingError> {
    let mut own = project.clone();
    if let Some(row) = own.set_mut(set.id) {
        row.clone_from(set);
        row.white.maximise = project::Maximise::Ler;
        row.white.limits.efficacy = project::Limit::default();
    }
    let mut base = set_problem(&own, set.id)?;
    base.problem.wall_plug.clear();
    base.problem.budget = Budget { boxes: BOXES_PER_QUESTION, seconds: None };
    Ok(base)
}

/// Place among the devices of every emitter of the problem.
fn places(set: &EmitterSet, base: &SetProblem, devices: &Devices) -> Vec<usize> {
    let place = |member: &usize| {
        let id = set.members[*member].emitter;
        devices.ids.iter().position(|other| *other == id).expect("every member that is on is a device")
    };
    base.members.iter().map(place).collect()
}

/// Lumens in the model's basis: per m² of panel, of the board for packages.
fn lumens(build: &Build, devices: &Devices, level: Level) -> Result<f64, MakingError> {
    let radiant = build.radiant_powers(&devices.emitters, &devices.shares, level)?;
    Ok(radiant.iter().zip(&devices.emitters).map(|(watts, e)| watts * e.light.ler_lm_per_w).sum())
}

struct Solver<'a, 'c> {
    problem: Problem,
    places: Vec<usize>,
    emitters: usize,
    devices: &'a Devices,
    white: &'a WhiteSpec,
    region: WhiteRegion,
    control: &'a Control<'c>,
    unproven: bool,
}

impl Solver<'_, '_> {
    fn pick(&self, all: &[f64]) -> Vec<f64> {
        self.places.iter().map(|place| all[*place]).collect()
    }
}

impl BlendSolver for Solver<'_, '_> {
    fn least(&mut self, question: &Question) -> Option<Reply> {
        if self.control.stop() {
            self.unproven = true;
            return None;
        }
        let mut problem = self.problem.clone();
        let costs = self.pick(&question.watts_per_radiant_w);
        let dearest = costs.iter().copied().fold(0.0, f64::max);
        if dearest > 0.0 {
            // A cost of nothing is no efficiency; one part in 10⁹ of the dearest changes no answer.
            problem.wall_plug = costs.iter().map(|cost| 1.0 / cost.max(1e-9 * dearest)).collect();
            problem.maximise = Objective::Efficacy;
        }
        problem.rows = question
            .rows
            .iter()
            .map(|row| LinearRow { coefficients: self.pick(&row.per_radiant_w), at_most: row.at_most })
            .collect();
        match optimiser::solve(&problem, self.control).ok()? {
            Outcome::Optimal(found) => {
                let mut shares = vec![0.0; self.emitters];
                for (place, share) in self.places.iter().zip(&found.shares) {
                    shares[*place] = *share;
                }
                let bound = if dearest > 0.0 { found.upper_bound.map(|most| 1.0 / most) } else { Some(0.0) };
                Some(Reply { shares, bound })
            }
            Outcome::Infeasible(why) => {
                self.unproven |= !why.proven;
                None
            }
        }
    }

    fn meets(&mut self, shares: &[f64]) -> bool {
        let measured = measure_blend(&self.devices.tensors.blend(shares), self.white);
        let margin = self.region.margin_uv_prime(measured.uv_prime(), measured.cct_duv());
        let exact = self.region.outline.is_empty();
        if margin < if exact { crate::state::derived::region::ON_TARGET_UV_PRIME - 1e-7 } else { -1e-9 } {
            return false;
        }
        Metric::ALL.into_iter().filter(|metric| *metric != Metric::Efficacy).all(|metric| {
            let limit = self.white.limits.of(metric);
            limit.is_open()
                || value_of(metric, &measured, shares, &[])
                    .and_then(|value| limit.margin(value))
                    .is_some_and(|margin| margin >= -SLACK)
        })
    }
}
