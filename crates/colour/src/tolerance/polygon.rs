//! Polygons in u′, v′.

use crate::chromaticity::UvPrime;
use thiserror::Error;

/// A closed polygon in u′, v′ without crossing edges. Straight edges in x, y are straight in u′, v′ too.
#[derive(Debug, Clone, PartialEq)]
pub struct Polygon {
    vertices: Vec<UvPrime>,
}

/// Why points are no polygon.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum PolygonError {
    /// Fewer than three points.
    #[error("a polygon needs at least three corners; {got} given")]
    TooFewCorners {
        /// Corners given.
        got: usize,
    },
    /// A coordinate is not finite.
    #[error("corner {index} is not a pair of finite numbers")]
    NotFinite {
        /// Corner, counted from 0.
        index: usize,
    },
    /// The corners enclose no area.
    #[error("the corners enclose no area")]
    Flat,
    /// Two edges cross.
    #[error("edges {first} and {second} cross")]
    Crossing {
        /// One edge, counted from 0.
        first: usize,
        /// The other.
        second: usize,
    },
}

impl Polygon {
    /// A polygon of corners in order, either way round.
    ///
    /// *Errors:* fewer than three corners, a coordinate that is not finite, no area, crossing edges.
    pub fn new(vertices: Vec<UvPrime>) -> Result<Polygon, PolygonError> {
        if vertices.len() < 3 {
            return Err(PolygonError::TooFewCorners { got: vertices.len() });
        }
        if let Some(index) = vertices.iter().position(|p| !p.u.is_finite() || !p.v.is_finite()) {
            return Err(PolygonError::NotFinite { index });
        }
        let polygon = Polygon { vertices };
        let n = polygon.vertices.len();
        for first in 0..n {
            for second in first + 2..n {
                if (second + 1) % n != first && cross(polygon.edge(first), polygon.edge(second)) {
                    return Err(PolygonError::Crossing { first, second });
                }
            }
        }
        if polygon.signed_area().abs() < 1e-12 {
            return Err(PolygonError::Flat);
        }
        Ok(polygon)
    }

    /// The corners, as given.
    pub fn vertices(&self) -> &[UvPrime] {
        &self.vertices
    }

    /// Area, positive counter-clockwise.
    pub fn signed_area(&self) -> f64 {
        (0..self.vertices.len())
            .map(|i| {
                let [a, b] = self.edge(i);
                0.5 * (a.u * b.v - a.v * b.u)
            })
            .sum()
    }

    /// Whether a point lies inside or on the edge (within 1e-12).
    pub fn contains(&self, point: UvPrime) -> bool {
        self.margin(point) >= -1e-12
    }

    /// Distance to the nearest edge in u′, v′: positive inside, negative outside.
    pub fn margin(&self, point: UvPrime) -> f64 {
        let mut least = f64::INFINITY;
        let mut inside = false;
        for i in 0..self.vertices.len() {
            let [a, b] = self.edge(i);
            let (du, dv) = (b.u - a.u, b.v - a.v);
            let along = ((point.u - a.u) * du + (point.v - a.v) * dv) / (du * du + dv * dv).max(1e-300);
            let t = along.clamp(0.0, 1.0);
            least = least.min((a.u + t * du - point.u).hypot(a.v + t * dv - point.v));
            if (a.v > point.v) != (b.v > point.v) && point.u < a.u + (point.v - a.v) / dv * du {
                inside = !inside;
            }
        }
        if inside { least } else { -least }
    }

    fn edge(&self, i: usize) -> [UvPrime; 2] {
        [self.vertices[i], self.vertices[(i + 1) % self.vertices.len()]]
    }
}

fn cross([a, b]: [UvPrime; 2], [c, d]: [UvPrime; 2]) -> bool {
    let side = |p: UvPrime, q: UvPrime, r: UvPrime| (q.u - p.u) * (r.v - p.v) - (q.v - p.v) * (r.u - p.u);
    side(a, b, c) * side(a, b, d) < 0.0 && side(c, d, a) * side(c, d, b) < 0.0
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(u: f64, v: f64) -> UvPrime {
        UvPrime { u, v }
    }

    #[test]
    fn margin_is_the_signed_distance_to_the_nearest_edge() {
        let square = Polygon::new(vec![at(0.2, 0.5), at(0.2, 0.6), at(0.3, 0.6), at(0.3, 0.5)]).unwrap();
        assert!((square.margin(at(0.21, 0.55)) - 0.01).abs() < 1e-15);
        assert!((square.margin(at(0.19, 0.55)) + 0.01).abs() < 1e-15);
        assert!((square.margin(at(0.33, 0.64)) + 0.05).abs() < 1e-15, "corner");
        assert!(square.contains(at(0.2, 0.55)) && !square.contains(at(0.199_99, 0.55)));
    }

    #[test]
    fn hollow_polygons_are_allowed_and_crossing_ones_refused() {
        let arrow = Polygon::new(vec![at(0.0, 0.0), at(0.4, 0.4), at(0.8, 0.0), at(0.4, 0.8)]).unwrap();
        assert!(!arrow.contains(at(0.4, 0.2)) && arrow.contains(at(0.4, 0.6)));
        let bow = Polygon::new(vec![at(0.0, 0.0), at(1.0, 1.0), at(1.0, 0.0), at(0.0, 1.0)]);
        assert!(matches!(bow, Err(PolygonError::Crossing { .. })));
        assert_eq!(Polygon::new(vec![at(0.0, 0.0), at(0.1, 0.1), at(0.2, 0.2)]), Err(PolygonError::Flat));
    }
}
