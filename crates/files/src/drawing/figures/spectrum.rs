//! The blend, its emitters and the reference over wavelength.

use super::{KEY_STEP, KeyLine, Look, Sample, key, tag};
use crate::drawing::axis::{Axis, Plot};
use crate::drawing::{Drawing, Frame, Ink, Path, Pattern, Pen, Place, theme};
use serde::{Deserialize, Serialize};

/// One emitter's contribution to the blend.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SpectrumLine {
    /// How it is told apart.
    pub look: Look,
    /// Power per nm at the plot's wavelengths, as it contributes to the blend.
    pub power_per_nm: Vec<f64>,
    /// What the key says beside the name, such as `12.0 %`.
    pub remark: String,
}

/// The blend, its emitters and the reference over one wavelength axis.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SpectrumPlot {
    /// Wavelengths, nm, ascending.
    pub wavelengths_nm: Vec<f64>,
    /// Power per nm of the blend at each wavelength.
    pub blend: Vec<f64>,
    /// Name and power per nm of the light drawn dotted, such as the Planckian of the same CCT and lumens.
    pub reference: Option<(String, Vec<f64>)>,
    /// The emitters.
    pub emitters: Vec<SpectrumLine>,
    /// What the upright axis counts, with its unit.
    pub ordinate: String,
}

impl SpectrumPlot {
    /// The drawing at a width in mm (at least 120 shows the key in full).
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let lines = 1 + usize::from(self.reference.is_some()) + self.emitters.len();
        let height = 74f64.max(lines as f64 * KEY_STEP + 16.0);
        let mut drawing = Drawing::new(
            width_mm,
            height,
            "Spectrum of the blend",
            format!(
                "Power per nanometre of the blend over wavelength, with the contributions of {} emitters{}.",
                self.emitters.len(),
                if self.reference.is_some() { " and a reference light, dotted" } else { "" }
            ),
        );
        let key_width = (0.36 * width_mm).clamp(44.0, 64.0);
        let frame = Frame { x: 14.0, y: 3.0, width: width_mm - key_width - 20.0, height: height - 15.0 };
        let plot = self.plot(frame);
        plot.ground(&mut drawing);
        drawing.window(frame, |d| self.curves(&plot, d));
        self.tags(&plot, &mut drawing);
        let column = Frame { x: frame.right() + 5.0, y: 3.0, width: key_width - 1.0, height: height - 6.0 };
        key(&mut drawing, column, &self.key_lines());
        drawing
    }

    fn plot(&self, frame: Frame) -> Plot {
        let ends = |list: &[f64]| {
            list.iter().copied().filter(|v| v.is_finite()).fold(None, |ends: Option<(f64, f64)>, v| {
                Some(ends.map_or((v, v), |(low, high)| (low.min(v), high.max(v))))
            })
        };
        let (first, last) = ends(&self.wavelengths_nm).unwrap_or((380.0, 780.0));
        let top = std::iter::once(self.blend.as_slice())
            .chain(self.emitters.iter().map(|e| e.power_per_nm.as_slice()))
            .filter_map(ends)
            .fold(0.0f64, |top, (_, high)| top.max(high));
        let top = if top > 0.0 { top } else { 1.0 };
        Plot {
            frame,
            across: Axis::over("wavelength, nm", first, last, 8.0),
            up: Axis::over(self.ordinate.clone(), 0.0, 1.08 * top, 5.0),
        }
    }

    fn line(&self, plot: &Plot, power: &[f64]) -> Vec<Place> {
        self.wavelengths_nm.iter().zip(power).map(|(nm, p)| plot.place(*nm, *p)).collect()
    }

    fn curves(&self, plot: &Plot, drawing: &mut Drawing) {
        for emitter in &self.emitters {
            let places = self.line(plot, &emitter.power_per_nm);
            let finite = places.iter().all(|p| p.x.is_finite() && p.y.is_finite());
            if let (true, Some(first), Some(last)) = (finite, places.first(), places.last()) {
                let ground = plot.frame.bottom();
                let area = Path::through(
                    std::iter::once(Place { y: ground, ..*first })
                        .chain(places.iter().copied())
                        .chain(std::iter::once(Place { y: ground, ..*last })),
                )
                .close();
                drawing.fill(area, emitter.look.ink.thinned(0.15));
            }
        }
        for emitter in &self.emitters {
            let pen = Pen::patterned(emitter.look.ink.legible(), theme::LINE_MM, emitter.look.pattern);
            drawing.stroke(Path::through(self.line(plot, &emitter.power_per_nm)), pen);
        }
        if let Some((_, power)) = &self.reference {
            drawing.stroke(Path::through(self.line(plot, power)), reference_pen());
        }
        drawing.stroke(Path::through(self.line(plot, &self.blend)), Pen::solid(theme::INK, theme::HEAVY_MM));
    }

    /// Number each emitter at its peak, moving a number down its curve while it would cover another.
    fn tags(&self, plot: &Plot, drawing: &mut Drawing) {
        const APART: f64 = 4.0;
        let mut taken: Vec<Place> = Vec::new();
        for (index, emitter) in self.emitters.iter().enumerate() {
            let places = self.line(plot, &emitter.power_per_nm);
            let highest = places
                .iter()
                .filter(|p| p.x.is_finite() && p.y.is_finite())
                .min_by(|a, b| a.y.total_cmp(&b.y));
            let Some(peak) = highest.copied() else { continue };
            let mut place = Place { y: (peak.y - 2.4).max(plot.frame.y + 2.2), ..peak };
            for _ in 0..40 {
                if taken.iter().all(|t| (t.x - place.x).hypot(t.y - place.y) >= APART) {
                    break;
                }
                place.x += 1.0;
            }
            taken.push(place);
            tag(drawing, place, index + 1, emitter.look.ink);
        }
    }

    fn key_lines(&self) -> Vec<KeyLine> {
        let plain = |name: &str, pen: Pen, bold: bool| KeyLine {
            number: None,
            sample: Sample::Line(pen),
            name: name.to_owned(),
            value: String::new(),
            bold,
        };
        let mut lines = vec![plain("the blend", Pen::solid(theme::INK, theme::HEAVY_MM), true)];
        lines.extend(self.reference.iter().map(|(name, _)| plain(name, reference_pen(), false)));
        lines.extend(self.emitters.iter().enumerate().map(|(index, emitter)| {
            let Look { name, ink, pattern } = &emitter.look;
            KeyLine {
                number: Some((index + 1, *ink)),
                sample: Sample::Line(Pen::patterned(ink.legible(), theme::LINE_MM, *pattern)),
                name: name.clone(),
                value: emitter.remark.clone(),
                bold: false,
            }
        }));
        lines
    }
}

/// The reference light's line.
fn reference_pen() -> Pen {
    Pen::patterned(Ink(0x4a, 0x4e, 0x55), 0.3, Pattern::Dotted)
}
