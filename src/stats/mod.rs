//! Room `stats`.
