//! What opens over the benches.

pub(super) mod emitter;
