//! Own currents for every channel under one budget of area (or of packages): least electrical power.
//!
//! A channel that must give the photon current D at current density J takes the area `a = D/(J·EQE)` and the
//! power `10·D·V/EQE`. The least power under `Σa ≤ fill` is found through its price µ on area: each channel
//! minimises `V/EQE·10 + µ/(J·EQE)` alone, and µ is raised until the areas fit. Where a channel's curve is
//! not convex the prices leave a gap; all grids are then merged under the budget, and exchanges of area between
//! pairs of channels refine the result.

use std::sync::Arc;

use crate::search::{scan_minimum, scan_minimum_to};
use crate::working::Characteristic;

/// Currents looked at before refining.
const GRID: usize = 160;
/// Bins of area in which [`merge`] keeps one partial choice each.
const MERGE_BINS: usize = 2000;
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
    /// The cheapest point of all, whatever its area.
    free: Option<Point>,
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
        let mut item = Item { characteristic, scale, grid: Vec::new(), free: None };
        let even = (0..=GRID).map(|k| match k {
            0 => low,
            GRID => high,
            k => low * (high / low).powf(k as f64 / GRID as f64),
        });
        // Rows of the tables are where a curve bends most.
        let mut currents: Vec<f64> = even.chain(item.characteristic.rows_inside()).collect();
        currents.sort_by(f64::total_cmp);
        currents.dedup();
        item.grid = currents.into_iter().map(|current| item.point(current)).collect();
        item.free = Some(item.best(0.0));
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
        let high = self.grid[(index + 1).min(self.grid.len() - 1)].current.ln();
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
        self.free.into_iter().for_each(offer);
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
            low = middle;
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
        // A curve that is not convex: merge all grids at once, then refine by exchanges from both starts.
        best = exchange(items, demand, budget, best);
        if let Some(merged) = merge(items, demand, budget) {
            let merged = exchange(items, demand, budget, fill_up(items, demand, budget, merged));
            if cost(&merged) < cost(&best) {
                best = merged;
            }
        }
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

/// A partial choice in [`merge`]: its totals, the grid point of the last item, the partial choice before it.
#[derive(Debug, Clone, Copy)]
struct Partial {
    area: f64,
    cost: f64,
    point: usize,
    before: usize,
}

/// The best combination of grid points, item by item, keeping the cheapest partial choice in each narrow bin of
/// area.
fn merge(items: &[&Item], demand: &[f64], budget: f64) -> Option<Vec<Point>> {
    let mut layers: Vec<Vec<Partial>> = vec![vec![Partial { area: 0.0, cost: 0.0, point: 0, before: 0 }]];
    for (item, d) in items.iter().zip(demand) {
        // Only points that no other point beats in both area and cost.
        let mut order: Vec<usize> = (0..item.grid.len()).collect();
        order.sort_by(|&a, &b| item.grid[a].area.total_cmp(&item.grid[b].area));
        let mut cheapest = f64::INFINITY;
        order.retain(|&k| {
            let better = item.grid[k].cost < cheapest;
            cheapest = cheapest.min(item.grid[k].cost);
            better
        });
        let mut bins: Vec<Option<Partial>> = vec![None; MERGE_BINS + 1];
        for (before, partial) in layers[layers.len() - 1].iter().enumerate() {
            for &point in &order {
                let area = partial.area + d * item.grid[point].area;
                if area > budget {
                    break;
                }
                let cost = partial.cost + d * item.grid[point].cost;
                let bin = &mut bins[(area / budget * MERGE_BINS as f64) as usize];
                if bin.is_none_or(|kept| cost < kept.cost) {
                    *bin = Some(Partial { area, cost, point, before });
                }
            }
        }
        layers.push(bins.into_iter().flatten().collect());
    }
    let last = layers.last()?;
    let mut at = (0..last.len()).min_by(|&a, &b| last[a].cost.total_cmp(&last[b].cost))?;
    let mut points = Vec::with_capacity(items.len());
    for (item, layer) in items.iter().zip(layers.iter().skip(1)).rev() {
        points.push(item.grid[layer[at].point]);
        at = layer[at].before;
    }
    points.reverse();
    Some(points)
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
                    let high = items[i].grid[(k + 1).min(items[i].grid.len() - 1)].current.ln();
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
