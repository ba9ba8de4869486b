//! How a state is solved for.

/// How the load is put on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum LoadSteps {
    /// The full load at once; smaller steps only where that fails.
    #[default]
    FullFirst,
    /// This many equal steps.
    Equal(u32),
}

/// Settings of a solve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Settings {
    /// How the load is put on.
    pub load_steps: LoadSteps,
    /// Largest residual over the largest of load and tension (–).
    pub tolerance: f64,
    /// Factorisations allowed in all.
    pub max_iterations: u32,
}

impl Default for Settings {
    fn default() -> Self {
        Self {
            load_steps: LoadSteps::FullFirst,
            tolerance: 1e-10,
            max_iterations: 400,
        }
    }
}
