//! Table of contents to come.
