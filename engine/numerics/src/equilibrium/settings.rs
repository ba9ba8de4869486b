//! How a state is solved for.

/// How the load is put on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum LoadSteps {
    /// The full load at once; with struts, smaller steps where that fails.
    #[default]
    FullFirst,
    /// This many equal steps, each solved and kept; zero counts as one.
    Equal(u32),
}

/// What the largest residual is measured against.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Yardstick {
    /// The larger of the largest load and the largest axial force.
    #[default]
    LoadOrForce,
    /// The largest load on a free direction; a net without load falls back on the axial forces.
    Load,
}

/// Settings of a solve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Settings {
    /// How the load is put on.
    pub load_steps: LoadSteps,
    /// Largest residual over the yardstick (–). Below the rounding of the positions it can not be met; there the
    /// rounding decides.
    pub tolerance: f64,
    /// What the residual is measured against.
    pub yardstick: Yardstick,
    /// Factorisations allowed in all.
    pub max_iterations: u32,
}

impl Default for Settings {
    fn default() -> Self {
        Self {
            load_steps: LoadSteps::FullFirst,
            tolerance: 1e-10,
            yardstick: Yardstick::LoadOrForce,
            max_iterations: 400,
        }
    }
}
