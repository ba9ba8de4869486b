//! Everything that can be wrong or odd: a brief changed in one place, and what is told of it.

use ropewalk_api::ropewalk::v1;
use ropewalk_service::decode::{Reading, read};
use serde_json::{Value, json};
use v1::FindingSeverity::{Doubt, Error, Note};

use crate::briefs::{LIMITS, changed, errors, first_net, message, reading, terrace};

/// The finding with a reason and a path.
#[track_caller]
pub(crate) fn told<'r>(
    reading: &'r Reading,
    severity: v1::FindingSeverity,
    reason: &str,
    path: &str,
) -> &'r v1::Finding {
    let found = reading
        .findings
        .iter()
        .find(|finding| finding.reason == reason && finding.path == path);
    let found = found.unwrap_or_else(|| panic!("no {reason} at {path} in {:#?}", reading.findings));
    assert_eq!(found.severity(), severity, "{found:#?}");
    assert!(!found.message.is_empty() && !found.cure.is_empty(), "{found:#?}");
    found
}

/// A change, and the one kind of error that it makes.
#[track_caller]
pub(crate) fn check(base: Value, changes: &[(&str, Value)], reason: &str, path: &str) {
    let reading = reading(&changed(base, changes));
    told(&reading, Error, reason, path);
    assert!(reading.work.is_none());
    let others: Vec<_> = errors(&reading).filter(|error| error.reason != reason).collect();
    assert!(others.is_empty(), "{changes:?} also gives {others:#?}");
}

/// A change, and a doubt or note that it makes, while the work can be done.
#[track_caller]
pub(crate) fn check_mild(
    base: Value,
    changes: &[(&str, Value)],
    severity: v1::FindingSeverity,
    reason: &str,
    path: &str,
) {
    let reading = reading(&changed(base, changes));
    told(&reading, severity, reason, path);
    assert!(reading.work.is_some(), "{:#?}", errors(&reading).collect::<Vec<_>>());
}

#[test]
fn the_base_briefs_are_in_order() {
    for base in [first_net(), terrace()] {
        let reading = reading(&base);
        let bad: Vec<_> = reading
            .findings
            .iter()
            .filter(|finding| finding.severity() != Note)
            .collect();
        assert!(bad.is_empty(), "{bad:#?}");
    }
}

#[test]
fn numbers_that_are_none() {
    for (pointer, path) in [
        ("/net/nodes/0/xyz_m/1", "net.nodes[A].xyz_m[1]"),
        ("/net/nodes/0/attached_mass_kg", "net.nodes[A].attached_mass_kg"),
        (
            "/net/nodes/3/support/springs/0/along/2",
            "net.nodes[D].support.springs[0].along[2]",
        ),
        (
            "/net/nodes/3/support/springs/0/stiffness_n_per_m",
            "net.nodes[D].support.springs[0].stiffness_n_per_m",
        ),
        (
            "/net/sections/0/axial_stiffness_n",
            "net.sections[r10].axial_stiffness_n",
        ),
        ("/net/sections/1/modulus_pa", "net.sections[r16].modulus_pa"),
        ("/net/sections/1/metallic_area_m2", "net.sections[r16].metallic_area_m2"),
        ("/net/sections/0/mass_kg_per_m", "net.sections[r10].mass_kg_per_m"),
        ("/net/sections/0/breaking_force_n", "net.sections[r10].breaking_force_n"),
        ("/net/sections/0/expansion_per_k", "net.sections[r10].expansion_per_k"),
        ("/net/sections/0/diameter_m", "net.sections[r10].diameter_m"),
        ("/net/sections/0/proof_force_n", "net.sections[r10].proof_force_n"),
        (
            "/net/sections/2/bending_stiffness_n_m2",
            "net.sections[tube].bending_stiffness_n_m2",
        ),
        (
            "/net/roles/1/end_fitting/take_up_m",
            "net.roles[guy].end_fitting.take_up_m",
        ),
        (
            "/net/roles/1/end_fitting/strength_factor",
            "net.roles[guy].end_fitting.strength_factor",
        ),
        (
            "/net/cables/0/end_fitting/strength_factor",
            "net.cables[carrying].end_fitting.strength_factor",
        ),
        (
            "/net/support_groups/0/stiffness_n_per_m/4",
            "net.support_groups[wall].stiffness_n_per_m[4]",
        ),
        ("/net/reference_temperature_deg_c", "net.reference_temperature_deg_c"),
        ("/net/gravity_m_per_s2", "net.gravity_m_per_s2"),
        ("/net/origin_m/0", "net.origin_m[0]"),
        (
            "/prestress/rules/0/force_density_n_per_m",
            "prestress.rules[0].force_density_n_per_m",
        ),
        (
            "/actions/1/loads/0/nodes/force_n/2",
            "actions[snow].loads[0].nodes.force_n[2]",
        ),
        (
            "/actions/2/loads/0/on_length/force_n_per_m/0",
            "actions[ice].loads[0].on_length.force_n_per_m[0]",
        ),
        (
            "/actions/2/loads/1/on_plan_length/force_n_per_m/0",
            "actions[ice].loads[1].on_plan_length.force_n_per_m[0]",
        ),
        (
            "/actions/3/loads/0/temperature/change_k",
            "actions[hot].loads[0].temperature.change_k",
        ),
        ("/actions/4/loads/0/move/by_m/2", "actions[creep].loads[0].move.by_m[2]"),
        (
            "/actions/5/loads/0/prestress/share",
            "actions[weak].loads[0].prestress.share",
        ),
        ("/cases/0/factors/snow", "cases[snowed].factors[snow]"),
        ("/checks/0/safety/factor", "checks[0].safety.factor"),
        (
            "/checks/1/slackness/min_share_of_reference",
            "checks[1].slackness.min_share_of_reference",
        ),
        ("/checks/2/movement/limit_m", "checks[2].movement.limit_m"),
        ("/checks/3/anchor_pull/limit_n", "checks[3].anchor_pull.limit_n"),
        ("/solving/tolerance", "solving.tolerance"),
    ] {
        for value in ["NaN", "Infinity", "-Infinity"] {
            check(terrace(), &[(pointer, json!(value))], "NOT_FINITE", path);
        }
    }
}

#[test]
fn numbers_out_of_bounds() {
    for (pointer, value, reason, path) in [
        (
            "/net/nodes/0/attached_mass_kg",
            -1.0,
            "NEGATIVE",
            "net.nodes[A].attached_mass_kg",
        ),
        (
            "/net/sections/0/axial_stiffness_n",
            0.0,
            "NOT_POSITIVE",
            "net.sections[r10].axial_stiffness_n",
        ),
        (
            "/net/sections/0/axial_stiffness_n",
            -6e6,
            "NOT_POSITIVE",
            "net.sections[r10].axial_stiffness_n",
        ),
        (
            "/net/sections/0/axial_stiffness_n",
            1e300,
            "OUT_OF_RANGE",
            "net.sections[r10].axial_stiffness_n",
        ),
        (
            "/net/sections/0/axial_stiffness_n",
            1e-300,
            "OUT_OF_RANGE",
            "net.sections[r10].axial_stiffness_n",
        ),
        (
            "/net/sections/1/modulus_pa",
            0.0,
            "NOT_POSITIVE",
            "net.sections[r16].modulus_pa",
        ),
        (
            "/net/sections/1/metallic_area_m2",
            -1.0,
            "NOT_POSITIVE",
            "net.sections[r16].metallic_area_m2",
        ),
        (
            "/net/sections/0/mass_kg_per_m",
            -0.5,
            "NEGATIVE",
            "net.sections[r10].mass_kg_per_m",
        ),
        (
            "/net/sections/0/breaking_force_n",
            0.0,
            "NOT_POSITIVE",
            "net.sections[r10].breaking_force_n",
        ),
        (
            "/net/sections/0/expansion_per_k",
            12.0,
            "OUT_OF_RANGE",
            "net.sections[r10].expansion_per_k",
        ),
        (
            "/net/sections/0/diameter_m",
            0.0,
            "NOT_POSITIVE",
            "net.sections[r10].diameter_m",
        ),
        (
            "/net/roles/1/end_fitting/strength_factor",
            1.1,
            "OUT_OF_RANGE",
            "net.roles[guy].end_fitting.strength_factor",
        ),
        (
            "/net/roles/1/end_fitting/strength_factor",
            0.0,
            "NOT_POSITIVE",
            "net.roles[guy].end_fitting.strength_factor",
        ),
        ("/net/gravity_m_per_s2", -9.81, "NEGATIVE", "net.gravity_m_per_s2"),
        ("/net/gravity_m_per_s2", 981.0, "OUT_OF_RANGE", "net.gravity_m_per_s2"),
        (
            "/net/reference_temperature_deg_c",
            -300.0,
            "OUT_OF_RANGE",
            "net.reference_temperature_deg_c",
        ),
        (
            "/actions/1/loads/0/nodes/force_n/2",
            1e300,
            "OUT_OF_RANGE",
            "actions[snow].loads[0].nodes.force_n[2]",
        ),
        (
            "/actions/3/loads/0/temperature/change_k",
            1e6,
            "OUT_OF_RANGE",
            "actions[hot].loads[0].temperature.change_k",
        ),
        (
            "/cases/0/factors/snow",
            1e9,
            "OUT_OF_RANGE",
            "cases[snowed].factors[snow]",
        ),
        (
            "/checks/0/safety/factor",
            0.9,
            "OUT_OF_RANGE",
            "checks[0].safety.factor",
        ),
        (
            "/checks/1/slackness/min_share_of_reference",
            1.5,
            "OUT_OF_RANGE",
            "checks[1].slackness.min_share_of_reference",
        ),
        (
            "/checks/1/slackness/min_share_of_reference",
            -0.1,
            "OUT_OF_RANGE",
            "checks[1].slackness.min_share_of_reference",
        ),
        (
            "/checks/2/movement/limit_m",
            0.0,
            "NOT_POSITIVE",
            "checks[2].movement.limit_m",
        ),
        (
            "/checks/3/anchor_pull/limit_n",
            -1.0,
            "NOT_POSITIVE",
            "checks[3].anchor_pull.limit_n",
        ),
        ("/solving/tolerance", 0.1, "OUT_OF_RANGE", "solving.tolerance"),
        ("/solving/tolerance", 0.0, "OUT_OF_RANGE", "solving.tolerance"),
    ] {
        check(terrace(), &[(pointer, json!(value))], reason, path);
    }
    let spring = "/net/nodes/3/support/springs/0/stiffness_n_per_m";
    let path = "net.nodes[D].support.springs[0].stiffness_n_per_m";
    check(terrace(), &[(spring, json!(0))], "NOT_POSITIVE", path);
    check(terrace(), &[(spring, json!(-5))], "NOT_POSITIVE", path);
    check(
        terrace(),
        &[("/solving/load_steps", json!(0))],
        "OUT_OF_RANGE",
        "solving.load_steps",
    );
    check(
        terrace(),
        &[("/solving/max_iterations", json!(0))],
        "OUT_OF_RANGE",
        "solving.max_iterations",
    );
    check(
        terrace(),
        &[("/cases/0/load_steps", json!(1001))],
        "OUT_OF_RANGE",
        "cases[snowed].load_steps",
    );
}

#[test]
fn lists_of_the_wrong_length() {
    for (pointer, value, path) in [
        ("/net/nodes/0/xyz_m", json!([0, 3]), "net.nodes[A].xyz_m"),
        ("/net/origin_m", json!([1, 2, 3, 4]), "net.origin_m"),
        (
            "/net/nodes/3/support/springs/0/along",
            json!([]),
            "net.nodes[D].support.springs[0].along",
        ),
        (
            "/actions/1/loads/0/nodes/force_n",
            json!([0]),
            "actions[snow].loads[0].nodes.force_n",
        ),
        (
            "/actions/4/loads/0/move/by_m",
            json!([0, 1]),
            "actions[creep].loads[0].move.by_m",
        ),
        ("/net/struts/0/nodes", json!(["F", "A", "m"]), "net.struts[post].nodes"),
        (
            "/net/support_groups/0/stiffness_n_per_m",
            json!([1, 2, 3]),
            "net.support_groups[wall].stiffness_n_per_m",
        ),
    ] {
        let reading = reading(&changed(terrace(), &[(pointer, value)]));
        told(&reading, Error, "WRONG_COUNT", path);
    }
    let direction = json!({"free": [{"along": [0, 0, 0]}]});
    check(
        terrace(),
        &[("/net/nodes/1/support", direction)],
        "ZERO_DIRECTION",
        "net.nodes[B].support.free[0].along",
    );
}

#[test]
fn ids() {
    for (changes, reason, path) in [
        (vec![("/id", json!(""))], "BAD_ID", "id"),
        (vec![("/id", json!("a/b"))], "BAD_ID", "id"),
        (vec![("/cases/0/id", json!("a".repeat(129)))], "BAD_ID", "cases[0].id"),
        (vec![("/cases/0/id", json!("a\u{7}"))], "BAD_ID", "cases[0].id"),
        (
            vec![("/checks/0/over", json!([])), ("/cases/1/sets/0", json!("[x]"))],
            "BAD_ID",
            "cases[iced].sets[0]",
        ),
        (
            vec![("/net/nodes/-", json!({"id": "A", "xyz_m": [1, 1, 1]}))],
            "DUPLICATE_ID",
            "net.nodes[7].id",
        ),
        (
            vec![("/net/sections/-", json!({"id": "r10", "axial_stiffness_n": 1e6}))],
            "DUPLICATE_ID",
            "net.sections[3].id",
        ),
        (
            vec![("/net/groups/-", json!({"id": "mast", "of": ["A"]}))],
            "DUPLICATE_ID",
            "net.groups[3].id",
        ),
        (
            vec![("/net/cables/-", json!({"id": "A", "role": "rope", "nodes": ["B", "m"]}))],
            "DUPLICATE_ID",
            "net.cables[4].id",
        ),
        (
            vec![("/actions/-", json!({"id": "hot"}))],
            "DUPLICATE_ID",
            "actions[6].id",
        ),
        (
            vec![("/cases/-", json!({"id": "iced", "factors": {"self": 1}}))],
            "DUPLICATE_ID",
            "cases[3].id",
        ),
        (
            vec![("/cases/0/sets/-", json!("iced"))],
            "DUPLICATE_ID",
            "cases[snowed].sets[2]",
        ),
        (vec![("/cases/2/id", json!("reference"))], "RESERVED_ID", "cases[2].id"),
        (vec![("/cases/2/id", json!("envelope"))], "RESERVED_ID", "cases[2].id"),
        (
            vec![("/cases/2/sets/-", json!("governing"))],
            "RESERVED_ID",
            "cases[summer].sets[1]",
        ),
        (
            vec![("/checks/0/over", json!(["reference"]))],
            "RESERVED_ID",
            "checks[0].over[0]",
        ),
        (
            vec![("/net/cables/1/nodes/1", json!("a[b"))],
            "BAD_ID",
            "net.cables[bracing].nodes[1]",
        ),
    ] {
        let reading = reading(&changed(terrace(), &changes));
        told(&reading, Error, reason, path);
    }
}

#[test]
fn a_bad_id_names_its_character() {
    let reading = reading(&changed(first_net(), &[("/id", json!("a/b"))]));
    let finding = told(&reading, Error, "BAD_ID", "id");
    assert_eq!(
        finding.message,
        "the id \"a/b\" has the character \"/\", which ids must not have"
    );
}

#[test]
fn names_of_nothing_and_what_was_meant() {
    for (pointer, value, path, meant) in [
        ("/net/cables/1/role", json!("rop"), "net.cables[bracing].role", "rope"),
        ("/net/cables/3/section", json!("r1O"), "net.cables[g2].section", "r10"),
        ("/net/roles/0/section", json!("r1l"), "net.roles[rope].section", "r10"),
        (
            "/net/cables/0/parts/0/section",
            json!("R16"),
            "net.cables[carrying].parts[0].section",
            "r16",
        ),
        (
            "/net/groups/0/of/2",
            json!("cornr"),
            "net.groups[anchors].of[2]",
            "corner",
        ),
        (
            "/net/support_groups/0/nodes/0",
            json!("c"),
            "net.support_groups[wall].nodes[0]",
            "C",
        ),
        ("/prestress/under/0", json!("selff"), "prestress.under[0]", "self"),
        ("/prestress/hold/0", json!("a"), "prestress.hold[0]", "A"),
        (
            "/prestress/rules/0/on/0",
            json!("ropes"),
            "prestress.rules[0].on[0]",
            "rope",
        ),
        (
            "/actions/1/loads/0/nodes/on/0",
            json!("M"),
            "actions[snow].loads[0].nodes.on[0]",
            "m",
        ),
        (
            "/actions/2/loads/0/on_length/on/0",
            json!("sadle"),
            "actions[ice].loads[0].on_length.on[0]",
            "saddle",
        ),
        (
            "/actions/4/loads/0/move/node",
            json!("c"),
            "actions[creep].loads[0].move.node",
            "C",
        ),
        ("/cases/0/factors/snw", json!(1), "cases[snowed].factors[snw]", "snow"),
        ("/checks/1/on/0", json!("sadddle"), "checks[1].on[0]", "saddle"),
        ("/checks/0/over/0", json!("wimter"), "checks[0].over[0]", "winter"),
    ] {
        let reading = reading(&changed(terrace(), &[(pointer, value)]));
        let finding = told(&reading, Error, "UNKNOWN_ID", path);
        assert!(
            finding.message.contains(&format!("Did you mean \"{meant}\"?")),
            "{}",
            finding.message
        );
    }
}

#[test]
fn a_typing_slip_reads_as_promised() {
    let cables = json!([
        {"id": "c3", "section": "r10", "nodes": ["A", "n31", "n32", "C"]},
        {"id": "c4", "section": "r10", "nodes": ["B", "n31", "n3l"]},
        {"id": "c5", "section": "r10", "nodes": ["D", "n32"]}
    ]);
    let rules = json!([{"on": ["c3", "c4", "c5"], "force_density_n_per_m": 3000}]);
    let changes = [
        ("/net/cables", cables),
        ("/prestress/rules", rules),
        ("/actions", json!([])),
        ("/cases", json!([])),
    ];
    let reading = reading(&changed(first_net(), &changes));
    let finding = told(&reading, Error, "NODE_USED_ONCE", "net.cables[c4].nodes");
    assert_eq!(
        finding.message,
        "node \"n3l\" is used once, by cable \"c4\", and has no coordinates: it would hang on one rope. Did you mean \"n31\"?"
    );
    assert_eq!(finding.id, "n3l");
}

#[test]
fn a_typing_slip_in_the_middle_of_a_rope_is_a_doubt() {
    let cables = json!([
        {"id": "c3", "section": "r10", "nodes": ["A", "n3l", "C"]},
        {"id": "c4", "section": "r10", "nodes": ["B", "n31", "D"]}
    ]);
    let rules = json!([{"on": ["c3", "c4"], "force_density_n_per_m": 3000}]);
    let changes = [
        ("/net/cables", cables),
        ("/prestress/rules", rules),
        ("/actions", json!([])),
        ("/cases", json!([])),
    ];
    check_mild(first_net(), &changes, Doubt, "NODE_LOOKS_LIKE", "net.cables[c3].nodes");
}

#[test]
fn nets_that_are_none() {
    let lone = json!({"id": "lone", "role": "rope", "nodes": ["B"]});
    for (changes, reason, path) in [
        (
            vec![("/net/cables", json!([])), ("/net/struts", json!([]))],
            "EMPTY_NET",
            "net",
        ),
        (vec![("/net", Value::Null)], "MISSING", "net"),
        (vec![("/net/cables/-", lone)], "TOO_FEW_NODES", "net.cables[lone].nodes"),
        (
            vec![("/net/cables/1/nodes", json!(["B", "m", "m", "D"]))],
            "NODE_TWICE_IN_A_ROW",
            "net.cables[bracing].nodes[2]",
        ),
        (
            vec![("/net/nodes/-", json!({"id": "Q", "xyz_m": [1, 1, 1]}))],
            "NODE_NOT_CONNECTED",
            "net.nodes[Q]",
        ),
        (
            vec![("/net/nodes/1/xyz_m", Value::Null)],
            "SUPPORT_WITHOUT_POSITION",
            "net.nodes[B].xyz_m",
        ),
        (
            vec![("/net/nodes/5/xyz_m", json!([0, 0, 3]))],
            "NO_LENGTH",
            "net.cables[g1].nodes",
        ),
        (
            vec![("/net/nodes/5/xyz_m/0", json!(-30000))],
            "FAR_FROM_ORIGIN",
            "net.nodes[G1].xyz_m",
        ),
        (
            vec![("/net/cables/1/nodes/1", json!("post"))],
            "WRONG_KIND",
            "net.cables[bracing].nodes[1]",
        ),
    ] {
        let reading = reading(&changed(terrace(), &changes));
        told(&reading, Error, reason, path);
        assert!(reading.work.is_none());
    }
    let away = json!({"id": "Q", "xyz_m": [1, 1, 1], "support": {}});
    check_mild(
        terrace(),
        &[("/net/nodes/-", away)],
        Doubt,
        "NODE_UNUSED",
        "net.nodes[Q]",
    );
}

#[test]
fn a_part_without_a_support_is_named() {
    let mut net = first_net();
    let ring = json!({"id": "ring", "section": "r10", "nodes": ["p", "q", "r", "p"]});
    net = changed(
        net,
        &[("/net/cables/-", ring), ("/prestress/rules/0/on/-", json!("ring"))],
    );
    let reading = reading(&net);
    let finding = told(&reading, Error, "PART_NOT_HELD", "net.nodes");
    assert_eq!(finding.id, "ring");
    assert!(finding.message.contains("\"p\", \"q\", \"r\""), "{}", finding.message);
}

#[test]
fn world_coordinates_get_an_origin() {
    let mut net = first_net();
    for node in 0..4 {
        let pointer = format!("/net/nodes/{node}/xyz_m");
        let place: Vec<f64> = net
            .pointer(&pointer)
            .and_then(Value::as_array)
            .expect("a place")
            .iter()
            .filter_map(Value::as_f64)
            .collect();
        let moved = json!([place[0] + 3_512_000.0, place[1] + 5_401_000.0, place[2]]);
        net = changed(net, &[(&pointer, moved)]);
    }
    let reading = reading(&net);
    let finding = told(&reading, Error, "FAR_FROM_ORIGIN", "net.nodes");
    assert!(
        finding
            .message
            .starts_with("all nodes lie about 6442 km from the origin"),
        "{}",
        finding.message
    );
    assert!(
        finding.cure.contains("subtract (3512000, 5401000, 0)") && finding.cure.contains("net.origin_m"),
        "{}",
        finding.cure
    );
}

#[test]
fn sections_that_say_too_little_or_too_much() {
    for (changes, reason, path) in [
        (
            vec![("/net/sections/0/axial_stiffness_n", Value::Null)],
            "MISSING",
            "net.sections[r10].axial_stiffness_n",
        ),
        (
            vec![("/net/sections/1/metallic_area_m2", Value::Null)],
            "MISSING",
            "net.sections[r16].metallic_area_m2",
        ),
        (
            vec![("/net/sections/1/modulus_pa", Value::Null)],
            "MISSING",
            "net.sections[r16].modulus_pa",
        ),
        (
            vec![("/net/sections/1/axial_stiffness_n", json!(1.93e7))],
            "STIFFNESS_DISAGREES",
            "net.sections[r16].axial_stiffness_n",
        ),
        (
            vec![("/net/cables/1/role", Value::Null)],
            "NO_SECTION",
            "net.cables[bracing].section",
        ),
        (
            vec![("/net/roles/2/section", Value::Null)],
            "NO_SECTION",
            "net.struts[post].section",
        ),
        (
            vec![("/net/cables/0/parts/0/section", Value::Null)],
            "MISSING",
            "net.cables[carrying].parts[0].section",
        ),
    ] {
        let reading = reading(&changed(terrace(), &changes));
        told(&reading, Error, reason, path);
    }
    // Within 0.1 %: both may be given.
    let close = [("/net/sections/1/axial_stiffness_n", json!(1.921e7))];
    assert!(reading(&changed(terrace(), &close)).work.is_some());
    let overlap = json!({"from": "A", "to": "C", "section": "r10"});
    check(
        terrace(),
        &[("/net/cables/0/parts/-", overlap)],
        "PARTS_OVERLAP",
        "net.cables[carrying].parts[1]",
    );
    check(
        terrace(),
        &[("/net/cables/0/parts/0/from", json!("D"))],
        "NO_SUCH_STRETCH",
        "net.cables[carrying].parts[0].from",
    );
    let backwards = json!({"from": "C", "to": "m", "section": "r16"});
    check(
        terrace(),
        &[("/net/cables/0/parts/0", backwards)],
        "NO_SUCH_STRETCH",
        "net.cables[carrying].parts[0]",
    );
}

#[test]
fn supports_that_contradict() {
    let both = json!({"free": [{"along": [0, 0, 1]}], "springs": [{"along": [0, 0, 2], "stiffness_n_per_m": 1e6}]});
    check(
        terrace(),
        &[("/net/nodes/3/support", both)],
        "SUPPORT_CONTRADICTS",
        "net.nodes[D].support.springs[0].along",
    );
    let free = json!({"free": [{"along": [1, 0, 0]}, {"along": [0, 1, 0]}, {"along": [0, 0, 1]}]});
    check_mild(
        terrace(),
        &[("/net/nodes/1/support", free)],
        Doubt,
        "SUPPORT_HOLDS_NOTHING",
        "net.nodes[B].support.free",
    );
    let matrix = "/net/support_groups/0/stiffness_n_per_m";
    check(
        terrace(),
        &[(matrix, json!([3e7, 1e6, 0, 0, 3e7, 0, 0, 0, 4e7]))],
        "NOT_SYMMETRIC",
        "net.support_groups[wall].stiffness_n_per_m[3]",
    );
    check(
        terrace(),
        &[(matrix, json!([3e7, 0, 0, 0, -3e7, 0, 0, 0, 4e7]))],
        "NOT_SEMI_DEFINITE",
        "net.support_groups[wall].stiffness_n_per_m",
    );
    check(
        terrace(),
        &[("/net/nodes/2/support", json!({"free": [{"along": [0, 0, 1]}]}))],
        "SUPPORT_CONTRADICTS",
        "net.support_groups[wall].nodes[0]",
    );
    let second = json!({"id": "wall2", "nodes": ["C"], "stiffness_n_per_m": [1, 0, 0, 0, 1, 0, 0, 0, 1]});
    check(
        terrace(),
        &[("/net/support_groups/-", second)],
        "REPEATED_IN_LIST",
        "net.support_groups[wall2].nodes[0]",
    );
    let free_node = json!({"id": "head", "nodes": ["A"], "stiffness_n_per_m": [1, 0, 0, 0, 1, 0, 0, 0, 1]});
    let reading = reading(&changed(terrace(), &[("/net/support_groups/-", free_node)]));
    told(&reading, Error, "MISSING", "net.support_groups[head].nodes[0]");
}

#[test]
fn groups_and_lists() {
    check(
        terrace(),
        &[("/net/groups/1/of/-", json!("anchors"))],
        "GROUP_CYCLE",
        "net.groups[anchors].of",
    );
    let itself = changed(terrace(), &[("/net/groups/2/of/-", json!("saddle"))]);
    told(&reading(&itself), Error, "GROUP_CYCLE", "net.groups[saddle].of");
    check(
        terrace(),
        &[("/actions/1/loads/0/nodes/on/-", json!("m"))],
        "REPEATED_IN_LIST",
        "actions[snow].loads[0].nodes.on[1]",
    );
    for (pointer, value, path) in [
        (
            "/actions/1/loads/0/nodes/on/0",
            json!("saddle"),
            "actions[snow].loads[0].nodes.on[0]",
        ),
        (
            "/actions/2/loads/0/on_length/on/0",
            json!("m"),
            "actions[ice].loads[0].on_length.on[0]",
        ),
        (
            "/actions/2/loads/1/on_plan_length/on/0",
            json!("anchors"),
            "actions[ice].loads[1].on_plan_length.on[0]",
        ),
        (
            "/actions/5/loads/0/prestress/on/0",
            json!("mast"),
            "actions[weak].loads[0].prestress.on[0]",
        ),
        (
            "/actions/4/loads/0/move/node",
            json!("g1"),
            "actions[creep].loads[0].move.node",
        ),
        ("/prestress/hold/0", json!("post"), "prestress.hold[0]"),
        ("/checks/0/on", json!(["B"]), "checks[0].on[0]"),
        ("/checks/3/on", json!(["carrying"]), "checks[3].on[0]"),
        ("/checks/3/on", json!(["m"]), "checks[3].on"),
    ] {
        let reading = reading(&changed(terrace(), &[(pointer, value)]));
        told(&reading, Error, "WRONG_KIND", path);
    }
    check(
        terrace(),
        &[("/actions/1/loads/0/nodes/on", json!([]))],
        "COVERS_NOTHING",
        "actions[snow].loads[0].nodes.on",
    );
    let role = json!({"id": "spare"});
    let changes = [
        ("/net/roles/-", role.clone()),
        ("/prestress/rules/0/on/-", json!("spare")),
    ];
    check_mild(terrace(), &changes, Doubt, "COVERS_NOTHING", "prestress.rules[0].on[1]");
    let changes = [("/net/roles/-", role), ("/checks/0/on", json!(["spare"]))];
    check(terrace(), &changes, "COVERS_NOTHING", "checks[0].on");
}

#[test]
fn prestress() {
    let rule = |rule: Value| vec![("/prestress/rules/0", rule)];
    let lengths = json!([{"on": ["carrying", "bracing"], "unstressed_length_m": 6.5}]);
    for (base, changes, reason, path) in [
        (terrace(), vec![("/prestress", Value::Null)], "MISSING", "prestress"),
        (
            terrace(),
            vec![("/prestress/rules", json!([]))],
            "MISSING",
            "prestress.rules",
        ),
        (
            terrace(),
            rule(json!({"on": ["rope"]})),
            "MISSING",
            "prestress.rules[0]",
        ),
        (
            terrace(),
            rule(json!({"on": ["carrying"], "tension_n": 1000})),
            "NO_RULE",
            "prestress.rules",
        ),
        (
            terrace(),
            rule(json!({"on": ["rope"], "tension_n": -1000})),
            "CABLE_PUSHES",
            "prestress.rules[0].tension_n",
        ),
        (
            terrace(),
            rule(json!({"on": ["rope"], "tension_n": 0})),
            "NOT_POSITIVE",
            "prestress.rules[0].tension_n",
        ),
        (
            terrace(),
            rule(json!({"on": ["rope"], "mean_tension_n": -1})),
            "NOT_POSITIVE",
            "prestress.rules[0].mean_tension_n",
        ),
        (
            terrace(),
            rule(json!({"on": ["rope"], "unstressed_length_m": 0})),
            "NOT_POSITIVE",
            "prestress.rules[0].unstressed_length_m",
        ),
        (
            terrace(),
            rule(json!({"on": ["rope"], "share_of_breaking": 1})),
            "OUT_OF_RANGE",
            "prestress.rules[0].share_of_breaking",
        ),
        (
            terrace(),
            vec![("/prestress/hold", json!([]))],
            "BALANCE_WITHOUT_HOLD",
            "prestress.rules[1].balance",
        ),
        (
            terrace(),
            vec![("/prestress/hold/0", json!("m"))],
            "HOLD_NOT_FREE",
            "prestress.hold[0]",
        ),
        (
            terrace(),
            vec![("/prestress/hold/-", json!("B"))],
            "HOLD_NOT_FREE",
            "prestress.hold[1]",
        ),
        (
            terrace(),
            vec![("/prestress/under/0", json!("hot"))],
            "UNDER_NOT_DEAD",
            "prestress.under[0]",
        ),
        (
            first_net(),
            vec![("/prestress/rules", lengths)],
            "NO_COORDINATES",
            "net.nodes",
        ),
    ] {
        check(base, &changes, reason, path);
    }
    let tie = json!({"on": ["guy", "post", "rope"], "balance": {}});
    let reading = reading(&changed(terrace(), &[("/prestress/rules/1", tie)]));
    let finding = told(&reading, Error, "RULES_TIE", "prestress.rules[1]");
    assert!(finding.message.contains("rules 0 and 1"), "{}", finding.message);
    let parts = json!({"parts": [
        {"cable": "carrying", "from": "A", "to": "C"}, {"cable": "carrying", "from": "m", "to": "C"}], "mean_tension_n": 1e4});
    check(
        terrace(),
        &[("/prestress/rules/-", parts)],
        "RULES_TIE",
        "prestress.rules[2]",
    );
    let strut = json!({"on": ["post"], "mean_tension_n": 1e4});
    let reading_strut = crate::briefs::reading(&changed(terrace(), &[("/prestress/rules/-", strut)]));
    told(&reading_strut, Error, "WRONG_KIND", "prestress.rules[2].mean_tension_n");
    let share = json!({"on": ["post"], "share_of_breaking": 0.1});
    let changes = [("/prestress/rules/1/on", json!(["guy"])), ("/prestress/rules/-", share)];
    check(
        terrace(),
        &changes,
        "NO_BREAKING_FORCE",
        "prestress.rules[2].share_of_breaking",
    );
    let held = json!({"on": ["rope", "guy", "post"], "tension_n": 1e4});
    check(
        terrace(),
        &[("/prestress/rules", json!([held]))],
        "HOLD_WITHOUT_BALANCE",
        "prestress.hold",
    );
}

#[test]
fn actions_and_cases() {
    for (changes, reason, path) in [
        (
            vec![("/actions/1/loads/-", json!({}))],
            "MISSING",
            "actions[snow].loads[1]",
        ),
        (
            vec![("/actions/4/loads/0/move/node", json!("m"))],
            "MOVE_WITHOUT_SUPPORT",
            "actions[creep].loads[0].move.node",
        ),
        (
            vec![("/actions/5/loads/0/prestress/share", json!(-1))],
            "SHARE_TAKES_ALL",
            "cases[summer].factors",
        ),
        (
            vec![("/cases/2/factors/weak", json!(10))],
            "SHARE_TAKES_ALL",
            "cases[summer].factors",
        ),
        (
            vec![("/cases", json!([])), ("/checks", json!([{"safety": {"factor": 2}}]))],
            "CHECK_WITHOUT_CASES",
            "checks[0].over",
        ),
        (vec![("/checks/-", json!({}))], "MISSING", "checks[4]"),
    ] {
        check(terrace(), &changes, reason, path);
    }
    // A spring in z holds; along a released direction nothing does.
    let free = json!({"free": [{"along": [1, 0, 0]}], "springs": [{"along": [0, 0, 1], "stiffness_n_per_m": 2e7}]});
    let base = changed(
        terrace(),
        &[
            ("/net/nodes/3/support", free),
            ("/actions/4/loads/0/move/node", json!("D")),
        ],
    );
    assert!(reading(&base).work.is_some());
    let by = json!([0.01, 0, 0]);
    check(
        base,
        &[("/actions/4/loads/0/move/by_m", by)],
        "MOVE_ALONG_FREE",
        "actions[creep].loads[0].move.by_m",
    );
    // A share may be below -1 as long as its factor is small.
    let changes = [
        ("/actions/5/loads/0/prestress/share", json!(-2)),
        ("/cases/2/factors/weak", json!(0.25)),
    ];
    assert!(reading(&changed(terrace(), &changes)).work.is_some());

    for (changes, severity, reason, path) in [
        (
            vec![("/actions/-", json!({"id": "nothing"}))],
            Doubt,
            "ACTION_WITHOUT_LOADS",
            "actions[nothing].loads",
        ),
        (
            vec![("/cases/-", json!({"id": "calm"}))],
            Doubt,
            "CASE_WITHOUT_ACTIONS",
            "cases[calm].factors",
        ),
        (
            vec![("/cases/0/factors/self", Value::Null)],
            Doubt,
            "CASE_WITHOUT_DEAD_LOAD",
            "cases[snowed].factors",
        ),
        (
            vec![("/net/reference_temperature_deg_c", Value::Null)],
            Doubt,
            "NO_REFERENCE_TEMPERATURE",
            "net.reference_temperature_deg_c",
        ),
        (
            vec![("/cases/0/factors/hot", json!(0))],
            Note,
            "FACTOR_ZERO",
            "cases[snowed].factors[hot]",
        ),
        (
            vec![("/cases/1/factors/ice", Value::Null)],
            Note,
            "ACTION_UNUSED",
            "actions",
        ),
        (vec![("/checks", json!([]))], Note, "NOTHING_CHECKED", "checks"),
    ] {
        check_mild(terrace(), &changes, severity, reason, path);
    }
    let mass = [("/net/sections/0/mass_kg_per_m", json!(0.5))];
    check_mild(first_net(), &mass, Doubt, "NO_OWN_WEIGHT", "cases");
    check_mild(first_net(), &[], Note, "NO_MASS", "net.sections");
    let weightless = [
        ("/actions/-", json!({"id": "self", "loads": [{"own_weight": {}}]})),
        ("/cases/0/factors/self", json!(1)),
    ];
    check_mild(first_net(), &weightless, Doubt, "NO_MASS", "actions[self]");
}

#[test]
fn members_that_a_check_cannot_judge() {
    let unknown = [("/net/sections/1/breaking_force_n", Value::Null)];
    let reading = reading(&changed(terrace(), &unknown));
    let finding = told(&reading, Doubt, "NOT_JUDGEABLE", "checks[0].safety");
    assert_eq!(
        finding.message,
        "2 of 4 members will not be judged: \"carrying\", \"g1\" have no breaking force"
    );
    check_mild(
        terrace(),
        &[("/checks/0/on", json!(["guy", "mast"]))],
        Doubt,
        "NOT_JUDGEABLE",
        "checks[0].on",
    );
}

#[test]
fn slips_of_unit() {
    let kilo = [
        ("/net/sections/0/axial_stiffness_n", json!(8900)),
        ("/prestress/rules/0", json!({"on": ["rope"], "tension_n": 13500})),
    ];
    let reading = reading(&changed(terrace(), &kilo));
    let strained: Vec<_> = reading
        .findings
        .iter()
        .filter(|f| f.message.contains("would stretch"))
        .collect();
    let [strained] = strained[..] else {
        panic!("one section is strained: {:#?}", reading.findings);
    };
    assert_eq!(
        strained.message,
        "section \"r10\": axial stiffness 8900 N; with 13 500 N in \"carrying\" the rope would stretch by 152 %. A 10 mm rope \
         has about 9e6 N: was the value in kN?"
    );
    assert_eq!((strained.reason.as_str(), strained.severity()), ("UNIT_SLIP", Doubt));
    for (pointer, value, path) in [
        (
            "/net/sections/0/diameter_m",
            json!(10),
            "net.sections[r10].axial_stiffness_n",
        ),
        (
            "/net/sections/0/breaking_force_n",
            json!(82),
            "net.sections[r10].breaking_force_n",
        ),
        (
            "/net/sections/0/mass_kg_per_m",
            json!(50),
            "net.sections[r10].mass_kg_per_m",
        ),
        (
            "/net/sections/1/modulus_pa",
            json!(160e3),
            "net.sections[r16].modulus_pa",
        ),
        ("/net/nodes/1/xyz_m", json!([9000, 0, 0]), "net.nodes"),
    ] {
        check_mild(terrace(), &[(pointer, value)], Doubt, "UNIT_SLIP", path);
    }
    let strong = [("/prestress/rules/0", json!({"on": ["rope"], "tension_n": 90e3}))];
    check_mild(
        terrace(),
        &strong,
        Doubt,
        "PRESTRESS_OVER_BREAKING",
        "net.sections[r10].breaking_force_n",
    );
}

#[test]
fn a_stiffness_far_from_the_others() {
    let soft = changed(terrace(), &[("/net/sections/1/modulus_pa", json!(1.6e8))]);
    let reading_of = |brief: &Value| told(&reading(brief), Doubt, "UNIT_SLIP", "net.cables[carrying]").clone();
    let finding = reading_of(&soft);
    assert_eq!(
        finding.message,
        "\"carrying\" has an axial stiffness of 19 200 N, 1/340 that of the median of the ropes: was it in another unit?"
    );
    let accepted = json!([{"reason": "UNIT_SLIP", "on": "carrying", "note": "a bungee"}]);
    assert_eq!(
        reading_of(&changed(soft, &[("/accepted", accepted)])).accepted_note,
        "a bungee"
    );
    // A thin tie beside a thick edge is no slip.
    let thin = reading(&changed(terrace(), &[("/net/sections/1/modulus_pa", json!(1.6e9))]));
    assert!(
        !thin.findings.iter().any(|f| f.path == "net.cables[carrying]"),
        "{:#?}",
        thin.findings
    );
}

#[test]
fn accepted_doubts_stay_visible() {
    let base = changed(terrace(), &[("/cases/0/factors/self", Value::Null)]);
    let accept = |reason: &str, on: &str, note: &str| json!([{"reason": reason, "on": on, "note": note}]);
    let given = changed(
        base.clone(),
        &[("/accepted", accept("CASE_WITHOUT_DEAD_LOAD", "snowed", "lifted"))],
    );
    let finding = told(
        &reading(&given),
        Doubt,
        "CASE_WITHOUT_DEAD_LOAD",
        "cases[snowed].factors",
    )
    .clone();
    assert_eq!(finding.accepted_note, "lifted");
    // Of another case: not accepted, and told.
    let other = changed(
        base.clone(),
        &[("/accepted", accept("CASE_WITHOUT_DEAD_LOAD", "iced", "lifted"))],
    );
    let other = reading(&other);
    assert_eq!(
        told(&other, Doubt, "CASE_WITHOUT_DEAD_LOAD", "cases[snowed].factors").accepted_note,
        ""
    );
    told(&other, Note, "ACCEPTED_NOT_FOUND", "accepted[0]");
    check(
        base.clone(),
        &[("/accepted", accept("CASE_WITHOUT_DEAD_LOAD", "", ""))],
        "MISSING",
        "accepted[0].note",
    );
    let typo = accept("UNIT_SLIPS", "", "known");
    check_mild(
        base,
        &[("/accepted", typo)],
        Doubt,
        "ACCEPTED_UNKNOWN",
        "accepted[0].reason",
    );
}

#[test]
fn parts_that_are_not_served() {
    for (pointer, value, path) in [
        ("/stored_net", json!("3f9a"), "stored_net"),
        ("/stages", json!([{"id": "first"}]), "stages[first]"),
        ("/workshop", json!({}), "workshop"),
        ("/readings", json!([{"id": "r1"}]), "readings[r1]"),
        ("/variants", json!([{"id": "v"}]), "variants[v]"),
    ] {
        let mut base = terrace();
        if pointer == "/stored_net" {
            base = changed(base, &[("/net", Value::Null)]);
        }
        check(base, &[(pointer, value)], "NOT_SERVED", path);
    }
}

#[test]
fn data_that_nothing_uses_is_told() {
    let reading = reading(&terrace());
    for path in ["net.roles", "actions"] {
        told(&reading, Note, "DATA_NOT_USED", path);
    }
}

#[test]
fn a_changed_section_of_a_frozen_brief_is_doubted_with_numbers() {
    let frozen = json!({"digest": "3f9a".repeat(16), "engine_version": "0.1.0",
        "sections": [{"id": "r10", "axial_stiffness_n": 6.5e6}]});
    let base = changed(
        first_net(),
        &[
            ("/net/nodes/-", json!({"id": "m", "xyz_m": [4.5, 4.5, 1.5]})),
            (
                "/prestress/rules/0",
                json!({"on": ["carrying", "bracing"], "unstressed_length_m": 6.518677}),
            ),
            ("/frozen_from", frozen),
        ],
    );
    let same = reading(&base);
    assert!(
        same.findings
            .iter()
            .all(|finding| finding.reason != "FROZEN_SECTION_CHANGED")
    );
    assert!(same.work.expect("no errors").frozen);
    let reading = reading(&changed(
        base.clone(),
        &[("/net/sections/0/axial_stiffness_n", json!(5.2e6))],
    ));
    let finding = told(
        &reading,
        Doubt,
        "FROZEN_SECTION_CHANGED",
        "net.sections[r10].axial_stiffness_n",
    );
    // 19.615 kN at the worked lengths, times 5.2 / 6.5.
    assert_eq!(
        finding.message,
        "this brief was frozen from digest 3f9a3f9a... with section \"r10\" (EA 6.5 MN); it now says 5.2 MN. With the cut \
         lengths the reference tension of \"carrying\" falls from 19.6 kN to about 15.7 kN."
    );
    check(
        base,
        &[("/frozen_from/digest", json!("3F9A"))],
        "BAD_ID",
        "frozen_from.digest",
    );
}

#[test]
fn limits() {
    let brief = || message(&terrace());
    for (limits, path) in [
        (ropewalk_service::config::Limits { nodes: 3, ..LIMITS }, "net.nodes"),
        (ropewalk_service::config::Limits { nodes: 7, ..LIMITS }, "net"),
        (ropewalk_service::config::Limits { segments: 6, ..LIMITS }, "net"),
        (ropewalk_service::config::Limits { cases: 2, ..LIMITS }, "cases"),
    ] {
        let reading = read(brief(), &limits);
        told(&reading, Error, "TOO_MANY", path);
    }
    let enough = ropewalk_service::config::Limits {
        nodes: 8,
        segments: 7,
        cases: 3,
        ..LIMITS
    };
    assert!(read(brief(), &enough).work.is_some());
    let long = changed(terrace(), &[("/note", json!("x".repeat(200_000)))]);
    told(&reading(&long), Error, "TOO_LARGE", "note");
    let sets: Vec<String> = (0..2000)
        .map(|i| format!("a set with a rather long name for a set, number {i}"))
        .collect();
    let wide = changed(terrace(), &[("/cases/0/sets", json!(sets)), ("/checks", json!([]))]);
    told(&reading(&wide), Error, "TOO_LARGE", "cases[snowed]");
}

/// Nothing stops at the first violation.
#[test]
fn everything_is_told_at_once() {
    let changes = [
        ("/id", json!("")),
        ("/net/nodes/0/xyz_m/0", json!("NaN")),
        ("/net/sections/0/axial_stiffness_n", json!(-1)),
        ("/net/cables/1/role", json!("rop")),
        ("/prestress/under/0", json!("hot")),
        ("/actions/1/loads/0/nodes/force_n", json!([1])),
        ("/cases/0/factors/snw", json!(1)),
        ("/checks/0/over/0", json!("wimter")),
        ("/solving/tolerance", json!("Infinity")),
        ("/workshop", json!({})),
        ("/accepted", json!([{"reason": "UNIT_SLIP"}])),
    ];
    let reading = reading(&changed(terrace(), &changes));
    for (reason, path) in [
        ("BAD_ID", "id"),
        ("NOT_FINITE", "net.nodes[A].xyz_m[0]"),
        ("NOT_POSITIVE", "net.sections[r10].axial_stiffness_n"),
        ("UNKNOWN_ID", "net.cables[bracing].role"),
        ("UNDER_NOT_DEAD", "prestress.under[0]"),
        ("WRONG_COUNT", "actions[snow].loads[0].nodes.force_n"),
        ("UNKNOWN_ID", "cases[snowed].factors[snw]"),
        ("UNKNOWN_ID", "checks[0].over[0]"),
        ("NOT_FINITE", "solving.tolerance"),
        ("NOT_SERVED", "workshop"),
        ("MISSING", "accepted[0].note"),
    ] {
        told(&reading, Error, reason, path);
    }
    // Errors first.
    let severities: Vec<i32> = reading.findings.iter().map(|finding| finding.severity).collect();
    assert!(severities.is_sorted());
}

/// A brief of nothing, and one of nonsense, get answers and no panic.
#[test]
fn empty_and_absurd_briefs_are_answered() {
    let empty = read(v1::Brief::default(), &LIMITS);
    told(&empty, Error, "BAD_ID", "id");
    told(&empty, Error, "MISSING", "net");
    let mut absurd = message(&terrace());
    if let Some(v1::brief::NetSource::Net(net)) = &mut absurd.net_source {
        net.cables.iter_mut().for_each(|cable| cable.nodes.clear());
        net.struts.iter_mut().for_each(|strut| strut.nodes.clear());
        net.nodes.iter_mut().for_each(|node| node.id.clear());
        net.sections.iter_mut().for_each(|section| section.id.clear());
    }
    let reading = read(absurd, &LIMITS);
    assert!(errors(&reading).count() > 20);
}
