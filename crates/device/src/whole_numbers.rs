//! Whole numbers of units or packages: the combination whose white comes closest.

use crate::light::{delta_uv_prime, uv_of_xyz};

/// Combinations looked at one by one; beyond this the search goes along multiples of the real solution.
pub const EXHAUSTIVE_LIMIT: f64 = 3e6;

/// The closest combination.
#[derive(Debug, Clone, PartialEq)]
pub struct Closest {
    /// Whole number of each kind.
    pub counts: Vec<u32>,
    /// Distance in u′v′ from the target.
    pub delta_uv_prime: f64,
    /// Whether every combination was looked at.
    pub exhaustive: bool,
}

/// What is searched.
#[derive(Debug, Clone, PartialEq)]
pub struct WholeNumbers {
    /// Tristimulus values one unit of each kind adds (any common scale; Y proportional to lumens).
    pub xyz_each: Vec<[f64; 3]>,
    /// Target u′, v′.
    pub target: (f64, f64),
    /// Least count of each kind.
    pub at_least: Vec<u32>,
    /// Most units in all.
    pub at_most: u32,
    /// Least total of Y, in the scale of `xyz_each`; 0 for none.
    pub least_y: f64,
}

impl WholeNumbers {
    /// The combination with the least Δu′v′ (ties: the fewest units); `None` where none meets the limits.
    pub fn closest(&self) -> Option<Closest> {
        let kinds = self.xyz_each.len();
        let least: u32 = self.at_least.iter().sum();
        if kinds == 0 || self.at_least.len() != kinds || least > self.at_most {
            return None;
        }
        let spare = self.at_most - least;
        if combinations(kinds, spare) <= EXHAUSTIVE_LIMIT {
            return self.exhaustive(spare);
        }
        self.along_the_real_solution()
    }

    fn exhaustive(&self, spare: u32) -> Option<Closest> {
        let mut counts = self.at_least.clone();
        let mut best: Option<Closest> = None;
        self.descend(0, spare, &mut counts, &mut best);
        best
    }

    fn descend(&self, kind: usize, spare: u32, counts: &mut Vec<u32>, best: &mut Option<Closest>) {
        if kind == counts.len() {
            self.offer(counts, true, best);
            return;
        }
        let base = counts[kind];
        for extra in 0..=spare {
            counts[kind] = base + extra;
            self.descend(kind + 1, spare - extra, counts, best);
        }
        counts[kind] = base;
    }

    fn offer(&self, counts: &[u32], exhaustive: bool, best: &mut Option<Closest>) {
        let mut xyz = [0.0; 3];
        for (&count, each) in counts.iter().zip(&self.xyz_each) {
            for (sum, part) in xyz.iter_mut().zip(each) {
                *sum += f64::from(count) * part;
            }
        }
        if xyz[1] < self.least_y * (1.0 - 1e-12) {
            return;
        }
        let delta = delta_uv_prime(uv_of_xyz(xyz), Some(self.target));
        if !delta.is_finite() {
            return;
        }
        let better = best.as_ref().is_none_or(|best| {
            let fewer = counts.iter().sum::<u32>() < best.counts.iter().sum::<u32>();
            delta < best.delta_uv_prime - 1e-12 || (delta <= best.delta_uv_prime + 1e-12 && fewer)
        });
        if better {
            *best = Some(Closest { counts: counts.to_vec(), delta_uv_prime: delta, exhaustive });
        }
    }

    /// Every total up to the limit, started from proportional counts and improved by single exchanges.
    fn along_the_real_solution(&self) -> Option<Closest> {
        let kinds = self.xyz_each.len();
        let mut best: Option<Closest> = None;
        let mut start = self.at_least.clone();
        loop {
            // Climb one unit at a time towards the target, then polish by moves of one unit.
            let mut local: Option<Closest> = None;
            self.offer(&start, false, &mut local);
            let mut counts = start.clone();
            loop {
                let mut moved: Option<Closest> = None;
                for from in 0..=kinds {
                    for to in 0..=kinds {
                        let mut trial = counts.clone();
                        if from < kinds {
                            if trial[from] <= self.at_least[from] {
                                continue;
                            }
                            trial[from] -= 1;
                        }
                        if to < kinds {
                            trial[to] += 1;
                        }
                        if trial.iter().sum::<u32>() <= self.at_most {
                            self.offer(&trial, false, &mut moved);
                        }
                    }
                }
                let improved = match (&moved, &local) {
                    (Some(m), Some(l)) => m.delta_uv_prime < l.delta_uv_prime - 1e-12,
                    (Some(_), None) => true,
                    _ => false,
                };
                if !improved {
                    break;
                }
                if let Some(m) = &moved {
                    counts.clone_from(&m.counts);
                }
                local = moved;
            }
            if let Some(found) = local {
                self.offer(&found.counts, false, &mut best);
            }
            // The next start adds the unit that leaves the white closest.
            let mut next: Option<Closest> = None;
            for kind in 0..kinds {
                let mut trial = start.clone();
                trial[kind] += 1;
                let loose = WholeNumbers { least_y: 0.0, ..self.clone() };
                loose.offer(&trial, false, &mut next);
            }
            match next {
                Some(next) if next.counts.iter().sum::<u32>() <= self.at_most => start = next.counts,
                _ => return best,
            }
        }
    }
}

/// Number of ways to spread up to `spare` units over `kinds`: C(spare + kinds, kinds).
fn combinations(kinds: usize, spare: u32) -> f64 {
    (1..=kinds).map(|k| (f64::from(spare) + k as f64) / k as f64).product()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn xyz(x: f64, y: f64, lumens: f64) -> [f64; 3] {
        [lumens * x / y, lumens, lumens * (1.0 - x - y) / y]
    }

    fn problem(at_most: u32, least_y: f64) -> WholeNumbers {
        WholeNumbers {
            xyz_each: vec![xyz(0.15, 0.05, 10.0), xyz(0.22, 0.70, 60.0), xyz(0.66, 0.34, 40.0)],
            target: (0.2246, 0.5023),
            at_least: vec![1, 1, 1],
            at_most,
            least_y,
        }
    }

    #[test]
    fn the_closest_white_is_no_worse_than_any_combination_tried_by_hand() {
        let problem = problem(14, 500.0);
        let found = problem.closest().unwrap();
        assert!(found.exhaustive);
        for a in 1..=12u32 {
            for b in 1..=12u32 {
                for c in 1..=12u32 {
                    if a + b + c > 14 {
                        continue;
                    }
                    let mut only = None;
                    problem.offer(&[a, b, c], true, &mut only);
                    if let Some(only) = only {
                        assert!(found.delta_uv_prime <= only.delta_uv_prime + 1e-12, "{a} {b} {c}");
                    }
                }
            }
        }
    }

    #[test]
    fn the_search_along_the_real_solution_comes_close_to_the_full_one() {
        for at_most in [8, 14, 22] {
            let problem = problem(at_most, 0.0);
            let full = problem.closest().unwrap();
            let along = problem.along_the_real_solution().unwrap();
            assert!(!along.exhaustive);
            assert!(along.delta_uv_prime <= full.delta_uv_prime * 1.5 + 1e-3, "{at_most}");
        }
    }

    #[test]
    fn too_few_units_for_the_lumens_is_no_answer() {
        assert_eq!(problem(3, 1e6).closest(), None);
        assert_eq!(problem(2, 0.0).closest(), None);
    }
}
