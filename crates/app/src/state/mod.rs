//! The project being edited: every change as an edit that carries its inverse, and the values derived from it.
