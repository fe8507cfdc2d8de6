//! One triangle into rows of pixels: exact coverage on a 1/256 pixel lattice, so neighbours never overlap or gap.

use egui::Color32;
use egui::epaint::Vertex;

/// Subpixel steps a pixel, as graphics hardware has them.
const STEPS: i64 = 256;

/// A texture as the rasteriser keeps it: premultiplied colours, row after row.
#[derive(Debug)]
pub(super) struct Texture {
    pub(super) width: usize,
    pub(super) height: usize,
    pub(super) pixels: Vec<Color32>,
    /// Blend the four nearest texels instead of taking the nearest one.
    pub(super) smooth: bool,
}

impl Texture {
    fn texel(&self, x: i64, y: i64) -> [f32; 4] {
        let x = x.clamp(0, self.width as i64 - 1) as usize;
        let y = y.clamp(0, self.height as i64 - 1) as usize;
        self.pixels.get(y * self.width + x).map_or([0.0; 4], |c| c.to_array().map(f32::from))
    }

    fn sample(&self, u: f32, v: f32) -> [f32; 4] {
        let (x, y) = (u * self.width as f32, v * self.height as f32);
        if !self.smooth {
            return self.texel(x.floor() as i64, y.floor() as i64);
        }
        let (x, y) = (x - 0.5, y - 0.5);
        let (left, top) = (x.floor(), y.floor());
        let (fx, fy) = (x - left, y - top);
        let (left, top) = (left as i64, top as i64);
        // Glyphs land on whole texels: one look-up is then the exact answer.
        if fx == 0.0 && fy == 0.0 {
            return self.texel(left, top);
        }
        let (a, b) = (self.texel(left, top), self.texel(left + 1, top));
        let (c, d) = (self.texel(left, top + 1), self.texel(left + 1, top + 1));
        std::array::from_fn(|k| {
            let upper = a[k] + (b[k] - a[k]) * fx;
            let lower = c[k] + (d[k] - c[k]) * fx;
            upper + (lower - upper) * fy
        })
    }
}

/// The part of the picture one worker paints: whole rows from `first_row` on.
pub(super) struct Band<'a> {
    pub(super) pixels: &'a mut [Color32],
    pub(super) width: usize,
    pub(super) first_row: usize,
}

/// A pixel rectangle, right and bottom exclusive.
#[derive(Clone, Copy)]
pub(super) struct PixelRect {
    pub(super) left: i64,
    pub(super) top: i64,
    pub(super) right: i64,
    pub(super) bottom: i64,
}

/// A quantity that varies linearly over the picture: value at the first vertex and its slopes.
#[derive(Clone, Copy)]
struct Plane {
    value: f64,
    per_x: f64,
    per_y: f64,
}

impl Plane {
    fn through(at: &[(f64, f64); 3], values: [f64; 3]) -> Self {
        let (dx1, dy1) = (at[1].0 - at[0].0, at[1].1 - at[0].1);
        let (dx2, dy2) = (at[2].0 - at[0].0, at[2].1 - at[0].1);
        let area = dx1 * dy2 - dx2 * dy1;
        let (d1, d2) = (values[1] - values[0], values[2] - values[0]);
        Self { value: values[0], per_x: (d1 * dy2 - d2 * dy1) / area, per_y: (d2 * dx1 - d1 * dx2) / area }
    }

    fn at(&self, dx: f64, dy: f64) -> f32 {
        (self.value + self.per_x * dx + self.per_y * dy) as f32
    }
}

/// Paints one triangle; positions are in pixels, colours premultiplied and blended in gamma space like egui's own painters.
pub(super) fn fill(
    texture: &Texture,
    vertices: [&Vertex; 3],
    scale: f32,
    clip: PixelRect,
    band: &mut Band<'_>,
) {
    let mut vertices = vertices;
    let lattice = |v: &Vertex| {
        let snap = |p: f32| (f64::from(p) * f64::from(scale) * STEPS as f64).round();
        (snap(v.pos.x), snap(v.pos.y))
    };
    if vertices.iter().any(|v| !(v.pos.x.is_finite() && v.pos.y.is_finite())) {
        return;
    }
    // Far outside positions are held so that the integer products below cannot overflow.
    let hold = |p: f64| p.clamp(-1e8, 1e8) as i64;
    let mut corners = vertices.map(|v| {
        let (x, y) = lattice(v);
        (hold(x), hold(y))
    });
    let area = (corners[1].0 - corners[0].0) * (corners[2].1 - corners[0].1)
        - (corners[1].1 - corners[0].1) * (corners[2].0 - corners[0].0);
    if area == 0 {
        return;
    }
    if area < 0 {
        corners.swap(1, 2);
        vertices.swap(1, 2);
    }

    let low = |pick: fn(&(i64, i64)) -> i64| corners.iter().map(pick).min().unwrap_or(0);
    let high = |pick: fn(&(i64, i64)) -> i64| corners.iter().map(pick).max().unwrap_or(0);
    let rows = band.pixels.len() / band.width.max(1);
    let top = low(|c| c.1).div_euclid(STEPS).max(clip.top).max(band.first_row as i64);
    let bottom = (high(|c| c.1).div_euclid(STEPS) + 1).min(clip.bottom).min((band.first_row + rows) as i64);
    let left = low(|c| c.0).div_euclid(STEPS).max(clip.left);
    let right = (high(|c| c.0).div_euclid(STEPS) + 1).min(clip.right);
    if top >= bottom || left >= right {
        return;
    }

    // Inside an edge a→b: cross(b−a, p−a) ≥ 0, with edges that are neither top nor left made strict by −1.
    let edges = [(0, 1), (1, 2), (2, 0)].map(|(a, b)| {
        let (dx, dy) = (corners[b].0 - corners[a].0, corners[b].1 - corners[a].1);
        let owns_boundary = dy < 0 || (dy == 0 && dx > 0);
        (corners[a], dx, dy, if owns_boundary { 0 } else { 1 })
    });

    let paint = Paint::of(texture, &vertices, &corners);
    for y in top..bottom {
        let centre_y = y * STEPS + STEPS / 2;
        let (mut first, mut last) = (left, right - 1);
        for &(from, dx, dy, strict) in &edges {
            // cross = dx·(cy − from.y) − dy·(cx − from.x) ≥ strict, cx = x·STEPS + STEPS/2
            let constant = dx * (centre_y - from.1) - dy * (STEPS / 2 - from.0) - strict;
            let slope = -dy * STEPS;
            match slope.signum() {
                0 => {
                    if constant < 0 {
                        last = first - 1;
                    }
                }
                1 => {
                    first = first
                        .max((-constant).div_euclid(slope) + i64::from((-constant).rem_euclid(slope) != 0));
                }
                _ => last = last.min(constant.div_euclid(-slope)),
            }
        }
        if first > last {
            continue;
        }
        let row = (y as usize - band.first_row) * band.width;
        if let Some(span) = band.pixels.get_mut(row + first as usize..=row + last as usize) {
            paint.span(texture, span, first, y);
        }
    }
}

/// How the inside of a triangle is coloured.
enum Paint {
    /// One colour all over, the commonest case by far.
    Flat([f32; 4]),
    /// Colour varies, texture does not: the soft edges of shapes.
    Shaded { origin: (f64, f64), colour: [Plane; 4] },
    /// Everything varies: glyphs and pictures.
    Textured { origin: (f64, f64), colour: Option<[Plane; 4]>, constant: [f32; 4], u: Plane, v: Plane },
}

impl Paint {
    fn of(texture: &Texture, vertices: &[&Vertex; 3], corners: &[(i64, i64); 3]) -> Self {
        let at = corners.map(|(x, y)| (x as f64 / STEPS as f64, y as f64 / STEPS as f64));
        let same_colour = vertices[0].color == vertices[1].color && vertices[1].color == vertices[2].color;
        let same_texel = vertices[0].uv == vertices[1].uv && vertices[1].uv == vertices[2].uv;
        let colours = vertices.map(|v| v.color.to_array().map(f32::from));
        let planes = |scale: [f32; 4]| {
            std::array::from_fn(|k| {
                Plane::through(&at, [0, 1, 2].map(|i| f64::from(colours[i][k] * scale[k] / 255.0)))
            })
        };
        if same_texel {
            let texel = texture.sample(vertices[0].uv.x, vertices[0].uv.y);
            if same_colour {
                return Self::Flat(std::array::from_fn(|k| texel[k] * colours[0][k] / 255.0));
            }
            return Self::Shaded { origin: at[0], colour: planes(texel) };
        }
        let plane = |values: [f32; 3]| Plane::through(&at, values.map(f64::from));
        Self::Textured {
            origin: at[0],
            colour: (!same_colour).then(|| planes([255.0; 4])),
            constant: colours[0],
            u: plane(vertices.map(|v| v.uv.x)),
            v: plane(vertices.map(|v| v.uv.y)),
        }
    }

    fn span(&self, texture: &Texture, span: &mut [Color32], first: i64, y: i64) {
        match self {
            Self::Flat(colour) => {
                if colour[3] >= 254.5 {
                    span.fill(pack(*colour));
                } else {
                    for pixel in span {
                        *pixel = over(*colour, *pixel);
                    }
                }
            }
            Self::Shaded { origin, colour } => {
                let dy = y as f64 + 0.5 - origin.1;
                for (k, pixel) in span.iter_mut().enumerate() {
                    let dx = (first + k as i64) as f64 + 0.5 - origin.0;
                    *pixel = over(colour.map(|plane| plane.at(dx, dy).clamp(0.0, 255.0)), *pixel);
                }
            }
            Self::Textured { origin, colour, constant, u, v } => {
                let dy = y as f64 + 0.5 - origin.1;
                // Snapping to 1/1024 texel keeps whole-texel glyphs exact in spite of rounding.
                let snap = |t: f32, size: usize| (t * size as f32 * 1024.0).round() / (size as f32 * 1024.0);
                for (k, pixel) in span.iter_mut().enumerate() {
                    let dx = (first + k as i64) as f64 + 0.5 - origin.0;
                    let texel =
                        texture.sample(snap(u.at(dx, dy), texture.width), snap(v.at(dx, dy), texture.height));
                    if texel[3] == 0.0 && texel[0] == 0.0 && texel[1] == 0.0 && texel[2] == 0.0 {
                        continue;
                    }
                    let tint = colour.as_ref().map_or(*constant, |c| c.map(|plane| plane.at(dx, dy)));
                    *pixel = over(std::array::from_fn(|i| texel[i] * tint[i] / 255.0), *pixel);
                }
            }
        }
    }
}

fn pack(colour: [f32; 4]) -> Color32 {
    let [r, g, b, a] = colour.map(|c| (c + 0.5) as u8);
    Color32::from_rgba_premultiplied(r, g, b, a)
}

fn over(colour: [f32; 4], below: Color32) -> Color32 {
    let keep = 1.0 - colour[3] / 255.0;
    let below = below.to_array();
    pack(std::array::from_fn(|k| colour[k] + f32::from(below[k]) * keep))
}
