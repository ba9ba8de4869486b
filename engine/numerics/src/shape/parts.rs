//! What the rules make of each segment, and the families whose force density is sought.

use std::ops::Range;

use super::given::Adjustable;
use super::{Prestress, PrestressRule, ShapeError};
use crate::element::{Bar, Sliding};
use crate::model::{AxialLaw, Net, NodeId, Segment};

/// What a segment is to the search.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Part {
    /// Its force density is given (N/m).
    Density(f64),
    /// It shares the sought force density of a family.
    Family(usize),
    /// Its unstressed length is given.
    Elastic(Bar),
    /// It bears what the held nodes need.
    Balance,
}

/// Segments with one force density in common, which is sought.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Family {
    /// Its segments.
    pub(super) segments: Vec<usize>,
    /// What decides it.
    pub(super) sought: Sought,
}

/// What decides the force density of a family.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Sought {
    /// A wanted mean of its axial forces (N), not zero.
    Mean(f64),
    /// Targets elsewhere, from a start and within bounds.
    Targets(Adjustable),
}

impl Family {
    /// Wanted mean of the axial forces (N), if any.
    pub(super) fn wanted(&self) -> Option<f64> {
        match self.sought {
            Sought::Mean(wanted) => Some(wanted),
            Sought::Targets(_) => None,
        }
    }

    /// Force density that the rules give to start from (N/m), if they do.
    pub(super) fn given_density(&self) -> Option<f64> {
        match self.sought {
            Sought::Mean(_) => None,
            Sought::Targets(given) => Some(given.density),
        }
    }

    /// Least and largest size of the force density (N/m).
    pub(super) fn bounds(&self) -> (f64, f64) {
        match self.sought {
            Sought::Mean(_) => (0.0, f64::INFINITY),
            Sought::Targets(given) => (given.least, given.most),
        }
    }
}

/// The rules, sorted.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Parts {
    /// One entry a segment.
    pub(super) of: Vec<Part>,
    /// Families, those of mean tensions first, then those for targets to decide, then one for each segment with a tension
    /// of its own.
    pub(super) families: Vec<Family>,
    /// Reaches that slide.
    pub(super) slides: Vec<Slide>,
    /// Which of them a segment belongs to, one entry a segment; empty where nothing slides.
    pub(super) slide_of: Vec<Option<usize>>,
}

/// A reach that slides: one tension in all of its segments.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Slide {
    /// Its segments, which share one rule.
    pub(super) segments: Range<usize>,
    /// Whether each of them counts for the length of a force density: those between two supports do not shape the net,
    /// and count only where there are no others.
    pub(super) counts: Vec<bool>,
    /// Its law where its unstressed length is given.
    pub(super) elastic: Option<Sliding>,
}

impl Parts {
    /// Sorts the rules and checks their numbers.
    pub(super) fn new(net: &Net, prestress: &Prestress) -> Result<Self, ShapeError> {
        let bad = |segment: usize, what, value| ShapeError::BadRule {
            member: net.member_name(crate::model::SegmentId::new(segment)).to_owned(),
            what,
            value,
        };
        let mut families: Vec<Family> = prestress
            .mean_tensions
            .iter()
            .map(|wanted| Family {
                segments: Vec::new(),
                sought: Sought::Mean(*wanted),
            })
            .collect();
        let n_means = families.len();
        families.extend(prestress.adjustables.iter().map(|given| Family {
            segments: Vec::new(),
            sought: Sought::Targets(*given),
        }));
        let mut of: Vec<Part> = Vec::with_capacity(prestress.rules.len());
        let continues = |e: usize| e > 0 && net.segments()[e].length == net.segments()[e - 1].length;
        let mixed = |e: usize| ShapeError::MixedReach {
            member: net.member_name(crate::model::SegmentId::new(e)).to_owned(),
            node: net.node_name(net.segments()[e].ends[0]).to_owned(),
        };
        for (index, (rule, segment)) in prestress.rules.iter().zip(net.segments()).enumerate() {
            let bearable = |force: f64| force.is_finite() && (force >= 0.0 || segment.law == AxialLaw::TwoWay);
            of.push(match *rule {
                PrestressRule::ForceDensity(q) if bearable(q) => Part::Density(q),
                PrestressRule::ForceDensity(q) => return Err(bad(index, "force density (N/m)", q)),
                // Without force there is nothing to seek.
                PrestressRule::Tension(0.0) => Part::Density(0.0),
                PrestressRule::Tension(n) if bearable(n) && continues(index) => match of[index - 1] {
                    // One tension in all segments of a reach that slides: one thing to seek.
                    Part::Family(family) if prestress.rules[index - 1] == *rule => {
                        families[family].segments.push(index);
                        Part::Family(family)
                    }
                    _ => return Err(mixed(index)),
                },
                PrestressRule::Tension(n) if bearable(n) => {
                    families.push(Family {
                        segments: vec![index],
                        sought: Sought::Mean(n),
                    });
                    Part::Family(families.len() - 1)
                }
                PrestressRule::Tension(n) => return Err(bad(index, "tension (N)", n)),
                PrestressRule::MeanTension(family) => {
                    let wanted = prestress.mean_tensions[family];
                    if !bearable(wanted) {
                        return Err(bad(index, "mean tension (N)", wanted));
                    }
                    if wanted == 0.0 {
                        Part::Density(0.0)
                    } else {
                        families[family].segments.push(index);
                        Part::Family(family)
                    }
                }
                PrestressRule::Adjustable(family) => {
                    let given = prestress.adjustables[family];
                    let within = given.least >= 0.0 && (given.least..=given.most).contains(&given.density.abs());
                    if given.density == 0.0 || !bearable(given.density) || !within {
                        return Err(bad(index, "adjustable force density (N/m)", given.density));
                    }
                    families[n_means + family].segments.push(index);
                    Part::Family(n_means + family)
                }
                PrestressRule::UnstressedLength(l0) if l0.is_finite() && l0 > 0.0 => {
                    Part::Elastic(Bar::new(segment.law, segment.section.axial_stiffness, l0, 0.0))
                }
                PrestressRule::UnstressedLength(l0) => return Err(bad(index, "unstressed length (m)", l0)),
                PrestressRule::Balance => Part::Balance,
            });
        }
        // Families that no segment belongs to are dropped, and the numbers of those behind them move up.
        let mut number = vec![0; families.len()];
        let mut kept = Vec::with_capacity(families.len());
        for (index, family) in families.into_iter().enumerate() {
            number[index] = kept.len();
            if !family.segments.is_empty() {
                kept.push(family);
            }
        }
        for part in &mut of {
            if let Part::Family(family) = part {
                *family = number[*family];
            }
        }
        let (slides, slide_of) = slides(net, prestress, &of)?;
        Ok(Self {
            of,
            families: kept,
            slides,
            slide_of,
        })
    }

    /// The reach of a segment, if it slides.
    pub(super) fn slide(&self, segment: usize) -> Option<usize> {
        self.slide_of.get(segment).copied().flatten()
    }

    /// Segments left to balance, together where one tension is in all of them.
    pub(super) fn balance_groups(&self) -> Vec<Vec<usize>> {
        let mut groups: Vec<Vec<usize>> = Vec::new();
        for e in self.balance() {
            let slide = self.slide(e);
            match groups.last_mut() {
                Some(last) if slide.is_some() && self.slide(last[0]) == slide => last.push(e),
                _ => groups.push(vec![e]),
            }
        }
        groups
    }

    /// Whether every member has a given unstressed length, as in a frozen net.
    pub(super) fn all_elastic(&self) -> bool {
        self.of.iter().all(|part| matches!(part, Part::Elastic(_)))
    }

    /// Sign of the force that a segment can have by its rule; zero where it has none.
    pub(super) fn sign(&self, segment: usize) -> f64 {
        match self.of[segment] {
            Part::Density(0.0) => 0.0,
            Part::Density(q) => q.signum(),
            Part::Family(family) => match self.families[family].sought {
                Sought::Mean(wanted) => wanted.signum(),
                Sought::Targets(given) => given.density.signum(),
            },
            // A strut of given length may come to either.
            Part::Elastic(_) | Part::Balance => 1.0,
        }
    }

    /// Segments left to balance.
    pub(super) fn balance(&self) -> Vec<usize> {
        (0..self.of.len()).filter(|e| self.of[*e] == Part::Balance).collect()
    }

    /// A member left to balance bears nothing in the search, so it may end only where something else holds.
    pub(super) fn check_balance_ends(&self, net: &Net, hold: &[NodeId]) -> Result<(), ShapeError> {
        let mut held = vec![false; net.nodes().len()];
        for node in hold {
            held[node.index()] = true;
        }
        for support in net.supports() {
            held[support.node().index()] = true;
        }
        for node in net.elastic_supports().iter().flat_map(|e| e.nodes()) {
            held[node.index()] = true;
        }
        for segment in self.balance() {
            for end in net.segments()[segment].ends {
                if !held[end.index()] {
                    return Err(ShapeError::BalanceNotHeld {
                        member: net.member_name(crate::model::SegmentId::new(segment)).to_owned(),
                        node: net.node_name(end).to_owned(),
                    });
                }
            }
        }
        Ok(())
    }
}

/// The reaches that slide, and that of each segment.
type Slides = (Vec<Slide>, Vec<Option<usize>>);

fn slides(net: &Net, prestress: &Prestress, of: &[Part]) -> Result<Slides, ShapeError> {
    let mut slides = Vec::new();
    let mut slide_of = Vec::new();
    for reach in net.reaches().iter().filter(|reach| reach.slides()) {
        slide_of.resize(of.len(), None);
        let segments = reach.segments.clone();
        let first = segments.start;
        let same = |e: &usize| match (of[first], of[*e]) {
            (Part::Elastic(_), Part::Elastic(_)) => prestress.rules[first] == prestress.rules[*e],
            (a, b) => a == b,
        };
        if let Some(other) = segments.clone().find(|e| !same(e)) {
            return Err(ShapeError::MixedReach {
                member: net.member_name(crate::model::SegmentId::new(other)).to_owned(),
                node: net.node_name(net.segments()[other].ends[0]).to_owned(),
            });
        }
        let elastic = match prestress.rules[first] {
            PrestressRule::UnstressedLength(unstressed_length) => Some(Sliding {
                first,
                axial_stiffness: segments
                    .clone()
                    .map(|e| net.segments()[e].section.axial_stiffness)
                    .collect(),
                expansion: vec![1.0; segments.len()],
                factors: vec![1.0; segments.len()],
                unstressed_length,
            }),
            _ => None,
        };
        let shapes = |s: &Segment| s.ends.iter().any(|end| net.support_of(*end).is_none());
        let mut counts: Vec<bool> = net.segments()[segments.clone()].iter().map(shapes).collect();
        if counts.iter().all(|counts| !counts) {
            counts.fill(true);
        }
        slide_of[segments.clone()].fill(Some(slides.len()));
        slides.push(Slide {
            segments,
            counts,
            elastic,
        });
    }
    Ok((slides, slide_of))
}
