//! What opens over the benches.

pub(super) mod emitter;
pub(super) mod import;
pub(super) mod paths;
