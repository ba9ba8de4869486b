//! What a member is made of.

/// Properties of a rope or a strut that do not depend on its length.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Section {
    /// `EA`: force for unit strain (N), positive.
    pub axial_stiffness: f64,
    /// Mass per unstressed length (kg/m), zero or more.
    pub mass_per_length: f64,
    /// Thermal expansion `α` (1/K).
    pub expansion: f64,
    /// Breaking force of the member with its end fittings (N), if known.
    pub breaking_force: Option<f64>,
    /// Characteristic force at the proof strength (N), if known; the end fittings do not lower it.
    pub proof_force: Option<f64>,
    /// Bending stiffness `EI` of a strut (N m²), if known.
    pub bending_stiffness: Option<f64>,
    /// Diameter of the rope or tube (m), if known.
    pub diameter: Option<f64>,
}
