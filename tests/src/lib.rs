//! Holds no code: the checks are the files beside it.
