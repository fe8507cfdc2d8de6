//! Pulling a row: from where the hand is to the shares of all rows.

use super::super::wish::Wish;
use crate::state::Edit;
use crate::state::derived::BlendView;
use crate::state::mixing::held::HeldWhite;
use crate::state::mixing::{Pulled, Stuck, kinds};
use project::{EmitterId, EmitterSet, Member, ShareKind};

/// A pull under way. Everything is computed from the shares at its beginning, so the outcome depends on where the
/// hand is and not on how it got there.
#[derive(Debug, Clone)]
pub(in crate::window) struct Pull {
    pub(in crate::window) emitter: EmitterId,
    row: usize,
    members: Vec<Member>,
    weights: Vec<kinds::Weights>,
    held: Option<HeldWhite>,
    hold_white: bool,
    kind: ShareKind,
    /// The share in `kind` at the beginning.
    pub(super) start: f64,
    /// True when the last movement went beyond what the row can reach.
    pub(in crate::window) at_end: bool,
    /// Why the row cannot move, when it cannot.
    pub(in crate::window) stuck: Option<Stuck>,
}

impl Pull {
    /// The beginning of a pull on a row.
    pub(super) fn begin(
        set: &EmitterSet,
        blend: &BlendView,
        row: usize,
        kind: ShareKind,
        hold_white: bool,
    ) -> Option<Self> {
        Some(Self {
            emitter: set.members.get(row)?.emitter,
            row,
            members: set.members.clone(),
            weights: blend.weights(),
            held: blend.held().cloned(),
            hold_white,
            kind,
            start: blend.rows.get(row)?.share(kind),
            at_end: false,
            stuck: None,
        })
    }

    fn shares(&self, wanted: f64) -> Result<Pulled, Stuck> {
        if self.hold_white {
            let held = self.held.as_ref().ok_or(Stuck::NoLight)?;
            held.pull_in_kind(self.row, wanted, &self.weights, self.kind)
        } else {
            kinds::pull(&self.members, &self.weights, self.row, wanted, self.kind)
        }
    }

    /// Moves the row to a share; the edit is asked for when it changes anything.
    pub(super) fn to(&mut self, wanted: f64, set: &EmitterSet, wishes: &mut Vec<Wish>) {
        match self.shares(wanted.clamp(0.0, 1.0)) {
            Ok(pulled) => {
                self.at_end = pulled.at_end;
                self.stuck = None;
                let changed =
                    set.members.iter().zip(&pulled.shares).any(|(m, s)| m.share.to_bits() != s.to_bits());
                if changed {
                    wishes.push(Wish::Edit(Edit::Shares { set: set.id, shares: pulled.shares }));
                }
            }
            Err(stuck) => self.stuck = Some(stuck),
        }
    }
}
