//! Facts about the report as a whole: what it says, that it runs and fetches nothing, that it survives any name.

mod demo;

use files::drawing::{Drawing, pdf, raster, svg};
use files::report::{PHOTOBIOLOGY_CAUTION, ReportModel, html, pdf as report_pdf, recipe_csv};
use proptest::prelude::*;
use quick_xml::{Reader, events::Event};

const HOSTILE: &str = "</title><script src=\"//x\">alert('1')</script>\" onload='x' & =1+1 <!-- \u{0} ]]>";

/// Every name of the demo replaced.
fn named(words: &str) -> ReportModel {
    let mut model = demo::model();
    for text in [
        &mut model.title,
        &mut model.project,
        &mut model.set,
        &mut model.program,
        &mut model.date,
        &mut model.data_note,
        &mut model.white,
        &mut model.proof,
    ] {
        words.clone_into(text);
    }
    for line in &mut model.ledger {
        words.clone_into(&mut line.name);
        words.clone_into(&mut line.note);
        words.clone_into(&mut line.unit);
    }
    for row in &mut model.shares {
        words.clone_into(&mut row.look.name);
    }
    if let Some(plot) = &mut model.spectrum {
        words.clone_into(&mut plot.ordinate);
        for line in &mut plot.emitters {
            words.clone_into(&mut line.look.name);
            words.clone_into(&mut line.remark);
        }
    }
    if let Some(recipe) = &mut model.recipe {
        words.clone_into(&mut recipe.build_form);
        for row in &mut recipe.rows {
            words.clone_into(&mut row.part);
            words.clone_into(&mut row.remark);
            row.calibration_runs = vec![words.to_owned()];
        }
    }
    for source in &mut model.sources {
        words.clone_into(&mut source.file);
        words.clone_into(&mut source.remark);
    }
    model.signatures = vec![words.to_owned()];
    model
}

/// All text of the pages, spaces left out, since where lines break is a matter of layout.
fn said(bytes: &[u8]) -> (usize, String) {
    let file = lopdf::Document::load_mem(bytes).expect("a PDF that parses");
    let numbers: Vec<u32> = file.get_pages().keys().copied().collect();
    let text = file.extract_text(&numbers).expect("text");
    (numbers.len(), text.split_whitespace().collect())
}

fn squeezed(words: &str) -> String {
    words.split_whitespace().collect()
}

/// Names of the elements of a page, which must be well formed.
fn elements(page: &str) -> Vec<String> {
    // Elements that HTML leaves open are closed first; nothing else sets the page apart from XML.
    let page = page
        .replace("<!DOCTYPE html>", "")
        .replace("charset=\"utf-8\">", "charset=\"utf-8\"/>")
        .replace("'unsafe-inline'\">", "'unsafe-inline'\"/>")
        .replace("width=device-width\">", "width=device-width\"/>");
    let mut reader = Reader::from_str(&page);
    let mut names = Vec::new();
    loop {
        match reader.read_event().expect("well-formed") {
            Event::Start(e) | Event::Empty(e) => {
                for attribute in e.attributes() {
                    let attribute = attribute.expect("a quoted attribute");
                    let key: &str = attribute.key.as_ref();
                    assert!(!key.starts_with("on") && key != "src" && key != "href", "{key}");
                }
                names.push(e.name().as_ref().to_owned());
            }
            Event::Eof => return names,
            _ => {}
        }
    }
}

#[test]
fn the_page_is_self_contained() {
    let page = html::page(&demo::model());
    let names = elements(&page);
    for foreign in ["script", "link", "img", "iframe", "object", "embed", "base", "form", "use", "image"] {
        assert!(!names.iter().any(|n| n == foreign), "<{foreign}>");
    }
    assert!(!page.contains("http:") && !page.contains("https:") && !page.contains("@import"));
    assert!(!page.replace("url(#", "").contains("url("));
    assert_eq!(names.iter().filter(|n| *n == "svg").count(), 6);
}

#[test]
fn hostile_names_stay_names() {
    let page = html::page(&named(HOSTILE));
    let names = elements(&page);
    assert!(!names.iter().any(|n| n == "script"));
    assert_eq!(names.len(), elements(&html::page(&named("plain"))).len());
    let (_, text) = said(&report_pdf::pages(&named(HOSTILE)).expect("a PDF"));
    assert!(text.contains("<script"));
}

#[test]
fn both_forms_say_the_white_the_recipe_the_sources_and_the_caution() {
    let model = demo::model();
    let page = html::page(&model);
    let (pages, text) = said(&report_pdf::pages(&model).expect("a PDF"));
    assert!(pages >= 3);
    let recipe = model.recipe.as_ref().expect("a recipe");
    let mut words = vec![
        model.title.clone(),
        model.white.clone(),
        model.proof.clone(),
        PHOTOBIOLOGY_CAUTION.to_owned(),
        recipe.rows[4].calibration_runs[0].clone(),
        "of radiant power".to_owned(),
        "of lumens".to_owned(),
        "of photons".to_owned(),
        "untouched default".to_owned(),
        "short by 3.3".to_owned(),
    ];
    words.extend(model.sources.iter().map(|s| s.sha256.clone()));
    words.extend(model.methods.iter().map(|m| m.source.clone()));
    for words in words {
        assert!(page.contains(&svg::escaped(&words)), "HTML lacks `{words}`");
        // Lines of neighbouring cells interleave in the PDF, so long texts of tables are looked for word by word.
        for word in words.split_whitespace() {
            let there = text.contains(word) || word.len() == 64 && text.contains(&word[..24]);
            assert!(there, "PDF lacks `{word}` of `{words}`");
        }
    }
    assert!(text.contains(&squeezed(PHOTOBIOLOGY_CAUTION)));
    assert!(text.contains(&squeezed(&format!("page 2 of {pages}"))));
}

#[test]
fn the_caution_stands_even_in_an_empty_report() {
    let model = ReportModel::default();
    assert!(html::page(&model).contains("no risk-group classification"));
    let (pages, text) = said(&report_pdf::pages(&model).expect("a PDF"));
    assert_eq!(pages, 1);
    assert!(text.contains(&squeezed(PHOTOBIOLOGY_CAUTION)));
}

#[test]
fn the_same_model_gives_the_same_bytes() {
    assert_eq!(html::page(&demo::model()), html::page(&demo::model()));
    assert_eq!(report_pdf::pages(&demo::model()), report_pdf::pages(&demo::model()));
}

#[test]
fn a_long_table_goes_on_over_pages_and_loses_no_row() {
    let mut model = demo::model();
    let recipe = model.recipe.as_mut().expect("a recipe");
    let first = recipe.rows[0].clone();
    recipe.rows = (0..200)
        .map(|i| {
            let mut row = first.clone();
            row.part = format!("row-{i:03}-end");
            row
        })
        .collect();
    let (pages, text) = said(&report_pdf::pages(&model).expect("a PDF"));
    assert!(pages >= 7, "{pages}");
    for i in 0..200 {
        assert_eq!(text.matches(&format!("row-{i:03}-end")).count(), 1, "row {i}");
    }
    // The head is repeated on every page the table reaches.
    assert!(text.matches("allowedband").count() >= 5);
}

#[test]
fn a_cell_longer_than_a_page_is_split() {
    let mut model = demo::model();
    model.assumptions[0].statement = (0..3000).map(|i| format!("w{i} ")).collect();
    let (pages, text) = said(&report_pdf::pages(&model).expect("a PDF"));
    assert!(pages > 6);
    assert!(text.contains("w2999") && text.contains("w0w1w2"));
}

#[test]
fn the_model_survives_being_stored() {
    let model = demo::model();
    let stored = serde_json::to_string(&model).expect("JSON");
    assert_eq!(serde_json::from_str::<ReportModel>(&stored).expect("a model"), model);
}

#[test]
fn the_recipe_of_the_demo_reads_back() {
    let rows = demo::model().recipe.expect("a recipe").rows;
    let text = recipe_csv::write(&rows).expect("a table");
    assert_eq!(recipe_csv::read(&text).expect("rows"), rows);
}

#[test]
fn every_device_picture_has_all_three_forms() {
    let drawings: Vec<Drawing> =
        vec![demo::stripes().draw(174.0), demo::stack().draw(174.0), demo::board().draw(174.0)];
    for drawing in drawings {
        let file = svg::document(&drawing);
        assert!(elements(&file.replace("<?xml version=\"1.0\" encoding=\"UTF-8\"?>", "")).len() > 20);
        assert!(pdf::document(&drawing).is_ok());
        assert!(raster::png(&drawing, 60.0).is_ok());
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(12))]
    #[test]
    fn any_name_makes_a_whole_report(words in any::<String>()) {
        let model = named(&words);
        let names = elements(&html::page(&model));
        prop_assert!(!names.iter().any(|n| n == "script"));
        let bytes = report_pdf::pages(&model).expect("a PDF");
        prop_assert!(lopdf::Document::load_mem(&bytes).is_ok());
    }

    #[test]
    fn numbers_that_are_not_numbers_are_called_unknown(bad in prop::sample::select(vec![f64::NAN, f64::INFINITY, -f64::INFINITY])) {
        let mut model = demo::model();
        for value in &mut model.measured {
            value.value = Some(bad);
        }
        if let Some(plot) = &mut model.spectrum {
            plot.blend[7] = bad;
            plot.emitters[0].power_per_nm[9] = bad;
        }
        if let Some(place) = &mut model.chromaticity {
            place.blend.u = bad;
        }
        if let Some(bars) = &mut model.rendering {
            bars.r[8] = bad;
        }
        let page = html::page(&model);
        prop_assert!(page.contains("unknown") && !page.contains("NaN") && !page.contains(">inf"));
        prop_assert!(report_pdf::pages(&model).is_ok());
    }
}
