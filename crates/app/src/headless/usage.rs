//! What is said when the arguments themselves cannot be used: one line, what was expected and what was found.

use super::answer::AnswerRecord;
use super::{BadInput, Exit, output};
use clap::error::{ContextKind, ContextValue, ErrorKind};
use std::error::Error;
use std::ffi::OsString;

/// Commands whose document is a list; the others answer with one record.
const LISTS: [&str; 4] = ["read", "measure", "recipe", "correct"];

/// Prints help or version, or says in one line what is wrong with the arguments. Where JSON was asked for, the document
/// is there all the same: an empty list, or a record of nulls with the sentence.
pub(super) fn answer(error: &clap::Error, arguments: &[OsString]) -> Exit {
    match error.kind() {
        ErrorKind::DisplayHelp | ErrorKind::DisplayVersion => {
            output::text(error.render().to_string().trim_end());
            Exit::Done
        }
        _ => {
            let sentence = sentence(error);
            if arguments.iter().any(|a| a == "--json") {
                if arguments.get(1).is_some_and(|command| LISTS.iter().any(|list| command == list)) {
                    output::json(&[(); 0]);
                } else {
                    output::json(&AnswerRecord {
                        message: Some(sentence.clone()),
                        ..AnswerRecord::default()
                    });
                }
            }
            output::sentence(BadInput::line(&sentence));
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
