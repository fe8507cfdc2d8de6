//! Facts about figures that a picture alone would not prove.

use super::*;
use crate::drawing::Mark;
use proptest::prelude::*;

fn look(index: usize) -> Look {
    Look { name: format!("emitter {index}"), ink: Ink(200, 90, 20), pattern: Pattern::of_index(index) }
}

/// Every text of a drawing, also behind windows.
fn texts(marks: &[Mark]) -> Vec<&Text> {
    marks
        .iter()
        .flat_map(|mark| match mark {
            Mark::Text(text) => vec![text],
            Mark::Window { marks, .. } => texts(marks),
            Mark::Shape { .. } => vec![],
        })
        .collect()
}

#[test]
fn stripes_are_drawn_to_scale() {
    let stripe = |width_um, index| Stripe { look: Some(look(index)), width_um };
    let plan =
        StripePlan { stripes: vec![stripe(100.0, 0), stripe(300.0, 1)], minimum_feature_um: Some(150.0) };
    assert!((plan.pitch_um() - 400.0).abs() < 1e-12);
    let drawing = plan.draw(166.0);
    // 160 mm hold two pitches of 400 µm: 0.2 mm a µm, so the stripes are 20 and 60 mm wide.
    let widths: Vec<f64> = drawing
        .marks
        .iter()
        .filter_map(|m| match m {
            Mark::Window { frame, .. } => Some(frame.width),
            _ => None,
        })
        .collect();
    // The first pattern has no hatching and so no window; the second has one in each pitch.
    assert!(widths.iter().filter(|w| (**w - 60.0).abs() < 1e-9).count() >= 2, "{widths:?}");
    assert!(texts(&drawing.marks).iter().any(|t| t.words.contains("below the least width")));
}

#[test]
fn packages_are_spread_and_counted() {
    let package = |count, index| BoardPackage { look: look(index), count, remark: String::new() };
    let board = Board {
        packages: vec![package(2, 0), package(4, 1), package(0, 2)],
        package_mm: 3.0,
        pitch_mm: 5.0,
        columns: 3,
    };
    assert_eq!(board.order(), [1, 0, 1, 1, 0, 1]);
}

#[test]
fn the_greatest_chroma_shift_is_put_in_words() {
    let mut hue = HueBins { chroma_shift_percent: vec![Some(1.0); 16], hue_shift: vec![Some(0.0); 16] };
    hue.chroma_shift_percent[11] = Some(-7.8);
    hue.chroma_shift_percent[3] = None;
    assert_eq!(hue.sentence(), "Greatest chroma shift: −7.8 % in hue bin 12.");
}

proptest! {
    #[test]
    fn a_board_places_every_package(counts in prop::collection::vec(0u32..30, 1..6)) {
        let packages: Vec<BoardPackage> = counts
            .iter()
            .enumerate()
            .map(|(i, count)| BoardPackage { look: look(i), count: *count, remark: String::new() })
            .collect();
        let board = Board { packages, package_mm: 3.0, pitch_mm: 5.0, columns: 7 };
        let order = board.order();
        for (kind, count) in counts.iter().enumerate() {
            prop_assert_eq!(order.iter().filter(|k| **k == kind).count(), *count as usize);
        }
    }

    #[test]
    fn no_picture_panics_whatever_the_numbers(
        numbers in prop::collection::vec(any::<f64>(), 24), width in 60.0..200.0f64,
    ) {
        let half = |range: std::ops::Range<usize>| numbers[range].to_vec();
        let drawings = [
            SpectrumPlot {
                wavelengths_nm: half(0..8),
                blend: half(8..16),
                reference: Some(("reference".to_owned(), half(16..24))),
                emitters: vec![SpectrumLine { look: look(1), power_per_nm: half(3..11), remark: String::new() }],
                ordinate: "power".to_owned(),
            }
            .draw(width),
            Neighbourhood {
                blend: colour::UvPrime { u: numbers[0], v: numbers[1] },
                target: Some(colour::UvPrime { u: numbers[2], v: numbers[3] }),
                bin: numbers[4..10].chunks(2).map(|p| colour::UvPrime { u: p[0], v: p[1] }).collect(),
                bin_name: "bin".to_owned(),
                circles: vec![1, 3],
            }
            .draw(width),
            RenderingBars { r: half(0..15) }.draw(width),
            HueBins {
                chroma_shift_percent: numbers[..16].iter().copied().map(Some).collect(),
                hue_shift: numbers[8..24].iter().copied().map(Some).collect(),
            }
            .draw(width),
            StripePlan {
                stripes: numbers[..6].iter().map(|w| Stripe { look: Some(look(2)), width_um: *w }).collect(),
                minimum_feature_um: Some(numbers[7]),
            }
            .draw(width),
            StackSection {
                layers: numbers[..6]
                    .iter()
                    .map(|t| StackLayer {
                        name: "layer".to_owned(),
                        thickness_nm: *t,
                        look: Some(look(3)),
                        remark: String::new(),
                    })
                    .collect(),
                substrate: "glass".to_owned(),
            }
            .draw(width),
            Board {
                packages: vec![BoardPackage { look: look(4), count: 5, remark: String::new() }],
                package_mm: numbers[0],
                pitch_mm: numbers[1],
                columns: 2,
            }
            .draw(width),
        ];
        for drawing in drawings {
            prop_assert!(drawing.height_mm.is_finite() && drawing.height_mm < 400.0);
            let file = crate::drawing::svg::document(&drawing);
            prop_assert!(!file.contains("NaN") && !file.contains("=\"inf"));
            prop_assert!(crate::drawing::pdf::document(&drawing).is_ok());
        }
    }
}
