//! The window: the loom, the ledger and the benches.
