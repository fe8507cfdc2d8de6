//! Drawing on the processor alone, for pictures and tests.
