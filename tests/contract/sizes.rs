//! No message from the engine comes near 1 MiB, whatever the size of the net.

use nalgebra::Vector3;
use prost::Message;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{EndForce, Plan, ReferenceOutcome, StateResult, SupportForce};
use ropewalk_numerics::equilibrium::Way;
use ropewalk_numerics::equilibrium::audit::Audit;
use ropewalk_numerics::load::Case;
use ropewalk_numerics::model::{Net, NodeId, ReferenceState, SegmentId};
use ropewalk_numerics::shape::ShapeReport;
use ropewalk_service::decode::{Work, read};
use ropewalk_service::encode::{self, Tally, check_report, closing, freeze, id_tables, reference, started};

use crate::briefs::LIMITS;

const LARGEST: usize = 256 * 1024;

/// A square grid of ropes with long ids, supported around its edge: its inner nodes are named in paths only.
fn grid(n: usize) -> v1::Brief {
    let id = |row: usize, column: usize| format!("node of a large invented grid in row {row} and column {column}");
    let mut net = v1::Net {
        sections: vec![v1::Section {
            id: "rope".to_owned(),
            axial_stiffness_n: Some(1e7),
            breaking_force_n: None,
            ..v1::Section::default()
        }],
        ..v1::Net::default()
    };
    for row in 0..n {
        for column in 0..n {
            if row == 0 || column == 0 || row + 1 == n || column + 1 == n {
                net.nodes.push(v1::Node {
                    id: id(row, column),
                    xyz_m: vec![row as f64, column as f64, 0.0],
                    support: Some(v1::Support::default()),
                    ..v1::Node::default()
                });
            }
        }
    }
    let mut cable = |name: String, nodes: Vec<String>| {
        net.cables.push(v1::Cable {
            id: name,
            section: "rope".to_owned(),
            nodes,
            ..v1::Cable::default()
        });
    };
    for line in 0..n {
        cable(format!("row {line}"), (0..n).map(|column| id(line, column)).collect());
        cable(format!("column {line}"), (0..n).map(|row| id(row, line)).collect());
    }
    let names: Vec<String> = net.cables.iter().map(|cable| cable.id.clone()).collect();
    v1::Brief {
        id: "grid".to_owned(),
        net_source: Some(v1::brief::NetSource::Net(net)),
        prestress: Some(v1::Prestress {
            rules: vec![v1::PrestressRule {
                on: names,
                rule: Some(v1::prestress_rule::Rule::ForceDensityNPerM(1000.0)),
                ..v1::PrestressRule::default()
            }],
            ..v1::Prestress::default()
        }),
        checks: Vec::new(),
        cases: vec![v1::Case {
            id: "calm".to_owned(),
            ..v1::Case::default()
        }],
        ..v1::Brief::default()
    }
}

/// A reference state of the right sizes; what is measured here is messages, not mechanics.
fn state(net: &Net) -> ReferenceOutcome {
    let (nodes, segments) = (net.nodes().len(), net.segments().len());
    let position = |index: usize| Vector3::new(index as f64 + 0.1, 1.0 / 3.0, 0.0);
    let state = ReferenceState {
        positions: (0..nodes).map(position).collect(),
        unstressed_lengths: (0..net.n_lengths()).map(|index| 1.0 + index as f64 * 1e-9).collect(),
        axial_forces: vec![1000.0; segments],
    };
    let supported = net.supports().iter().map(|support| support.node());
    let ends = net.segments().iter().enumerate();
    let ends = ends.flat_map(|(index, segment)| segment.ends.map(|node| (node, SegmentId::new(index))));
    let result = StateResult {
        positions: state.positions.clone(),
        displacements: vec![Vector3::zeros(); nodes],
        axial_forces: state.axial_forces.clone(),
        stretches: vec![1.0001; segments],
        slack: vec![false; segments],
        lengths: vec![1.0; segments],
        removed: Vec::new(),
        pulls: vec![[Vector3::x(), -Vector3::x()]; segments],
        lying: vec![1.0; segments],
        loads: vec![Vector3::zeros(); nodes],
        unstressed_lengths: state.unstressed_lengths.clone(),
        support_forces: supported
            .map(|node| SupportForce {
                node,
                force: Vector3::z(),
                own_axes: [0.0; 3],
            })
            .collect(),
        end_forces: ends
            .filter(|(node, _)| net.support_of(*node).is_some())
            .map(|(node, segment)| EndForce {
                node,
                segment,
                force: Vector3::x(),
            })
            .collect(),
        load_sum: Vector3::zeros(),
        load_moment: Vector3::zeros(),
        support_sum: Vector3::zeros(),
        support_moment: Vector3::zeros(),
        panel_areas: Vec::new(),
        panel_pressures: Vec::new(),
        loose_nodes: (0..nodes).map(NodeId::new).collect(),
        ponding: None,
        audit: Audit {
            passed: true,
            ..Audit::default()
        },
        certificate: None,
        diagnosis: None,
        modes: None,
    };
    ReferenceOutcome {
        case: Case {
            nodal_forces: Vec::new(),
            unstressed_lengths: Vec::new(),
            segments: Vec::new(),
            support_movements: Vec::new(),
            removed: Vec::new(),
            ..Case::default()
        },
        history: Vec::new(),
        bases: Vec::new(),
        report: ShapeReport {
            unmet: None,
            way: Way::ForceDensities,
            iterations: 1,
            targets: Vec::new(),
            balance: None,
            taut_given_lengths: Vec::new(),
            imbalance: 0.0,
            largest_force: 1000.0,
            polished: false,
            largest_strain: None,
        },
        state,
        result,
    }
}

#[track_caller]
fn small<M: Message>(messages: &[M]) {
    for message in messages {
        let size = message.encoded_len();
        assert!(size < LARGEST, "{size} bytes");
    }
}

#[test]
fn every_message_of_a_large_net_is_small() {
    // 174 x 174 nodes: 30 276.
    let brief = grid(174);
    let reading = read(brief.clone(), &LIMITS);
    assert!(reading.work.is_some(), "{:#?}", reading.findings);
    let work: Work = reading.work.expect("no errors");
    let plan = Plan::new(work.brief.clone());
    assert_eq!(plan.brief().net.nodes().len(), 30_276);
    let tables = id_tables(&work, &plan, &[0]);
    small(&tables);
    let nodes: Vec<_> = tables.iter().filter(|table| table.over() == v1::Range::Node).collect();
    assert!(nodes.len() > 5, "the table of nodes comes in parts");
    let mut next = 0;
    for part in &nodes {
        assert_eq!((part.offset, part.total), (next, 30_276));
        next += u32::try_from(part.ids.len()).expect("few");
    }
    assert_eq!(next, 30_276);
    small(&[started(&work, &plan, &[0])]);
    let found = Ok(state(&plan.brief().net));
    small(&reference(
        &work,
        &plan,
        &found,
        &found.as_ref().map_or(vec![], |r| r.history.clone()),
    ));
    small(&closing(&work, &plan, Tally::new(&plan, &[0], &[], &found)));
    let frozen = freeze(&work, &plan, &found).expect("a state");
    assert!(frozen.len() > 20, "a frozen brief comes in parts");
    small(&frozen);
    small(&check_report(read(brief, &LIMITS)));
}

#[test]
fn long_texts_of_the_client_are_not_repeated_whole() {
    let mut brief = grid(4);
    if let Some(v1::brief::NetSource::Net(net)) = &mut brief.net_source {
        net.sections[0].breaking_force_n = Some(1e5);
        net.sections[0].breaking_force_origin = "certificate ".repeat(60_000);
    }
    let check = v1::Check {
        kind: Some(v1::check::Kind::Safety(v1::SafetyCheck {
            factor: 2.0,
            ..v1::SafetyCheck::default()
        })),
        ..v1::Check::default()
    };
    brief.checks = vec![check.clone(), check];
    let work = read(brief.clone(), &LIMITS).work.expect("no errors");
    let plan = Plan::new(work.brief.clone());
    let found = Ok(state(&plan.brief().net));
    let mut tally = Tally::new(&plan, &[0], &[], &found);
    let reference = found.as_ref().expect("a state");
    let outcome = plan.case(reference, 0, &mut |_| std::ops::ControlFlow::Continue(()));
    tally.add(0, &encode::case(&work, &plan, reference, 0, &outcome).1);
    let messages = closing(&work, &plan, tally);
    small(&messages);

    // A case that is refused for its size is told in the report all the same.
    brief.cases[0].sets = (0..12_000).map(|number| format!("{number:0126}")).collect();
    brief.cases.push(v1::Case {
        id: "x".repeat(2_000_000),
        ..v1::Case::default()
    });
    let reading = read(brief, &LIMITS);
    assert!(reading.work.is_none());
    small(&check_report(reading));
}

#[test]
fn very_many_findings_come_in_parts() {
    let mut brief = grid(60);
    if let Some(v1::brief::NetSource::Net(net)) = &mut brief.net_source {
        for cable in &mut net.cables {
            cable.section = "roppe".to_owned();
            cable.role = "nobody".to_owned();
            cable.nodes.iter_mut().step_by(2).for_each(|id| id.push('/'));
        }
        for index in 0..5000 {
            net.nodes.push(v1::Node {
                id: format!("far node {index}"),
                xyz_m: vec![f64::NAN, 1e9, 0.0],
                ..v1::Node::default()
            });
        }
    }
    let reading = read(brief, &LIMITS);
    assert!(
        reading
            .findings
            .iter()
            .any(|finding| finding.reason == "MORE_OF_THE_SAME")
    );
    let report = check_report(reading);
    small(&report);
    let totals = report
        .last()
        .and_then(|part| part.totals.as_ref())
        .expect("totals come last");
    assert!(totals.findings[0].count > 1000);
    assert_eq!((totals.seconds, totals.bytes), (0.0, 0));
}
