//! Whole packages on strings: `P_i = n_i·Φ_i(I_i)`, n_i whole.
//!
//! With trimmed currents the blend is met exactly: each string's current gives its packages the flux the blend
//! asks for, and the counts are free (least power within a number of packages, by dynamic programming over
//! whole numbers). Without trimming every package runs at its test current and the counts alone make the white:
//! the combination with the least Δu′v′ that still gives the lumens.

use serde::{Deserialize, Serialize};

use crate::error::DeviceError;
use crate::form::{BuildFace, ChannelState, Context, Realised, States};
use crate::power::{Coupling, LeastPower};
use crate::whole_numbers::WholeNumbers;
use crate::working::Characteristic;

/// Packages allowed in all where no limit is given.
pub const DEFAULT_MOST_PACKAGES: u32 = 60;

/// What the driver asks of every string.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct StringRule {
    /// Lowest string voltage the driver regulates, V.
    pub lowest_v: f64,
    /// Highest string voltage, V.
    pub highest_v: f64,
    /// Most strings of one emitter in parallel; each needs its own ballast.
    pub most_parallel: u32,
}

/// Settings of the packages form.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Packages {
    /// Fixed counts, one per emitter of the set (converters' entries are ignored).
    pub counts: Option<Vec<u32>>,
    /// Most packages in all. With trimmed currents and no limit, counts are those that run at or just below
    /// the test current.
    pub at_most: Option<u32>,
    /// Voltage window of the strings.
    pub strings: Option<StringRule>,
    /// Run every package at its test current and let counts alone make the white.
    pub untrimmed: bool,
}

/// Fabrication quantities, one entry a driven channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Board {
    /// Packages of each channel.
    pub counts: Vec<u32>,
    /// Current of each package, mA; 0 where dark.
    pub currents_ma: Vec<f64>,
    /// Flux of the packages actually placed, relative to their sheet; 1 unless a bin is being looked at.
    pub flux_factors: Vec<f64>,
}

/// One emitter's line of a package recipe.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct BoardLine {
    /// Emitter name.
    pub name: String,
    /// Packages.
    pub count: u32,
    /// Current through each, mA.
    pub current_ma: f64,
    /// Forward voltage of one, V.
    pub forward_voltage_v: Option<f64>,
    /// Strings in parallel.
    pub strings: Option<u32>,
    /// Packages in series on each.
    pub in_series: Option<u32>,
    /// Voltage of a string, V.
    pub string_voltage_v: Option<f64>,
    /// Flux bin edges relative to its middle, where a bin is given.
    pub bin: Option<(f64, f64)>,
}

impl Packages {
    /// Strings × packages for a count at a forward voltage: the fewest strings inside the window.
    fn arrange(&self, count: u32, forward_v: f64) -> Option<(u32, u32)> {
        let rule = self.strings?;
        (1..=rule.most_parallel.max(1)).filter(|strings| count.is_multiple_of(*strings)).find_map(|strings| {
            let in_series = count / strings;
            let volts = f64::from(in_series) * forward_v;
            let inside = volts >= rule.lowest_v * (1.0 - 1e-12) && volts <= rule.highest_v * (1.0 + 1e-12);
            (in_series > 0 && inside).then_some((strings, in_series))
        })
    }

    fn allowed(&self, c: &Characteristic, count: u32, current_ma: f64) -> bool {
        match self.strings {
            None => true,
            Some(_) => c.has_voltage() && self.arrange(count, c.voltage(current_ma)).is_some(),
        }
    }

    /// Current and power of a count of one channel at a demand; `None` where the count does not work.
    fn option(&self, c: &Characteristic, demand_ma: f64, count: u32) -> Option<(f64, f64)> {
        let current = c.current_for(demand_ma / f64::from(count))?;
        if !self.allowed(c, count, current) {
            return None;
        }
        let power = if c.has_voltage() {
            f64::from(count) * current * 1e-3 * c.voltage(current)
        } else {
            // Without a voltage the fewest packages are the best there is to say.
            f64::from(count) * 1e-9
        };
        Some((current, power))
    }

    /// Counts and currents of least power, exact over whole numbers.
    fn least_power_counts(
        &self,
        context: &Context<'_>,
        demands: &[f64],
        at_most: u32,
    ) -> Result<Vec<(u32, f64)>, DeviceError> {
        let most = at_most as usize;
        let lit: Vec<usize> = Context::lit(demands).collect();
        // best[n]: least power of the channels so far with n packages; choice remembers how.
        let mut best = vec![f64::INFINITY; most + 1];
        best[0] = 0.0;
        let mut choices: Vec<Vec<u32>> = Vec::with_capacity(lit.len());
        for &k in &lit {
            let c = &context.characteristics[k];
            let options: Vec<Option<f64>> = (0..=at_most)
                .map(|n| if n == 0 { None } else { self.option(c, demands[k], n).map(|o| o.1) })
                .collect();
            let mut next = vec![f64::INFINITY; most + 1];
            let mut choice = vec![0u32; most + 1];
            for used in 0..=most {
                if !best[used].is_finite() {
                    continue;
                }
                for n in 1..=(most - used) {
                    if let Some(power) = options[n]
                        && best[used] + power < next[used + n]
                    {
                        next[used + n] = best[used] + power;
                        choice[used + n] = n as u32;
                    }
                }
            }
            best = next;
            choices.push(choice);
        }
        let found = (0..=most).filter(|&n| best[n].is_finite()).min_by(|&a, &b| best[a].total_cmp(&best[b]));
        let Some(mut used) = found else {
            return Err(self.no_counts(context, demands, at_most));
        };
        let mut out = vec![(0, 0.0); demands.len()];
        for (&k, choice) in lit.iter().zip(&choices).rev() {
            let n = choice[used];
            let current = self.option(&context.characteristics[k], demands[k], n).map_or(0.0, |o| o.0);
            out[k] = (n, current);
            used -= n as usize;
        }
        Ok(out)
    }

    fn no_counts(&self, context: &Context<'_>, demands: &[f64], at_most: u32) -> DeviceError {
        let least = |k: usize| {
            let c = &context.characteristics[k];
            (demands[k] / c.photon_current(c.range().1)).ceil()
        };
        let total: f64 = Context::lit(demands).map(least).sum();
        let strings = if self.strings.is_some() { " and the string voltage window" } else { "" };
        DeviceError::Unreachable {
            reason: format!(
                "no whole numbers of at most {at_most} packages meet this blend within their currents{strings}: at \
                 full current it takes {total:.0}"
            ),
        }
    }

    /// For each channel the smallest workable count that runs at or below the test current.
    fn counts_at_test(&self, context: &Context<'_>, demands: &[f64]) -> Result<Vec<(u32, f64)>, DeviceError> {
        let mut out = vec![(0, 0.0); demands.len()];
        for k in Context::lit(demands) {
            let c = &context.characteristics[k];
            let test = test_current(context, k);
            let found = (1..=DEFAULT_MOST_PACKAGES).find_map(|n| {
                let (current, _) = self.option(c, demands[k], n)?;
                (current <= test * (1.0 + 1e-9)).then_some((n, current))
            });
            out[k] = found.ok_or_else(|| self.no_counts(context, demands, DEFAULT_MOST_PACKAGES))?;
        }
        Ok(out)
    }

    fn untrimmed(&self, context: &Context<'_>, demands: &[f64]) -> Result<(Board, Vec<String>), DeviceError> {
        let lit: Vec<usize> = Context::lit(demands).collect();
        let lights = context.channel_lights();
        let each: Vec<f64> = lit
            .iter()
            .map(|&k| context.characteristics[k].photon_current(test_current(context, k)))
            .collect();
        let at_most = self.at_most.unwrap_or(DEFAULT_MOST_PACKAGES);
        let target = context
            .white(&lights, demands)
            .ok_or_else(|| DeviceError::Unreachable { reason: "there is no light to make".to_owned() })?;
        let lumens: f64 = lit.iter().map(|&k| demands[k] * lights[k].lumens).sum();
        // Y and lumens are proportional, whatever the scale of the tristimulus values.
        let y: f64 = lit.iter().map(|&k| demands[k] * lights[k].xyz[1]).sum();
        let search = WholeNumbers {
            xyz_each: lit.iter().zip(&each).map(|(&k, n)| lights[k].xyz.map(|part| part * n)).collect(),
            target,
            at_least: vec![1; lit.len()],
            at_most,
            least_y: y,
        };
        let found = search.closest().ok_or_else(|| DeviceError::Unreachable {
            reason: format!("{at_most} packages at their test currents do not give {lumens:.0} lm"),
        })?;
        let mut board = Board {
            counts: vec![0; demands.len()],
            currents_ma: vec![0.0; demands.len()],
            flux_factors: vec![1.0; demands.len()],
        };
        for (&k, &count) in lit.iter().zip(&found.counts) {
            board.counts[k] = count;
            board.currents_ma[k] = test_current(context, k);
        }
        let looked = if found.exhaustive {
            "all combinations looked at"
        } else {
            "searched along multiples of the blend"
        };
        let notice = format!(
            "whole numbers at test currents: Δu′v′ {:.5} from the blend ({looked})",
            found.delta_uv_prime
        );
        Ok((board, vec![notice]))
    }

    /// Least power over whole numbers and currents, in watts; counts stand in for areas.
    pub(crate) fn least_power(
        &self,
        context: &Context<'_>,
        demands: &[f64],
    ) -> Result<LeastPower, DeviceError> {
        context.need_eqe(demands)?;
        for k in Context::lit(demands) {
            if !context.characteristics[k].has_voltage() {
                return Err(DeviceError::Missing {
                    emitter: context.characteristics[k].name().to_owned(),
                    missing: "the package's forward voltage is missing: least power needs it".to_owned(),
                });
            }
        }
        let found =
            self.least_power_counts(context, demands, self.at_most.unwrap_or(DEFAULT_MOST_PACKAGES))?;
        let watts = |(k, (count, current)): (usize, &(u32, f64))| match count {
            0 => 0.0,
            count => f64::from(*count) * current * 1e-3 * context.characteristics[k].voltage(*current),
        };
        Ok(LeastPower {
            watts: found.iter().enumerate().map(watts).sum(),
            currents: found.iter().map(|f| f.1).collect(),
            areas: found.iter().map(|f| f64::from(f.0)).collect(),
        })
    }

    /// The same settings with the counts of a made board fixed.
    pub fn holding(&self, made: &Board, driven: &[usize], emitters: usize) -> Packages {
        let mut counts = vec![0; emitters];
        driven.iter().zip(&made.counts).for_each(|(&emitter, &count)| counts[emitter] = count);
        Packages { counts: Some(counts), ..self.clone() }
    }

    /// The lines of a package recipe.
    pub(crate) fn lines(&self, context: &Context<'_>, made: &Board) -> Vec<BoardLine> {
        let line = |k: usize| {
            let c = &context.characteristics[k];
            let (count, current_ma) = (made.counts[k], made.currents_ma[k]);
            let volts = (c.has_voltage() && current_ma > 0.0).then(|| c.voltage(current_ma));
            let arranged = volts.and_then(|volts| self.arrange(count, volts));
            let package = context.emitters[context.channels.driven[k]].sheet.package.as_ref();
            let bin = package.and_then(|p| p.flux_bin_low_lm.zip(p.flux_bin_high_lm)).map(|(low, high)| {
                let middle = 0.5 * (low + high);
                (low / middle, high / middle)
            });
            BoardLine {
                name: c.name().to_owned(),
                count,
                current_ma,
                forward_voltage_v: volts,
                strings: arranged.map(|a| a.0),
                in_series: arranged.map(|a| a.1),
                string_voltage_v: arranged.zip(volts).map(|(a, volts)| f64::from(a.1) * volts),
                bin,
            }
        };
        (0..made.counts.len()).map(line).collect()
    }
}

fn test_current(context: &Context<'_>, channel: usize) -> f64 {
    let package = context.emitters[context.channels.driven[channel]].sheet.package.as_ref();
    let (low, high) = context.characteristics[channel].range();
    package.and_then(|p| p.test_current_ma).unwrap_or(high).clamp(low, high)
}

impl BuildFace for Packages {
    type Quantities = Board;

    fn realise(&self, context: &Context<'_>, demands: &[f64]) -> Result<Realised<Board>, DeviceError> {
        context.need_eqe(demands)?;
        let mut notices = Vec::new();
        let board = if let Some(counts) = &self.counts {
            if counts.len() != context.emitters.len() {
                let (expected, found) = (context.emitters.len(), counts.len());
                return Err(DeviceError::LengthMismatch { what: "package counts", expected, found });
            }
            let mut board = Board {
                counts: vec![0; demands.len()],
                currents_ma: vec![0.0; demands.len()],
                flux_factors: vec![1.0; demands.len()],
            };
            for k in Context::lit(demands) {
                let (c, count) = (&context.characteristics[k], counts[context.channels.driven[k]]);
                let current = (count > 0).then(|| c.current_for(demands[k] / f64::from(count))).flatten();
                let current = current.ok_or_else(|| DeviceError::Unreachable {
                    reason: format!(
                        "{count} package(s) of {} cannot give this flux between {} and {} mA",
                        c.name(),
                        c.range().0,
                        c.range().1
                    ),
                })?;
                if !self.allowed(c, count, current) {
                    notices.push(format!(
                        "{count} package(s) of {} do not fit the string voltage window",
                        c.name()
                    ));
                }
                board.counts[k] = count;
                board.currents_ma[k] = current;
            }
            board
        } else if self.untrimmed {
            let (board, said) = self.untrimmed(context, demands)?;
            notices = said;
            board
        } else {
            let found = match self.at_most {
                Some(at_most) => self.least_power_counts(context, demands, at_most)?,
                None => self.counts_at_test(context, demands)?,
            };
            Board {
                counts: found.iter().map(|f| f.0).collect(),
                currents_ma: found.iter().map(|f| f.1).collect(),
                flux_factors: vec![1.0; demands.len()],
            }
        };
        let mut out = Realised::new(board);
        out.notices = notices;
        for k in Context::lit(demands) {
            let emitter = &context.emitters[context.channels.driven[k]];
            let Some(package) = &emitter.sheet.package else { continue };
            let die = package.die_area_mm2.is_some() && emitter.sheet.eqe.is_some();
            if package.relative_flux.is_none() && !die {
                out.assumptions.push(format!("{}: flux is taken proportional to current", emitter.name));
            }
            if package.forward_voltage.is_none() && package.forward_voltage_v.is_some() {
                out.assumptions.push(format!("{}: the forward voltage is taken as constant", emitter.name));
            }
            if package.radiant_flux_w.is_none() {
                out.assumptions
                    .push(format!("{}: packages are taken at the middle of their flux bin", emitter.name));
            }
            let parallel = self.lines(context, &out.quantities)[k].strings.is_some_and(|strings| strings > 1);
            if parallel {
                out.notices.push(format!("{}: parallel strings need ballast", emitter.name));
            }
        }
        Ok(out)
    }

    fn states(&self, context: &Context<'_>, made: &Board) -> Result<States, DeviceError> {
        let count = context.channels.len();
        if made.counts.len() != count || made.currents_ma.len() != count {
            let found = made.counts.len();
            return Err(DeviceError::LengthMismatch { what: "package counts", expected: count, found });
        }
        let mut states =
            States { channels: Vec::new(), absolute: true, shared_electrical_w: None, notices: Vec::new() };
        for k in 0..count {
            let (packages, current) = (f64::from(made.counts[k]), made.currents_ma[k]);
            if packages <= 0.0 || current <= 0.0 {
                states.channels.push(ChannelState::default());
                continue;
            }
            let c = &context.characteristics[k];
            let mut at = c.at(current)?;
            states.notices.append(&mut at.notices);
            let package = context.emitters[context.channels.driven[k]].sheet.package.as_ref();
            let die_cm2 = package.and_then(|p| p.die_area_mm2).map(|mm2| mm2 * 1e-2);
            let eqe = at.eqe.map(|eqe| eqe * made.flux_factors.get(k).copied().unwrap_or(1.0));
            let photon_current = packages * current * eqe.unwrap_or(0.0);
            let by_wall_plug = c.wall_plug().map(|w| {
                photon_current * context.channels.watts_per_photon_current(context.channels.driven[k]) / w
            });
            states.channels.push(ChannelState {
                photon_current,
                eqe,
                current_density_ma_per_cm2: die_cm2.map(|area| current / area),
                voltage_v: at.voltage_v,
                area_share: None,
                // m² of dies.
                lit_area: die_cm2.map(|area| packages * area * 1e-4),
                electrical_w: at.voltage_v.map(|volts| packages * current * 1e-3 * volts).or(by_wall_plug),
            });
        }
        Ok(states)
    }

    fn coupling(&self, _context: &Context<'_>) -> Result<Coupling, DeviceError> {
        Ok(Coupling::Own { budget: f64::from(self.at_most.unwrap_or(DEFAULT_MOST_PACKAGES)) })
    }

    fn freedoms(&self, _context: &Context<'_>) -> Vec<String> {
        match (&self.counts, self.untrimmed) {
            (Some(_), _) => Vec::new(),
            (None, true) => vec!["the whole numbers of packages are free".to_owned()],
            (None, false) => vec!["the whole numbers of packages are free; currents follow".to_owned()],
        }
    }
}
