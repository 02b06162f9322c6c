//! A diver in the register.

use super::Id;
use crate::quantity::{Mass, Share, Uncertain, Volume};

/// What fills the loop beside the oxygen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Diluent {
    /// Air.
    Air,
    /// A gas with this share of oxygen.
    Oxygen(Share),
}

/// A diver: everything here is personal and goes when the diver is forgotten.
#[derive(Debug, Clone, PartialEq)]
pub struct Diver {
    /// The name in the register.
    pub id: Id,
    /// The diver's own name.
    pub name: Option<String>,
    /// Body mass, for plausibility only.
    pub mass: Option<Mass>,
    /// Volume of loop and lungs; the ± is expanded, k = 2.
    pub loop_volume: Option<Uncertain<Volume>>,
    /// Diluent.
    pub diluent: Option<Diluent>,
}

impl Diver {
    /// A diver of whom only the name in the register is known.
    #[must_use]
    pub const fn bare(id: Id) -> Self {
        Self { id, name: None, mass: None, loop_volume: None, diluent: None }
    }
}
