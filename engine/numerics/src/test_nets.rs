//! Nets for tests, written by name.

use std::collections::BTreeMap;

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
        ..Section::default()
    }
}

/// A net in the making; nodes that only occur in paths are free and have no coordinates.
#[derive(Default)]
pub(crate) struct Sketch {
    pub(crate) given: NetGiven,
    index: BTreeMap<String, usize>,
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
            ..CableGiven::default()
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

/// The invented courtyard canopy: its ropes, guys and masts, without skin and adjusters, the bracing rope clamped at the
/// wall bracket, the bracket rigid.
pub(crate) fn courtyard() -> Sketch {
    let mut sketch = Sketch::default();
    sketch.node("W", [-9.0, 0.0, 5.2]);
    sketch.node("E", [9.0, 0.0, 5.2]);
    for (name, position) in [
        ("S", [0.0, -7.0, 2.4]),
        ("N", [0.0, 7.0, 2.4]),
        ("K", [0.0, 7.0, 0.4]),
        ("Z", [0.0, 0.0, 0.0]),
        ("FW", [-9.0, 0.0, 0.0]),
        ("FE", [9.0, 0.0, 0.0]),
        ("GW1", [-13.5, -3.0, 0.0]),
        ("GW2", [-13.5, 3.0, 0.0]),
        ("GE1", [13.5, -3.0, 0.0]),
        ("GE2", [13.5, 3.0, 0.0]),
    ] {
        sketch.held(name, position);
    }
    let with_breaking_force = |axial_stiffness, mass, breaking_force| Section {
        breaking_force: Some(breaking_force),
        ..section(axial_stiffness, mass)
    };
    let r10 = with_breaking_force(8.9e6, 0.5, 82e3);
    let r20 = with_breaking_force(35e6, 2.0, 331e3);
    let r24 = with_breaking_force(51e6, 2.9, 476e3);
    for (name, path) in [
        ("c1", "p1 n11 n12 n13 p4"),
        ("c2", "W n21 n22 n23 E"),
        ("c3", "p8 n31 n32 n33 p5"),
        ("b1", "p2 n11 n21 n31 p7"),
        ("b2", "S n12 n22 n32 N K"),
        ("b3", "p3 n13 n23 n33 p6"),
    ] {
        sketch.cable(name, r10, path);
    }
    for (name, path) in [
        ("eSW", "W p1 p2 S"),
        ("eSE", "S p3 p4 E"),
        ("eNE", "E p5 p6 N"),
        ("eNW", "N p7 p8 W"),
    ] {
        sketch.cable(name, r20, path);
    }
    sketch.given.cables[7].sections[2] = r24;
    for (name, path) in [("gW1", "W GW1"), ("gW2", "W GW2"), ("gE1", "E GE1"), ("gE2", "E GE2")] {
        sketch.cable(name, r24, path);
    }
    sketch.cable("storm1", r10, "n22 Z");
    sketch.strut("mW", section(844e6, 31.6), "FW", "W");
    sketch.strut("mE", section(844e6, 31.6), "FE", "E");
    sketch
}

/// Its prestress, under the action of index 0.
pub(crate) fn courtyard_prestress(net: &Net) -> crate::shape::Prestress {
    use crate::shape::PrestressRule;
    let mut rules = vec![PrestressRule::Balance; net.segments().len()];
    let mut set = |names: &[&str], rule| {
        for segment in segments(net, names) {
            rules[segment] = rule;
        }
    };
    set(&["c1", "c2", "c3"], PrestressRule::ForceDensity(4000.0));
    set(&["b1", "b2", "b3"], PrestressRule::ForceDensity(5000.0));
    for (family, edge) in ["eSW", "eSE", "eNE", "eNW"].into_iter().enumerate() {
        set(&[edge], PrestressRule::MeanTension(family));
    }
    set(&["storm1"], PrestressRule::UnstressedLength(3.75));
    crate::shape::Prestress {
        rules,
        mean_tensions: vec![60e3; 4],
        hold: vec![node(net, "W"), node(net, "E")],
        under: vec![0],
        ..crate::shape::Prestress::default()
    }
}
