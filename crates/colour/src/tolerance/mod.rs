//! Where a white may lie: quadrangles, ellipses, circles, polygons. Each names its standard and its centre, because
//! "three steps" of two standards round two centres are different regions.

mod circle;
mod ellipse;
mod polygon;
mod quadrangle;

pub use circle::{STEP_RADIUS, StepCircle};
pub use ellipse::{Ellipse, IEC_60081};
pub use polygon::{Polygon, PolygonError};
pub use quadrangle::{C78_377_2017, EDITION, NOMINAL_CCTS_K, Quadrangle};
