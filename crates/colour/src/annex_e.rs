//! Specification priorities of ANSI/IES TM-30 Annex E: preference, vividness, fidelity.

use crate::fidelity::Fidelity;
use serde::{Deserialize, Serialize};

/// The best priority level (1 is the strictest) a light reaches in each design intent; None where it reaches none.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
pub struct AnnexE {
    /// P1–P3.
    pub preference: Option<u8>,
    /// V1–V3.
    pub vividness: Option<u8>,
    /// F1–F3.
    pub fidelity: Option<u8>,
}

/// The levels a light reaches.
///
/// | | 1 | 2 | 3 |
/// |-|-|-|-|
/// | P | Rf ≥ 78, Rg ≥ 95, −1 ≤ Rcs,h1 ≤ 15 % | ≥ 75, ≥ 92, −7..19 % | ≥ 70, ≥ 89, −12..23 % |
/// | V | Rg ≥ 118, Rcs,h1 ≥ 15 % | ≥ 110, ≥ 6 % | ≥ 100, ≥ 0 % |
/// | F | Rf ≥ 95 | Rf ≥ 90, Rf,h1 ≥ 90 | ≥ 85, ≥ 85 |
///
/// Preference and vividness need Rg: where a hue bin is empty they are None. *Source:* ANSI/IES TM-30-20 Annex E.
pub fn annex_e(numbers: &Fidelity) -> AnnexE {
    let (rf, rg) = (numbers.rf, numbers.rg);
    let (red_shift, red_fidelity) = (numbers.rcs_bins[0], numbers.rf_bins[0]);
    let preference = rg.zip(red_shift).and_then(|(rg, shift)| {
        first_level([(78.0, 95.0, -1.0, 15.0), (75.0, 92.0, -7.0, 19.0), (70.0, 89.0, -12.0, 23.0)], |row| {
            rf >= row.0 && rg >= row.1 && (row.2..=row.3).contains(&shift)
        })
    });
    let vividness = rg.zip(red_shift).and_then(|(rg, shift)| {
        first_level([(118.0, 15.0), (110.0, 6.0), (100.0, 0.0)], |row| rg >= row.0 && shift >= row.1)
    });
    let fidelity = if rf >= 95.0 {
        Some(1)
    } else {
        red_fidelity
            .and_then(|red| first_level([90.0, 85.0], |least| rf >= least && red >= least))
            .map(|level| level + 1)
    };
    AnnexE { preference, vividness, fidelity }
}

fn first_level<const N: usize, T: Copy>(rows: [T; N], met: impl Fn(T) -> bool) -> Option<u8> {
    (1..).zip(rows).find(|(_, row)| met(*row)).map(|(level, _)| level)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn light(rf: f64, rg: f64, red_shift: f64, red_fidelity: f64) -> Fidelity {
        let mut rcs_bins = [Some(0.0); 16];
        rcs_bins[0] = Some(red_shift);
        let mut rf_bins = [Some(rf); 16];
        rf_bins[0] = Some(red_fidelity);
        Fidelity {
            rf,
            rg: Some(rg),
            samples: [rf; 99],
            rf_bins,
            rcs_bins,
            rhs_bins: [Some(0.0); 16],
            test_means: [None; 16],
            reference_means: [None; 16],
        }
    }

    #[test]
    fn levels_begin_at_their_limits() {
        let of = |rf, rg, shift, red| annex_e(&light(rf, rg, shift, red));
        assert_eq!(of(78.0, 95.0, -1.0, 60.0).preference, Some(1));
        assert_eq!(of(78.0, 95.0, -1.1, 60.0).preference, Some(2));
        assert_eq!(of(74.9, 95.0, 0.0, 60.0).preference, Some(3));
        assert_eq!(of(69.9, 95.0, 0.0, 60.0).preference, None);
        assert_eq!(of(60.0, 118.0, 15.0, 50.0).vividness, Some(1));
        assert_eq!(of(60.0, 112.0, 15.0, 50.0).vividness, Some(2));
        assert_eq!(of(60.0, 99.0, 15.0, 50.0).vividness, None);
        assert_eq!(of(95.0, 100.0, 0.0, 10.0).fidelity, Some(1));
        assert_eq!(of(94.0, 100.0, 0.0, 91.0).fidelity, Some(2));
        assert_eq!(of(94.0, 100.0, 0.0, 86.0).fidelity, Some(3));
        assert_eq!(of(94.0, 100.0, 0.0, 84.0).fidelity, None);
    }

    #[test]
    fn without_rg_only_fidelity_is_judged() {
        let mut numbers = light(92.0, 100.0, 0.0, 92.0);
        numbers.rg = None;
        assert_eq!(annex_e(&numbers), AnnexE { preference: None, vividness: None, fidelity: Some(2) });
    }
}
