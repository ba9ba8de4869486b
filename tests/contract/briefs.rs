//! Briefs as JSON, as messages, and changed in places.

use std::ops::ControlFlow;

use prost::Message as _;
use prost_reflect::{DescriptorPool, DynamicMessage, MessageDescriptor};
use ropewalk_api::FILE_DESCRIPTOR_SET;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Plan, ReferenceOutcome};
use ropewalk_service::config::Limits;
use ropewalk_service::decode::{Reading, Work, read};
use serde_json::{Value, json};

pub(crate) const LIMITS: Limits = Limits {
    request_bytes: 64 << 20,
    nodes: 100_000,
    segments: 300_000,
    cases: 1000,
};

pub(crate) fn descriptor() -> MessageDescriptor {
    let pool = DescriptorPool::decode(FILE_DESCRIPTOR_SET).expect("the descriptors are valid");
    pool.get_message_by_name("ropewalk.v1.Brief")
        .expect("the contract has briefs")
}

/// The brief that a JSON value says.
#[track_caller]
pub(crate) fn message(json: &Value) -> v1::Brief {
    let dynamic = DynamicMessage::deserialize(descriptor(), json).expect("the JSON form of a brief");
    v1::Brief::decode(dynamic.encode_to_vec().as_slice()).expect("a brief")
}

#[track_caller]
pub(crate) fn reading(json: &Value) -> Reading {
    read(message(json), &LIMITS)
}

/// The work of a brief without errors.
#[track_caller]
pub(crate) fn work(json: &Value) -> Work {
    let reading = reading(json);
    let errors: Vec<_> = errors(&reading).collect();
    assert!(errors.is_empty(), "{errors:#?}");
    reading.work.expect("no errors, so there is work")
}

pub(crate) fn errors(reading: &Reading) -> impl Iterator<Item = &v1::Finding> {
    let findings = reading.findings.iter();
    findings.filter(|finding| finding.severity() == v1::FindingSeverity::Error)
}

/// The plan and the reference state of a brief.
#[track_caller]
pub(crate) fn found(work: &Work) -> (Plan, ReferenceOutcome) {
    let plan = Plan::new(work.brief.clone());
    let reference = plan.reference(&mut |_| ControlFlow::Continue(()));
    let reference = reference.expect("a reference state");
    (plan, reference)
}

/// The minimal draft of the contract.
pub(crate) fn first_net() -> Value {
    let text = include_str!("../../client-example/briefs/first-net.json");
    serde_json::from_str(text).expect("valid JSON")
}

/// The realistic draft of the contract.
pub(crate) fn quince_yard() -> Value {
    let text = include_str!("../../client-example/briefs/quince-yard.json");
    serde_json::from_str(text).expect("valid JSON")
}

/// The realistic draft without the parts that have nothing to do with its skin.
pub(crate) fn quince_cloth() -> Value {
    let mut brief = quince_yard();
    let fields = brief.as_object_mut().expect("a brief");
    for part in ["factors", "combinations", "modes", "stages", "workshop", "keep"] {
        fields.remove(part);
    }
    let rest = json!([
        {"movement": {"limit_m": 0.35}, "on": ["cloth"], "over": ["service"]},
        {"anchor_pull": {"limit_n": 150000}, "on": ["wall-anchors"], "over": ["ultimate"]}
    ]);
    changed(
        brief,
        &[
            ("/net/adjusters", Value::Null),
            ("/net/cables/4/slides", Value::Null),
            ("/checks", rest),
        ],
    )
}

/// An invented brief that has one of everything that is served: a saddle of two ropes, one end of it on a guyed mast.
pub(crate) fn terrace() -> Value {
    json!({
        "id": "terrace", "title": "Terrace", "note": "invented", "labels": {"revision": "B"},
        "net": {
            "reference_temperature_deg_c": 10, "gravity_m_per_s2": 9.81, "origin_m": [3512000, 5401000, 310],
            "nodes": [
                {"id": "A", "xyz_m": [0, 0, 3], "attached_mass_kg": 20},
                {"id": "B", "xyz_m": [9, 0, 0], "support": {}},
                {"id": "C", "xyz_m": [9, 9, 3], "support": {}},
                {"id": "D", "xyz_m": [0, 9, 0],
                 "support": {"springs": [{"along": [0, 0, 2], "stiffness_n_per_m": 2e7}]}},
                {"id": "F", "xyz_m": [0, 0, 0], "support": {}},
                {"id": "G1", "xyz_m": [-3, 1, 0], "support": {}},
                {"id": "G2", "xyz_m": [1, -3, 0], "support": {}}
            ],
            "sections": [
                {"id": "r10", "axial_stiffness_n": 6.5e6, "mass_kg_per_m": 0.5, "breaking_force_n": 82e3,
                 "breaking_force_origin": "certificate 17", "expansion_per_k": 12e-6, "diameter_m": 0.010},
                {"id": "r16", "modulus_pa": 1.6e11, "metallic_area_m2": 1.2e-4, "mass_kg_per_m": 1.1,
                 "breaking_force_n": 200e3, "expansion_per_k": 12e-6},
                {"id": "tube", "modulus_pa": 2.1e11, "metallic_area_m2": 2e-3, "mass_kg_per_m": 15.7,
                 "expansion_per_k": 12e-6, "bending_stiffness_n_m2": 1e6}
            ],
            "roles": [
                {"id": "rope", "section": "r10"},
                {"id": "guy", "section": "r16", "end_fitting": {"take_up_m": 0.1, "strength_factor": 0.9}},
                {"id": "mast", "section": "tube"}
            ],
            "cables": [
                {"id": "carrying", "role": "rope", "nodes": ["A", "m", "C"],
                 "parts": [{"from": "m", "to": "C", "section": "r16"}], "end_fitting": {"strength_factor": 0.8}},
                {"id": "bracing", "role": "rope", "nodes": ["B", "m", "D"]},
                {"id": "g1", "role": "guy", "nodes": ["A", "G1"]},
                {"id": "g2", "role": "guy", "section": "r10", "nodes": ["A", "G2"]}
            ],
            "struts": [{"id": "post", "role": "mast", "nodes": ["F", "A"]}],
            "groups": [
                {"id": "anchors", "of": ["B", "D", "corner"]},
                {"id": "corner", "of": ["C"]},
                {"id": "saddle", "of": ["carrying", "bracing"]}
            ],
            "support_groups": [{"id": "wall", "nodes": ["C"], "stiffness_n_per_m":
                [3e7, 1e6, 0, 1e6, 3e7, 0, 0, 0, 4e7]}]
        },
        "prestress": {
            "under": ["self"], "hold": ["A"],
            "rules": [
                {"on": ["rope"], "force_density_n_per_m": 3000},
                {"on": ["guy", "post"], "balance": {}}
            ]
        },
        "actions": [
            {"id": "self", "class": "permanent", "loads": [{"own_weight": {}}]},
            {"id": "snow", "loads": [{"nodes": {"on": ["m"], "force_n": [0, 0, -5000]}}]},
            {"id": "ice", "loads": [
                {"on_length": {"on": ["saddle"], "force_n_per_m": [0, 0, -20]}},
                {"on_plan_length": {"on": ["guy"], "force_n_per_m": [0, 0, -10]}}]},
            {"id": "hot", "loads": [{"temperature": {"change_k": 35}}]},
            {"id": "creep", "loads": [{"move": {"node": "C", "by_m": [0, 0, -0.01]}}]},
            {"id": "weak", "loads": [{"prestress": {"share": -0.1, "on": ["saddle"]}}]}
        ],
        "cases": [
            {"id": "snowed", "sets": ["service", "winter"], "factors": {"self": 1, "snow": 1}, "load_steps": 2},
            {"id": "iced", "sets": ["winter"], "factors": {"self": 1.35, "ice": 1.5}},
            {"id": "summer", "sets": ["service"], "factors": {"self": 1, "hot": 1, "creep": 1, "weak": 1}}
        ],
        "checks": [
            {"safety": {"factor": 2.2}, "over": ["winter"]},
            {"slackness": {"min_share_of_reference": 0.1}, "on": ["saddle"], "over": ["service"]},
            {"movement": {"limit_m": 0.2}},
            {"anchor_pull": {"limit_n": 60000}, "on": ["anchors"], "over": ["snowed", "winter"]}
        ],
        "solving": {"tolerance": 1e-9, "max_iterations": 300}
    })
}

/// The value with other values at some places, named by JSON pointers. A pointer that ends in `/-` appends to a list;
/// `null` takes a field away.
#[track_caller]
pub(crate) fn changed(mut json: Value, changes: &[(&str, Value)]) -> Value {
    for (pointer, value) in changes {
        let (parent, key) = pointer.rsplit_once('/').expect("a JSON pointer");
        let parent = json.pointer_mut(parent).unwrap_or_else(|| panic!("no {pointer}"));
        match parent {
            Value::Array(list) if key == "-" => list.push(value.clone()),
            Value::Array(list) => list[key.parse::<usize>().expect("a position")] = value.clone(),
            Value::Object(object) if value.is_null() => {
                object.remove(key);
            }
            Value::Object(object) => {
                object.insert(key.to_owned(), value.clone());
            }
            _ => panic!("{pointer} lies in no list or object"),
        }
    }
    json
}
