//! The headless commands as a person runs them: the built program, its two streams and its exit code.

// Every line here is a test: a missing value is a failed check.
#![allow(clippy::unwrap_used)]

mod arguments;
mod correct;
mod jobs;
mod measure;
mod read;
mod recipe;
mod solve;
mod support;
