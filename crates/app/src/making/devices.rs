//! A plan's emitters as the device crate takes them: light, sheet and share, in the plan's order.

use super::{MakingError, uv_prime};
use colour::{Observer, Tensor, TensorSet, UvPrime};
use device::out_coupling::{CouplingFactor, Inclusion};
use device::{Build, DeviceEmitter, EmitterLight};
use project::{EmitterId, EmitterSet, Project, RecipePlan};

/// The emitters of a plan.
#[derive(Debug, Clone)]
pub struct Devices {
    /// Which emitters, in the plan's order.
    pub ids: Vec<EmitterId>,
    /// Their light and sheets.
    pub emitters: Vec<DeviceEmitter>,
    /// Radiant shares of the blend, sum 1.
    pub shares: Vec<f64>,
    /// Their light at unit radiant power, any per-wavelength out-coupling applied.
    pub tensors: TensorSet,
    /// Power per nm at 380 … 780 nm at unit radiant power.
    pub grids: Vec<Vec<f64>>,
    xyz: Vec<[f64; 3]>,
}

impl Devices {
    /// The emitters of a plan for a set: those the plan lists, then those of the set that are on and not listed.
    ///
    /// # Errors
    /// An emitter that has left the project; samples without light; a set without a share.
    pub fn of(project: &Project, set: &EmitterSet, plan: &RecipePlan) -> Result<Self, MakingError> {
        let mut ids = plan.emitters.clone();
        ids.extend(
            set.members.iter().filter(|m| m.on).map(|m| m.emitter).filter(|id| !plan.emitters.contains(id)),
        );
        let mut out = Self {
            ids,
            emitters: Vec::new(),
            shares: Vec::new(),
            tensors: TensorSet::default(),
            grids: Vec::new(),
            xyz: Vec::new(),
        };
        let mut tensors = Vec::new();
        for &id in &out.ids {
            let emitter =
                project.emitter(id).ok_or_else(|| MakingError::EmitterGone { plan: plan.name.clone() })?;
            let mut grid = emitter.spectrum()?.on_colour_grid();
            let mut sheet = emitter.sheet.clone();
            sheet.wall_plug = sheet.wall_plug.or(emitter.wall_plug);
            let light = EmitterLight::with_out_coupling(&grid, &sheet);
            if let Some(coupling) = sheet.out_coupling.as_ref().filter(|coupling| {
                coupling.inclusion == Inclusion::NotInMeasuredEqe
                    && matches!(coupling.factor, CouplingFactor::PerWavelength(_))
            }) {
                for (nm, power) in (380..).zip(grid.iter_mut()) {
                    *power *= coupling.at_nm(f64::from(nm));
                }
            }
            let tensor = Tensor::of_grid(&grid);
            let watts = tensor.radiant_power();
            if !(tensor.is_light() && watts > 0.0) {
                return Err(crate::solving::SolvingError::Dark { name: emitter.name.clone() }.into());
            }
            grid.iter_mut().for_each(|power| *power /= watts);
            let xyz = tensor.xyz(Observer::Cie1931);
            out.xyz.push([xyz.x / watts, xyz.y / watts, xyz.z / watts]);
            tensors.push(tensor);
            out.grids.push(grid);
            out.emitters.push(DeviceEmitter {
                name: emitter.name.clone(),
                light,
                sheet,
                temperature_c: plan.temperature_c,
            });
            let member = set.members.iter().find(|m| m.emitter == id && m.on);
            out.shares.push(member.map_or(0.0, |m| m.share.max(0.0)));
        }
        let sum: f64 = out.shares.iter().sum();
        if sum.is_nan() || sum <= 0.0 {
            return Err(MakingError::NoBlend { set: set.name.clone() });
        }
        out.shares.iter_mut().for_each(|share| *share /= sum);
        out.tensors = TensorSet::new(&tensors);
        Ok(out)
    }

    /// Chromaticity of radiant shares or powers; `None` without light.
    pub fn white(&self, radiant: &[f64]) -> Option<UvPrime> {
        let mut sum = [0.0; 3];
        for (xyz, watts) in self.xyz.iter().zip(radiant) {
            for (total, part) in sum.iter_mut().zip(xyz) {
                *total += watts * part;
            }
        }
        uv_prime(sum)
    }

    /// Power per nm at 380 … 780 nm of a blend of one optical watt.
    pub fn curve(&self, shares: &[f64]) -> Vec<f64> {
        let mut curve = vec![0.0; colour::GRID_POINTS];
        for (grid, share) in self.grids.iter().zip(shares) {
            curve.iter_mut().zip(grid).for_each(|(sum, power)| *sum += share * power);
        }
        curve
    }

    /// Emitter number of every driven channel: all but the converters, ascending.
    pub fn driven(&self, build: &Build) -> Vec<usize> {
        let converted =
            |k: &usize| build.conversions.iter().any(|c| c.layers.iter().any(|layer| layer.emitter == *k));
        (0..self.emitters.len()).filter(|k| !converted(k)).collect()
    }
}
