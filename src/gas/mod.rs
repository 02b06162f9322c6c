//! Room `gas`.
