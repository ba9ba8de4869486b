//! Nets for tests, written by name.

use std::collections::HashMap;

use nalgebra::{DMatrix, Matrix3, Vector3};

use crate::model::{
    CableGiven, ElasticSupportGiven, Net, NetGiven, NodeGiven, NodeId, Section, StrutGiven, SupportGiven,
};

/// A section with nothing but stiffness and mass.
pub(crate) fn section(axial_stiffness: f64, mass_per_length: f64) -> Section {
    Section {
        axial_stiffness,
        mass_per_length,
        expansion: 12e-6,
        breaking_force: None,
    }
}

/// A net in the making; nodes that only occur in paths are free and have no coordinates.
#[derive(Default)]
pub(crate) struct Sketch {
    pub(crate) given: NetGiven,
    index: HashMap<String, usize>,
}

impl Sketch {
    pub(crate) fn id(&mut self, name: &str) -> NodeId {
        let nodes = &mut self.given.nodes;
        let index = *self.index.entry(name.to_owned()).or_insert_with(|| {
            nodes.push(NodeGiven {
                name: name.to_owned(),
                ..NodeGiven::default()
            });
            nodes.len() - 1
        });
        NodeId::new(index)
    }

    pub(crate) fn node(&mut self, name: &str, position: [f64; 3]) -> &mut NodeGiven {
        let index = self.id(name).index();
        self.given.nodes[index].position = Some(Vector3::from(position));
        &mut self.given.nodes[index]
    }

    pub(crate) fn held(&mut self, name: &str, position: [f64; 3]) {
        self.node(name, position).support = Some(SupportGiven::default());
    }

    /// A node held but for springs of given stiffness (N/m) along the axes.
    pub(crate) fn sprung(&mut self, name: &str, position: [f64; 3], stiffness: [f64; 3]) {
        self.held(name, position);
        let stiffness = Matrix3::from_diagonal(&Vector3::from(stiffness));
        let nodes = vec![self.id(name)];
        self.given.elastic_supports.push(ElasticSupportGiven {
            nodes,
            stiffness: DMatrix::from_column_slice(3, 3, stiffness.as_slice()),
        });
    }

    pub(crate) fn cable(&mut self, name: &str, section: Section, path: &str) {
        let path: Vec<NodeId> = path.split_whitespace().map(|n| self.id(n)).collect();
        self.given.cables.push(CableGiven {
            name: name.to_owned(),
            sections: vec![section; path.len() - 1],
            path,
        });
    }

    pub(crate) fn strut(&mut self, name: &str, section: Section, foot: &str, head: &str) {
        let ends = [self.id(foot), self.id(head)];
        self.given.struts.push(StrutGiven {
            name: name.to_owned(),
            ends,
            section,
        });
    }

    pub(crate) fn net(self) -> Net {
        Net::new(self.given).expect("a valid net")
    }
}

/// The node of a name.
pub(crate) fn node(net: &Net, name: &str) -> NodeId {
    NodeId::new(
        net.nodes()
            .iter()
            .position(|n| n.name == name)
            .expect("a node of the net"),
    )
}

/// Segments of the cables and struts of these names.
pub(crate) fn segments(net: &Net, names: &[&str]) -> Vec<usize> {
    let cables = net.cables().iter().filter(|c| names.contains(&c.name.as_str()));
    let struts = net.struts().iter().filter(|s| names.contains(&s.name.as_str()));
    cables
        .flat_map(|c| c.segments.clone())
        .chain(struts.map(|s| s.segment.index()))
        .collect()
}
