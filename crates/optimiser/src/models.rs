//! Linear models of one metric around a point.

/// Most free directions handled: 40 emitters at an exact white leave 37.
pub(crate) const MOST: usize = 40;

/// `lower + grad·(t − c) ≤ metric(t) ≤ upper + grad·(t − c)` over a box round c; at a mere point upper = lower = value.
#[derive(Clone, Debug)]
pub(crate) struct Model {
    pub(crate) upper: f64,
    pub(crate) lower: f64,
    pub(crate) grad: [f64; MOST],
}

impl Default for Model {
    fn default() -> Model {
        Model { upper: f64::INFINITY, lower: f64::NEG_INFINITY, grad: [0.0; MOST] }
    }
}

impl Model {
    /// Makes it a tangent at a point.
    pub(crate) fn set_point(&mut self, value: f64) {
        self.upper = value;
        self.lower = value;
    }
}
