//! Room `entry`.
