//! The demo projects worked out: identities, bands, the way back.

use super::*;
use crate::state::demo;

fn every_making() -> Vec<(Project, Making)> {
    let mut out = Vec::new();
    for (_, text) in demo::ALL {
        let project = files::project_file::read_project(text.as_bytes()).unwrap().project;
        for set in &project.sets {
            for index in 0..set.recipes.len() {
                let making = make(&project, set.id, index)
                    .unwrap_or_else(|e| panic!("{}, {}: {e}", set.name, set.recipes[index].name));
                out.push((project.clone(), making));
            }
        }
    }
    out
}

#[test]
fn the_demo_projects_hold_every_build_form_and_a_conversion() {
    let all = every_making();
    for form in [BuildForm::SideBySide, BuildForm::SeriesStack, BuildForm::SharedZone, BuildForm::Packages] {
        assert!(all.iter().any(|(_, m)| m.build.build_form() == form), "{}", form.name());
    }
    assert!(all.iter().any(|(_, m)| !m.build.conversions.is_empty()));
}

#[test]
fn every_demo_recipe_states_what_physics_ties_together() {
    for (_, making) in every_making() {
        let place = format!("{}, {}", making.set_name, making.plan.name);
        let recipe = &making.recipe;
        let sum: f64 = recipe.shares_radiant().iter().sum();
        assert!((sum - 1.0).abs() < 1e-12, "{place}");
        for e in &recipe.emitters {
            // Photons and watts: both shares are tied by the mean wavelength.
            let mean: f64 = recipe.emitters.iter().map(|o| o.share_radiant * o.mean_wavelength_nm).sum();
            assert!((e.share_photon - e.share_radiant * e.mean_wavelength_nm / mean).abs() < 1e-9, "{place}");
            if let (Some(j), Some(eqe), Some(m)) =
                (e.current_density_ma_per_cm2, e.eqe, e.radiant_exitance_w_per_m2)
            {
                let expected = 10.0 * j * eqe * 1239.842 / e.mean_wavelength_nm;
                assert!(
                    (m / expected - 1.0).abs() < 1e-5 || (m == 0.0 && expected == 0.0),
                    "{place}, {}",
                    e.name
                );
            }
        }
    }
}

#[test]
fn corners_of_the_joint_band_keep_the_white_inside() {
    for (_, making) in every_making() {
        let place = format!("{}, {}", making.set_name, making.plan.name);
        let Ok(bands) = making.bands() else { continue };
        let made = making.made().unwrap();
        for side in [false, true] {
            let mut moved = made.clone();
            for (k, band) in bands.bands.iter().enumerate() {
                let high = (k % 2 == 0) == side;
                moved = moved.with(band.quantity, if high { band.together_high } else { band.together_low });
            }
            let plan = RecipePlan { made: Some(moved), ..making.plan.clone() };
            let recipe = making.build.predict(&making.devices.emitters, plan.made.as_ref().unwrap()).unwrap();
            let white = making.devices.white(&recipe.shares_radiant()).unwrap();
            let at = locus::cct_duv(white.uv());
            assert!(making.band_region.margin_uv_prime(white, at) > -1e-9, "{place}");
        }
    }
}

#[test]
fn a_number_set_by_hand_moves_the_white_and_the_way_back_undoes_it() {
    let mut tried = 0;
    for (project, making) in every_making() {
        let set = project.set(making.set).unwrap();
        let reach = |s: &Sensitivity| s.du_prime_per_percent.hypot(s.dv_prime_per_percent);
        let most = making.sensitivities().unwrap_or_default();
        let Some(most) = most.iter().max_by(|a, b| reach(a).total_cmp(&reach(b))) else { continue };
        let Some(number) = making.numbers(None).into_iter().find(|n| n.key == Some(most.quantity)) else {
            panic!("{}: every sensitivity is that of a number", making.plan.name)
        };
        let key = number.key.unwrap();
        let plan = making.with_number(key, number.value / number.factor * 0.98).unwrap();
        let Ok(moved) = make_plan(&project, set, &plan) else { continue };
        assert!(moved.recipe.delta_uv_prime.unwrap() > 1e-6, "{}", making.plan.name);
        let Ok(back) = moved.way_back() else { continue };
        let aim = making.devices.white(&making.devices.shares).unwrap();
        let here = making.devices.white(&back.recipe.shares_radiant()).unwrap();
        if making.recipe.delta_uv_prime.is_some_and(|d| d < 1e-9) {
            assert!(here.distance(aim) < 1e-8, "{}", making.plan.name);
        }
        tried += 1;
    }
    assert!(tried >= 4, "only {tried} recipes could be brought back");
}
