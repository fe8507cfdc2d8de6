//! egui's clipped meshes into a picture.

use super::triangle::{Band, PixelRect, Texture, fill};
use egui::epaint::{ClippedPrimitive, ImageData, ImageDelta, Primitive};
use egui::{Color32, TextureFilter, TextureId, TexturesDelta};
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Rows one worker paints at a time.
const BAND_ROWS: usize = 48;

/// Paints egui's output on the processor: no driver, no display, the same bytes on every machine and thread count.
///
/// Hold one per egui context and give it every texture change, in order.
#[derive(Debug, Default)]
pub struct Rasteriser {
    // Ordered by the identity's printed number: the map is only looked up, never walked.
    textures: BTreeMap<(u8, u64), Texture>,
}

fn key(id: TextureId) -> (u8, u64) {
    match id {
        TextureId::Managed(n) => (0, n),
        TextureId::User(n) => (1, n),
    }
}

impl Rasteriser {
    /// Takes the textures that are new or changed; call before [`Self::paint`].
    pub fn set_textures(&mut self, changes: &mut TexturesDelta) {
        // Textures are independent of each other, so the map's order does not matter.
        #[expect(clippy::iter_over_hash_type, reason = "each entry touches its own texture only")]
        for (id, list) in changes.set.drain() {
            for change in &list {
                self.set_texture(id, change);
            }
        }
    }

    /// Drops the textures egui no longer needs; call after [`Self::paint`].
    pub fn free_textures(&mut self, changes: &mut TexturesDelta) {
        #[expect(clippy::iter_over_hash_type, reason = "removal in any order gives the same map")]
        for id in changes.free.drain() {
            self.textures.remove(&key(id));
        }
    }

    fn set_texture(&mut self, id: TextureId, change: &ImageDelta) {
        let ImageData::Color(image) = &change.image;
        let [width, height] = image.size;
        match change.pos {
            None => {
                let smooth = change.options.magnification == TextureFilter::Linear;
                let texture = Texture { width, height, pixels: image.pixels.clone(), smooth };
                self.textures.insert(key(id), texture);
            }
            Some([left, top]) => {
                if let Some(texture) = self.textures.get_mut(&key(id)) {
                    for (row, pixels) in image.pixels.chunks_exact(width.max(1)).enumerate() {
                        let start = (top + row) * texture.width + left;
                        if let Some(target) = texture.pixels.get_mut(start..start + width) {
                            target.copy_from_slice(pixels);
                        }
                    }
                }
            }
        }
    }

    /// Paints over `pixels`, a picture of `width` columns with premultiplied colours.
    pub fn paint(
        &self,
        primitives: &[ClippedPrimitive],
        pixels_per_point: f32,
        pixels: &mut [Color32],
        width: usize,
    ) {
        if width == 0 {
            return;
        }
        let height = (pixels.len() / width) as i64;
        let edge = |point: f32, most: i64| ((point * pixels_per_point).round() as i64).clamp(0, most);
        let jobs: Vec<_> = primitives
            .iter()
            .filter_map(|primitive| {
                let Primitive::Mesh(mesh) = &primitive.primitive else { return None };
                let texture = self.textures.get(&key(mesh.texture_id))?;
                let clip = PixelRect {
                    left: edge(primitive.clip_rect.min.x, width as i64),
                    top: edge(primitive.clip_rect.min.y, height),
                    right: edge(primitive.clip_rect.max.x, width as i64),
                    bottom: edge(primitive.clip_rect.max.y, height),
                };
                (clip.left < clip.right && clip.top < clip.bottom).then_some((mesh, texture, clip))
            })
            .collect();
        pixels.par_chunks_mut(width * BAND_ROWS).enumerate().for_each(|(index, pixels)| {
            let first_row = index * BAND_ROWS;
            let end_row = (first_row + BAND_ROWS) as i64;
            let mut band = Band { pixels, width, first_row };
            for (mesh, texture, clip) in &jobs {
                if clip.bottom <= first_row as i64 || clip.top >= end_row {
                    continue;
                }
                for corner in mesh.indices.chunks_exact(3) {
                    let vertex = |k: usize| mesh.vertices.get(*corner.get(k)? as usize);
                    if let (Some(a), Some(b), Some(c)) = (vertex(0), vertex(1), vertex(2)) {
                        fill(texture, [a, b, c], pixels_per_point, *clip, &mut band);
                    }
                }
            }
        });
    }

    /// Paints one frame of `context` as it was put out, on `ground`; returns the columns, the rows and the pixels.
    pub fn picture(
        &self,
        context: &egui::Context,
        output: &egui::FullOutput,
        ground: Color32,
    ) -> (usize, usize, Vec<Color32>) {
        let size = context.content_rect().size() * output.pixels_per_point;
        let (width, height) = (size.x.round() as usize, size.y.round() as usize);
        let mut pixels = vec![ground; width * height];
        let primitives = context.tessellate(output.shapes.clone(), output.pixels_per_point);
        self.paint(&primitives, output.pixels_per_point, &mut pixels, width);
        (width, height, pixels)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use egui::epaint::{Mesh, Vertex};
    use egui::{ColorImage, Rect, TextureOptions, pos2};

    fn white() -> Rasteriser {
        let mut rasteriser = Rasteriser::default();
        let mut changes = TexturesDelta::default();
        let image = ColorImage::filled([1, 1], Color32::WHITE);
        changes.push(TextureId::default(), ImageDelta::full(image, TextureOptions::LINEAR));
        rasteriser.set_textures(&mut changes);
        rasteriser
    }

    fn mesh(corners: &[(f32, f32)], indices: &[u32], colour: Color32) -> ClippedPrimitive {
        let vertices = corners
            .iter()
            .map(|&(x, y)| Vertex { pos: pos2(x, y), uv: pos2(0.0, 0.0), color: colour })
            .collect();
        let mesh = Mesh { indices: indices.to_vec(), vertices, texture_id: TextureId::default() };
        ClippedPrimitive { clip_rect: Rect::EVERYTHING, primitive: Primitive::Mesh(mesh) }
    }

    #[test]
    fn neighbouring_triangles_share_no_pixel_and_leave_no_gap() {
        // A fan of eight triangles round an off-lattice centre; half-transparent, so a pixel painted twice shows.
        let mut corners = vec![(31.37, 29.81)];
        let mut indices = Vec::new();
        for k in 0..8 {
            let angle = f64::from(k) * std::f64::consts::FRAC_PI_4;
            corners.push((31.37 + 90.0 * angle.cos() as f32, 29.81 + 90.0 * angle.sin() as f32));
            indices.extend([0, k as u32 + 1, (k as u32 + 1) % 8 + 1]);
        }
        let mut pixels = vec![Color32::BLACK; 64 * 64];
        let half = Color32::from_rgba_premultiplied(100, 100, 100, 128);
        white().paint(&[mesh(&corners, &indices, half)], 1.0, &mut pixels, 64);
        let once = pixels[0];
        assert_ne!(once, Color32::BLACK);
        assert!(pixels.iter().all(|p| *p == once));
    }

    #[test]
    fn winding_does_not_matter_and_the_clip_rectangle_holds() {
        let square = [(2.0, 2.0), (6.0, 2.0), (6.0, 6.0), (2.0, 6.0)];
        let paint = |indices: &[u32], clip: Rect| {
            let mut pixels = vec![Color32::BLACK; 64];
            let mut primitive = mesh(&square, indices, Color32::WHITE);
            primitive.clip_rect = clip;
            white().paint(&[primitive], 1.0, &mut pixels, 8);
            pixels.iter().filter(|p| **p == Color32::WHITE).count()
        };
        assert_eq!(paint(&[0, 1, 2, 0, 2, 3], Rect::EVERYTHING), 16);
        assert_eq!(paint(&[2, 1, 0, 3, 2, 0], Rect::EVERYTHING), 16);
        assert_eq!(paint(&[0, 1, 2, 0, 2, 3], Rect::from_min_max(pos2(0.0, 0.0), pos2(4.0, 4.0))), 4);
    }

    #[test]
    fn positions_that_are_not_numbers_paint_nothing() {
        let mut pixels = vec![Color32::BLACK; 64];
        let corners = [(f32::NAN, 0.0), (8.0, 0.0), (8.0, f32::INFINITY)];
        white().paint(&[mesh(&corners, &[0, 1, 2], Color32::WHITE)], 1.0, &mut pixels, 8);
        assert!(pixels.iter().all(|p| *p == Color32::BLACK));
    }

    #[test]
    fn scale_covers_more_pixels_for_the_same_points() {
        let mut pixels = vec![Color32::BLACK; 16 * 16];
        let square = [(1.0, 1.0), (5.0, 1.0), (5.0, 5.0), (1.0, 5.0)];
        white().paint(&[mesh(&square, &[0, 1, 2, 0, 2, 3], Color32::WHITE)], 2.0, &mut pixels, 16);
        assert_eq!(pixels.iter().filter(|p| **p == Color32::WHITE).count(), 64);
    }
}
