//! Emitter sheets and build forms: how shares of a blend become a device, and back.
//!
//! | module | subject |
//! |---|---|
//! | [`sheet`] | what a maker knows about one emitter, as plain data |
//! | [`curve`] | measured tables over current |
//! | [`roll_off`] | published EQE roll-off formulas and their fits |
//! | [`out_coupling`] | the factor on outgoing light |
//! | [`light`], [`shares`] | the light of an emitter; the three kinds of share |
//! | [`working`] | everything a sheet gives at one current |
//! | [`conversion`] | pumps and converters |
//! | [`build`] | a build: from shares to a recipe, from fabrication numbers back |
//! | [`side_by_side`], [`series_stack`], [`shared_zone`], [`packages`] | the build forms |
//! | [`calibration`] | the user's runs behind a shared zone |
//! | [`whole_numbers`] | closest white of whole units |
//! | [`power`] | device electrical power as an objective, with bounds |
//! | [`efficacy`] | best lm/W over blends and freedoms, around a solver the caller brings |
//! | [`sensitivity`], [`dimming`] | what each number, and dimming, does to the white |
//! | [`made`], [`recipe`], [`bands`], [`bring_back`] | fabrication numbers, what a recipe says, allowed bands, the way back |
//! | [`form`], [`channels`] | what the forms have in common |
//! | [`units`] | physical constants |
//! | [`error`] | errors and notices |
//!
//! Out of scope: finding the blend (the optimiser does), files, pictures. Nothing here reads a clock, a file
//! or a global.

mod allocation;
pub mod bands;
pub mod bring_back;
pub mod build;
pub mod calibration;
pub mod channels;
pub mod conversion;
pub mod curve;
pub mod dimming;
pub mod efficacy;
pub mod error;
pub mod form;
pub mod light;
pub mod made;
pub mod out_coupling;
mod package_law;
pub mod packages;
pub mod power;
mod predict;
pub mod recipe;
pub mod roll_off;
mod search;
pub mod sensitivity;
pub mod series_stack;
pub mod shared_zone;
pub mod shares;
pub mod sheet;
pub mod side_by_side;
mod stripe_rules;
pub mod units;
pub mod whole_numbers;
pub mod working;

pub use build::{Build, FormSettings, Level};
pub use error::{DeviceError, Notice};
pub use form::BuildForm;
pub use light::{DeviceEmitter, EmitterLight};
pub use made::{Made, Quantities, Quantity, QuantityKind};
pub use recipe::{Recipe, RecipeEmitter};
pub use shares::ShareKind;
pub use sheet::Sheet;
pub use working::{Characteristic, Working};
