//! Room `plot`.
