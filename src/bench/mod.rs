//! Room `bench`.
