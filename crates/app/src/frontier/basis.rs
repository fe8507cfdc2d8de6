//! What an answer holds for.

use crate::state::derived::light::content_key;
use project::{EmitterId, EmitterSet, Project, SetId, WhiteSpec};

/// Everything an answer depends on: when it has changed, the answer is stale.
#[derive(Debug, Clone, PartialEq)]
pub struct Basis {
    set: SetId,
    white: WhiteSpec,
    rows: Vec<Row>,
}

#[derive(Debug, Clone, PartialEq)]
struct Row {
    emitter: EmitterId,
    on: bool,
    /// The share, when it is locked.
    locked: Option<f64>,
    bounds: [f64; 2],
    wall_plug: Option<f64>,
    /// A hash of the samples and corrections.
    light: u64,
}

impl Basis {
    /// For answers about the emitters of a set. Shares that are free do not belong to it.
    pub fn of_set(project: &Project, set: &EmitterSet) -> Self {
        let rows = set.members.iter().filter_map(|member| {
            let emitter = project.emitter(member.emitter)?;
            Some(Row {
                emitter: member.emitter,
                on: member.on,
                locked: (member.locked && member.on).then_some(member.share),
                bounds: [member.least, member.most],
                wall_plug: emitter.wall_plug,
                light: content_key(emitter),
            })
        });
        Self { set: set.id, white: white(set), rows: rows.collect() }
    }

    /// For answers about all emitters of a project at the white of a set.
    pub fn of_project(project: &Project, set: &EmitterSet) -> Self {
        let rows = project.emitters.iter().map(|emitter| Row {
            emitter: emitter.id,
            on: true,
            locked: None,
            bounds: [0.0, 1.0],
            wall_plug: emitter.wall_plug,
            light: content_key(emitter),
        });
        Self { set: set.id, white: white(set), rows: rows.collect() }
    }

    /// The set the answer is about.
    pub fn set(&self) -> SetId {
        self.set
    }
}

/// The spec without what leaves the answers alone: how much light is wanted, and what Solve makes largest.
fn white(set: &EmitterSet) -> WhiteSpec {
    WhiteSpec {
        lumens: None,
        luminance_cd_per_m2: None,
        maximise: project::Maximise::Ler,
        ..set.white.clone()
    }
}
