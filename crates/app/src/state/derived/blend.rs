//! A set's blend: its curve, its numbers, and its rows.

use super::{ContentKey, Light, WhiteRegion};
use crate::state::mixing::held::HeldWhite;
use crate::state::mixing::{Stuck, kinds, rebalance};
use colour::appearance::{self, Srgb};
use colour::{Measurement, Observer, Reference, Tensor, UvPrime, Xyz, illuminant, locus, measure};
use project::{EmitterId, EmitterSet, Project, ShareKind};
use std::sync::Arc;

/// A displacement of the white in u′v′.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Shift {
    /// Change of u′.
    pub du: f64,
    /// Change of v′.
    pub dv: f64,
}

impl Shift {
    /// Δu′v′.
    pub fn distance(self) -> f64 {
        self.du.hypot(self.dv)
    }
}

/// The curve a blend is compared with by eye.
#[derive(Debug, Clone, PartialEq)]
pub struct ReferenceCurve {
    /// What it is: "Planckian 3000 K, same lumens".
    pub words: String,
    /// Power per nm at 380, 381 … 780 nm, with the lumens of one watt of the blend.
    pub curve: Vec<f64>,
}

/// One row of the blend.
#[derive(Debug, Clone)]
pub struct RowView {
    /// Which emitter.
    pub emitter: EmitterId,
    /// Its light, when it has one.
    pub light: Option<Arc<Light>>,
    /// Share of the radiant power.
    pub radiant: f64,
    /// Share of the luminous flux.
    pub luminous: f64,
    /// Share of the photons.
    pub photon: f64,
    /// Where the white goes when this row gets 1 % more of its own power; when its share is zero, 1 % of the blend's.
    pub plus_one_percent: Shift,
    /// Where the white goes when this row's curve moves by +1 nm.
    pub plus_one_nm: Shift,
    /// Optical watts inside 380–780 nm for the wanted lumens.
    pub watts: Option<f64>,
    /// Electrical watts for the wanted lumens.
    pub electrical_watts: Option<f64>,
    /// Least and greatest radiant share by pulling.
    pub span: Result<(f64, f64), Stuck>,
    /// Least and greatest radiant share with the white held.
    pub held_span: Result<(f64, f64), Stuck>,
}

impl RowView {
    /// The share in a kind.
    pub fn share(&self, kind: ShareKind) -> f64 {
        match kind {
            ShareKind::Radiant => self.radiant,
            ShareKind::Luminous => self.luminous,
            ShareKind::Photon => self.photon,
        }
    }
}

/// What depends on lights, shares and target alone, and is costly enough to remember.
#[derive(Debug)]
pub(crate) struct Numbers {
    tensor: Tensor,
    measurement: Measurement,
    curve: Vec<f64>,
    reference: Option<ReferenceCurve>,
}

/// A set's blend, scaled to one watt inside 380–780 nm.
#[derive(Debug, Clone)]
pub struct BlendView {
    /// The rows, in member order.
    pub rows: Vec<RowView>,
    /// Where the white may lie.
    pub region: WhiteRegion,
    /// Sum of the shares as kept in the project; the blend is computed from shares scaled to 1.
    pub share_sum: f64,
    /// Luminous efficacy of the device, lm per electrical watt; `None` while a wall-plug efficiency is missing.
    pub efficacy_lm_per_w: Option<f64>,
    /// Names of the emitters in use whose wall-plug efficiency is missing.
    pub without_wall_plug: Vec<String>,
    /// Optical watts for the wanted lumens.
    pub watts: Option<f64>,
    /// Wavelength of the curve's greatest value, nm.
    pub peak_nm: f64,
    /// The white as a screen can show it.
    pub srgb: Srgb,
    /// The target as a screen can show it.
    pub target_srgb: Srgb,
    held: Option<HeldWhite>,
    numbers: Arc<Numbers>,
}

impl Numbers {
    pub(crate) fn of(set: &EmitterSet, rows: &[Option<Arc<Light>>]) -> Option<Self> {
        let shares = scaled_shares(set, rows)?;
        let mut tensor = Tensor::dark();
        let mut curve = vec![0.0; colour::GRID_POINTS];
        for (share, light) in shares.iter().zip(rows) {
            if let Some(light) = light.as_ref().filter(|_| *share > 0.0) {
                tensor.add_scaled(&light.tensor, *share);
                curve.iter_mut().zip(&light.curve).for_each(|(sum, v)| *sum += share * v);
            }
        }
        if !tensor.is_light() {
            return None;
        }
        let measurement = numbers_at(&tensor, set);
        let reference = measurement.cct_k.map(|cct_k| reference_curve(cct_k, tensor.luminous_flux_lm()));
        Some(Self { tensor, measurement, curve, reference })
    }
}

/// The numbers of a light as the set's spec judges them: an exact white, once reached, is judged against the reference
/// of the target, so that rounding cannot flip the switch of references at 5000 K.
pub(crate) fn numbers_at(tensor: &Tensor, set: &EmitterSet) -> Measurement {
    let target = locus::uv_at(set.white.cct_k, set.white.duv);
    let on_target = tensor.xyz(Observer::Cie1931).uv().distance(target) < 1e-7;
    if set.white.region == project::Region::Point && on_target {
        measure::measure_at(tensor, &Reference::at(set.white.cct_k))
    } else {
        measure::measure(tensor)
    }
}

fn reference_curve(cct_k: f64, lumens: f64) -> ReferenceCurve {
    let (name, grid) = if cct_k < 5000.0 {
        ("Planckian", illuminant::planckian_grid(cct_k))
    } else {
        ("daylight", illuminant::daylight_grid(cct_k))
    };
    let [_, y, _] = luminosity_weights();
    let own = colour::PHOTOPIC_EFFICACY_LM_PER_W * grid.iter().zip(y).map(|(s, v)| s * v).sum::<f64>();
    let factor = if own > 0.0 { lumens / own } else { 0.0 };
    ReferenceCurve {
        words: format!("{name} {cct_k:.0} K, same lumens"),
        curve: grid.iter().map(|s| s * factor).collect(),
    }
}

fn luminosity_weights() -> &'static [Vec<f64>; 3] {
    static WEIGHTS: std::sync::LazyLock<[Vec<f64>; 3]> =
        std::sync::LazyLock::new(|| Observer::Cie1931.matching_functions());
    &WEIGHTS
}

/// Shares of the rows that have light, scaled to sum to 1.
fn scaled_shares(set: &EmitterSet, rows: &[Option<Arc<Light>>]) -> Option<Vec<f64>> {
    let shares: Vec<f64> = set
        .members
        .iter()
        .zip(rows)
        .map(|(m, light)| if m.on && light.is_some() { m.share.max(0.0) } else { 0.0 })
        .collect();
    let sum: f64 = shares.iter().sum();
    (sum > 0.0).then(|| shares.iter().map(|s| s / sum).collect())
}

/// The key of a blend's numbers.
pub(crate) fn content_key(set: &EmitterSet, rows: &[Option<Arc<Light>>]) -> u64 {
    let mut key = ContentKey::new();
    for (member, light) in set.members.iter().zip(rows) {
        key.word(light.as_ref().map_or(0, |light| light.key));
        key.number(if member.on { member.share } else { -1.0 });
    }
    key.number(set.white.cct_k);
    key.number(set.white.duv);
    key.word(u64::from(set.white.region == project::Region::Point));
    key.0
}

impl BlendView {
    pub(crate) fn of(
        project: &Project,
        set: &EmitterSet,
        lights: Vec<Option<Arc<Light>>>,
        numbers: Arc<Numbers>,
    ) -> Self {
        let radiant = scaled_shares(set, &lights).unwrap_or_else(|| vec![0.0; lights.len()]);
        let weights = weights_of(&lights);
        let luminous = kinds::from_radiant(&radiant, &weights, ShareKind::Luminous);
        let photon = kinds::from_radiant(&radiant, &weights, ShareKind::Photon);
        let xyz: Vec<[f64; 3]> =
            lights.iter().map(|light| light.as_ref().map_or([0.0; 3], |light| light.xyz)).collect();
        let held = HeldWhite::new(&set.members, &xyz).ok();
        let ler = numbers.tensor.ler_lm_per_w();
        let watts = set.white.lumens.map(|lumens| lumens / ler);
        let white = numbers.tensor.xyz(Observer::Cie1931).to_array();
        let mut electrical = 0.0;
        let mut without_wall_plug = Vec::new();
        let mut rows = Vec::with_capacity(lights.len());
        for (k, light) in lights.into_iter().enumerate() {
            let member = &set.members[k];
            let emitter = project.emitter(member.emitter);
            let wall_plug = emitter.and_then(|e| e.wall_plug.or(e.sheet.wall_plug)).filter(|w| *w > 0.0);
            if radiant[k] > 0.0 {
                match wall_plug {
                    Some(wall_plug) => electrical += radiant[k] / wall_plug,
                    None => without_wall_plug.extend(emitter.map(|e| e.name.clone())),
                }
            }
            let row_watts = watts.map(|watts| watts * radiant[k]);
            let (plus_one_percent, plus_one_nm) = light.as_ref().map_or_else(Default::default, |light| {
                let more = if radiant[k] > 0.0 { 0.01 * radiant[k] } else { 0.01 };
                let moved = std::array::from_fn(|c| light.xyz_shifted[c] - light.xyz[c]);
                (shift(white, light.xyz, more), shift(white, moved, radiant[k]))
            });
            rows.push(RowView {
                emitter: member.emitter,
                light,
                radiant: radiant[k],
                luminous: luminous[k],
                photon: photon[k],
                plus_one_percent,
                plus_one_nm,
                watts: row_watts,
                electrical_watts: row_watts.zip(wall_plug).map(|(watts, wall_plug)| watts / wall_plug),
                span: rebalance::span(&set.members, k),
                held_span: held.as_ref().map_or(Err(Stuck::NoLight), |held| held.span(k)),
            });
        }
        let known = without_wall_plug.is_empty() && electrical > 0.0;
        let region = WhiteRegion::of(&set.white);
        let target_uv = locus::uv_at(set.white.cct_k, set.white.duv);
        let peak = numbers.curve.iter().enumerate().max_by(|a, b| a.1.total_cmp(b.1)).map_or(0, |(k, _)| k);
        Self {
            rows,
            region,
            share_sum: set.share_sum(),
            efficacy_lm_per_w: known.then(|| ler / electrical),
            without_wall_plug,
            watts,
            peak_nm: colour::FIRST_NM + peak as f64,
            srgb: appearance::of_light(&numbers.tensor),
            target_srgb: appearance::of_chromaticity(target_uv.xy()),
            held,
            numbers,
        }
    }

    /// The linear quantities of one watt of the blend.
    pub fn tensor(&self) -> &Tensor {
        &self.numbers.tensor
    }

    /// Every colour number.
    pub fn measurement(&self) -> &Measurement {
        &self.numbers.measurement
    }

    /// Power per nm at 380, 381 … 780 nm, of one watt.
    pub fn curve(&self) -> &[f64] {
        &self.numbers.curve
    }

    /// Planckian (below 5000 K) or daylight of the same CCT and lumens; `None` when the white has no CCT.
    pub fn reference(&self) -> Option<&ReferenceCurve> {
        self.numbers.reference.as_ref()
    }

    /// The blends of this chromaticity; keep a copy from when a pull begins.
    pub fn held(&self) -> Option<&HeldWhite> {
        self.held.as_ref()
    }

    /// What each row counts for in each kind of share.
    pub fn weights(&self) -> Vec<kinds::Weights> {
        self.rows.iter().map(|row| weight_of(row.light.as_ref())).collect()
    }

    /// The chromaticity.
    pub fn uv_prime(&self) -> UvPrime {
        self.numbers.measurement.uv_prime()
    }
}

fn weights_of(lights: &[Option<Arc<Light>>]) -> Vec<kinds::Weights> {
    lights.iter().map(|light| weight_of(light.as_ref())).collect()
}

fn weight_of(light: Option<&Arc<Light>>) -> kinds::Weights {
    light.map_or(kinds::Weights { lm_per_w: 0.0, mean_wavelength_nm: 0.0 }, |light| light.weights)
}

/// Where the white goes when `amount` of `added` is added to it.
fn shift(white: [f64; 3], added: [f64; 3], amount: f64) -> Shift {
    let before = Xyz::from_array(white).uv_prime();
    let after = Xyz::from_array(std::array::from_fn(|c| white[c] + amount * added[c])).uv_prime();
    Shift { du: after.u - before.u, dv: after.v - before.v }
}
