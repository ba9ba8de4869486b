//! The minimal draft becomes the net that it describes.

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::equilibrium::Settings;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::NodeId;
use ropewalk_numerics::shape::PrestressRule;

use crate::briefs::{first_net, found, reading, work};

#[test]
fn every_number_arrives() {
    let work = work(&first_net());
    let brief = &work.brief;
    let net = &brief.net;
    let names: Vec<&str> = net.nodes().iter().map(|node| node.name.as_str()).collect();
    assert_eq!(names, ["A", "B", "C", "D", "m"]);
    assert_eq!(net.nodes()[2].position, Some(Vector3::new(9.0, 9.0, 3.0)));
    assert_eq!(net.nodes()[4].position, None);
    assert_eq!(net.supports().len(), 4);
    assert!(net.supports().iter().all(|support| support.held().len() == 3));
    let path = |cable: usize| {
        net.cables()[cable]
            .path
            .iter()
            .map(|node| node.index())
            .collect::<Vec<_>>()
    };
    assert_eq!((path(0), path(1)), (vec![0, 4, 2], vec![1, 4, 3]));
    assert!(net.struts().is_empty() && net.elastic_supports().is_empty());
    for segment in net.segments() {
        assert_eq!(segment.section.axial_stiffness, 6.5e6);
        assert_eq!(segment.section.breaking_force, Some(82e3));
        assert_eq!(segment.section.mass_per_length, 0.0);
        assert_eq!(segment.section.expansion, 12e-6);
    }
    assert_eq!(brief.prestress.rules, [PrestressRule::ForceDensity(3000.0); 4]);
    assert!(brief.prestress.hold.is_empty() && brief.prestress.under.is_empty());
    assert_eq!(
        brief.actions[0].loads,
        [Load::Nodes {
            nodes: vec![NodeId::new(4)],
            force: Vector3::new(0.0, 0.0, -5000.0)
        }]
    );
    assert_eq!(brief.cases[0].factors, [(0, 1.0)]);
    assert_eq!(brief.settings, Settings::default());
    assert!(!work.frozen);
    assert_eq!(work.in_words(0), "1 snow");
}

#[test]
fn what_was_left_out_is_told_with_its_origin() {
    let reading = reading(&first_net());
    let origin = |path: &str, value: &str| {
        let found = reading
            .resolved
            .iter()
            .find(|resolved| resolved.path == path && resolved.value == value);
        found.map_or_else(|| panic!("{path} = {value} is not told"), |found| found.origin.clone())
    };
    assert_eq!(origin("net.gravity_m_per_s2", "9.80665"), "default");
    assert_eq!(origin("net.sections[r10].mass_kg_per_m", "0"), "default");
    assert_eq!(origin("net.sections[r10].expansion_per_k", "1.2e-5"), "default");
    assert_eq!(origin("solving.tolerance", "1e-10"), "default");
    assert_eq!(origin("solving.energies", "false"), "default");
    assert_eq!(
        origin("net.nodes[m]", "free, its place is to be found"),
        "net.cables[carrying].nodes"
    );
    assert_eq!(
        origin("net.cables[bracing]", "force density 3000 N/m"),
        "prestress.rules[0]"
    );
    assert_eq!(reading.cases.len(), 1);
    assert_eq!(reading.cases[0].in_words, "1 snow");
}

#[test]
fn nothing_but_notes_is_found() {
    let reading = reading(&first_net());
    for finding in &reading.findings {
        assert_eq!(finding.severity(), v1::FindingSeverity::Note, "{finding:#?}");
    }
}

/// Worked numbers of the draft: own Newton solve, stated beside it in the contract's design.
#[test]
fn its_reference_state_is_the_known_one() {
    let work = work(&first_net());
    let (_, reference) = found(&work);
    assert!((reference.state.positions[4] - Vector3::new(4.5, 4.5, 1.5)).norm() < 1e-9);
    for (tension, length) in reference
        .state
        .axial_forces
        .iter()
        .zip(&reference.state.unstressed_lengths)
    {
        assert!((tension - 19_615.0).abs() < 0.5, "{tension}");
        assert!((length - 6.518_677).abs() < 5e-7, "{length}");
    }
}
