//! Shares of radiant power, of lumens and of photons: the same blend in three countings.
//!
//! With radiant shares pᵢ and a weight fᵢ of each emitter's unit power, the share in that kind is
//! pᵢ·fᵢ / Σ pⱼ·fⱼ. The weight is 1 (radiant), lm/W (luminous) or the mean wavelength in nm (photon: the photons of
//! one watt are λ̄/hc).

use super::{Pulled, Stuck, rebalance};
use project::{Member, ShareKind};

/// What one watt of an emitter counts for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Weights {
    /// Lumens of one watt of its light.
    pub lm_per_w: f64,
    /// Mean wavelength ∫Sλ/∫S over 380–780 nm.
    pub mean_wavelength_nm: f64,
}

impl Weights {
    /// The weight in a kind of share.
    pub fn of(&self, kind: ShareKind) -> f64 {
        match kind {
            ShareKind::Radiant => 1.0,
            ShareKind::Luminous => self.lm_per_w,
            ShareKind::Photon => self.mean_wavelength_nm,
        }
    }
}

/// Shares in `kind` of a blend given by radiant shares; all zero when nothing has weight.
///
/// *Units and shape*: both slices one entry a row; the answer sums to 1.
pub fn from_radiant(radiant: &[f64], weights: &[Weights], kind: ShareKind) -> Vec<f64> {
    let parts: Vec<f64> = radiant.iter().zip(weights).map(|(p, w)| p * w.of(kind)).collect();
    let total: f64 = parts.iter().sum();
    if total > 0.0 { parts.iter().map(|part| part / total).collect() } else { vec![0.0; parts.len()] }
}

/// Radiant shares of a blend given by shares in `kind`.
///
/// # Errors
/// When a row with a share has no weight in that kind, or nothing has a share.
pub fn to_radiant(shares: &[f64], weights: &[Weights], kind: ShareKind) -> Result<Vec<f64>, Stuck> {
    let mut parts = Vec::with_capacity(shares.len());
    for (share, weight) in shares.iter().zip(weights) {
        let weight = weight.of(kind);
        if *share > 0.0 && weight <= 0.0 {
            return Err(Stuck::NoWeight);
        }
        parts.push(if *share > 0.0 { share / weight } else { 0.0 });
    }
    let total: f64 = parts.iter().sum();
    if total > 0.0 && total.is_finite() {
        Ok(parts.iter().map(|part| part / total).collect())
    } else {
        Err(Stuck::NoLight)
    }
}

/// Gives row `row` the share `wanted` in `kind`; the other free rows keep their proportions and the locked rows their
/// radiant shares.
///
/// The radiant share q follows from wanted = q·f / (q·f + L + (H−q)·φ): L is what the locked rows weigh, H what they
/// leave, φ the mean weight of the other free rows.
///
/// # Errors
/// Why the row cannot move.
pub fn pull(
    members: &[Member],
    weights: &[Weights],
    row: usize,
    wanted: f64,
    kind: ShareKind,
) -> Result<Pulled, Stuck> {
    if kind == ShareKind::Radiant {
        return rebalance::pull(members, row, wanted);
    }
    let (low, high) = rebalance::span(members, row)?;
    let f = weights[row].of(kind);
    if f <= 0.0 {
        return Err(Stuck::NoWeight);
    }
    let others =
        || members.iter().zip(weights).enumerate().filter(|(k, (m, _))| *k != row && rebalance::is_free(m));
    let held: f64 = members
        .iter()
        .zip(weights)
        .filter(|(m, _)| m.on && m.locked)
        .map(|(m, w)| m.share * w.of(kind))
        .sum();
    let sum: f64 = others().map(|(_, (m, _))| m.share).sum();
    let phi = if sum > 1e-12 {
        others().map(|(_, (m, w))| m.share * w.of(kind)).sum::<f64>() / sum
    } else {
        others().map(|(_, (_, w))| w.of(kind)).sum::<f64>() / others().count() as f64
    };
    let wanted = if wanted.is_finite() { wanted.clamp(0.0, 1.0) } else { return Err(Stuck::NoRow) };
    let below = f * (1.0 - wanted) + wanted * phi;
    let q = if below > 0.0 { wanted * (held + high * phi) / below } else { high };
    let mut pulled = rebalance::pull(members, row, q)?;
    pulled.at_end |= q < low || q > high;
    Ok(pulled)
}

#[cfg(test)]
mod tests {
    use super::*;
    use project::EmitterId;
    use proptest::prelude::*;

    /// LER and mean wavelength of three Gaussians (455/25, 530/60, 612/80 nm), rounded.
    const ROWS: [Weights; 3] = [
        Weights { lm_per_w: 35.3, mean_wavelength_nm: 455.0 },
        Weights { lm_per_w: 504.6, mean_wavelength_nm: 530.2 },
        Weights { lm_per_w: 336.4, mean_wavelength_nm: 612.0 },
    ];

    /// Worked example of our methods notes (Gaussians at 4000 K): power .171/.307/.522 is lumens .018/.460/.522
    /// and photons .139/.291/.571.
    #[test]
    fn the_three_countings_of_one_white_differ() {
        let radiant = [0.171, 0.307, 0.522];
        let lumens = from_radiant(&radiant, &ROWS, ShareKind::Luminous);
        let photons = from_radiant(&radiant, &ROWS, ShareKind::Photon);
        for (found, stated) in lumens.iter().zip([0.018, 0.460, 0.522]) {
            assert!((found - stated).abs() < 0.001, "{lumens:?}");
        }
        for (found, stated) in photons.iter().zip([0.139, 0.291, 0.571]) {
            assert!((found - stated).abs() < 0.001, "{photons:?}");
        }
    }

    fn members(shares: &[f64]) -> Vec<Member> {
        shares
            .iter()
            .enumerate()
            .map(|(k, &share)| Member { share, ..Member::new(EmitterId(k as u64)) })
            .collect()
    }

    proptest! {
        #[test]
        fn kinds_convert_both_ways(a in 0.01..1.0_f64, b in 0.01..1.0_f64, c in 0.01..1.0_f64) {
            let total = a + b + c;
            let radiant = [a / total, b / total, c / total];
            for kind in [ShareKind::Radiant, ShareKind::Luminous, ShareKind::Photon] {
                let there = from_radiant(&radiant, &ROWS, kind);
                let back = to_radiant(&there, &ROWS, kind).unwrap();
                for (p, q) in radiant.iter().zip(back) { prop_assert!((p - q).abs() < 1e-12); }
            }
        }

        #[test]
        fn a_typed_share_is_met_in_its_own_kind(
            a in 0.01..1.0_f64, b in 0.01..1.0_f64, c in 0.01..1.0_f64, wanted in 0.0..1.0_f64, row in 0..3_usize,
            lock in 0..4_usize,
        ) {
            let total = a + b + c;
            let mut members = members(&[a / total, b / total, c / total]);
            if lock < 3 && lock != row { members[lock].locked = true; }
            for kind in [ShareKind::Luminous, ShareKind::Photon] {
                let pulled = pull(&members, &ROWS, row, wanted, kind).unwrap();
                let found = from_radiant(&pulled.shares, &ROWS, kind)[row];
                if pulled.at_end {
                    prop_assert!(found < wanted, "{found} {wanted}");
                } else {
                    prop_assert!((found - wanted).abs() < 1e-9, "{found} {wanted}");
                }
            }
        }
    }

    #[test]
    fn an_emitter_without_lumens_has_no_luminous_share_to_set() {
        let mut weights = ROWS;
        weights[0].lm_per_w = 0.0;
        let members = members(&[0.2, 0.3, 0.5]);
        assert_eq!(pull(&members, &weights, 0, 0.1, ShareKind::Luminous).unwrap_err(), Stuck::NoWeight);
        assert_eq!(to_radiant(&[0.1, 0.4, 0.5], &weights, ShareKind::Luminous).unwrap_err(), Stuck::NoWeight);
    }
}
