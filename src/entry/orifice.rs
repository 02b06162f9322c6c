//! An orifice in the register.

use super::{Build, Id};
use crate::quantity::Length;

/// An orifice or valve that runs are made of.
#[derive(Debug, Clone, PartialEq)]
pub struct Orifice {
    /// Its name.
    pub id: Id,
    /// What it is, in words.
    pub description: Option<String>,
    /// Serial number.
    pub serial: Option<String>,
    /// Maker.
    pub maker: Option<String>,
    /// Whose it is.
    pub customer: Option<String>,
    /// How its hole is built.
    pub build: Build,
    /// Length of the hole.
    pub length: Option<Length>,
    /// Diameter the maker states.
    pub nominal_diameter: Option<Length>,
    /// The acceptance it is judged by where a run names none.
    pub acceptance: Option<Id>,
}

impl Orifice {
    /// An orifice of which only the name is known.
    #[must_use]
    pub const fn bare(id: Id) -> Self {
        Self {
            id,
            description: None,
            serial: None,
            maker: None,
            customer: None,
            build: Build::Unknown,
            length: None,
            nominal_diameter: None,
            acceptance: None,
        }
    }
}
