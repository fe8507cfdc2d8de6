//! Background jobs: one queue, progress, cancelling, the latest request wins.
