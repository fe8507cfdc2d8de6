//! One share is set; the free rows make up for it in proportion to what they have.

use super::{Pulled, Stuck, settle};
use project::Member;

/// True when a row's share may be changed by moving another row.
pub fn is_free(member: &Member) -> bool {
    member.on && !member.locked
}

/// The radiant shares that row `row` can be given without holding the white: 0 to what the locked rows leave.
///
/// # Errors
/// Why the row cannot move at all.
pub fn span(members: &[Member], row: usize) -> Result<(f64, f64), Stuck> {
    let member = members.get(row).ok_or(Stuck::NoRow)?;
    if !member.on {
        return Err(Stuck::Off);
    }
    if member.locked {
        return Err(Stuck::Locked);
    }
    if !members.iter().enumerate().any(|(k, m)| k != row && is_free(m)) {
        return Err(Stuck::NoOther);
    }
    Ok((0.0, (1.0 - locked_sum(members)).max(0.0)))
}

/// Gives row `row` the radiant share `wanted`; the other free rows keep their proportions (even parts when all of
/// them are at zero).
///
/// # Errors
/// Why the row cannot move at all.
pub fn pull(members: &[Member], row: usize, wanted: f64) -> Result<Pulled, Stuck> {
    let (low, high) = span(members, row)?;
    let wanted = if wanted.is_finite() { wanted } else { members[row].share };
    let given = wanted.clamp(low, high);
    let mut shares: Vec<f64> = members.iter().map(|m| if m.on { m.share } else { 0.0 }).collect();
    let free = |k: usize| k != row && is_free(&members[k]);
    spread(&mut shares, free, high - given);
    shares[row] = given;
    settle(&mut shares, free);
    Ok(Pulled { shares, given, at_end: given != wanted })
}

/// Gives the share of row `row` to the free rows, leaving it at zero: the row is about to go.
///
/// # Errors
/// When no other row is free.
pub(crate) fn release(members: &mut [Member], row: usize) -> Result<(), Stuck> {
    let free: Vec<bool> = members.iter().enumerate().map(|(k, m)| k != row && is_free(m)).collect();
    if !free.contains(&true) {
        return Err(Stuck::NoOther);
    }
    let mut shares: Vec<f64> = members.iter().map(|m| if m.on { m.share } else { 0.0 }).collect();
    shares[row] = 0.0;
    let kept: f64 = shares.iter().zip(&free).filter(|(_, free)| !**free).map(|(s, _)| s).sum();
    spread(&mut shares, |k| free[k], (1.0 - kept).max(0.0));
    settle(&mut shares, |k| free[k]);
    members.iter_mut().zip(shares).for_each(|(m, share)| m.share = share);
    Ok(())
}

/// Makes the rows that are `free` sum to `total`, in proportion.
fn spread(shares: &mut [f64], free: impl Fn(usize) -> bool, total: f64) {
    let rows: Vec<usize> = (0..shares.len()).filter(|&k| free(k)).collect();
    let before: f64 = rows.iter().map(|&k| shares[k]).sum();
    for &k in &rows {
        shares[k] = if before > 1e-12 { shares[k] * (total / before) } else { total / rows.len() as f64 };
    }
}

fn locked_sum(members: &[Member]) -> f64 {
    members.iter().filter(|m| m.on && m.locked).map(|m| m.share).sum()
}

#[cfg(test)]
mod tests {
    use super::*;
    use project::EmitterId;
    use proptest::prelude::*;

    fn rows(shares: &[f64]) -> Vec<Member> {
        shares
            .iter()
            .enumerate()
            .map(|(k, &share)| Member { share, ..Member::new(EmitterId(k as u64)) })
            .collect()
    }

    #[test]
    fn the_free_rows_keep_their_proportions() {
        let pulled = pull(&rows(&[0.2, 0.2, 0.6]), 0, 0.6).unwrap();
        assert_eq!(pulled.given, 0.6);
        assert!((pulled.shares[1] - 0.1).abs() < 1e-15 && (pulled.shares[2] - 0.3).abs() < 1e-15);
    }

    #[test]
    fn a_pull_beyond_what_the_locks_leave_ends_there() {
        let mut members = rows(&[0.2, 0.3, 0.5]);
        members[1].locked = true;
        let pulled = pull(&members, 0, 0.95).unwrap();
        assert!((pulled.given - 0.7).abs() < 1e-15 && pulled.at_end);
        assert_eq!(pulled.shares[1], 0.3);
        assert!(pulled.shares[2].abs() < 1e-15);
    }

    #[test]
    fn rows_at_zero_take_even_parts() {
        let pulled = pull(&rows(&[1.0, 0.0, 0.0]), 0, 0.5).unwrap();
        assert_eq!(pulled.shares, [0.5, 0.25, 0.25]);
    }

    #[test]
    fn a_row_with_no_room_says_why() {
        let mut members = rows(&[0.5, 0.5]);
        members[1].locked = true;
        assert_eq!(pull(&members, 0, 0.1).unwrap_err(), Stuck::NoOther);
        assert_eq!(pull(&members, 1, 0.1).unwrap_err(), Stuck::Locked);
        members[0].on = false;
        assert_eq!(pull(&members, 0, 0.1).unwrap_err(), Stuck::Off);
        assert_eq!(pull(&members, 7, 0.1).unwrap_err(), Stuck::NoRow);
    }

    proptest! {
        #[test]
        fn shares_sum_to_one_stay_positive_and_locks_keep(
            weights in prop::collection::vec(0.0..1.0_f64, 2..12),
            locks in prop::collection::vec(any::<bool>(), 12),
            offs in prop::collection::vec(any::<bool>(), 12),
            row in 0..12_usize,
            wanted in -0.5..1.5_f64,
        ) {
            let mut members = rows(&weights);
            for (k, m) in members.iter_mut().enumerate() {
                m.on = offs[k];
                m.locked = locks[k];
                if !m.on { m.share = 0.0; }
            }
            let total: f64 = members.iter().map(|m| m.share).sum();
            prop_assume!(total > 0.01);
            members.iter_mut().for_each(|m| m.share /= total);
            if let Ok(pulled) = pull(&members, row % weights.len(), wanted) {
                let sum: f64 = pulled.shares.iter().sum();
                prop_assert!((sum - 1.0).abs() < 1e-12, "{sum}");
                for (share, m) in pulled.shares.iter().zip(&members) {
                    prop_assert!(*share >= 0.0);
                    if m.locked && m.on { prop_assert_eq!(*share, m.share); }
                    if !m.on { prop_assert_eq!(*share, 0.0); }
                }
            }
        }
    }
}
