//! What is about to run.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::Plan;
use ropewalk_numerics::equilibrium::LoadSteps;
use ropewalk_numerics::model::{Member, Net, NodeId};

use super::parts::{BYTES, count};
use crate::build_info::engine_build;
use crate::decode::Work;

/// The beginning of a run.
#[must_use]
pub fn started(work: &Work, plan: &Plan, cases: &[usize]) -> v1::Started {
    let settings = &plan.brief().settings;
    let gravity = match &work.message.net_source {
        Some(v1::brief::NetSource::Net(net)) => net.gravity_m_per_s2,
        _ => None,
    };
    v1::Started {
        brief_id: work.message.id.clone(),
        digest: work.digest.clone(),
        engine: Some(engine_build()),
        settings: Some(v1::EffectiveSettings {
            load_steps: match settings.load_steps {
                LoadSteps::FullFirst => 0,
                LoadSteps::Equal(steps) => steps,
            },
            tolerance: settings.tolerance,
            max_iterations: settings.max_iterations,
            gravity_m_per_s2: gravity.unwrap_or(crate::decode::STANDARD_GRAVITY),
        }),
        sizes: Some(sizes(plan, cases.len())),
        frozen: work.frozen,
    }
}

pub(super) fn sizes(plan: &Plan, cases: usize) -> v1::Sizes {
    let net = &plan.brief().net;
    v1::Sizes {
        nodes: count(net.nodes().len()),
        segments: count(net.segments().len()),
        cables: count(net.cables().len()),
        struts: count(net.struts().len()),
        supports: count(net.supports().len()),
        unknowns: count(plan.estimate().unknowns),
        cases: count(cases),
    }
}

/// Ends of segments at supported nodes, in the order of segments, first end before second: node and segment.
pub(super) fn ends(net: &Net) -> impl Iterator<Item = (NodeId, usize)> + '_ {
    let segments = net.segments().iter().enumerate();
    segments
        .flat_map(|(index, segment)| segment.ends.map(|node| (node, index)))
        .filter(|(node, _)| net.support_of(*node).is_some())
}

/// Nodes through which ropes slide, in cable order and along each cable: node and the segment before it.
pub(super) fn slides(net: &Net) -> impl Iterator<Item = (NodeId, usize)> + '_ {
    let sliding = net.reaches().iter().filter(|reach| reach.slides());
    let before = sliding.flat_map(|reach| reach.segments.start..reach.segments.end - 1);
    before.map(|segment| (net.segments()[segment].ends[1], segment))
}

/// Tables of ids, in parts.
#[must_use]
pub fn id_tables(_work: &Work, plan: &Plan, cases: &[usize]) -> Vec<v1::IdTable> {
    let brief = plan.brief();
    let net = &brief.net;
    let member = |segment: usize| match net.segments()[segment].member {
        Member::Cable(cable) => net.cables()[cable.index()].name.as_str(),
        Member::Strut(strut) => net.struts()[strut.index()].name.as_str(),
    };
    let position = |node: NodeId| count(node.index());

    let mut tables = Vec::new();
    let rows = |over, ids: &mut dyn Iterator<Item = Row>| table(over, ids.collect());
    let plain = |id: &str| Row::new(id, [None, None, None]);
    tables.extend(rows(
        v1::Range::Node,
        &mut net.nodes().iter().map(|node| plain(&node.name)),
    ));
    tables.extend(rows(
        v1::Range::Cable,
        &mut net.cables().iter().map(|cable| plain(&cable.name)),
    ));
    tables.extend(rows(
        v1::Range::Strut,
        &mut net.struts().iter().map(|strut| plain(&strut.name)),
    ));
    let segments = net.segments().iter().enumerate();
    let mut segments = segments.map(|(index, segment)| {
        let [from, to] = segment.ends.map(position);
        Row::new(member(index), [Some(from), Some(to), None])
    });
    tables.extend(rows(v1::Range::Segment, &mut segments));
    let mut supports = net
        .supports()
        .iter()
        .map(|support| plain(net.node_name(support.node())));
    tables.extend(rows(v1::Range::Support, &mut supports));
    let mut ends =
        ends(net).map(|(node, segment)| Row::new(member(segment), [Some(position(node)), None, Some(count(segment))]));
    tables.extend(rows(v1::Range::End, &mut ends));
    let mut slides = slides(net)
        .map(|(node, segment)| Row::new(member(segment), [Some(position(node)), None, Some(count(segment))]));
    if !net.is_clamped() {
        tables.extend(rows(v1::Range::Slide, &mut slides));
        let reaches = net.reaches().iter().map(|reach| {
            let cable = &net.cables()[reach.cable.index()].name;
            Row::new(cable, [None, None, Some(count(reach.segments.start))])
        });
        let struts = net
            .struts()
            .iter()
            .map(|strut| Row::new(&strut.name, [None, None, Some(count(strut.segment.index()))]));
        tables.extend(rows(v1::Range::Reach, &mut reaches.chain(struts)));
    }
    let mut cases = cases.iter().map(|case| plain(&brief.cases[*case].name));
    tables.extend(rows(v1::Range::Case, &mut cases));
    let mut actions = brief.actions.iter().map(|action| plain(&action.name));
    tables.extend(rows(v1::Range::Action, &mut actions));
    tables
}

/// One entry of a table: id, first node, second node, segment.
struct Row {
    id: String,
    positions: [Option<u32>; 3],
}

impl Row {
    fn new(id: &str, positions: [Option<u32>; 3]) -> Self {
        Self {
            id: id.to_owned(),
            positions,
        }
    }
}

/// A table in parts; an empty one has one part, so that every table is told.
fn table(over: v1::Range, rows: Vec<Row>) -> Vec<v1::IdTable> {
    let total = count(rows.len());
    let empty = |offset: usize| v1::IdTable {
        over: over.into(),
        offset: count(offset),
        total,
        ..v1::IdTable::default()
    };
    let mut parts = vec![empty(0)];
    let mut size = 0;
    for (offset, row) in rows.into_iter().enumerate() {
        let own = row.id.len() + 20;
        if size + own > BYTES {
            parts.push(empty(offset));
            size = 0;
        }
        size += own;
        let part = parts.last_mut().expect("there is always one part");
        part.ids.push(row.id);
        let [from, to, segment] = row.positions;
        part.from_nodes.extend(from);
        part.to_nodes.extend(to);
        part.segments.extend(segment);
    }
    parts
}
