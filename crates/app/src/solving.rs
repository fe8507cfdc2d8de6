//! A white spec and its emitters as a problem for the optimiser.
