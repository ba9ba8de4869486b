//! A state to start from: force densities and wanted tensions.

mod given;

use thiserror::Error;

pub use given::{Prestress, PrestressRule};

/// How the reference state was found.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct ShapeReport {}

/// Why there is no reference state.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ShapeError {}
