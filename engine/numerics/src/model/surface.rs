//! Skins, and zones that split them.

use nalgebra::Vector2;

/// A skin: cloth or cladding that passes load to the corners of its panels and does nothing else.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Skin {
    /// The client's id.
    pub name: String,
    /// Mass per area in the reference state (kg/m²), zero or more.
    pub mass_per_area: f64,
    /// Its panels, by index; a panel belongs to one skin.
    pub panels: Vec<usize>,
}

/// A part of a skin: the panels whose centre lies within an outline in plan, in the reference state.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Zone {
    /// The client's id.
    pub name: String,
    /// Its skin, by index.
    pub skin: usize,
    /// Corners of the outline in plan (m), at least three.
    pub outline: Vec<Vector2<f64>>,
}

/// Panels or what they are parts of, in the lists that a load names.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Area {
    /// All panels of a skin, by index.
    Skin(usize),
    /// The panels of a zone, by index.
    Zone(usize),
}
