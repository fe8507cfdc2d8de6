//! Facts about what files say.
