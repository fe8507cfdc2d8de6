//! Axes: round numbers, and a plot's ground with ticks, grid and titles.

use super::{Anchor, Drawing, Frame, MM_PER_PT, Path, Pen, Place, Text, at, font, theme};

/// One axis: the values at its two ends and how its numbers are written.
#[derive(Debug, Clone)]
pub(crate) struct Axis {
    pub(crate) title: String,
    pub(crate) low: f64,
    pub(crate) high: f64,
    /// Values that get a tick and a number.
    pub(crate) ticks: Vec<f64>,
    pub(crate) decimals: usize,
}

impl Axis {
    /// An axis over a range with about `count` round ticks. A range without extent is widened.
    pub(crate) fn over(title: impl Into<String>, low: f64, high: f64, count: f64) -> Axis {
        let (low, high) = widened(low, high);
        let step = round_step((high - low) / count.max(1.0));
        let decimals = (-step.log10().floor()).clamp(0.0, 9.0) as usize;
        let first = (low / step - 1e-9).ceil();
        let last = (high / step + 1e-9).floor();
        let ticks =
            (0..=(last - first).clamp(0.0, 100.0) as usize).map(|i| (first + i as f64) * step).collect();
        Axis { title: title.into(), low, high, ticks, decimals }
    }

    /// Position of a value between the ends, 0–1 when inside.
    pub(crate) fn fraction(&self, value: f64) -> f64 {
        (value - self.low) / (self.high - self.low)
    }

    fn label(&self, value: f64) -> String {
        // The minus sign of typography, and no negative zero.
        let text = format!("{:.*}", self.decimals, value);
        match text.strip_prefix('-') {
            Some(rest) if rest.bytes().any(|b| b.is_ascii_digit() && b != b'0') => format!("−{rest}"),
            Some(rest) => rest.to_owned(),
            None => text,
        }
    }
}

fn widened(low: f64, high: f64) -> (f64, f64) {
    // Beyond this the differences of an axis lose their meaning.
    const MOST: f64 = 1e100;
    if low.abs() > MOST || high.abs() > MOST {
        (0.0, 1.0)
    } else if low.is_finite() && high.is_finite() && high - low > 1e-12 * low.abs().max(high.abs()) {
        (low, high)
    } else if low.is_finite() {
        (low - 0.5, low + 0.5)
    } else {
        (0.0, 1.0)
    }
}

/// The least of 1, 2, 5 × 10ⁿ that is not below `rough`.
pub(crate) fn round_step(rough: f64) -> f64 {
    let power = 10f64.powf(rough.log10().floor());
    let mantissa = rough / power;
    let round = [1.0, 2.0, 5.0, 10.0].into_iter().find(|m| *m >= mantissa - 1e-9).unwrap_or(10.0);
    round * power
}

/// A plot area with its two axes.
#[derive(Debug, Clone)]
pub(crate) struct Plot {
    pub(crate) frame: Frame,
    pub(crate) across: Axis,
    pub(crate) up: Axis,
}

impl Plot {
    /// Where a pair of values lies on the sheet.
    pub(crate) fn place(&self, x: f64, y: f64) -> Place {
        at(
            self.frame.x + self.across.fraction(x) * self.frame.width,
            self.frame.bottom() - self.up.fraction(y) * self.frame.height,
        )
    }

    /// Ground, grid, numbers and titles.
    pub(crate) fn ground(&self, drawing: &mut Drawing) {
        let frame = self.frame;
        drawing.fill(frame.path(), theme::PANEL);
        let hair = Pen::solid(theme::RULE, theme::HAIR_MM);
        let gap = 1.1;
        let capital = font::CAPITAL_HEIGHT_EM * theme::TICK_PT * MM_PER_PT;
        for tick in &self.across.ticks {
            let x = self.place(*tick, self.up.low).x;
            drawing.stroke(Path::line(at(x, frame.y), at(x, frame.bottom())), hair);
            drawing.text(
                Text::new(
                    at(x, frame.bottom() + gap + capital),
                    self.across.label(*tick),
                    theme::TICK_PT,
                    theme::QUIET,
                )
                .anchored(Anchor::Middle),
            );
        }
        let mut widest = 0.0f64;
        for tick in &self.up.ticks {
            let y = self.place(self.across.low, *tick).y;
            drawing.stroke(Path::line(at(frame.x, y), at(frame.right(), y)), hair);
            let text = Text::new(
                at(frame.x - gap, y + capital / 2.0),
                self.up.label(*tick),
                theme::TICK_PT,
                theme::QUIET,
            )
            .anchored(Anchor::End);
            widest = widest.max(text.width_mm());
            drawing.text(text);
        }
        drawing.stroke(frame.path(), Pen::solid(theme::EDGE, theme::HAIR_MM));
        drawing.text(
            Text::new(
                at(frame.x + frame.width / 2.0, frame.bottom() + gap + capital + 4.0),
                self.across.title.clone(),
                theme::LABEL_PT,
                theme::INK,
            )
            .anchored(Anchor::Middle),
        );
        if !self.up.title.is_empty() {
            drawing.text(
                Text::new(
                    at(frame.x - gap - widest - 1.6, frame.y + frame.height / 2.0),
                    self.up.title.clone(),
                    theme::LABEL_PT,
                    theme::INK,
                )
                .anchored(Anchor::Middle)
                .upwards(),
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn steps_are_one_two_or_five() {
        assert!((round_step(0.03) - 0.05).abs() < 1e-12);
        assert!((round_step(1.0) - 1.0).abs() < 1e-12);
        assert!((round_step(61.0) - 100.0).abs() < 1e-9);
    }

    #[test]
    fn a_wavelength_axis_is_ticked_every_fifty_nm() {
        let axis = Axis::over("wavelength, nm", 380.0, 780.0, 8.0);
        let labels: Vec<String> = axis.ticks.iter().map(|t| axis.label(*t)).collect();
        assert_eq!(labels, ["400", "450", "500", "550", "600", "650", "700", "750"]);
    }

    #[test]
    fn zero_has_no_sign_and_a_loss_has_a_true_minus() {
        let axis = Axis::over("", -1.0, 1.0, 4.0);
        assert_eq!(axis.label(-0.0), "0.0");
        assert_eq!(axis.label(-0.5), "−0.5");
    }

    proptest! {
        #[test]
        fn ticks_lie_inside_and_are_few(low in -1e6..1e6f64, extent in 0.0..1e6f64) {
            let axis = Axis::over("", low, low + extent, 6.0);
            prop_assert!(axis.ticks.len() <= 101);
            for tick in &axis.ticks {
                prop_assert!((-1e-6..=1.0 + 1e-6).contains(&axis.fraction(*tick)));
            }
        }
    }
}
