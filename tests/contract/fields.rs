//! Field by field: every number and name of a brief reaches its place in the domain.

use nalgebra::{DMatrix, Vector3};
use ropewalk_numerics::brief::CheckKind;
use ropewalk_numerics::check::{MovementLimit, PullLimits};
use ropewalk_numerics::equilibrium::LoadSteps;
use ropewalk_numerics::load::{Load, Scope};
use ropewalk_numerics::model::{CableId, NodeId, SegmentId, StrutId};
use ropewalk_numerics::shape::PrestressRule;
use serde_json::{Value, json};

use crate::briefs::{changed, first_net, reading, terrace, work};

fn segments(list: &[usize]) -> Scope {
    Scope::Segments(list.iter().copied().map(SegmentId::new).collect())
}

#[test]
fn sections_fittings_and_parts() {
    let work = work(&terrace());
    let net = &work.brief.net;
    // carrying: A-m by its role, m-C by its part; bracing twice; g1, g2; post.
    let sections: Vec<_> = net.segments().iter().map(|segment| segment.section).collect();
    assert_eq!(sections.len(), 7);
    assert_eq!(sections[0].axial_stiffness, 6.5e6);
    assert_eq!(sections[0].breaking_force, Some(0.8 * 82e3));
    assert_eq!(sections[1].axial_stiffness, 1.6e11 * 1.2e-4);
    assert_eq!(sections[1].breaking_force, Some(0.8 * 200e3));
    assert_eq!(sections[2].breaking_force, Some(82e3));
    // The role's fitting on the role's section, then on the cable's own section.
    assert_eq!(sections[4].breaking_force, Some(0.9 * 200e3));
    assert_eq!(sections[5].axial_stiffness, 6.5e6);
    assert_eq!(sections[5].breaking_force, Some(0.9 * 82e3));
    assert_eq!((sections[0].diameter, sections[1].diameter), (Some(0.010), None));
    assert_eq!(sections[0].proof_force, None);
    assert_eq!(sections[6].bending_stiffness, Some(1e6));
    assert_eq!(sections[6].axial_stiffness, 2.1e11 * 2e-3);
    assert_eq!(sections[6].mass_per_length, 15.7);
    assert_eq!(sections[6].breaking_force, None);
    assert_eq!(net.nodes()[0].attached_mass, 20.0);
}

#[test]
fn supports_springs_and_groups() {
    let work = work(&terrace());
    let net = &work.brief.net;
    let held = |id: usize| net.support_of(NodeId::new(id)).map(|support| support.held().len());
    // A is free; B is rigid; C stands in a support group, which takes the place of the rigid support; D is on a spring in z.
    assert_eq!([held(0), held(1), held(2), held(3)], [None, Some(3), Some(0), Some(2)]);
    let elastic = net.elastic_supports();
    assert_eq!(elastic.len(), 2);
    assert_eq!(elastic[0].nodes(), [NodeId::new(3)]);
    let mut spring = DMatrix::zeros(3, 3);
    spring[(2, 2)] = 2e7;
    assert_eq!(*elastic[0].stiffness(), spring);
    assert_eq!(elastic[1].nodes(), [NodeId::new(2)]);
    let wall = DMatrix::from_row_slice(3, 3, &[3e7, 1e6, 0.0, 1e6, 3e7, 0.0, 0.0, 0.0, 4e7]);
    assert_eq!(*elastic[1].stiffness(), wall);
}

#[test]
fn skew_springs_of_a_node_are_summed_and_free_directions_released() {
    let springs = json!([
        {"along": [3, 0, 4], "stiffness_n_per_m": 1e6},
        {"along": [0, 0, 5], "stiffness_n_per_m": 2e6}
    ]);
    let support = json!({"springs": springs, "free": [{"along": [0, 7, 0]}]});
    let work = work(&changed(terrace(), &[("/net/nodes/3/support", support)]));
    let net = &work.brief.net;
    let sum = net.elastic_supports()[0].stiffness();
    let expected = [[0.36e6, 0.0, 0.48e6], [0.0, 0.0, 0.0], [0.48e6, 0.0, 2.64e6]];
    for row in 0..3 {
        for column in 0..3 {
            assert!((sum[(row, column)] - expected[row][column]).abs() < 1e-6, "{sum}");
        }
    }
    assert_eq!(
        net.support_of(NodeId::new(3)).map(|support| support.held().len()),
        Some(0)
    );
}

#[test]
fn rules_and_their_narrowness() {
    let rules = |rules: Value| {
        let work = work(&changed(
            terrace(),
            &[
                ("/prestress/rules", rules),
                ("/net/groups/2/of", json!(["carrying", "bracing", "g1", "g2"])),
            ],
        ));
        (
            work.brief.prestress.rules.clone(),
            work.brief.prestress.mean_tensions.clone(),
        )
    };
    let balance = json!({"on": ["post"], "balance": {}});
    // Group, role, member and part: each narrower one wins.
    let (found, _) = rules(json!([
        {"parts": [{"cable": "carrying", "from": "m", "to": "C"}], "tension_n": 4},
        {"on": ["saddle"], "tension_n": 1}, {"on": ["rope"], "tension_n": 2}, {"on": ["carrying"], "tension_n": 3}, balance
    ]));
    let tension = PrestressRule::Tension;
    assert_eq!(
        found,
        [
            tension(3.0),
            tension(4.0),
            tension(2.0),
            tension(2.0),
            tension(1.0),
            tension(1.0),
            PrestressRule::Balance
        ]
    );
    // One family of a mean tension for each cable, also where a role names them.
    let (found, means) = rules(json!([
        {"on": ["rope"], "mean_tension_n": 20000}, {"on": ["g1"], "share_of_breaking": 0.1},
        {"on": ["g2"], "unstressed_length_m": 4.3}, balance
    ]));
    assert_eq!(means, [20000.0, 20000.0]);
    let mean = PrestressRule::MeanTension;
    assert_eq!(found[..4], [mean(0), mean(0), mean(1), mean(1)]);
    assert_eq!(found[4], tension(0.1 * (0.9 * 200e3)));
    assert_eq!(found[5], PrestressRule::UnstressedLength(4.3));
    // A strut may push.
    let (found, _) = rules(json!([
        {"on": ["saddle"], "tension_n": 1000}, {"on": ["post"], "force_density_n_per_m": -900}, {"on": ["g1"], "balance": {}}
    ]));
    assert_eq!(found[6], PrestressRule::ForceDensity(-900.0));
    let work = work(&terrace());
    assert_eq!(work.brief.prestress.hold, [NodeId::new(0)]);
    assert_eq!(work.brief.prestress.under, [0]);
}

#[test]
fn loads_of_every_kind() {
    let work = work(&terrace());
    let loads: Vec<&Load> = work.brief.actions.iter().flat_map(|action| &action.loads).collect();
    let down = |size: f64| Vector3::new(0.0, 0.0, -size);
    let expected = [
        Load::OwnWeight { gravity: down(9.81) },
        Load::Nodes {
            nodes: vec![NodeId::new(7)],
            force: down(5000.0),
        },
        Load::PerUnstressedLength {
            scope: segments(&[0, 1, 2, 3]),
            force: down(20.0),
        },
        Load::PerPlanLength {
            scope: segments(&[4, 5]),
            force: down(10.0),
        },
        Load::Temperature {
            scope: Scope::All,
            change: 35.0,
        },
        Load::SupportMovement {
            node: NodeId::new(2),
            by: down(0.01),
        },
        Load::PrestressShare {
            scope: segments(&[0, 1, 2, 3]),
            share: -0.1,
        },
    ];
    assert_eq!(loads.len(), expected.len());
    for (found, expected) in loads.iter().zip(&expected) {
        assert_eq!(*found, expected);
    }
}

#[test]
fn cases_checks_and_settings() {
    let work = work(&terrace());
    let brief = &work.brief;
    assert_eq!(brief.cases[1].factors, [(0, 1.35), (2, 1.5)]);
    assert_eq!(brief.cases[1].sets, ["winter"]);
    assert_eq!(brief.cases[0].load_steps, Some(LoadSteps::Equal(2)));
    assert_eq!(brief.cases[1].load_steps, None);
    assert_eq!(work.in_words(1), "1.35 self + 1.5 ice");
    assert_eq!(work.reference_in_words(), "prestress under 1 self");
    let [safety, slackness, movement, pull] = &brief.checks[..] else {
        panic!("four checks");
    };
    assert_eq!(safety.kind, CheckKind::Safety { factor: 2.2 });
    let cables = |ids: &[usize]| ids.iter().copied().map(CableId::new).collect::<Vec<_>>();
    let nodes = |ids: &[usize]| ids.iter().copied().map(NodeId::new).collect::<Vec<_>>();
    assert_eq!((&safety.cables, &safety.cases), (&cables(&[0, 1, 2, 3]), &vec![0, 1]));
    assert_eq!(safety.struts, Vec::<StrutId>::new());
    assert_eq!((&slackness.cables, &slackness.cases), (&cables(&[0, 1]), &vec![0, 2]));
    assert_eq!((&movement.nodes, &movement.cases), (&nodes(&[0, 7]), &vec![0, 1, 2]));
    let limit = MovementLimit::Length(0.2);
    assert_eq!(movement.kind, CheckKind::Movement { limit, from: None });
    // Groups within groups, in the order of their lists.
    assert_eq!((&pull.nodes, &pull.cases), (&nodes(&[1, 3, 2]), &vec![0, 1]));
    let limits = PullLimits {
        resultant: Some(60000.0),
        ..PullLimits::default()
    };
    assert_eq!(pull.kind, CheckKind::AnchorPull(limits));
    assert_eq!(brief.settings.tolerance, 1e-9);
    assert_eq!(brief.settings.max_iterations, 300);
    assert_eq!(brief.settings.load_steps, LoadSteps::FullFirst);
}

#[test]
fn a_negative_factor_reads_as_a_difference() {
    let work = work(&changed(
        terrace(),
        &[("/cases/1/factors", json!({"self": 1, "snow": -0.5}))],
    ));
    assert_eq!(work.in_words(1), "1 self - 0.5 snow");
}

#[test]
fn inherited_values_are_told() {
    let reading = reading(&terrace());
    let has = |path: &str, value: &str, origin: &str| {
        let found = (reading.resolved.iter())
            .any(|r| (r.path.as_str(), r.value.as_str(), r.origin.as_str()) == (path, value, origin));
        assert!(
            found,
            "{path} = {value} from {origin} is not among {:#?}",
            reading.resolved
        );
    };
    has("net.cables[bracing].section", "r10", "net.roles[rope].section");
    has("net.struts[post].section", "tube", "net.roles[mast].section");
    has(
        "net.cables[g2].end_fitting",
        "strength factor 0.9",
        "net.roles[guy].end_fitting",
    );
    has(
        "net.sections[tube].axial_stiffness_n",
        "4.2e8",
        "net.sections[tube].modulus_pa",
    );
    has("net.struts[post]", "balance", "prestress.rules[1]");
    has("checks[2].on", "all free nodes", "default");
    assert!(
        !reading.resolved.iter().any(|r| r.path == "net.cables[g2].section"),
        "its own section is not inherited"
    );
}

#[test]
fn a_ring_wraps_and_visits_count() {
    let ring = json!([{"id": "ring", "section": "r10", "nodes": ["A", "B", "C", "D", "A"],
        "parts": [{"from": "D", "to": "B", "section": "r8"}]}]);
    let changes = [
        ("/net/cables", ring),
        ("/net/sections/-", json!({"id": "r8", "axial_stiffness_n": 4e6})),
        ("/prestress/rules", json!([{"on": ["ring"], "tension_n": 1000}])),
        ("/actions", json!([])),
        ("/cases", json!([])),
    ];
    let work = work(&changed(first_net(), &changes));
    let stiffness = work
        .brief
        .net
        .segments()
        .iter()
        .map(|segment| segment.section.axial_stiffness);
    assert_eq!(stiffness.collect::<Vec<_>>(), [4e6, 6.5e6, 6.5e6, 4e6]);
}

#[test]
fn only_picks_sets_and_cases_in_brief_order() {
    let work = work(&terrace());
    let select = |only: &[&str]| {
        let only: Vec<String> = only.iter().map(|name| (*name).to_owned()).collect();
        work.select(&only).map(|selected| selected.cases).map_err(Box::new)
    };
    assert_eq!(select(&[]), Ok(vec![0, 1, 2]));
    assert_eq!(select(&["summer", "winter"]), Ok(vec![0, 1, 2]));
    assert_eq!(select(&["summer", "snowed"]), Ok(vec![0, 2]));
    assert_eq!(select(&["reference"]), Ok(vec![]));
    let error = select(&["service", "sumer"]).expect_err("no such case");
    assert_eq!((error.path.as_str(), error.id.as_str()), ("only[1]", "sumer"));
    assert!(error.message.contains("\"summer\""), "{}", error.message);
}
