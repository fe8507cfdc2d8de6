//! What would move a line of the ledger: one more per cent of each row, tried.

use super::BlendView;
use super::blend::numbers_at;
use colour::{Measurement, Tensor};
use project::{EmitterId, EmitterSet, Project};

impl BlendView {
    /// Change of a ledger line when each row in turn gets 1 % of the blend's power more, in row order. Rows that are
    /// off or without light are left out; so is everything when the line has no number. One measurement a row: for
    /// when the pointer rests on a line, not for every frame.
    pub fn sensitivity(&self, set: &EmitterSet, key: &str) -> Vec<(EmitterId, f64)> {
        let Some(before) = number(self.measurement(), key) else { return Vec::new() };
        let on = self.rows.iter().zip(&set.members).filter(|(_, m)| m.on);
        on.filter_map(|(row, _)| {
            let light = row.light.as_ref()?;
            let mut tensor: Tensor = self.tensor().clone();
            tensor.add_scaled(&light.tensor, 0.01);
            let after = number(&numbers_at(&tensor, set), key)?;
            Some((row.emitter, after - before))
        })
        .collect()
    }

    /// The same in a sentence: the row that raises the line most and the one that lowers it most.
    pub fn what_would_move(&self, project: &Project, set: &EmitterSet, key: &str) -> Option<String> {
        let changes = self.sensitivity(set, key);
        let digits = if key == "duv" { 5 } else { 2 };
        let name = |id: EmitterId| project.emitter(id).map_or("?", |e| e.name.as_str());
        let most = changes.iter().max_by(|a, b| a.1.total_cmp(&b.1))?;
        let least = changes.iter().min_by(|a, b| a.1.total_cmp(&b.1))?;
        let mut parts = Vec::new();
        if most.1 > 0.0 {
            parts.push(format!("1 % more {} raises it by {:.digits$}", name(most.0), most.1));
        }
        if least.1 < 0.0 {
            parts.push(format!("1 % more {} lowers it by {:.digits$}", name(least.0), -least.1));
        }
        (!parts.is_empty()).then(|| format!("{}.", parts.join("; ")))
    }
}

/// The number behind a ledger line that a measurement gives.
fn number(measured: &Measurement, key: &str) -> Option<f64> {
    match key {
        "cct" => measured.cct_k,
        "duv" => measured.duv,
        "ra" => measured.ra,
        "r9" => measured.r9(),
        "rf" => measured.rf,
        "rg" => measured.rg,
        "ler" => Some(measured.ler_lm_per_w),
        "sp_ratio" => Some(measured.sp_ratio),
        "melanopic_der" => Some(measured.melanopic_der),
        "blue_light" => Some(measured.kbv_w_per_lm),
        _ => None,
    }
}
