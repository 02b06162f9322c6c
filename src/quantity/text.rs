//! Text to quantity and back.

/// A value with the expanded uncertainty that stood after its `±`, if any (k = 2 unless its table says otherwise).
///
/// `D` is the type of differences of `T`; for most quantities they are the same.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Uncertain<T, D = T> {
    /// The value.
    pub value: T,
    /// The expanded uncertainty after `±`.
    pub expanded: Option<D>,
}

/// Why a text is no quantity.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum QuantityError {}
