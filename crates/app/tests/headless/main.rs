//! The headless commands as a person runs them: the built program, its two streams and its exit code.

mod arguments;
mod correct;
mod jobs;
mod measure;
mod read;
mod solve;
mod support;
