//! Room `record`.
