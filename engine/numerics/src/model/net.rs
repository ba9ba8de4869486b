//! The net: nodes, cables, struts and supports, checked once and then shared.

use std::ops::Range;

use nalgebra::Vector3;
use nalgebra_sparse::{CooMatrix, CsrMatrix};

use super::support::{ElasticSupport, ElasticSupportGiven, Support, SupportGiven};
use super::violations::{check_section, check_surface, violations};
use super::{CableId, NetError, NodeId, Section, SegmentId, Skin, StrutId, Zone};

/// A node as given.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct NodeGiven {
    /// The client's id.
    pub name: String,
    /// Position (m); a free node of a net that is shaped first may have none.
    pub position: Option<Vector3<f64>>,
    /// Rigid support, if any.
    pub support: Option<SupportGiven>,
    /// Mass of clamps, lamps and the like (kg).
    pub attached_mass: f64,
}

/// A node through which a rope slides instead of being clamped.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Slide {
    /// Position of the node in the path of the cable: neither its first nor its last.
    pub place: usize,
    /// Coulomb friction coefficient (–), zero or more.
    pub friction: f64,
}

/// A cable as given: one rope through its nodes in order.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CableGiven {
    /// The client's id.
    pub name: String,
    /// At least two nodes, none twice in a row; a closed rope repeats its first node last.
    pub path: Vec<NodeId>,
    /// One section a segment.
    pub sections: Vec<Section>,
    /// Where it slides, by place; empty: clamped at every node.
    pub slides: Vec<Slide>,
    /// Whether its segments hang as elastic catenaries under loads per length, instead of being straight with half of
    /// such loads at each end.
    pub hangs: bool,
}

/// A panel as given: a mesh of the net that passes pressure to its corners.
#[derive(Clone, Debug, PartialEq)]
pub struct PanelGiven {
    /// The client's id, or one made of its corners.
    pub name: String,
    /// At least three nodes in order; seen from the outer side they run counter-clockwise.
    pub corners: Vec<NodeId>,
}

/// A strut as given: one straight two-way bar.
#[derive(Clone, Debug, PartialEq)]
pub struct StrutGiven {
    /// The client's id.
    pub name: String,
    /// Foot and head.
    pub ends: [NodeId; 2],
    /// Its section.
    pub section: Section,
}

/// Everything a net is made of, not yet checked.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct NetGiven {
    /// Nodes, in result order.
    pub nodes: Vec<NodeGiven>,
    /// Cables, in result order.
    pub cables: Vec<CableGiven>,
    /// Struts, in result order.
    pub struts: Vec<StrutGiven>,
    /// Springs and stiffness matrices.
    pub elastic_supports: Vec<ElasticSupportGiven>,
    /// Panels, in result order.
    pub panels: Vec<PanelGiven>,
    /// Skins, in result order.
    pub skins: Vec<Skin>,
    /// Zones, in result order.
    pub zones: Vec<Zone>,
}

/// A node of a net.
#[derive(Clone, Debug, PartialEq)]
pub struct Node {
    /// The client's id.
    pub name: String,
    /// Position as given (m).
    pub position: Option<Vector3<f64>>,
    /// Mass of what is attached (kg).
    pub attached_mass: f64,
}

/// A cable of a net.
#[derive(Clone, Debug, PartialEq)]
pub struct Cable {
    /// The client's id.
    pub name: String,
    /// Its nodes in order.
    pub path: Vec<NodeId>,
    /// Its segments, one between each two nodes of the path.
    pub segments: Range<usize>,
    /// Its reaches, in order.
    pub reaches: Range<usize>,
}

/// A strut of a net.
#[derive(Clone, Debug, PartialEq)]
pub struct Strut {
    /// The client's id.
    pub name: String,
    /// Its segment.
    pub segment: SegmentId,
}

/// What a segment belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Member {
    /// A piece of a rope.
    Cable(CableId),
    /// The whole of a strut.
    Strut(StrutId),
}

/// How axial force follows from stretch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum AxialLaw {
    /// `N = EA max(0, λ − 1)`: a rope.
    TensionOnly,
    /// `N = EA (λ − 1)`: a strut.
    TwoWay,
}

/// A straight piece between two nodes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Segment {
    /// Its nodes in path order.
    pub ends: [NodeId; 2],
    /// What it belongs to.
    pub member: Member,
    /// Its law.
    pub law: AxialLaw,
    /// Its section.
    pub section: Section,
    /// Index of its unstressed length; see [`Net::n_lengths`]. Segments of one reach share it.
    pub length: usize,
    /// Whether it hangs as an elastic catenary under loads per length.
    pub hangs: bool,
}

/// The piece of a cable between two clamped nodes: its unstressed length is conserved.
#[derive(Clone, Debug, PartialEq)]
pub struct Reach {
    /// The rope.
    pub cable: CableId,
    /// Its segments: one, unless the rope slides through nodes.
    pub segments: Range<usize>,
    /// Coulomb friction coefficient at each of the nodes through which it slides (–).
    pub friction: Vec<f64>,
}

impl Reach {
    /// Whether the rope slides somewhere along it.
    #[must_use]
    pub fn slides(&self) -> bool {
        self.segments.len() > 1
    }
}

/// A panel: the corners of a mesh.
#[derive(Clone, Debug, PartialEq)]
pub struct Panel {
    /// Its id.
    pub name: String,
    /// Its corners in order, counter-clockwise seen from the outer side.
    pub corners: Vec<NodeId>,
}

impl From<PanelGiven> for Panel {
    fn from(given: PanelGiven) -> Self {
        Self {
            name: given.name,
            corners: given.corners,
        }
    }
}

impl Panel {
    /// Where its corners are (m), of one position a node.
    pub fn places<'a>(&'a self, positions: &'a [Vector3<f64>]) -> Vec<Vector3<f64>> {
        self.corners.iter().map(|corner| positions[corner.index()]).collect()
    }
}

/// A valid net, immutable: finite numbers, positive stiffness, no dangling index, no path without length.
#[derive(Clone, Debug)]
pub struct Net {
    nodes: Vec<Node>,
    cables: Vec<Cable>,
    struts: Vec<Strut>,
    segments: Vec<Segment>,
    reaches: Vec<Reach>,
    supports: Vec<Support>,
    support_of_node: Vec<Option<usize>>,
    elastic_supports: Vec<ElasticSupport>,
    panels: Vec<Panel>,
    skins: Vec<Skin>,
    zones: Vec<Zone>,
    branch_node: CsrMatrix<f64>,
}

impl Net {
    /// Checks what is given and numbers it: segments in cable order, along each cable, then struts.
    ///
    /// A node touched by an elastic support is held by it alone: a rigid support given as well keeps only the
    /// directions in which the elastic one has no stiffness of its own.
    ///
    /// # Errors
    /// Every [`NetError`] found, not just the first.
    pub fn new(given: NetGiven) -> Result<Self, Vec<NetError>> {
        let errors = violations(&given);
        if !errors.is_empty() {
            return Err(errors);
        }
        let NetGiven {
            nodes: nodes_given,
            cables: cables_given,
            struts: struts_given,
            elastic_supports,
            panels,
            skins,
            zones,
        } = given;

        let mut segments = Vec::new();
        let mut reaches = Vec::new();
        let mut cables = Vec::with_capacity(cables_given.len());
        for (index, cable) in cables_given.into_iter().enumerate() {
            let id = CableId::new(index);
            let (first_segment, first_reach) = (segments.len(), reaches.len());
            for (place, (ends, section)) in cable.path.windows(2).zip(cable.sections).enumerate() {
                let segment = segments.len();
                // The piece goes on where the rope slides through its first node.
                match cable.slides.iter().find(|slide| slide.place == place) {
                    Some(slide) => {
                        let reach: &mut Reach = reaches.last_mut().expect("a rope slides at inner nodes only");
                        reach.segments.end = segment + 1;
                        reach.friction.push(slide.friction);
                    }
                    None => reaches.push(Reach {
                        cable: id,
                        segments: segment..segment + 1,
                        friction: Vec::new(),
                    }),
                }
                segments.push(Segment {
                    ends: [ends[0], ends[1]],
                    member: Member::Cable(id),
                    law: AxialLaw::TensionOnly,
                    section,
                    length: reaches.len() - 1,
                    hangs: cable.hangs,
                });
            }
            cables.push(Cable {
                name: cable.name,
                path: cable.path,
                segments: first_segment..segments.len(),
                reaches: first_reach..reaches.len(),
            });
        }
        let mut struts = Vec::with_capacity(struts_given.len());
        for (index, strut) in struts_given.into_iter().enumerate() {
            let segment = SegmentId::new(segments.len());
            segments.push(Segment {
                ends: strut.ends,
                member: Member::Strut(StrutId::new(index)),
                law: AxialLaw::TwoWay,
                section: strut.section,
                length: reaches.len() + index,
                hangs: false,
            });
            struts.push(Strut {
                name: strut.name,
                segment,
            });
        }

        let mut softened: Vec<Vec<Vector3<f64>>> = vec![Vec::new(); nodes_given.len()];
        for elastic in &elastic_supports {
            for (position, node) in elastic.nodes.iter().enumerate() {
                let block = elastic
                    .stiffness
                    .fixed_view::<3, 3>(3 * position, 3 * position)
                    .into_owned();
                let eigen = block.symmetric_eigen();
                let largest = eigen.eigenvalues.max();
                for (value, vector) in eigen.eigenvalues.iter().zip(eigen.eigenvectors.column_iter()) {
                    if *value > 1e-12 * largest {
                        softened[node.index()].push(vector.into_owned());
                    }
                }
            }
        }
        let mut supports = Vec::new();
        let mut support_of_node = vec![None; nodes_given.len()];
        let mut nodes = Vec::with_capacity(nodes_given.len());
        for (index, node) in nodes_given.into_iter().enumerate() {
            if let Some(support) = node.support {
                let mut released = support.released;
                released.append(&mut softened[index]);
                support_of_node[index] = Some(supports.len());
                supports.push(Support::new(NodeId::new(index), &released));
            }
            nodes.push(Node {
                name: node.name,
                position: node.position,
                attached_mass: node.attached_mass,
            });
        }
        let elastic_supports = elastic_supports
            .into_iter()
            .map(|elastic| {
                let rest = elastic
                    .nodes
                    .iter()
                    .map(|node| {
                        nodes[node.index()]
                            .position
                            .expect("checked: a held node has a position")
                    })
                    .collect();
                ElasticSupport::new(elastic, rest)
            })
            .collect();

        let branch_node = branch_node_matrix(nodes.len(), &segments);
        Ok(Self {
            nodes,
            cables,
            struts,
            segments,
            reaches,
            supports,
            support_of_node,
            elastic_supports,
            panels: panels.into_iter().map(Panel::from).collect(),
            skins,
            zones,
            branch_node,
        })
    }

    /// The same net with other sections.
    ///
    /// `sections`: one a segment.
    ///
    /// # Errors
    /// Every [`NetError`] of a section that no net can have.
    ///
    /// # Panics
    /// If there are not as many sections as segments.
    pub fn with_sections(&self, sections: &[Section]) -> Result<Self, Vec<NetError>> {
        assert_eq!(sections.len(), self.segments.len(), "one section a segment");
        let mut errors = Vec::new();
        let mut net = self.clone();
        for (index, section) in sections.iter().enumerate() {
            if net.segments[index].section != *section {
                check_section(self.member_name(SegmentId::new(index)), section, &mut errors);
                net.segments[index].section = *section;
            }
        }
        if errors.is_empty() { Ok(net) } else { Err(errors) }
    }

    /// The same net with other panels, skins and zones: panels are meshes of the net and found only when it is known.
    ///
    /// # Errors
    /// Every [`NetError`] found in them.
    pub fn with_surface(
        mut self,
        panels: Vec<PanelGiven>,
        skins: Vec<Skin>,
        zones: Vec<Zone>,
    ) -> Result<Self, Vec<NetError>> {
        let mut errors = Vec::new();
        check_surface(&panels, &skins, &zones, self.nodes.len(), &mut errors);
        if !errors.is_empty() {
            return Err(errors);
        }
        self.panels = panels.into_iter().map(Panel::from).collect();
        self.skins = skins;
        self.zones = zones;
        Ok(self)
    }

    /// The same net with segments of ropes divided into straight ones in a row, none of which hangs.
    ///
    /// Nodes keep their indices; those between the pieces come after them, segment by segment, free and without a position. No
    /// id that a client may give has a slash in it, as their names have.
    ///
    /// `pieces`: one a segment, at least 1; 1 for struts and where a rope slides.
    ///
    /// # Panics
    /// If there are not as many numbers as segments, or a strut or a piece of a sliding rope is to be divided.
    #[must_use]
    pub fn divided(&self, pieces: &[usize]) -> Self {
        assert_eq!(pieces.len(), self.segments.len(), "one number a segment");
        let mut net = self.clone();
        (net.segments, net.reaches) = (Vec::new(), Vec::new());
        for (cable, before) in net.cables.iter_mut().zip(&self.cables) {
            let (first_segment, first_reach) = (net.segments.len(), net.reaches.len());
            cable.path.truncate(1);
            for reach in &self.reaches[before.reaches.clone()] {
                for e in reach.segments.clone() {
                    assert!(!reach.slides() || pieces[e] == 1, "a sliding rope stays whole");
                    let segment = &self.segments[e];
                    for piece in 1..=pieces[e].max(1) {
                        let from = cable.path[cable.path.len() - 1];
                        let to = if piece < pieces[e] {
                            let name = format!("{}/{}", cable.name, net.nodes.len());
                            net.nodes.push(Node {
                                name,
                                position: None,
                                attached_mass: 0.0,
                            });
                            NodeId::new(net.nodes.len() - 1)
                        } else {
                            segment.ends[1]
                        };
                        cable.path.push(to);
                        if !reach.slides() || e == reach.segments.start {
                            net.reaches.push(Reach {
                                segments: net.segments.len()..net.segments.len(),
                                ..reach.clone()
                            });
                        }
                        let of_segment = net.reaches.len() - 1;
                        net.segments.push(Segment {
                            ends: [from, to],
                            length: of_segment,
                            hangs: false,
                            ..*segment
                        });
                        net.reaches[of_segment].segments.end = net.segments.len();
                    }
                }
            }
            cable.segments = first_segment..net.segments.len();
            cable.reaches = first_reach..net.reaches.len();
        }
        for (index, strut) in net.struts.iter_mut().enumerate() {
            let e = strut.segment.index();
            assert_eq!(pieces[e], 1, "a strut stays whole");
            strut.segment = SegmentId::new(net.segments.len());
            net.segments.push(Segment {
                length: net.reaches.len() + index,
                ..self.segments[e]
            });
        }
        net.support_of_node.resize(net.nodes.len(), None);
        net.branch_node = branch_node_matrix(net.nodes.len(), &net.segments);
        net
    }

    /// Nodes in the order given.
    #[must_use]
    pub fn nodes(&self) -> &[Node] {
        &self.nodes
    }

    /// Cables in the order given.
    #[must_use]
    pub fn cables(&self) -> &[Cable] {
        &self.cables
    }

    /// Struts in the order given.
    #[must_use]
    pub fn struts(&self) -> &[Strut] {
        &self.struts
    }

    /// Segments of the cables, then one for each strut.
    #[must_use]
    pub fn segments(&self) -> &[Segment] {
        &self.segments
    }

    /// Reaches of the cables, in cable order and along each cable.
    #[must_use]
    pub fn reaches(&self) -> &[Reach] {
        &self.reaches
    }

    /// Rigid supports in node order.
    #[must_use]
    pub fn supports(&self) -> &[Support] {
        &self.supports
    }

    /// The rigid support of a node, if it has one.
    #[must_use]
    pub fn support_of(&self, node: NodeId) -> Option<&Support> {
        self.support_of_node[node.index()].map(|index| &self.supports[index])
    }

    /// Springs and stiffness matrices.
    #[must_use]
    pub fn elastic_supports(&self) -> &[ElasticSupport] {
        &self.elastic_supports
    }

    /// Panels in the order given.
    #[must_use]
    pub fn panels(&self) -> &[Panel] {
        &self.panels
    }

    /// Skins in the order given.
    #[must_use]
    pub fn skins(&self) -> &[Skin] {
        &self.skins
    }

    /// Zones in the order given.
    #[must_use]
    pub fn zones(&self) -> &[Zone] {
        &self.zones
    }

    /// Whether a segment is part of a reach that slides.
    #[must_use]
    pub fn slides(&self, segment: SegmentId) -> bool {
        let length = self.segments[segment.index()].length;
        self.reaches.get(length).is_some_and(Reach::slides)
    }

    /// Whether every rope is clamped at every node: then reaches are segments.
    #[must_use]
    pub fn is_clamped(&self) -> bool {
        !self.reaches.iter().any(Reach::slides)
    }

    /// Whether some rope slides against friction.
    #[must_use]
    pub fn has_friction(&self) -> bool {
        self.reaches
            .iter()
            .any(|reach| reach.friction.iter().any(|mu| *mu > 0.0))
    }

    /// Whether every rope is clamped at every node and every member straight: what is left is straight bars.
    #[must_use]
    pub fn is_plain(&self) -> bool {
        self.segments.iter().all(|s| !s.hangs) && !self.reaches.iter().any(Reach::slides)
    }

    /// Branch–node matrix `C`: one row a segment, −1 at its first node and +1 at its second (Schek 1974).
    #[must_use]
    pub fn branch_node_matrix(&self) -> &CsrMatrix<f64> {
        &self.branch_node
    }

    /// Number of unstressed lengths: one for each reach, then one for each strut.
    #[must_use]
    pub fn n_lengths(&self) -> usize {
        self.reaches.len() + self.struts.len()
    }

    /// Whether every member is a rope: then the energy is convex and each equilibrium a global minimum.
    #[must_use]
    pub fn is_pure_tension(&self) -> bool {
        self.struts.is_empty()
    }

    /// The client's id of a node.
    #[must_use]
    pub fn node_name(&self, node: NodeId) -> &str {
        &self.nodes[node.index()].name
    }

    /// The client's id of the member to which a segment belongs.
    #[must_use]
    pub fn member_name(&self, segment: SegmentId) -> &str {
        match self.segments[segment.index()].member {
            Member::Cable(cable) => &self.cables[cable.index()].name,
            Member::Strut(strut) => &self.struts[strut.index()].name,
        }
    }
}

fn branch_node_matrix(n_nodes: usize, segments: &[Segment]) -> CsrMatrix<f64> {
    let mut entries = CooMatrix::new(segments.len(), n_nodes);
    for (row, segment) in segments.iter().enumerate() {
        entries.push(row, segment.ends[0].index(), -1.0);
        entries.push(row, segment.ends[1].index(), 1.0);
    }
    CsrMatrix::from(&entries)
}
