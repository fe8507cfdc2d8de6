//! Writes the demo projects in `assets/`: invented emitters, and each set solved for its own white spec.
//!
//! ```text
//! cargo run --release -p whitesmith --example make_demos -- assets
//! ```
//!
//! Every number below is invented; only the kinds of curve (vibronic progression, skewed and split bells, bells over
//! photon energy) and their usual widths are those of real emitters.

use colour::shapes::{EnergyOrdinate, Shape};
use device::calibration::{ZoneRun, ZoneSetting};
use device::conversion::{Conversion, Converter};
use device::packages::{Packages, StringRule};
use device::series_stack::{SeriesStack, StackUnit};
use device::shared_zone::SharedZone;
use device::sheet::{EqeModel, Package, Sheet, VoltageModel};
use device::side_by_side::{Drive, Freedom, SideBySide, StripeLayout};
use device::{Build, FormSettings, ShareKind, curve::Table, roll_off::TripletRollOff};
use project::{
    Emitter, EmitterId, EmitterSet, Geometry, Import, Limit, Limits, Maximise, Member, Mounting, Origin,
    Project, RecipePlan, Region, SetId, WhiteSpec,
};
use std::error::Error;
use std::path::Path;

/// Photon energy times wavelength, eV·nm.
const HC_EV_NM: f64 = 1239.842;

fn main() -> Result<(), Box<dyn Error>> {
    let folder = std::env::args().nth(1).unwrap_or_else(|| "assets".to_owned());
    for (name, project) in [("night-ferry-cabin.ron", cabin()?), ("night-ferry-library.ron", library()?)] {
        let mut project = solved(project)?;
        recipes(&mut project)?;
        let text = files::project_file::project_text(&project)?;
        std::fs::write(Path::new(&folder).join(name), text)?;
    }
    Ok(())
}

/// Wall panels: organic, quantum-dot and perovskite emitters, some with a sheet.
fn cabin() -> Result<Project, Box<dyn Error>> {
    let mut project = Project::new("Night-ferry cabin panel");
    "Wall panels for the cabins of the night ferries. Every emitter is invented."
        .clone_into(&mut project.note);
    let vibronic = Shape::Vibronic { origin_ev: 2.70, huang_rhys: 0.8, spacing_ev: 0.17, fwhm_ev: 0.12 };
    let teal = Shape::SplitGaussian { peak_nm: 497.0, fwhm_below_nm: 32.0, fwhm_above_nm: 44.0 };
    let green = Shape::Skewed { peak_nm: 531.0, width_nm: 54.0, skew: 0.28 };
    let lime = Shape::GaussianEv { peak_ev: 2.235, fwhm_ev: 0.105, ordinate: EnergyOrdinate::Photons };
    let amber = Shape::Skewed { peak_nm: 586.0, width_nm: 69.0, skew: 0.22 };
    let red = Shape::Skewed { peak_nm: 622.0, width_nm: 45.0, skew: 0.30 };
    let ember = Shape::GaussianEv { peak_ev: 1.937, fwhm_ev: 0.068, ordinate: EnergyOrdinate::Power };
    let organic = |low_current_eqe, half_current_ma_per_cm2, volts: [f64; 4]| Sheet {
        eqe: Some(EqeModel::TripletTriplet(TripletRollOff { low_current_eqe, half_current_ma_per_cm2 })),
        voltage: Some(VoltageModel::Table(Table::new(
            [0.5, 2.0, 5.0, 15.0].into_iter().zip(volts).collect(),
        ))),
        reference_current_ma_per_cm2: Some(5.0),
        maximum_current_ma_per_cm2: Some(15.0),
        ..Sheet::default()
    };
    let rows = [
        ("Kingfisher blue", vibronic, 0.21, organic(0.215, 90.0, [3.1, 3.4, 3.7, 4.2]), "organic, vibronic"),
        ("Reed teal", teal, 0.24, organic(0.245, 110.0, [2.9, 3.2, 3.4, 3.9]), "organic, two-sided"),
        ("Fern green", green, 0.36, organic(0.37, 150.0, [2.7, 2.9, 3.1, 3.5]), "organic, skewed"),
        ("Sedge lime", lime, 0.27, Sheet::default(), "quantum dots"),
        ("Brass amber", amber, 0.33, organic(0.34, 140.0, [2.7, 2.9, 3.1, 3.5]), "organic, broad"),
        ("Rowan red", red, 0.34, organic(0.35, 120.0, [2.6, 2.8, 3.0, 3.4]), "organic, skewed"),
        ("Ember red", ember, 0.22, Sheet::default(), "perovskite, narrow"),
    ];
    for (name, shape, eqe, sheet, kind) in rows {
        let volts = match &sheet.voltage {
            Some(VoltageModel::Table(table)) => table.points[2].1,
            _ => 3.4,
        };
        let mut emitter = emitter(&mut project, name, shape, 1.0, kind)?;
        emitter.origin = Origin::Electroluminescence { current_density_ma_per_cm2: Some(5.0) };
        emitter.geometry = Geometry::Sphere;
        emitter.mounting = Mounting::SingleDevice;
        // Optical over electrical power at the working current: EQE · photon energy / voltage.
        let mean_nm = colour::Tensor::of(&emitter.spectrum()?).mean_wavelength_nm();
        let wall_plug = eqe * HC_EV_NM / mean_nm / volts;
        emitter.wall_plug = Some((1000.0 * wall_plug).round() / 1000.0);
        emitter.sheet = sheet;
        project.emitters.push(emitter);
    }
    let cabin = WhiteSpec {
        cct_k: 3000.0,
        duv: 0.0005,
        region: Region::Point,
        limits: Limits {
            ra: Limit::at_least(93.0),
            r9: Limit::at_least(60.0),
            rf: Limit::at_least(88.0),
            rg: Limit::between(95.0, 105.0),
            ..Limits::default()
        },
        maximise: Maximise::Efficacy,
        lumens: Some(240.0),
        luminance_cd_per_m2: Some(3000.0),
    };
    let corridor = WhiteSpec {
        cct_k: 4000.0,
        duv: 0.0,
        region: Region::Circle { steps: 3.0 },
        limits: Limits { ra: Limit::at_least(80.0), r9: Limit::at_least(0.0), ..Limits::default() },
        maximise: Maximise::Efficacy,
        lumens: Some(600.0),
        luminance_cd_per_m2: None,
    };
    let five = ["Kingfisher blue", "Reed teal", "Fern green", "Brass amber", "Rowan red"];
    let narrow = ["Kingfisher blue", "Reed teal", "Sedge lime", "Brass amber", "Ember red"];
    let all =
        ["Kingfisher blue", "Reed teal", "Fern green", "Sedge lime", "Brass amber", "Rowan red", "Ember red"];
    let relaxed = Limits { ra: Limit::at_least(80.0), rf: Limit::at_least(75.0), ..Limits::default() };
    add_set(&mut project, "Cabin, five organic", &five, &cabin);
    add_set(
        &mut project,
        "Cabin, dots and perovskite",
        &narrow,
        &WhiteSpec { limits: relaxed, ..cabin.clone() },
    );
    let finer = Limits { ra: Limit::at_least(95.0), r9: Limit::at_least(80.0), ..cabin.limits };
    add_set(&mut project, "Cabin, all seven", &all, &WhiteSpec { limits: finer, ..cabin.clone() });
    add_set(&mut project, "Deck corridor 4000 K", &five, &corridor);
    let stair = WhiteSpec {
        region: Region::Point,
        limits: Limits::default(),
        maximise: Maximise::Ler,
        lumens: Some(90.0),
        luminance_cd_per_m2: Some(1500.0),
        ..cabin
    };
    add_set(&mut project, "Stair light, one zone", &["Kingfisher blue", "Fern green", "Rowan red"], &stair);
    project.current_set = project.sets.first().map(|set| set.id);
    Ok(project)
}

/// Reading lamps: inorganic emitters and phosphors, for a white that is tuned from 2200 to 5000 K.
fn library() -> Result<Project, Box<dyn Error>> {
    let mut project = Project::new("Night-ferry library");
    "Reading lamps of the ships' libraries, tuned from 2200 K at night to 5000 K by day. Every emitter is invented."
        .clone_into(&mut project.note);
    let ingan = |peak_nm, width_nm, skew| Shape::Skewed { peak_nm, width_nm, skew };
    let phosphor = |peak_nm, fwhm_below_nm, fwhm_above_nm| Shape::SplitGaussian {
        peak_nm,
        fwhm_below_nm,
        fwhm_above_nm,
    };
    let dot = |peak_nm: f64, fwhm_nm: f64| Shape::GaussianEv {
        peak_ev: HC_EV_NM / peak_nm,
        fwhm_ev: HC_EV_NM * fwhm_nm / (peak_nm * peak_nm),
        ordinate: EnergyOrdinate::Photons,
    };
    let rows = [
        ("Gannet blue", ingan(452.0, 19.0, 0.12), 0.62, 1.0, "InGaN"),
        ("Tern cyan", ingan(498.0, 29.0, 0.10), 0.38, 1.0, "InGaN"),
        ("Moss green", ingan(525.0, 33.0, 0.10), 0.31, 1.0, "InGaN"),
        ("Barley yellow", phosphor(548.0, 82.0, 128.0), 0.46, 2.0, "phosphor"),
        ("Marigold", phosphor(596.0, 70.0, 92.0), 0.37, 2.0, "phosphor"),
        ("Kestrel orange", dot(614.0, 32.0), 0.30, 1.0, "quantum dots"),
        ("Poppy red", ingan(634.0, 17.0, -0.18), 0.44, 1.0, "AlInGaP"),
        ("Garnet red", ingan(659.0, 20.0, -0.15), 0.47, 1.0, "AlInGaP"),
    ];
    for (name, shape, wall_plug, step_nm, kind) in rows {
        let mut emitter = emitter(&mut project, name, shape, step_nm, kind)?;
        emitter.origin = Origin::Electroluminescence { current_density_ma_per_cm2: None };
        emitter.geometry = Geometry::Sphere;
        emitter.mounting = Mounting::SingleDevice;
        emitter.wall_plug = Some(wall_plug);
        let volts = if name.ends_with("red") { 2.1 } else { 3.0 };
        emitter.sheet = packaged(wall_plug, volts);
        project.emitters.push(emitter);
    }
    let six = ["Gannet blue", "Moss green", "Barley yellow", "Marigold", "Kestrel orange", "Poppy red"];
    let eight: Vec<String> = project.emitters.iter().map(|e| e.name.clone()).collect();
    let eight: Vec<&str> = eight.iter().map(String::as_str).collect();
    let spec = |cct_k: f64, duv: f64, ra: f64, r9: f64| WhiteSpec {
        cct_k,
        duv,
        region: Region::Point,
        limits: Limits { ra: Limit::at_least(ra), r9: Limit::at_least(r9), ..Limits::default() },
        maximise: Maximise::Efficacy,
        lumens: Some(450.0),
        luminance_cd_per_m2: None,
    };
    add_set(&mut project, "Day 5000 K", &six, &spec(5000.0, 0.001, 90.0, 50.0));
    add_set(&mut project, "Dusk 3500 K", &six, &spec(3500.0, 0.0, 92.0, 60.0));
    add_set(&mut project, "Night 2200 K", &six, &spec(2200.0, 0.0, 90.0, 50.0));
    add_set(&mut project, "Dusk 3500 K, all eight", &eight, &spec(3500.0, 0.0, 95.0, 80.0));
    project.current_set = project.sets.get(1).map(|set| set.id);
    Ok(project)
}

fn emitter(
    project: &mut Project,
    name: &str,
    shape: Shape,
    step_nm: f64,
    kind: &str,
) -> Result<Emitter, Box<dyn Error>> {
    let spectrum = shape.spectrum(380.0, 780.0, step_nm)?;
    // Five figures are what an instrument gives.
    let power_per_nm = spectrum.values().iter().map(|v| (1e5 * v).round() / 1e5).collect();
    let import =
        Import { wavelengths_nm: spectrum.wavelengths_nm().to_vec(), power_per_nm, ..Import::default() };
    Ok(Emitter {
        id: EmitterId(project.take_id()),
        name: name.to_owned(),
        invented: true,
        note: format!("Invented: {kind}."),
        import,
        corrections: Vec::new(),
        geometry: Geometry::Unknown,
        origin: Origin::Modelled,
        mounting: Mounting::Unknown,
        instrument_range_nm: None,
        wall_plug: None,
        sheet: Sheet::default(),
    })
}

fn add_set(project: &mut Project, name: &str, emitters: &[&str], white: &WhiteSpec) {
    let members: Vec<Member> = project
        .emitters
        .iter()
        .filter(|e| emitters.contains(&e.name.as_str()))
        .map(|e| Member { share: 1.0 / emitters.len() as f64, ..Member::new(e.id) })
        .collect();
    let id = SetId(project.take_id());
    let white = white.clone();
    project.sets.push(EmitterSet {
        id,
        name: name.to_owned(),
        note: String::new(),
        members,
        white,
        recipes: Vec::new(),
    });
}

/// Every set with the shares that its own spec asks for.
fn solved(mut project: Project) -> Result<Project, Box<dyn Error>> {
    for index in 0..project.sets.len() {
        let id = project.sets[index].id;
        let asked = whitesmith::solving::set_problem(&project, id)?;
        let set = &mut project.sets[index];
        match optimiser::solve(&asked.problem, &optimiser::Control::none())? {
            optimiser::Outcome::Optimal(answer) => {
                set.members.iter_mut().for_each(|member| member.share = 0.0);
                for (member, share) in asked.members.iter().zip(&answer.shares) {
                    set.members[*member].share = *share;
                }
                let gap = answer
                    .gap
                    .map_or_else(|| "no gap known".to_owned(), |gap| format!("gap {:.3} %", 100.0 * gap));
                set.note = format!(
                    "Solved: {:.2} lm/W of the device, {}, {gap}.",
                    answer.objective,
                    answer.grade.key()
                );
            }
            optimiser::Outcome::Infeasible(why) => {
                return Err(format!("{}: {}", set.name, why.explanation).into());
            }
        }
    }
    Ok(project)
}

/// A small package at 65 mA: flux droops and voltage rises with current.
fn packaged(wall_plug: f64, volts: f64) -> Sheet {
    let currents = [0.5, 5.0, 20.0, 65.0, 120.0, 200.0];
    let flux = |ma: f64| ma / 65.0 * (1.12 - 0.12 * (ma / 65.0).sqrt());
    let forward = |ma: f64| volts + 0.14 * (ma / 65.0).ln();
    let rounded = |value: f64| (1e4 * value).round() / 1e4;
    Sheet {
        package: Some(Package {
            test_current_ma: Some(65.0),
            radiant_flux_w: Some(rounded(wall_plug * volts * 0.065)),
            maximum_current_ma: Some(200.0),
            die_area_mm2: Some(0.36),
            relative_flux: Some(Table::new(currents.iter().map(|&ma| (ma, rounded(flux(ma)))).collect())),
            forward_voltage: Some(Table::new(
                currents.iter().map(|&ma| (ma, rounded(forward(ma)))).collect(),
            )),
            ..Package::default()
        }),
        ..Sheet::default()
    }
}

/// Between the demo projects a recipe of every build form, and two with down-conversion; each is worked out here.
fn recipes(project: &mut Project) -> Result<(), Box<dyn Error>> {
    let before = project.clone();
    for index in 0..before.sets.len() {
        let set = &before.sets[index];
        let ids: Vec<EmitterId> = set.members.iter().map(|m| m.emitter).collect();
        let name_of = |id: &EmitterId| before.emitter(*id).map(|e| e.name.clone()).unwrap_or_default();
        let place = |name: &str| ids.iter().position(|id| name_of(id) == name);
        let need = |name: &str| place(name).ok_or_else(|| format!("{} without {name}", set.name));
        let plan = |name: &str, form: FormSettings| {
            RecipePlan::new(name, ids.clone(), Build { form, ..Build::default() })
        };
        let plans = match set.name.as_str() {
            "Cabin, five organic" => {
                let mut stack = plan(
                    "Ceiling panel, stacked",
                    FormSettings::SeriesStack(SeriesStack {
                        units: ["Rowan red", "Brass amber", "Fern green", "Reed teal", "Kingfisher blue"]
                            .iter()
                            .filter_map(|name| place(name))
                            .map(|emitter| StackUnit { emitter, repeats: 1 })
                            .collect(),
                        junction_drop_v: Some(0.15),
                        fill: Some(0.92),
                        ..SeriesStack::default()
                    }),
                );
                stack.thickness_nm = ids.iter().copied().zip([78.0, 82.0, 86.0, 94.0, 104.0]).collect();
                vec![plan("Wall panel, striped", striped()), stack]
            }
            "Cabin, dots and perovskite" => {
                let mut converted = plan("Wall panel, dots over blue", striped());
                converted.build.conversions = vec![Conversion {
                    pump: need("Kingfisher blue")?,
                    layers: vec![
                        converter(need("Ember red")?, 0.86, 0.020, 18.0),
                        converter(need("Sedge lime")?, 0.91, 0.028, 22.0),
                    ],
                }];
                vec![converted]
            }
            "Stair light, one zone" => {
                vec![plan("Stair light, one zone", FormSettings::SharedZone(zone(&before, set, &ids)?))]
            }
            "Dusk 3500 K" => vec![plan(
                "Reading lamp board",
                FormSettings::Packages(Packages {
                    at_most: Some(36),
                    strings: Some(StringRule { lowest_v: 1.2, highest_v: 40.0, most_parallel: 2 }),
                    ..Packages::default()
                }),
            )],
            "Day 5000 K" => {
                let mut board = plan(
                    "Day board, phosphors over blue",
                    FormSettings::Packages(Packages { at_most: Some(36), ..Packages::default() }),
                );
                let mut yellow = converter(need("Barley yellow")?, 0.93, 0.016, 60.0);
                let marigold = need("Marigold")?;
                yellow.relative_absorption = vec![(marigold, 0.02)];
                board.build.conversions = vec![Conversion {
                    pump: need("Gannet blue")?,
                    layers: vec![converter(marigold, 0.88, 0.012, 40.0), yellow],
                }];
                vec![board]
            }
            _ => Vec::new(),
        };
        project.sets[index].recipes = plans;
        for number in 0..project.sets[index].recipes.len() {
            let set = &project.sets[index];
            whitesmith::making::make(project, set.id, number)
                .map_err(|error| format!("{}, {}: {error}", set.name, set.recipes[number].name))?;
        }
    }
    Ok(())
}

fn striped() -> FormSettings {
    FormSettings::SideBySide(SideBySide {
        fill: Some(0.8),
        drive: Drive::OwnCurrent(Freedom::LeastPower),
        layout: Some(StripeLayout { pitch_um: 1500.0, gap_um: 30.0, minimum_um: 40.0 }),
        ..SideBySide::default()
    })
}

fn converter(emitter: usize, quantum_yield: f64, depth_per_percent_um: f64, thickness_um: f64) -> Converter {
    Converter {
        emitter,
        quantum_yield,
        depth_per_percent_um: Some(depth_per_percent_um),
        thickness_um: Some(thickness_um),
        ..Converter::default()
    }
}

/// Six invented calibration runs round the dopings this white needs; the first emitter is the reference.
fn zone(project: &Project, set: &EmitterSet, ids: &[EmitterId]) -> Result<SharedZone, Box<dyn Error>> {
    let mut photons = Vec::new();
    for (member, id) in set.members.iter().zip(ids) {
        let emitter = project.emitter(*id).ok_or("an emitter of the set")?;
        let light = colour::Tensor::of(&emitter.spectrum()?);
        photons.push(member.share * light.mean_wavelength_nm());
    }
    // Dopings in wt% that make the white, slopes of the logarithm of the photon ratio, and what each run was set to.
    let (doping, slope) = ([0.0, 0.55, 0.18], [0.0, 0.82, 0.74]);
    let steps = [(0.7, 1.3), (0.85, 0.75), (1.0, 1.1), (1.15, 0.9), (1.3, 1.25), (0.95, 0.8)];
    let scatter =
        [(1.012, 0.991), (0.994, 1.009), (1.004, 0.996), (0.989, 1.006), (1.007, 1.011), (0.996, 0.988)];
    let runs = steps.iter().zip(scatter).enumerate().map(|(k, (step, scatter))| {
        let (step, scatter) = ([1.0, step.0, step.1], [1.0, scatter.0, scatter.1]);
        let figure = |value: f64| (1e4 * value).round() / 1e4;
        let seen: Vec<f64> =
            (0..3).map(|i| photons[i] / photons[0] * f64::powf(step[i], slope[i]) * scatter[i]).collect();
        let sum: f64 = seen.iter().sum();
        ZoneRun {
            id: format!("Z-{:03}", 41 + k),
            current_ma_per_cm2: Some(2.0),
            settings: (0..3)
                .map(|i| ZoneSetting {
                    concentration_percent: (i > 0).then(|| figure(doping[i] * step[i])),
                    thickness_nm: Some([18.0, 10.0, 8.0][i]),
                })
                .collect(),
            shares: seen.iter().map(|n| figure(n / sum)).collect(),
            kind: ShareKind::Photon,
        }
    });
    Ok(SharedZone { reference: 0, runs: runs.collect(), fill: Some(0.95), ..SharedZone::default() })
}
