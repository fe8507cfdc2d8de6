//! Making an edit: checks first, then the change, and the edit that takes it back.

use super::edit::{Edit, EditError, SHARE_SUM_TOLERANCE, ShareFault};
use super::mixing::rebalance::release;
use project::{Emitter, EmitterId, EmitterSet, Member, Project, SetId, WhiteSpec};
use std::mem;

/// Makes `edit` and returns its inverse; on an error the project is as it was.
pub(crate) fn make(project: &mut Project, edit: Edit) -> Result<Edit, EditError> {
    match edit {
        Edit::ProjectName(name) => {
            named(&name)?;
            Ok(Edit::ProjectName(mem::replace(&mut project.name, name)))
        }
        Edit::ProjectNote(note) => Ok(Edit::ProjectNote(mem::replace(&mut project.note, note))),
        Edit::ShareKind(kind) => Ok(Edit::ShareKind(mem::replace(&mut project.share_kind, kind))),
        Edit::ReplaceProject(other) => {
            other.check()?;
            Ok(Edit::ReplaceProject(Box::new(mem::replace(project, *other))))
        }
        Edit::NextId(next) => Ok(Edit::NextId(mem::replace(&mut project.next_id, next))),
        Edit::Together { label, edits } => together(project, label, edits),
        edit @ (Edit::InsertEmitter { .. }
        | Edit::RemoveEmitter(_)
        | Edit::MoveEmitter { .. }
        | Edit::InsertSet { .. }
        | Edit::RemoveSet(_)
        | Edit::MoveSet { .. }
        | Edit::SelectSet(_)) => rearrange(project, edit),
        edit @ (Edit::EmitterName { .. }
        | Edit::EmitterNote { .. }
        | Edit::EmitterGeometry { .. }
        | Edit::EmitterOrigin { .. }
        | Edit::EmitterMounting { .. }
        | Edit::InstrumentRange { .. }
        | Edit::WallPlug { .. }
        | Edit::Sheet { .. }
        | Edit::Corrections { .. }) => describe(project, edit),
        edit => blend(project, edit),
    }
}

fn together(project: &mut Project, label: String, edits: Vec<Edit>) -> Result<Edit, EditError> {
    let mut undo = Vec::with_capacity(edits.len());
    for edit in edits {
        match make(project, edit) {
            Ok(inverse) => undo.push(inverse),
            Err(error) => {
                for inverse in undo.into_iter().rev() {
                    make(project, inverse)?;
                }
                return Err(error);
            }
        }
    }
    undo.reverse();
    Ok(Edit::Together { label, edits: undo })
}

/// Emitters and sets coming, going and changing places.
fn rearrange(project: &mut Project, edit: Edit) -> Result<Edit, EditError> {
    let label = edit.label();
    match edit {
        Edit::InsertEmitter { at, emitter } => {
            named(&emitter.name)?;
            let id = emitter.id;
            if project.emitter(id).is_some() {
                return Err(EditError::IdentityTaken(id.0));
            }
            let previous = project.next_id;
            project.next_id = previous.max(id.0.saturating_add(1));
            let at = at.min(project.emitters.len());
            project.emitters.insert(at, *emitter);
            Ok(Edit::Together { label, edits: vec![Edit::RemoveEmitter(id), Edit::NextId(previous)] })
        }
        Edit::RemoveEmitter(id) => {
            let at = place(&project.emitters, |e| e.id == id).ok_or(EditError::NoEmitter(id.0))?;
            let mut restored = Vec::new();
            let mut sets = project.sets.clone();
            for set in sets.iter_mut().filter(|s| s.members.iter().any(|m| m.emitter == id)) {
                restored.push(Edit::Members { set: set.id, members: set.members.clone() });
                take_out(set, id, &project.emitters[at].name)?;
            }
            project.sets = sets;
            let emitter = Box::new(project.emitters.remove(at));
            let next = project.next_id;
            let mut edits = vec![Edit::InsertEmitter { at, emitter }, Edit::NextId(next)];
            edits.append(&mut restored);
            Ok(Edit::Together { label, edits })
        }
        Edit::MoveEmitter { emitter, to } => {
            let from =
                place(&project.emitters, |e| e.id == emitter).ok_or(EditError::NoEmitter(emitter.0))?;
            shift(&mut project.emitters, from, to);
            Ok(Edit::MoveEmitter { emitter, to: from })
        }
        Edit::InsertSet { at, set } => {
            named(&set.name)?;
            let id = set.id;
            if project.set(id).is_some() {
                return Err(EditError::IdentityTaken(id.0));
            }
            check_members(project, &set.name, &set.members)?;
            check_white(&set.white)?;
            let previous = project.next_id;
            project.next_id = previous.max(id.0.saturating_add(1));
            let at = at.min(project.sets.len());
            project.sets.insert(at, *set);
            Ok(Edit::Together { label, edits: vec![Edit::RemoveSet(id), Edit::NextId(previous)] })
        }
        Edit::RemoveSet(id) => {
            let at = place(&project.sets, |s| s.id == id).ok_or(EditError::NoSet(id.0))?;
            let chosen = project.current_set;
            if chosen == Some(id) {
                let near = project.sets.get(at + 1).or_else(|| at.checked_sub(1).map(|k| &project.sets[k]));
                project.current_set = near.map(|s| s.id);
            }
            let set = Box::new(project.sets.remove(at));
            let edits =
                vec![Edit::InsertSet { at, set }, Edit::NextId(project.next_id), Edit::SelectSet(chosen)];
            Ok(Edit::Together { label, edits })
        }
        Edit::MoveSet { set, to } => {
            let from = place(&project.sets, |s| s.id == set).ok_or(EditError::NoSet(set.0))?;
            shift(&mut project.sets, from, to);
            Ok(Edit::MoveSet { set, to: from })
        }
        Edit::SelectSet(choice) => {
            if let Some(id) = choice.filter(|id| project.set(*id).is_none()) {
                return Err(EditError::NoSet(id.0));
            }
            Ok(Edit::SelectSet(mem::replace(&mut project.current_set, choice)))
        }
        _ => unreachable!("`make` sends each edit to the function that knows it"),
    }
}

/// What is known of one emitter.
fn describe(project: &mut Project, edit: Edit) -> Result<Edit, EditError> {
    match edit {
        Edit::EmitterName { emitter, name } => {
            named(&name)?;
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::EmitterName { emitter, name: mem::replace(&mut row.name, name) })
        }
        Edit::EmitterNote { emitter, note } => {
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::EmitterNote { emitter, note: mem::replace(&mut row.note, note) })
        }
        Edit::EmitterGeometry { emitter, geometry } => {
            if let project::Geometry::Angle(degrees) = geometry {
                within("angle from the normal", degrees, 0.0..=90.0, "0 to 90 degrees")?;
            }
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::EmitterGeometry { emitter, geometry: mem::replace(&mut row.geometry, geometry) })
        }
        Edit::EmitterOrigin { emitter, origin } => {
            if let project::Origin::Electroluminescence { current_density_ma_per_cm2: Some(j) } = origin {
                within("current density", j, 0.0..=f64::MAX, "a number of at least 0 mA/cm\u{b2}")?;
            }
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::EmitterOrigin { emitter, origin: mem::replace(&mut row.origin, origin) })
        }
        Edit::EmitterMounting { emitter, mounting } => {
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::EmitterMounting { emitter, mounting: mem::replace(&mut row.mounting, mounting) })
        }
        Edit::InstrumentRange { emitter, range_nm } => {
            if let Some((first, last)) = range_nm {
                within("first wavelength", first, 1.0..=1e5, "1 to 100000 nm")?;
                within("last wavelength", last, first..=1e5, "more than the first wavelength")?;
            }
            let row = emitter_mut(project, emitter)?;
            let range_nm = mem::replace(&mut row.instrument_range_nm, range_nm);
            Ok(Edit::InstrumentRange { emitter, range_nm })
        }
        Edit::WallPlug { emitter, wall_plug } => {
            if let Some(value) = wall_plug {
                within("wall-plug efficiency", value, f64::MIN_POSITIVE..=1.0, "above 0 and at most 1")?;
            }
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::WallPlug { emitter, wall_plug: mem::replace(&mut row.wall_plug, wall_plug) })
        }
        Edit::Sheet { emitter, sheet } => {
            let row = emitter_mut(project, emitter)?;
            Ok(Edit::Sheet { emitter, sheet: Box::new(mem::replace(&mut row.sheet, *sheet)) })
        }
        Edit::Corrections { emitter, steps } => {
            let row = emitter_mut(project, emitter)?;
            let before = mem::replace(&mut row.corrections, steps);
            match row.spectrum() {
                Ok(_) => Ok(Edit::Corrections { emitter, steps: before }),
                Err(problem) => {
                    row.corrections = before;
                    Err(problem.into())
                }
            }
        }
        _ => unreachable!("`make` sends each edit to the function that knows it"),
    }
}

/// What a set holds and is to meet.
fn blend(project: &mut Project, edit: Edit) -> Result<Edit, EditError> {
    match edit {
        Edit::SetName { set, name } => {
            named(&name)?;
            let row = set_mut(project, set)?;
            Ok(Edit::SetName { set, name: mem::replace(&mut row.name, name) })
        }
        Edit::SetNote { set, note } => {
            let row = set_mut(project, set)?;
            Ok(Edit::SetNote { set, note: mem::replace(&mut row.note, note) })
        }
        Edit::White { set, white } => {
            check_white(&white)?;
            let row = set_mut(project, set)?;
            Ok(Edit::White { set, white: Box::new(mem::replace(&mut row.white, *white)) })
        }
        Edit::Shares { set, shares } => {
            let row = project.set(set).ok_or(EditError::NoSet(set.0))?;
            let shares = check_shares(project, &row.members, shares)?;
            let row = set_mut(project, set)?;
            let members = row.members.clone();
            row.members.iter_mut().zip(shares).for_each(|(member, share)| member.share = share);
            Ok(Edit::Members { set, members })
        }
        Edit::Lock { set, emitter, locked } => {
            let member = member_mut(project, set, emitter)?;
            Ok(Edit::Lock { set, emitter, locked: mem::replace(&mut member.locked, locked) })
        }
        Edit::Switch { set, emitter, on } => {
            let name = project.emitter(emitter).map_or_else(String::new, |e| e.name.clone());
            member_mut(project, set, emitter)?;
            let row = set_mut(project, set)?;
            let members = row.members.clone();
            if on {
                let alone = !row.members.iter().any(|m| m.on);
                let member = member_mut(project, set, emitter)?;
                member.on = true;
                if alone {
                    member.share = 1.0;
                }
            } else {
                let mut after = row.members.clone();
                let k = place(&after, |m| m.emitter == emitter).ok_or(EditError::NoEmitter(emitter.0))?;
                if after[k].on && !after.iter().enumerate().any(|(j, m)| j != k && m.on) {
                    return Err(EditError::LastOn(name));
                }
                if after[k].share > 0.0 {
                    release(&mut after, k)
                        .map_err(|_| EditError::Locked { set: row.name.clone(), emitter: name })?;
                }
                after[k].on = false;
                after[k].share = 0.0;
                row.members = after;
            }
            Ok(Edit::Members { set, members })
        }
        Edit::Bounds { set, emitter, least, most } => {
            within("least share", least, 0.0..=1.0, "0 to 1")?;
            within("greatest share", most, least..=1.0, "the least share to 1")?;
            let member = member_mut(project, set, emitter)?;
            let before = (mem::replace(&mut member.least, least), mem::replace(&mut member.most, most));
            Ok(Edit::Bounds { set, emitter, least: before.0, most: before.1 })
        }
        Edit::AddMember { set, emitter, at } => {
            let name =
                project.emitter(emitter).ok_or(EditError::NoEmitter(emitter.0)).map(|e| e.name.clone())?;
            let row = set_mut(project, set)?;
            if row.members.iter().any(|m| m.emitter == emitter) {
                return Err(EditError::AlreadyInSet { set: row.name.clone(), emitter: name });
            }
            let members = row.members.clone();
            let mut member = Member::new(emitter);
            if !row.members.iter().any(|m| m.on) {
                member.share = 1.0;
            }
            row.members.insert(at.min(members.len()), member);
            Ok(Edit::Members { set, members })
        }
        Edit::RemoveMember { set, emitter } => {
            let name = project.emitter(emitter).map_or_else(String::new, |e| e.name.clone());
            member_mut(project, set, emitter)?;
            let row = set_mut(project, set)?;
            let members = row.members.clone();
            take_out(row, emitter, &name)?;
            Ok(Edit::Members { set, members })
        }
        Edit::MoveMember { set, emitter, to } => {
            member_mut(project, set, emitter)?;
            let row = set_mut(project, set)?;
            let from =
                place(&row.members, |m| m.emitter == emitter).ok_or(EditError::NoEmitter(emitter.0))?;
            shift(&mut row.members, from, to);
            Ok(Edit::MoveMember { set, emitter, to: from })
        }
        Edit::Members { set, members } => {
            let name = project.set(set).ok_or(EditError::NoSet(set.0))?.name.clone();
            check_members(project, &name, &members)?;
            let row = set_mut(project, set)?;
            Ok(Edit::Members { set, members: mem::replace(&mut row.members, members) })
        }
        Edit::Recipes { set, recipes } => {
            for plan in &recipes {
                named(&plan.name)?;
            }
            let row = set_mut(project, set)?;
            Ok(Edit::Recipes { set, recipes: mem::replace(&mut row.recipes, recipes) })
        }
        _ => unreachable!("`make` sends each edit to the function that knows it"),
    }
}

fn place<T>(items: &[T], wanted: impl Fn(&T) -> bool) -> Option<usize> {
    items.iter().position(wanted)
}

fn shift<T>(items: &mut Vec<T>, from: usize, to: usize) {
    let item = items.remove(from);
    items.insert(to.min(items.len()), item);
}

fn named(name: &str) -> Result<(), EditError> {
    if name.trim().is_empty() { Err(EditError::EmptyName) } else { Ok(()) }
}

fn within(
    what: &'static str,
    value: f64,
    range: std::ops::RangeInclusive<f64>,
    expected: &'static str,
) -> Result<(), EditError> {
    if value.is_finite() && range.contains(&value) {
        Ok(())
    } else {
        Err(EditError::Range { what, expected, found: value })
    }
}

fn emitter_mut(project: &mut Project, id: EmitterId) -> Result<&mut Emitter, EditError> {
    project.emitter_mut(id).ok_or(EditError::NoEmitter(id.0))
}

fn set_mut(project: &mut Project, id: SetId) -> Result<&mut EmitterSet, EditError> {
    project.set_mut(id).ok_or(EditError::NoSet(id.0))
}

fn member_mut(project: &mut Project, set: SetId, emitter: EmitterId) -> Result<&mut Member, EditError> {
    let row = set_mut(project, set)?;
    let name = row.name.clone();
    row.members
        .iter_mut()
        .find(|m| m.emitter == emitter)
        .ok_or(EditError::NotInSet { set: name, emitter: emitter.0 })
}

/// Takes an emitter out of a set, the free rows making up its share.
fn take_out(set: &mut EmitterSet, emitter: EmitterId, name: &str) -> Result<(), EditError> {
    let Some(k) = place(&set.members, |m| m.emitter == emitter) else { return Ok(()) };
    let mut members = set.members.clone();
    let others_on = members.iter().enumerate().any(|(j, m)| j != k && m.on);
    if members[k].share > 0.0 && others_on {
        release(&mut members, k)
            .map_err(|_| EditError::Locked { set: set.name.clone(), emitter: name.to_owned() })?;
    }
    members.remove(k);
    set.members = members;
    Ok(())
}

/// Shares that make a blend, scaled so that they sum to 1 as closely as numbers allow.
fn check_shares(project: &Project, members: &[Member], mut shares: Vec<f64>) -> Result<Vec<f64>, EditError> {
    let fault = |fault| Err(EditError::Shares(fault));
    if shares.len() != members.len() {
        return fault(ShareFault::Count { expected: members.len(), found: shares.len() });
    }
    for (k, (share, member)) in shares.iter_mut().zip(members).enumerate() {
        if !share.is_finite() || *share < -1e-12 {
            return fault(ShareFault::Value { row: k + 1, found: *share });
        }
        if !member.on && *share > 0.0 {
            return fault(ShareFault::Off { row: k + 1, found: *share });
        }
        *share = share.max(0.0);
        if member.locked && member.on {
            if (member.share - *share).abs() > SHARE_SUM_TOLERANCE {
                let emitter = project.emitter(member.emitter).map_or_else(String::new, |e| e.name.clone());
                return Err(EditError::LockedShare { emitter, share: member.share });
            }
            *share = member.share;
        }
    }
    let sum: f64 = shares.iter().sum();
    if (sum - 1.0).abs() > SHARE_SUM_TOLERANCE {
        return fault(ShareFault::Sum(sum));
    }
    let locked: f64 = shares.iter().zip(members).filter(|(_, m)| m.locked).map(|(s, _)| s).sum();
    let free = sum - locked;
    if free > SHARE_SUM_TOLERANCE {
        let scale = (1.0 - locked) / free;
        shares.iter_mut().zip(members).filter(|(_, m)| !m.locked).for_each(|(s, _)| *s *= scale);
    }
    Ok(shares)
}

fn check_members(project: &Project, set: &str, members: &[Member]) -> Result<(), EditError> {
    for (k, member) in members.iter().enumerate() {
        let Some(emitter) = project.emitter(member.emitter) else {
            return Err(EditError::NoEmitter(member.emitter.0));
        };
        if members[..k].iter().any(|m| m.emitter == member.emitter) {
            return Err(EditError::AlreadyInSet { set: set.to_owned(), emitter: emitter.name.clone() });
        }
        within("share", member.share, 0.0..=1.0 + SHARE_SUM_TOLERANCE, "0 to 1")?;
        within("least share", member.least, 0.0..=1.0, "0 to 1")?;
        within("greatest share", member.most, member.least..=1.0, "the least share to 1")?;
    }
    Ok(())
}

fn check_white(white: &WhiteSpec) -> Result<(), EditError> {
    within("target CCT", white.cct_k, 1000.0..=20000.0, "1000 to 20000 K")?;
    within("target Duv", white.duv, -0.05..=0.05, "-0.05 to 0.05")?;
    for metric in project::Metric::ALL {
        let limit = white.limits.of(metric);
        for end in [limit.low, limit.high].into_iter().flatten() {
            within("limit", end, -1e6..=1e6, "a finite number")?;
        }
        if let (Some(low), Some(high)) = (limit.low, limit.high) {
            within("upper end of a limit", high, low..=1e6, "at least the lower end")?;
        }
    }
    if let Some(lumens) = white.lumens {
        within("wanted flux", lumens, f64::MIN_POSITIVE..=1e9, "above 0 lm")?;
    }
    if let Some(luminance) = white.luminance_cd_per_m2 {
        within("wanted luminance", luminance, f64::MIN_POSITIVE..=1e9, "above 0 cd/m\u{b2}")?;
    }
    Ok(())
}
