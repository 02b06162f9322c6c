//! Room `series`.
