//! What is said when the arguments themselves cannot be used: one line, what was expected and what was found.

use super::{BadInput, Exit, output};
use clap::error::{ContextKind, ContextValue, ErrorKind};
use std::error::Error;

/// Prints help or version, or says in one line what is wrong with the arguments.
pub(super) fn answer(error: &clap::Error) -> Exit {
    match error.kind() {
        ErrorKind::DisplayHelp | ErrorKind::DisplayVersion => {
            output::text(error.render().to_string().trim_end());
            Exit::Done
        }
        _ => {
            output::sentence(BadInput::line(&sentence(error)));
            Exit::Bad
        }
    }
}

fn sentence(error: &clap::Error) -> String {
    let one = |kind| match error.get(kind) {
        Some(ContextValue::String(text)) => Some(text.clone()),
        Some(ContextValue::Strings(list)) => Some(list.join(" ")),
        _ => None,
    };
    let argument = one(ContextKind::InvalidArg).unwrap_or_else(|| "arguments".to_owned());
    let option = argument.split_whitespace().next().unwrap_or("arguments").to_owned();
    let found = one(ContextKind::InvalidValue).unwrap_or_default();
    match error.kind() {
        ErrorKind::ValueValidation => match error.source() {
            Some(source) => format!("{option}: {source}"),
            None => format!("{option}: expected another value, found `{found}`"),
        },
        ErrorKind::InvalidValue => {
            let valid = match error.get(ContextKind::ValidValue) {
                Some(ContextValue::Strings(list)) if !list.is_empty() => list.join(", "),
                _ => "a value".to_owned(),
            };
            let found = if found.is_empty() { "none".to_owned() } else { format!("`{found}`") };
            format!("{option}: expected {valid}, found {found}")
        }
        ErrorKind::MissingRequiredArgument => format!("arguments: expected {argument} as well, found none"),
        ErrorKind::UnknownArgument => {
            format!("arguments: expected an option of this command, found `{argument}`")
        }
        ErrorKind::ArgumentConflict => format!("arguments: expected {option} at most once, found it twice"),
        _ => {
            let text = error.render().to_string();
            let first = text.lines().next().unwrap_or_default();
            format!("arguments: {}", first.trim_start_matches("error: "))
        }
    }
}
