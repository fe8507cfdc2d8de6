//! Device electrical power as an objective: exact least power of a blend, and lower bounds for every blend.
//!
//! The optimiser works with linear rows. [`PowerModel::cells`] gives it a list of [`Cell`]s; the least
//! electrical power of ANY blend is at least the smallest, over the cells whose rows the blend meets, of the
//! largest of that cell's planes. Cells narrow with the number of pieces, so the bound closes on
//! [`PowerModel::least_power`]. Own currents need one cell whose planes are prices on area; a common current, a
//! common voltage, a stack and a shared zone have one cell per interval of that current or voltage.
//!
//! Blends enter as radiant exitances (W/m² of panel; W for packages), power leaves in W/m² (W).

use std::sync::Arc;

use crate::allocation::{self, Item};
use crate::channels::Channels;
use crate::error::DeviceError;
use crate::search::scan_minimum;
use crate::working::Characteristic;

/// An affine function of the radiant powers of the emitters.
#[derive(Debug, Clone, PartialEq)]
pub struct Plane {
    /// Value at no light, W/m² (W for packages).
    pub constant_w: f64,
    /// Electrical watts per radiant watt of each emitter.
    pub per_radiant_w: Vec<f64>,
}

impl Plane {
    /// Value at radiant powers.
    pub fn at(&self, radiant: &[f64]) -> f64 {
        self.constant_w + dot(&self.per_radiant_w, radiant)
    }
}

/// A linear limit `Σ per_radiant_w·P ≤ at_most` every blend of a cell meets.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Coefficient of each emitter's radiant power.
    pub per_radiant_w: Vec<f64>,
    /// The limit.
    pub at_most: f64,
}

/// A piece of the freedom of a build form, relaxed to linear rows.
#[derive(Debug, Clone, PartialEq)]
pub struct Cell {
    /// Lower end of the common current (mA/cm²) or voltage (V); 0 where there is none.
    pub low: f64,
    /// Upper end.
    pub high: f64,
    /// The power is at least each of these.
    pub planes: Vec<Plane>,
    /// Blends this cell can make meet each of these (necessary, not sufficient).
    pub rows: Vec<Row>,
}

impl Cell {
    /// The cell's lower bound for a blend; `None` where a row excludes the blend.
    pub fn bound(&self, radiant: &[f64]) -> Option<f64> {
        let meets = |row: &Row| dot(&row.per_radiant_w, radiant) <= row.at_most * (1.0 + 1e-12);
        if !self.rows.iter().all(meets) {
            return None;
        }
        Some(self.planes.iter().map(|plane| plane.at(radiant)).fold(0.0, f64::max))
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// The least power of a blend and the freedoms that reach it, one entry a driven channel.
#[derive(Debug, Clone, PartialEq)]
pub struct LeastPower {
    /// Electrical power, W/m² of panel (W for packages).
    pub watts: f64,
    /// Current density of each channel, mA/cm² (mA for packages); 0 where dark.
    pub currents: Vec<f64>,
    /// Area share of each channel (count, as a real number, for packages); the fill for a stack or zone.
    pub areas: Vec<f64>,
}

/// How the channels of a form hang together electrically.
#[derive(Debug, Clone)]
pub(crate) enum Coupling {
    /// Own current each, areas sum to at most the budget.
    Own { budget: f64 },
    /// One current density, areas sum to at most the budget.
    CommonCurrent { budget: f64 },
    /// One voltage, areas sum to at most the budget.
    CommonVoltage { budget: f64 },
    /// One current through stacked units, `repeats` of each, each of the same lit area.
    Series { fill: f64, repeats: Vec<f64>, junctions_v: f64 },
    /// One zone shared by all: electrons divide among the emitters.
    Zone { fill: f64, voltage: Option<Arc<Characteristic>> },
}

/// A build form's electrical power over blends.
#[derive(Debug, Clone)]
pub struct PowerModel {
    channels: Channels,
    characteristics: Vec<Arc<Characteristic>>,
    items: Vec<Item>,
    coupling: Coupling,
    scale: f64,
}

/// Samples of a common current or voltage before refining.
const SCAN: usize = 240;

impl PowerModel {
    pub(crate) fn new(
        channels: Channels,
        characteristics: Vec<Arc<Characteristic>>,
        coupling: Coupling,
        scale: f64,
    ) -> Result<PowerModel, DeviceError> {
        let mut items = Vec::with_capacity(characteristics.len());
        for characteristic in &characteristics {
            // The voltage of a shared zone may come from the zone itself.
            let zone_voltage = matches!(&coupling, Coupling::Zone { voltage: Some(_), .. });
            match Item::new(characteristic.clone(), scale) {
                Some(item) => items.push(item),
                None if zone_voltage && characteristic.has_eqe() => {}
                None => return Err(lacking(characteristic)),
            }
            let stacked = matches!(&coupling, Coupling::Series { .. } | Coupling::CommonVoltage { .. })
                || matches!(&coupling, Coupling::Zone { voltage: None, .. });
            if stacked && !characteristic.has_voltage() {
                return Err(lacking(characteristic));
            }
        }
        Ok(PowerModel { channels, characteristics, items, coupling, scale })
    }

    /// Number of emitters of the set: the length of every radiant-power list.
    pub fn emitters(&self) -> usize {
        self.channels.emitters()
    }

    /// The exact least power of one blend.
    ///
    /// # Errors
    /// [`DeviceError::Unreachable`] where no current of the sheets gives this much light.
    pub fn least_power(&self, radiant: &[f64]) -> Result<LeastPower, DeviceError> {
        if radiant.len() != self.emitters() {
            let (expected, found) = (self.emitters(), radiant.len());
            return Err(DeviceError::LengthMismatch { what: "radiant powers", expected, found });
        }
        let (demands, _) = self.channels.demands(radiant)?;
        self.least_power_of_demands(&demands)
    }

    pub(crate) fn least_power_of_demands(&self, demands: &[f64]) -> Result<LeastPower, DeviceError> {
        if let Coupling::Own { budget } = self.coupling {
            return self.own(demands, budget);
        }
        let Some((low, high)) = self.parameter_range(demands) else {
            return Err(DeviceError::Unreachable {
                reason: "the sheets of the lit emitters have no common range of current or voltage"
                    .to_owned(),
            });
        };
        let value = |log: f64| self.watts_at(log.exp().clamp(low, high), demands).unwrap_or(f64::INFINITY);
        let best = if high > low { scan_minimum(value, low.ln(), high.ln(), SCAN) } else { low.ln() };
        // The ends are often the answer: meet them exactly.
        let candidates = [best.exp().clamp(low, high), low, high];
        let chosen = candidates
            .into_iter()
            .filter_map(|at| self.watts_at(at, demands).map(|watts| (at, watts)))
            .min_by(|a, b| a.1.total_cmp(&b.1));
        let Some((at, watts)) = chosen else {
            return Err(self.too_much_light(demands, high));
        };
        let mut currents = Vec::with_capacity(demands.len());
        let mut areas = Vec::with_capacity(demands.len());
        for (index, &demand) in demands.iter().enumerate() {
            let (current, area) = if demand > 0.0 { self.channel_at(index, at, demand) } else { (0.0, 0.0) };
            currents.push(current);
            areas.push(area);
        }
        Ok(LeastPower { watts, currents, areas })
    }

    fn own(&self, demands: &[f64], budget: f64) -> Result<LeastPower, DeviceError> {
        let lit: Vec<usize> = (0..demands.len()).filter(|&k| demands[k] > 0.0).collect();
        let items: Vec<&Item> = lit.iter().map(|&k| &self.items[k]).collect();
        let wanted: Vec<f64> = lit.iter().map(|&k| demands[k]).collect();
        let points = allocation::least_power(&items, &wanted, budget).map_err(|short| {
            DeviceError::Unreachable {
                reason: format!(
                    "at the highest currents of the sheets the emitters take {:.4} where {budget:.4} is there: \
                     ask for less light or allow more current",
                    short.needed
                ),
            }
        })?;
        let mut least =
            LeastPower { watts: 0.0, currents: vec![0.0; demands.len()], areas: vec![0.0; demands.len()] };
        for ((&k, point), demand) in lit.iter().zip(points).zip(wanted) {
            least.watts += demand * point.cost;
            least.currents[k] = point.current;
            least.areas[k] = demand * point.area;
        }
        Ok(least)
    }

    /// Current and area of one lit channel at a value of the common parameter.
    fn channel_at(&self, index: usize, at: f64, demand: f64) -> (f64, f64) {
        let characteristic = &self.characteristics[index];
        match &self.coupling {
            Coupling::CommonVoltage { .. } => {
                let current = characteristic.current_at_voltage(at);
                (current, demand / characteristic.photon_current(current))
            }
            Coupling::Series { fill, .. } | Coupling::Zone { fill, .. } => (at, *fill),
            Coupling::CommonCurrent { .. } | Coupling::Own { .. } => {
                (at, demand / characteristic.photon_current(at))
            }
        }
    }

    /// Range of the common current or voltage for the lit channels (all channels where nothing is lit).
    fn parameter_range(&self, demands: &[f64]) -> Option<(f64, f64)> {
        let anything = demands.iter().any(|d| *d > 0.0);
        let (mut low, mut high) = (0.0f64, f64::INFINITY);
        let mut narrow = |range: (f64, f64)| {
            low = low.max(range.0);
            high = high.min(range.1);
        };
        for (characteristic, &demand) in self.characteristics.iter().zip(demands) {
            // Every unit of a stack carries the current, lit or not.
            let counts = demand > 0.0 || !anything || matches!(self.coupling, Coupling::Series { .. });
            if !counts {
                continue;
            }
            let range = characteristic.range();
            narrow(match self.coupling {
                Coupling::CommonVoltage { .. } => {
                    (characteristic.voltage(range.0), characteristic.voltage(range.1))
                }
                _ => range,
            });
        }
        if let Coupling::Zone { voltage: Some(zone), .. } = &self.coupling {
            narrow(zone.range());
        }
        (low <= high && low > 0.0 && high.is_finite()).then_some((low, high))
    }

    /// Power of demands at one value of the common parameter; `None` where it cannot give them.
    pub(crate) fn watts_at(&self, at: f64, demands: &[f64]) -> Option<f64> {
        let fits = |value: f64, limit: f64| value <= limit * (1.0 + 1e-12);
        let lit = || self.characteristics.iter().zip(demands).filter(|(_, d)| **d > 0.0);
        match &self.coupling {
            Coupling::Own { .. } => None,
            Coupling::CommonCurrent { budget } => {
                let area: f64 = lit().map(|(c, d)| d / c.photon_current(at)).sum();
                fits(area, *budget).then(|| {
                    let of = |(item, d): (&Item, &f64)| d * item.point(at).cost;
                    self.items.iter().zip(demands).filter(|(_, d)| **d > 0.0).map(of).sum()
                })
            }
            Coupling::CommonVoltage { budget } => {
                let (mut area, mut watts) = (0.0, 0.0);
                for (c, d) in lit() {
                    let current = c.current_at_voltage(at);
                    area += d / c.photon_current(current);
                    watts += self.scale * d * at / c.eqe(current);
                }
                fits(area, *budget).then_some(watts)
            }
            Coupling::Series { fill, repeats, junctions_v } => {
                let enough = self
                    .characteristics
                    .iter()
                    .zip(demands)
                    .zip(repeats)
                    .all(|((c, d), repeats)| fits(*d, fill * repeats * c.photon_current(at)));
                let volts: f64 =
                    self.characteristics.iter().zip(repeats).map(|(c, r)| r * c.voltage(at)).sum();
                enough.then_some(self.scale * fill * at * (volts + junctions_v))
            }
            Coupling::Zone { fill, voltage } => {
                let electrons: f64 = lit().map(|(c, d)| d / c.eqe(at)).sum();
                let volts = match voltage {
                    Some(zone) => zone.voltage(at),
                    None => lit().map(|(c, _)| c.voltage(at)).fold(0.0, f64::max),
                };
                fits(electrons, fill * at).then_some(self.scale * fill * at * volts)
            }
        }
    }

    /// Linear relaxations that cover the whole freedom of the form, in about `pieces` parts.
    ///
    /// For own currents: one cell with that many planes. Otherwise: that many intervals of the common current
    /// or voltage, equal in its logarithm.
    pub fn cells(&self, pieces: usize) -> Vec<Cell> {
        let pieces = pieces.max(1);
        if let Coupling::Own { budget } = self.coupling {
            return vec![self.price_cell(budget, pieces)];
        }
        let Some((low, high)) = self.whole_range() else {
            return Vec::new();
        };
        let edge = |k: usize| match k {
            0 => low,
            k if k == pieces => high,
            k => low * (high / low).powf(k as f64 / pieces as f64),
        };
        (0..pieces).map(|k| self.cell(edge(k), edge(k + 1))).collect()
    }

    /// The range that can serve any blend: an emitter may be dark, so the union over emitters.
    fn whole_range(&self) -> Option<(f64, f64)> {
        if matches!(self.coupling, Coupling::Series { .. }) {
            return self.parameter_range(&vec![1.0; self.characteristics.len()]);
        }
        let (mut low, mut high) = (f64::INFINITY, 0.0f64);
        for index in 0..self.characteristics.len() {
            let mut only = vec![0.0; self.characteristics.len()];
            only[index] = 1.0;
            let range = self.parameter_range(&only)?;
            low = low.min(range.0);
            high = high.max(range.1);
        }
        (low <= high).then_some((low, high))
    }

    /// The two halves of a cell of a common current or voltage; a cell of own currents gives itself.
    pub fn split(&self, cell: &Cell) -> Vec<Cell> {
        if matches!(self.coupling, Coupling::Own { .. }) || cell.high <= cell.low {
            return vec![cell.clone()];
        }
        let middle = (cell.low * cell.high).sqrt();
        vec![self.cell(cell.low, middle), self.cell(middle, cell.high)]
    }

    /// Lower bound on the power of one blend from a list of cells; `None` where every cell excludes it.
    pub fn lower_bound(cells: &[Cell], radiant: &[f64]) -> Option<f64> {
        cells.iter().filter_map(|cell| cell.bound(radiant)).min_by(f64::total_cmp)
    }

    /// Turns a coefficient per unit of channel demand into one per radiant watt of every emitter.
    fn per_watt(&self, per_demand: &[f64]) -> Vec<f64> {
        (0..self.emitters())
            .map(|emitter| {
                let (channel, demand) = self.channels.least_demand_per_watt(emitter);
                per_demand[channel] * demand
            })
            .collect()
    }

    /// A budget row over channels; channels without a finite coefficient get a row that keeps them dark.
    fn budget_rows(&self, per_demand: &[f64], at_most: f64) -> Vec<Row> {
        let finite: Vec<f64> = per_demand.iter().map(|v| if v.is_finite() { *v } else { 0.0 }).collect();
        let mut rows = vec![Row { per_radiant_w: self.per_watt(&finite), at_most }];
        if per_demand.iter().any(|v| !v.is_finite()) {
            let dark: Vec<f64> = per_demand.iter().map(|v| if v.is_finite() { 0.0 } else { 1.0 }).collect();
            rows.push(Row { per_radiant_w: self.per_watt(&dark), at_most: 0.0 });
        }
        rows
    }

    /// Whether the form is bounded by prices on area (own currents) and not by intervals.
    pub fn is_priced(&self) -> bool {
        matches!(self.coupling, Coupling::Own { .. })
    }

    /// Prices on area that can matter, W per unit of area: from far below to far above the power density at
    /// which the channels run.
    pub fn price_range(&self) -> (f64, f64) {
        let (mut least, mut most) = (f64::INFINITY, 0.0f64);
        for item in &self.items {
            let (low, high) = item.characteristic().range();
            for at in [low, high] {
                let point = item.point(at);
                least = least.min(point.cost / point.area);
                most = most.max(point.cost / point.area);
            }
        }
        if least.is_finite() { (least * 1e-2, most * 10.0) } else { (1e-3, 1e3) }
    }

    /// The cell with the one plane of a price on area; for other forms, the plane of an empty budget.
    ///
    /// For every blend, least power ≥ `Σ D·min_J[cost + price·area] − price·budget`.
    pub fn priced(&self, price: f64) -> Cell {
        let budget = match self.coupling {
            Coupling::Own { budget } => budget,
            _ => 0.0,
        };
        let tightest: Vec<f64> =
            self.items.iter().map(|item| 1.0 / most_photons(item.characteristic())).collect();
        let rows = vec![Row { per_radiant_w: self.per_watt(&tightest), at_most: budget }];
        Cell { low: 0.0, high: 0.0, planes: vec![self.price_plane(price, budget)], rows }
    }

    fn price_plane(&self, price: f64, budget: f64) -> Plane {
        let per_demand: Vec<f64> = self.items.iter().map(|item| item.bound(price, 1e-5)).collect();
        Plane { constant_w: -price * budget, per_radiant_w: self.per_watt(&per_demand) }
    }

    fn price_cell(&self, budget: f64, prices: usize) -> Cell {
        let (least, most) = self.price_range();
        let spread = (0..prices).map(|k| least * (most / least).powf((k as f64 + 0.5) / prices as f64));
        let planes =
            std::iter::once(0.0).chain(spread).map(|price| self.price_plane(price, budget)).collect();
        Cell { planes, ..self.priced(0.0) }
    }

    /// The relaxation over one interval of the common current or voltage.
    fn cell(&self, low: f64, high: f64) -> Cell {
        let count = self.characteristics.len();
        let none = vec![0.0; self.emitters()];
        match &self.coupling {
            Coupling::Own { budget } => self.price_cell(*budget, 1),
            Coupling::CommonCurrent { budget } | Coupling::CommonVoltage { budget } => {
                let by_voltage = matches!(self.coupling, Coupling::CommonVoltage { .. });
                let (mut costs, mut areas) = (Vec::with_capacity(count), Vec::with_capacity(count));
                for (item, c) in self.items.iter().zip(&self.characteristics) {
                    let span = if by_voltage {
                        (c.current_at_voltage(low), c.current_at_voltage(high))
                    } else {
                        (low, high)
                    };
                    let Some((a, b)) = overlap(span, c.range()) else {
                        // This emitter cannot be lit here: a row of its own keeps it dark.
                        costs.push(0.0);
                        areas.push(f64::INFINITY);
                        continue;
                    };
                    let best_eqe = c.eqe_extremes(a, b).1;
                    costs.push(if by_voltage {
                        self.scale * low / best_eqe
                    } else if c.has_voltage() {
                        self.scale * c.voltage_extremes(a, b).0 / best_eqe
                    } else {
                        item.point(a).cost
                    });
                    areas.push(1.0 / (b * best_eqe));
                }
                Cell {
                    low,
                    high,
                    planes: vec![Plane { constant_w: 0.0, per_radiant_w: self.per_watt(&costs) }],
                    rows: self.budget_rows(&areas, *budget),
                }
            }
            Coupling::Series { fill, repeats, junctions_v } => {
                let mut volts = *junctions_v;
                let mut rows = Vec::with_capacity(count);
                for (index, (c, r)) in self.characteristics.iter().zip(repeats).enumerate() {
                    let (a, b) = overlap((low, high), c.range()).unwrap_or((low, high));
                    volts += r * c.voltage_extremes(a, b).0;
                    let mut only = vec![0.0; count];
                    only[index] = 1.0;
                    let most = fill * r * b * c.eqe_extremes(a, b).1;
                    rows.push(Row { per_radiant_w: self.per_watt(&only), at_most: most });
                }
                let constant_w = self.scale * fill * low * volts;
                Cell { low, high, planes: vec![Plane { constant_w, per_radiant_w: none }], rows }
            }
            Coupling::Zone { fill, voltage } => {
                let mut electrons = Vec::with_capacity(count);
                let mut least_volts = f64::INFINITY;
                for c in &self.characteristics {
                    match overlap((low, high), c.range()) {
                        Some((a, b)) => {
                            electrons.push(1.0 / c.eqe_extremes(a, b).1);
                            least_volts = least_volts.min(c.voltage_extremes(a, b).0);
                        }
                        None => electrons.push(f64::INFINITY),
                    }
                }
                if let Some(zone) = voltage {
                    let (a, b) = overlap((low, high), zone.range()).unwrap_or((low, high));
                    least_volts = zone.voltage_extremes(a, b).0;
                }
                let volts = if least_volts.is_finite() { least_volts } else { 0.0 };
                let constant_w = self.scale * fill * low * volts;
                let floor: Vec<f64> = electrons
                    .iter()
                    .map(|per| if per.is_finite() { self.scale * volts * per } else { 0.0 })
                    .collect();
                Cell {
                    low,
                    high,
                    planes: vec![
                        Plane { constant_w, per_radiant_w: none },
                        Plane { constant_w: 0.0, per_radiant_w: self.per_watt(&floor) },
                    ],
                    rows: self.budget_rows(&electrons, fill * high),
                }
            }
        }
    }

    fn too_much_light(&self, demands: &[f64], highest: f64) -> DeviceError {
        let reason = match &self.coupling {
            Coupling::Series { fill, repeats, .. } => {
                let worst = self
                    .characteristics
                    .iter()
                    .zip(demands)
                    .zip(repeats)
                    .map(|((c, d), r)| (c.name(), d / (fill * r * c.photon_current(highest))))
                    .max_by(|a, b| a.1.total_cmp(&b.1));
                let (name, factor) = worst.unwrap_or(("a unit", 1.0));
                format!(
                    "{name} gives too few photons in a stack at {highest} mA/cm²: {factor:.3} times as many are \
                     needed; repeat the unit or ask for less light"
                )
            }
            _ => format!(
                "the emitters cannot give this much light on the lit area up to {highest} (current in mA/cm² or \
                 voltage in V): ask for less light, more lit area or more current"
            ),
        };
        DeviceError::Unreachable { reason }
    }
}

fn overlap(a: (f64, f64), b: (f64, f64)) -> Option<(f64, f64)> {
    let (low, high) = (a.0.max(b.0), a.1.min(b.1));
    (low <= high).then_some((low, high))
}

/// An upper bound on the photon current over the whole range, by halving spans.
fn most_photons(c: &Characteristic) -> f64 {
    let (low, high) = c.range();
    let pieces = 400;
    let edge = |k: usize| low * (high / low).powf(k as f64 / pieces as f64);
    (0..pieces)
        .map(|k| {
            let (a, b) = (edge(k), edge(k + 1).min(high));
            b * c.eqe_extremes(a, b).1
        })
        .fold(0.0, f64::max)
}

fn lacking(characteristic: &Characteristic) -> DeviceError {
    let missing = if !characteristic.has_eqe() {
        "EQE against current density is missing: least power needs it"
    } else {
        "voltage against current density is missing: least power needs it"
    };
    DeviceError::Missing { emitter: characteristic.name().to_owned(), missing: missing.to_owned() }
}
