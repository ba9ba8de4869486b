//! Skins, zones and panels, and what lies on them: what is found, what is told, what is refused.

use std::ops::ControlFlow;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::Plan;
use ropewalk_numerics::load::Load;
use ropewalk_numerics::model::Area;
use ropewalk_service::decode::Work;
use serde_json::{Value, json};
use v1::FindingSeverity::{Doubt, Error, Note};
use v1::run_response::Event;

use crate::briefs::{changed, errors, quince_cloth, reading, terrace, work};
use crate::results::run;
use crate::violations::{check, check_mild, told};

/// Four corners, a mast in the middle of nothing, and ropes between: two square panels of 3 m side, west and east of a
/// common rope, upon given nodes.
pub(crate) fn awning() -> Value {
    json!({
        "id": "awning",
        "net": {
            "nodes": [
                {"id": "a", "xyz_m": [0, 0, 3], "support": {}},
                {"id": "b", "xyz_m": [3, 0, 3], "support": {}},
                {"id": "c", "xyz_m": [6, 0, 3], "support": {}},
                {"id": "d", "xyz_m": [6, 3, 4], "support": {}},
                {"id": "e", "xyz_m": [3, 3, 3], "support": {}},
                {"id": "f", "xyz_m": [0, 3, 4], "support": {}}
            ],
            "sections": [
                {"id": "rope", "axial_stiffness_n": 5e6, "mass_kg_per_m": 0.4, "diameter_m": 0.01},
                {"id": "bare", "axial_stiffness_n": 5e6, "mass_kg_per_m": 0.4}
            ],
            "cables": [
                {"id": "rim", "section": "rope", "nodes": ["a", "b", "c", "d", "e", "f", "a"]},
                {"id": "ridge", "section": "rope", "nodes": ["b", "e"]},
                {"id": "spare", "section": "bare", "nodes": ["a", "c"]}
            ],
            "skins": [{"id": "cloth", "between": ["rim", "ridge"], "mass_kg_per_m2": 1.0}],
            "zones": [
                {"id": "west", "skin": "cloth", "outline_xy_m": [-1, -1, 3, -1, 3, 4, -1, 4]},
                {"id": "east", "skin": "cloth", "outline_xy_m": [3, -1, 7, -1, 7, 4, 3, 4]}
            ]
        },
        "prestress": {"rules": [{"on": ["rim", "ridge", "spare"], "tension_n": 2000}]},
        "actions": [
            {"id": "self", "loads": [{"own_weight": {}}]},
            {"id": "snow", "loads": [{"on_plan": {"on": ["cloth"], "pressure_pa": 500}}]},
            {"id": "wind", "loads": [{"on_surface": {"pressure_pa": 400, "coefficients": {"west": -0.8, "east": -0.5}}}]},
            {"id": "gale", "loads": [{"wind_on_ropes":
                {"pressure_pa": 600, "along": [2, 0, 0], "drag_coefficient": 1.2, "on": ["rim"]}}]},
            {"id": "ice", "loads": [{"ice": {"thickness_m": 0.02, "on": ["rim"]}}]}
        ],
        "cases": [{"id": "all", "factors": {"self": 1, "snow": 1.5, "gale": 1, "ice": 1}}],
        "checks": [{"anchor_pull": {"limit_n": 60000}}]
    })
}

#[test]
fn the_base_brief_is_in_order() {
    let reading = reading(&awning());
    let bad: Vec<_> = reading.findings.iter().filter(|f| f.severity() != Note).collect();
    assert!(bad.is_empty(), "{bad:#?}");
}

#[test]
fn every_field_reaches_its_place() {
    let work = work(&awning());
    let net = &work.brief.net;
    let names: Vec<&str> = net.panels().iter().map(|panel| panel.name.as_str()).collect();
    assert_eq!(names, ["a-b-e-f", "b-c-d-e"]);
    assert_eq!(net.skins()[0].panels, [0, 1]);
    assert_eq!(net.skins()[0].mass_per_area, 1.0);
    assert_eq!(
        (net.zones()[1].name.as_str(), net.zones()[1].outline.len()),
        ("east", 4)
    );
    assert_eq!(net.segments()[0].section.diameter, Some(0.01));
    let load = |action: usize| &work.brief.actions[action].loads[0];
    assert_eq!(
        *load(1),
        Load::OnPlan {
            on: vec![Area::Skin(0)],
            pressure: 500.0
        }
    );
    assert_eq!(
        *load(2),
        Load::OnSurface {
            pressure: 400.0,
            coefficients: vec![(Area::Zone(0), -0.8), (Area::Zone(1), -0.5)],
            elsewhere: None
        }
    );
    let Load::WindOnRopes {
        pressure,
        along,
        drag_coefficient,
        ..
    } = load(3)
    else {
        panic!("{:?}", load(3));
    };
    assert_eq!((*pressure, along.x, *drag_coefficient), (600.0, 1.0, 1.2));
    let Load::Ice {
        thickness,
        density,
        gravity,
        ..
    } = load(4)
    else {
        panic!("{:?}", load(4));
    };
    assert_eq!((*thickness, *density, gravity.z), (0.02, 900.0, -9.80665));
}

#[test]
fn check_lists_the_panels() {
    let reading = reading(&awning());
    let value = |path: &str| {
        let found = reading.resolved.iter().find(|value| value.path == path);
        found.unwrap_or_else(|| panic!("no {path}")).clone()
    };
    let panel = value("net.panels[b-c-d-e]");
    assert_eq!(panel.origin, "net.skins[cloth].between");
    assert_eq!(panel.value, "4 corners, 9 m2 on plan, in east");
    assert_eq!(value("actions[ice].loads[0].ice.density_kg_per_m3").value, "900");
}

/// Area on plan within the edge ropes in the reference state (m²), by their nodes around the net.
fn within_the_edges(work: &Work, events: &[Event]) -> f64 {
    let positions = events.iter().find_map(|event| match event {
        Event::Columns(columns) if columns.name == "position_m" => Some(&columns.values),
        _ => None,
    });
    let positions = positions.expect("positions of the reference state");
    let at = |name: &str| {
        let index = work.brief.net.nodes().iter().position(|node| node.name == name);
        let index = index.expect("a node of the net");
        (positions[3 * index], positions[3 * index + 1])
    };
    let rim = ["W", "p1", "p2", "S", "p3", "p4", "E", "p5", "p6", "N", "p7", "p8"];
    (0..rim.len())
        .map(|k| {
            let ((x, y), (u, v)) = (at(rim[k]), at(rim[(k + 1) % rim.len()]));
            0.5 * (x * v - u * y)
        })
        .sum()
}

/// The realistic draft: sixteen panels, found although no inner node has coordinates, that fill its edges.
#[test]
fn the_realistic_draft_has_sixteen_panels() {
    let work = work(&quince_cloth());
    assert_eq!(work.brief.net.panels().len(), 16);
    // The check of movement covers the free corners of the skin: 9 inner nodes, 8 on the edges, and the mast heads.
    assert_eq!(work.brief.checks[0].nodes.len(), 19);
    let events = run(&work, &[]);
    let panels: Vec<&v1::PanelEntry> = events
        .iter()
        .filter_map(|event| match event {
            Event::Panels(part) => Some(&part.panels),
            _ => None,
        })
        .flatten()
        .collect();
    assert_eq!(panels.len(), 16);
    assert!(
        panels
            .iter()
            .all(|panel| panel.skin == "cloth" && panel.zones.len() == 1)
    );
    let on_plan: f64 = panels.iter().map(|panel| panel.area_on_plan_m2).sum();
    assert!((on_plan - within_the_edges(&work, &events)).abs() < 1e-10 * on_plan);
    let picture = |action: &str| {
        let found = events.iter().find_map(|event| match event {
            Event::LoadPicture(picture) if picture.action == action => Some(picture),
            _ => None,
        });
        found.expect("a picture of the action")
    };
    let snow = picture("snow");
    assert!((snow.force_n[2] + 520.0 * on_plan).abs() < 1e-9 * 520.0 * on_plan);
    assert!((snow.loaded_area_on_plan_m2 - on_plan).abs() < 1e-9 && snow.loaded_panels == 16);
    // The canopy is symmetric about x = 0, and the drift is heavier in the west by half.
    assert!(snow.point_m[0].abs() < 1e-6);
    assert!(picture("snow-west").point_m[0] < -0.5);
    let lift = picture("wind-lift");
    assert!(lift.force_n[2] > 0.0 && lift.pressure_pa.iter().all(|p| [-360.0, -225.0].contains(p)));
    assert!(lift.without_value.is_empty());
    let summary = events.iter().find_map(|event| match event {
        Event::Summary(summary) => Some(summary),
        _ => None,
    });
    let cautions = &summary.expect("a summary").cautions;
    assert!(cautions.iter().any(|caution| caution.contains("kins only pass load")));
}

/// The load is not what you think: zones that leave two panels of the north-east bare.
#[test]
fn panels_without_a_value_are_named_with_their_area() {
    let east = json!([0, -7, 9, -7, 9, 2.6, 3, 2.6, 3, 3, 0, 3]);
    let brief = changed(quince_cloth(), &[("/net/zones/1/outline_xy_m", east)]);
    let first = reading(&brief);
    let note = told(
        &first,
        Note,
        "PANELS_WITHOUT_VALUE",
        "actions[wind-lift].loads[0].on_surface.coefficients",
    );
    assert!(note.message.contains("about"), "{}", note.message);
    let events = run(&work(&brief), &[]);
    let doubt = events.iter().find_map(|event| match event {
        Event::Finding(finding) if finding.reason == "PANELS_WITHOUT_VALUE" => Some(finding),
        _ => None,
    });
    let doubt = doubt.expect("a doubt");
    assert_eq!(
        (doubt.severity(), doubt.id.as_str(), doubt.case.as_str()),
        (Doubt, "wind-lift", "reference")
    );
    assert_eq!(
        doubt.message,
        "action \"wind-lift\": coefficients for zones west, east cover 14 of 16 panels (103 of 114 m2 on plan). Without \
         value: N-n32-n33-p6, n33-p5-p6"
    );
    assert!(doubt.cure.contains("elsewhere"));
    let picture = events.iter().find_map(|event| match event {
        Event::LoadPicture(picture) if picture.action == "wind-lift" => Some(picture),
        _ => None,
    });
    let picture = picture.expect("a picture");
    assert_eq!((picture.loaded_panels, picture.without_value_total), (14, 2));
    assert_eq!(picture.without_value, ["N-n32-n33-p6", "n33-p5-p6"]);
    let mended = changed(brief, &[("/actions/3/loads/0/on_surface/elsewhere", json!(-0.5))]);
    let events = run(&work(&mended), &[]);
    assert!(
        !events.iter().any(
            |event| matches!(event, Event::Finding(f) if f.reason == "PANELS_WITHOUT_VALUE" && f.id == "wind-lift")
        )
    );
}

/// Loads and supports balance, in forces and in moments, in the reference state and in a case.
#[test]
fn sums_and_moments_of_loads_and_supports_balance() {
    let work = work(&quince_cloth());
    let plan = Plan::new(work.brief.clone());
    let go = &mut |_: &_| ControlFlow::Continue(());
    let found = plan.reference(go).expect("a reference state");
    let state = &found.result;
    let size = state.load_sum.norm();
    assert!(size > 1000.0);
    assert!((state.load_sum + state.support_sum).norm() < 1e-6 * size);
    assert!((state.load_moment + state.support_moment).norm() < 1e-5 * size);
    assert_eq!(state.panel_areas.len(), 16);
}

#[test]
fn ropes_whose_meshes_are_unclear() {
    // A rope across the two panels, without a node on the ridge.
    let across = json!(["rim", "ridge", "spare"]);
    let crossing = &[
        ("/net/cables/2/nodes", json!(["a", "d"])),
        ("/net/skins/0/between", across.clone()),
    ];
    let reading = reading(&changed(awning(), crossing));
    let error = told(&reading, Error, "MESHES_UNCLEAR", "net.skins[cloth].between");
    assert!(error.message.contains("\"ridge\" from b to e") && error.message.contains("\"spare\" from a to d"));
    // A rope that runs along two others.
    check(
        awning(),
        &[("/net/skins/0/between", across)],
        "MESHES_UNCLEAR",
        "net.skins[cloth].between",
    );
    let upright = &[("/net/nodes/4/xyz_m", json!([3, 0, 6]))];
    check(awning(), upright, "MESHES_UNCLEAR", "net.skins[cloth].between");
}

#[test]
fn skins_without_panels_and_loose_ropes() {
    let at = "net.skins[cloth].between";
    let open = &[("/net/skins/0/between", json!(["ridge", "spare"]))];
    check(awning(), open, "SKIN_WITHOUT_PANELS", at);
    let nothing = &[("/net/skins/0/between", json!([]))];
    check(awning(), nothing, "SKIN_WITHOUT_PANELS", at);
    let two = &[("/net/skins/-", json!({"id": "lining", "between": ["rim", "ridge"]}))];
    check(awning(), two, "PANEL_TWICE", "net.skins[lining].between");
    let tail = &[
        ("/net/nodes/-", json!({"id": "g", "xyz_m": [3, 6, 0], "support": {}})),
        ("/net/cables/1/nodes", json!(["b", "e", "g"])),
    ];
    check_mild(awning(), tail, Note, "ROPE_BOUNDS_NO_PANEL", at);
    let nodes = &[("/net/skins/0/between", json!(["a"]))];
    check(awning(), nodes, "WRONG_KIND", "net.skins[cloth].between[0]");
    let heavy = &[("/net/skins/0/mass_kg_per_m2", json!(-1))];
    check(awning(), heavy, "NEGATIVE", "net.skins[cloth].mass_kg_per_m2");
}

#[test]
fn zones_that_are_none() {
    let outline = "net.zones[west].outline_xy_m";
    for (value, reason) in [
        (json!([0, 0, 3, 0]), "WRONG_COUNT"),
        (json!([0, 0, 3, 0, 3]), "WRONG_COUNT"),
        (json!(vec![0.5; 2002]), "TOO_MANY"),
        (json!([0, 0, 3, 3, 3, 0, 0, 3]), "BAD_OUTLINE"),
        (json!([0, 0, 3, 0, 6, 0]), "BAD_OUTLINE"),
    ] {
        check(awning(), &[("/net/zones/0/outline_xy_m", value)], reason, outline);
    }
    check(
        awning(),
        &[("/net/zones/0/skin", json!("cloht"))],
        "UNKNOWN_ID",
        "net.zones[west].skin",
    );
    check(
        awning(),
        &[("/net/zones/0/skin", json!("rim"))],
        "WRONG_KIND",
        "net.zones[west].skin",
    );
    check(
        awning(),
        &[("/net/zones/0/skin", json!(""))],
        "MISSING",
        "net.zones[west].skin",
    );
    let away = &[("/net/zones/0/outline_xy_m", json!([-9, 0, -8, 0, -8, 1]))];
    check_mild(awning(), away, Doubt, "COVERS_NOTHING", outline);
}

#[test]
fn panels_given_one_by_one() {
    let pane = |nodes: Value| {
        [
            ("/net/skins/-", json!({"id": "glass", "mass_kg_per_m2": 25})),
            ("/net/panels", json!([{"id": "pane", "skin": "glass", "nodes": nodes}])),
        ]
    };
    let upright = work(&changed(awning(), &pane(json!(["a", "c", "d"]))));
    let net = &upright.brief.net;
    assert_eq!(net.panels()[2].name, "pane");
    assert_eq!(net.skins()[1].panels, [2]);
    let at = "net.panels[pane].nodes";
    check(awning(), &pane(json!(["a", "c"])), "WRONG_COUNT", at);
    check(
        awning(),
        &pane(json!(["a", "c", "a"])),
        "REPEATED_IN_LIST",
        &format!("{at}[2]"),
    );
    check(
        awning(),
        &pane(json!(["a", "c", "rim"])),
        "WRONG_KIND",
        &format!("{at}[2]"),
    );
    check(
        awning(),
        &pane(json!(["a", "c", "q"])),
        "UNKNOWN_ID",
        &format!("{at}[2]"),
    );
    check(
        awning(),
        &pane(json!(["f", "e", "b", "a"])),
        "PANEL_TWICE",
        "net.panels[pane]",
    );
    let skinless = &[("/net/panels", json!([{"id": "pane", "nodes": ["a", "c", "d"]}]))];
    check(awning(), skinless, "MISSING", "net.panels[pane].skin");
}

#[test]
fn pressures_that_cannot_act() {
    let snow = "/actions/1/loads/0/on_plan";
    let at = "actions[snow].loads[0].on_plan";
    let plan = |value: Value| [(snow, value)];
    check(
        awning(),
        &plan(json!({"on": [], "pressure_pa": 500})),
        "COVERS_NOTHING",
        &format!("{at}.on"),
    );
    check(
        awning(),
        &plan(json!({"on": ["rim"], "pressure_pa": 500})),
        "WRONG_KIND",
        &format!("{at}.on[0]"),
    );
    check(
        awning(),
        &plan(json!({"on": ["cloth"], "pressure_pa": "NaN"})),
        "NOT_FINITE",
        &format!("{at}.pressure_pa"),
    );
    check_mild(
        awning(),
        &plan(json!({"on": ["cloth"], "pressure_pa": 0.5})),
        Doubt,
        "UNIT_SLIP",
        &format!("{at}.pressure_pa"),
    );
    let wind = "/actions/2/loads/0/on_surface";
    let at = "actions[wind].loads[0].on_surface";
    let surface = |value: Value| [(wind, value)];
    for (value, reason, place) in [
        (json!({"pressure_pa": 400}), "COVERS_NOTHING", "coefficients"),
        (
            json!({"pressure_pa": 400, "coefficients": {"wset": 1}}),
            "UNKNOWN_ID",
            "coefficients[wset]",
        ),
        (
            json!({"pressure_pa": 400, "coefficients": {"rim": 1}}),
            "WRONG_KIND",
            "coefficients[rim]",
        ),
        (
            json!({"pressure_pa": 400, "coefficients": {"west": 1e9}}),
            "OUT_OF_RANGE",
            "coefficients[west]",
        ),
        (
            json!({"pressure_pa": "Infinity", "elsewhere": 1}),
            "NOT_FINITE",
            "pressure_pa",
        ),
        (
            json!({"pressure_pa": 400, "elsewhere": -1e9}),
            "OUT_OF_RANGE",
            "elsewhere",
        ),
    ] {
        check(awning(), &surface(value), reason, &format!("{at}.{place}"));
    }
    let wide = &[("/net/zones/1/outline_xy_m", json!([-1, -1, 7, -1, 7, 4, -1, 4]))];
    check(awning(), wide, "ZONES_CONTRADICT", &format!("{at}.coefficients"));
    let alike = [
        wide[0].clone(),
        (
            wind,
            json!({"pressure_pa": 400, "coefficients": {"west": -0.5, "east": -0.5}}),
        ),
    ];
    assert_eq!(errors(&reading(&changed(awning(), &alike))).count(), 0);
    // Without any skin, a pressure acts on nothing.
    let bare = json!({"on_surface": {"pressure_pa": 400, "elsewhere": 1}});
    check(
        terrace(),
        &[("/actions/1/loads/0", bare)],
        "COVERS_NOTHING",
        "actions[snow].loads[0].on_surface.coefficients",
    );
    let under = &[("/prestress/under", json!(["wind"]))];
    check(awning(), under, "UNDER_NOT_DEAD", "prestress.under[0]");
}

#[test]
fn wind_and_ice_on_ropes_that_cannot_act() {
    let at = "actions[gale].loads[0].wind_on_ropes";
    let gale = |field: &str, value: Value| [(format!("/actions/3/loads/0/wind_on_ropes/{field}"), value)];
    for (field, value, reason, place) in [
        ("on", json!([]), "COVERS_NOTHING", "on"),
        ("on", json!(["spare"]), "NO_DIAMETER", "on"),
        ("on", json!(["cloth"]), "WRONG_KIND", "on[0]"),
        ("along", json!([0, 0, 0]), "ZERO_DIRECTION", "along"),
        ("along", json!([1, 0]), "WRONG_COUNT", "along"),
        ("pressure_pa", json!(-600), "NEGATIVE", "pressure_pa"),
        ("drag_coefficient", json!(0), "NOT_POSITIVE", "drag_coefficient"),
    ] {
        let changes = gale(field, value);
        let changes: Vec<(&str, Value)> = changes.iter().map(|(p, v)| (p.as_str(), v.clone())).collect();
        check(awning(), &changes, reason, &format!("{at}.{place}"));
    }
    let at = "actions[ice].loads[0].ice";
    let ice = "/actions/4/loads/0/ice";
    for (value, reason, place) in [
        (json!({"thickness_m": 0, "on": ["rim"]}), "NOT_POSITIVE", "thickness_m"),
        (json!({"thickness_m": 0.02, "on": ["spare"]}), "NO_DIAMETER", "on"),
        (
            json!({"thickness_m": 0.02, "density_kg_per_m3": -900, "on": ["rim"]}),
            "NOT_POSITIVE",
            "density_kg_per_m3",
        ),
    ] {
        check(awning(), &[(ice, value)], reason, &format!("{at}.{place}"));
    }
    check_mild(
        awning(),
        &[(ice, json!({"thickness_m": 2, "on": ["rim"]}))],
        Doubt,
        "UNIT_SLIP",
        &format!("{at}.thickness_m"),
    );
    let under = &[("/prestress/under", json!(["gale"]))];
    check(awning(), under, "UNDER_NOT_DEAD", "prestress.under[0]");
}

/// A frozen brief keeps its skins, zones and panels, and finds the same panels again.
#[test]
fn freezing_keeps_the_surface() {
    let work = work(&quince_cloth());
    let plan = Plan::new(work.brief.clone());
    let found = plan.reference(&mut |_| ControlFlow::Continue(()));
    let parts = ropewalk_service::encode::freeze(&work, &plan, &found).expect("a frozen brief");
    let mut frozen = v1::Brief::default();
    for part in parts {
        if let Some(v1::freeze_response::Part::Brief(part)) = part.part {
            use prost::Message as _;
            frozen.merge(part.encode_to_vec().as_slice()).expect("parts merge");
        }
    }
    let again = ropewalk_service::decode::read(frozen, &crate::briefs::LIMITS);
    let again = again.work.expect("no errors");
    let names = |work: &ropewalk_service::decode::Work| -> Vec<String> {
        work.brief.net.panels().iter().map(|panel| panel.name.clone()).collect()
    };
    let (mut before, mut after) = (names(&work), names(&again));
    before.sort();
    after.sort();
    assert_eq!(before.len(), after.len());
    assert_eq!(again.brief.net.zones().len(), 2);
}

/// A case that gathers water: read, told in words, answered with its ponds.
#[test]
fn ponding_is_read_and_told() {
    let wet = changed(
        quince_cloth(),
        &[("/cases/1/ponding", json!({"density_kg_per_m3": 998}))],
    );
    let work = work(&wet);
    assert_eq!(work.brief.cases[1].ponding.map(|given| given.density), Some(998.0));
    assert!(work.in_words(1).ends_with("+ ponding water"));
    let events = run(&work, &[1]);
    let closing = events.iter().find_map(|event| match event {
        Event::CaseSummary(closing) if closing.case == "storm-snow" => Some(closing),
        _ => None,
    });
    let ponding = closing
        .and_then(|closing| closing.ponding.as_ref())
        .expect("it was asked for");
    assert_eq!(ponding.end(), v1::PondingEnd::Settled);
    assert!((ponding.mass_kg - 998.0 * ponding.volume_m3).abs() < 1e-9);
    assert_eq!(ponding.ponds.len(), ponding.ponds_total as usize);
}

#[test]
fn ponding_that_cannot_be() {
    let given = |value: Value| [("/cases/0/ponding", value)];
    let base = awning();
    check(
        base.clone(),
        &given(json!({"density_kg_per_m3": 0})),
        "NOT_POSITIVE",
        "cases[all].ponding.density_kg_per_m3",
    );
    let path = [("/cases/0/ponding", json!({})), ("/cases/0/path", json!({}))];
    check(base, &path, "PONDING_WITH_PATH", "cases[all].ponding");
    check(terrace(), &given(json!({})), "COVERS_NOTHING", "cases[snowed].ponding");
}
