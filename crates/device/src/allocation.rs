//! Own currents for every channel under one budget of area (or of packages): least electrical power.
//!
//! A channel that must give the photon current D at current density J takes the area `a = D/(J·EQE)` and the
//! power `10·D·V/EQE`. The least power under `Σa ≤ fill` is found through its price µ on area: each channel
//! minimises `V/EQE·10 + µ/(J·EQE)` alone, and µ is raised until the areas fit. Where a channel's curve is
//! not convex the prices may leave area unused; exchanges between pairs of channels then use it up.

use std::sync::Arc;

use crate::roll_off::{scan_minimum, scan_minimum_to};
use crate::working::Characteristic;

/// Currents looked at before refining.
const GRID: usize = 160;
/// Rounds of pair exchanges, far more than are ever needed.
const EXCHANGE_ROUNDS: usize = 30;

/// Area and cost of one unit of demand at one current.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Point {
    pub(crate) current: f64,
    pub(crate) area: f64,
    pub(crate) cost: f64,
}

/// One channel seen as a choice of current.
#[derive(Debug, Clone)]
pub(crate) struct Item {
    characteristic: Arc<Characteristic>,
    scale: f64,
    grid: Vec<Point>,
}

impl Item {
    /// `None` where the sheet lacks EQE, or both voltage and wall-plug efficiency.
    pub(crate) fn new(characteristic: Arc<Characteristic>, scale: f64) -> Option<Item> {
        let known = characteristic.has_eqe()
            && (characteristic.has_voltage() || characteristic.wall_plug().is_some());
        if !known {
            return None;
        }
        let (low, high) = characteristic.range();
        let mut item = Item { characteristic, scale, grid: Vec::new() };
        item.grid = (0..=GRID)
            .map(|k| match k {
                0 => low,
                GRID => high,
                k => low * (high / low).powf(k as f64 / GRID as f64),
            })
            .map(|current| item.point(current))
            .collect();
        Some(item)
    }

    pub(crate) fn characteristic(&self) -> &Characteristic {
        &self.characteristic
    }

    /// Electrical power of one unit of demand at a current.
    fn cost(&self, current: f64) -> f64 {
        let c = &self.characteristic;
        if c.has_voltage() {
            self.scale * c.voltage(current) / c.eqe(current)
        } else {
            let wall_plug = c.wall_plug().unwrap_or(1.0);
            self.scale * crate::units::PHOTON_ENERGY_EV_NM / c.light().mean_wavelength_nm / wall_plug
        }
    }

    pub(crate) fn point(&self, current: f64) -> Point {
        let area = 1.0 / self.characteristic.photon_current(current);
        Point { current, area, cost: self.cost(current) }
    }

    /// Lower bounds on area and cost over a span of currents.
    fn span(&self, low: f64, high: f64) -> (f64, f64) {
        let c = &self.characteristic;
        let best_eqe = c.eqe_extremes(low, high).1;
        let area = 1.0 / (high * best_eqe);
        let cost = if c.has_voltage() {
            self.scale * c.voltage_extremes(low, high).0 / best_eqe
        } else {
            self.cost(low)
        };
        (area, cost)
    }

    /// The best grid point at a price on area.
    fn best_index(&self, price: f64) -> usize {
        let mut best = (0, f64::INFINITY);
        for (index, point) in self.grid.iter().enumerate() {
            let value = point.cost + price * point.area;
            if value < best.1 {
                best = (index, value);
            }
        }
        best.0
    }

    /// The best current at a price on area.
    pub(crate) fn best(&self, price: f64) -> Point {
        let index = self.best_index(price);
        let low = self.grid[index.saturating_sub(1)].current.ln();
        let high = self.grid[(index + 1).min(GRID)].current.ln();
        if high <= low {
            return self.grid[index];
        }
        let value = |log: f64| {
            let point = self.point(log.exp());
            point.cost + price * point.area
        };
        // 28 steps leave 1e-6 of two grid steps: the value is then exact to rounding.
        let refined = self.point(scan_minimum_to(value, low, high, 2, 28).exp().clamp(low.exp(), high.exp()));
        let grid = self.grid[index];
        if refined.cost + price * refined.area <= grid.cost + price * grid.area { refined } else { grid }
    }

    /// A rigorous lower bound of `cost + price·area` over every current, within `tolerance` (relative).
    pub(crate) fn bound(&self, price: f64, tolerance: f64) -> f64 {
        let best = self.best(price);
        let found = best.cost + price * best.area;
        let floor = found * (1.0 - tolerance);
        let (low, high) = self.characteristic.range();
        let mut open = vec![(low, high)];
        let mut bound = found;
        let mut looked = 0usize;
        while let Some((a, b)) = open.pop() {
            let (area, cost) = self.span(a, b);
            let value = cost + price * area;
            looked += 1;
            let tiny = b <= a * (1.0 + 1e-9) || looked > 20_000;
            if value >= floor || tiny {
                bound = bound.min(value);
                continue;
            }
            let middle = (a * b).sqrt();
            open.push((a, middle));
            open.push((middle, b));
        }
        bound
    }

    /// The cheapest point that takes at most this area per unit of demand.
    fn cheapest_within(&self, area: f64) -> Option<Point> {
        let mut best: Option<Point> = None;
        let mut offer = |point: Point| {
            let fits = point.area <= area * (1.0 + 1e-13);
            if fits && best.is_none_or(|best| point.cost < best.cost) {
                best = Some(point);
            }
        };
        if let Some(current) = self.characteristic.current_for(1.0 / area) {
            offer(self.point(current));
        }
        self.grid.iter().for_each(|point| offer(*point));
        offer(self.best(0.0));
        best
    }
}

/// Why no currents can be given.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct TooLittleArea {
    /// The area that even the highest currents need.
    pub(crate) needed: f64,
}

/// Least-power points for the items with these demands (all above zero) under a budget of area.
pub(crate) fn least_power(items: &[&Item], demand: &[f64], budget: f64) -> Result<Vec<Point>, TooLittleArea> {
    let total = |points: &[Point], of: fn(&Point) -> f64| -> f64 {
        points.iter().zip(demand).map(|(point, d)| d * of(point)).sum()
    };
    let area = |points: &[Point]| total(points, |p| p.area);
    let cost = |points: &[Point]| total(points, |p| p.cost);
    let at_price = |price: f64| -> Vec<Point> { items.iter().map(|item| item.best(price)).collect() };
    let fits = |points: &[Point]| area(points) <= budget * (1.0 + 1e-12);

    let free = at_price(0.0);
    if fits(&free) {
        return Ok(free);
    }
    let needed = smallest_area(items, demand);
    if needed > budget * (1.0 + 1e-12) {
        return Err(TooLittleArea { needed });
    }
    // A price in the scale of the problem, then up until it fits.
    let mut high = cost(&free) / budget;
    let mut low = 0.0;
    let mut dear = at_price(high);
    let mut doublings = 0;
    while !fits(&dear) && doublings < 200 {
        low = high;
        high *= 4.0;
        dear = at_price(high);
        doublings += 1;
    }
    if !fits(&dear) {
        dear = tightest(items);
    }
    let mut cheap = if low > 0.0 { at_price(low) } else { free };
    for _ in 0..60 {
        let middle = if low > 0.0 { (low * high).sqrt() } else { high / 16.0 };
        if high <= low * (1.0 + 1e-13) || middle < 1e-300 {
            break;
        }
        let points = at_price(middle);
        if fits(&points) {
            (high, dear) = (middle, points);
            if area(&dear) >= budget * (1.0 - 1e-10) {
                break;
            }
        } else {
            (low, cheap) = (middle, points);
        }
    }
    // The price bound: no choice of currents costs less.
    let bound = items
        .iter()
        .zip(demand)
        .zip(&dear)
        .map(|((_, d), point)| d * (point.cost + high * point.area))
        .sum::<f64>()
        - high * budget;
    let mut best = fill_up(items, demand, budget, dear);
    if cost(&best) > bound * (1.0 + 1e-7) {
        // A jump between two branches: try each jumping item on the cheap branch, then exchange.
        for index in 0..items.len() {
            let mut trial = best.clone();
            trial[index] = cheap[index];
            if fits(&trial) && cost(&trial) < cost(&best) {
                best = trial;
            }
        }
        best = exchange(items, demand, budget, best);
    }
    Ok(best)
}

/// The smallest area that any currents allow.
pub(crate) fn smallest_area(items: &[&Item], demand: &[f64]) -> f64 {
    tightest(items).iter().zip(demand).map(|(point, d)| d * point.area).sum()
}

fn tightest(items: &[&Item]) -> Vec<Point> {
    let of = |item: &Item| {
        item.grid.iter().copied().min_by(|a, b| a.area.total_cmp(&b.area)).unwrap_or(item.grid[0])
    };
    items.iter().map(|item| of(item)).collect()
}

/// Lets each item in turn use the area that is left over.
fn fill_up(items: &[&Item], demand: &[f64], budget: f64, mut points: Vec<Point>) -> Vec<Point> {
    for index in 0..items.len() {
        let used: f64 = (0..items.len()).filter(|&k| k != index).map(|k| demand[k] * points[k].area).sum();
        let room = (budget - used) / demand[index];
        if let Some(point) = items[index].cheapest_within(room).filter(|p| p.cost < points[index].cost) {
            points[index] = point;
        }
    }
    points
}

/// Exchanges area between pairs of items until nothing is gained.
fn exchange(items: &[&Item], demand: &[f64], budget: f64, mut points: Vec<Point>) -> Vec<Point> {
    let cost = |points: &[Point]| -> f64 { points.iter().zip(demand).map(|(p, d)| d * p.cost).sum() };
    for _ in 0..EXCHANGE_ROUNDS {
        let before = cost(&points);
        for i in 0..items.len() {
            for j in 0..items.len() {
                if i == j {
                    continue;
                }
                let used: f64 =
                    (0..items.len()).filter(|&k| k != i && k != j).map(|k| demand[k] * points[k].area).sum();
                let room = budget - used;
                let pair = |point: Point| -> Option<(Point, Point, f64)> {
                    let left = (room - demand[i] * point.area) / demand[j];
                    let other = (left > 0.0).then(|| items[j].cheapest_within(left)).flatten()?;
                    Some((point, other, demand[i] * point.cost + demand[j] * other.cost))
                };
                let mut best =
                    (points[i], points[j], demand[i] * points[i].cost + demand[j] * points[j].cost);
                let mut at = None;
                for (k, point) in items[i].grid.iter().enumerate() {
                    if let Some(found) = pair(*point).filter(|found| found.2 < best.2) {
                        best = found;
                        at = Some(k);
                    }
                }
                if let Some(k) = at {
                    let low = items[i].grid[k.saturating_sub(1)].current.ln();
                    let high = items[i].grid[(k + 1).min(GRID)].current.ln();
                    let value = |log: f64| pair(items[i].point(log.exp())).map_or(f64::INFINITY, |f| f.2);
                    let log = scan_minimum(value, low, high, 8);
                    if let Some(found) = pair(items[i].point(log.exp())).filter(|found| found.2 < best.2) {
                        best = found;
                    }
                }
                (points[i], points[j]) = (best.0, best.1);
            }
        }
        if cost(&points) >= before * (1.0 - 1e-10) {
            break;
        }
    }
    points
}
