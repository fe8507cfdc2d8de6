//! `report`: a white, its recipe and everything behind it as one HTML file or an A4 PDF.

use super::recipe::{chosen, open, refused};
use super::{BadInput, Exit, output};
use crate::making::report::{day, report};
use clap::Args;
use std::path::PathBuf;

/// Write the report of a saved project's current set and its first recipe
#[derive(Debug, Args)]
pub struct ReportArgs {
    /// The project
    #[arg(value_name = "PROJECT")]
    pub project: PathBuf,
    /// Where to write: a name ending in .pdf or .html
    #[arg(short, long, value_name = "FILE", required = true)]
    pub output_file: PathBuf,
    /// Another emitter set than the current one
    #[arg(long, value_name = "NAME")]
    pub set: Option<String>,
    /// Another recipe than the set's first
    #[arg(long, value_name = "NAME")]
    pub recipe: Option<String>,
    /// The date to print; today's when not given
    #[arg(long, value_name = "TEXT")]
    pub date: Option<String>,
}

/// Runs the command.
pub(super) fn run(args: &ReportArgs) -> Exit {
    let target = args.output_file.display().to_string();
    let kind = args.output_file.extension().and_then(|e| e.to_str()).map(str::to_lowercase);
    if !matches!(kind.as_deref(), Some("pdf" | "html")) {
        output::sentence(BadInput::at(
            "--output-file",
            &format!("expected a name ending in .pdf or .html, found {target}"),
        ));
        return Exit::Bad;
    }
    let project = match open(&args.project) {
        Ok(project) => project,
        Err(exit) => return exit,
    };
    let set = args.set.clone().or_else(|| project.current().map(|set| set.name.clone()));
    let wanted = chosen(&project, set.as_deref(), args.recipe.as_deref());
    let Some((set, index)) = wanted.first().copied() else {
        let place = args.project.display().to_string();
        output::sentence(BadInput::at(&place, "expected a set and recipe of these names, found none"));
        return Exit::Bad;
    };
    let seconds =
        std::time::SystemTime::now().duration_since(std::time::UNIX_EPOCH).map_or(0, |since| since.as_secs());
    let date = args.date.clone().unwrap_or_else(|| day(seconds));
    let model = match report(&project, set, index, &date, "") {
        Ok(model) => model,
        Err(error) => return refused(&args.project.display().to_string(), &error),
    };
    let bytes = if kind.as_deref() == Some("pdf") {
        ::files::report::pdf::pages(&model).map_err(|e| e.to_string())
    } else {
        Ok(::files::report::html::page(&model).into_bytes())
    };
    let written = bytes.and_then(|bytes| {
        ::files::save::save(&args.output_file, &bytes, None).map(drop).map_err(|e| e.to_string())
    });
    match written {
        Ok(()) => Exit::Done,
        Err(why) => {
            output::sentence(BadInput::at(&target, &why));
            Exit::Bad
        }
    }
}
