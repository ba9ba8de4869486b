//! What is worked out once for a net before any state is sought.

use std::sync::{Arc, OnceLock};

use super::linear::{Factor, Symbolic};
use crate::assembly::{Pattern, Structure};
use crate::model::Net;

/// Numbering, pattern and elimination order of a net; cheap to clone, shared by every case and thread.
#[derive(Clone, Debug)]
pub struct Analysis {
    structure: Arc<Structure>,
    symbolic: Arc<Symbolic>,
    node_graph: Arc<OnceLock<NodeGraph>>,
}

/// Pattern and elimination order of matrices with one row a node, as force densities make them.
#[derive(Debug)]
pub(super) struct NodeGraph {
    pub(super) pattern: Pattern,
    pub(super) symbolic: Arc<Symbolic>,
}

impl Analysis {
    /// Analyses a net.
    #[must_use]
    pub fn new(net: Arc<Net>) -> Self {
        Self::of(Structure::new(net))
    }

    /// Analyses a numbered net.
    #[must_use]
    pub fn of(structure: Structure) -> Self {
        let symbolic = Arc::new(Symbolic::new(structure.pattern()));
        Self {
            structure: Arc::new(structure),
            symbolic,
            node_graph: Arc::default(),
        }
    }

    /// The net with its numbering.
    #[must_use]
    pub fn structure(&self) -> &Structure {
        &self.structure
    }

    /// The same, for one who outlives the analysis.
    #[must_use]
    pub fn shared_structure(&self) -> Arc<Structure> {
        Arc::clone(&self.structure)
    }

    /// Elimination order and structure of the factor.
    #[must_use]
    pub fn symbolic(&self) -> &Arc<Symbolic> {
        &self.symbolic
    }

    /// What matrices with one row a node need; worked out when first asked for.
    pub(super) fn node_graph(&self) -> &NodeGraph {
        self.node_graph.get_or_init(|| {
            let pattern = self.structure.node_pattern();
            let symbolic = Arc::new(Symbolic::new(&pattern));
            NodeGraph { pattern, symbolic }
        })
    }

    /// Room for factorisations, for one worker.
    #[must_use]
    pub fn new_factor(&self) -> Factor {
        Factor::new(Arc::clone(&self.symbolic))
    }
}
