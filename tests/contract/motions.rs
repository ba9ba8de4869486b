//! Motions in time: how they are read, what is refused of them, what is told of them.

use std::f64::consts::PI;

use nalgebra::Vector3;
use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{
    BreakGiven, DampingGiven, DrivenGiven, DrivenWhat, MotionGiven, SpectraGiven, StartGiven, Watched,
};
use ropewalk_numerics::model::{CableId, NodeId, SegmentId};
use ropewalk_numerics::motion::MassGiven;
use ropewalk_numerics::motion::transient::{BreakWhen, Frames, History, Scheme};
use ropewalk_service::decode::Work;
use serde_json::{Value, json};
use v1::FindingSeverity::{Doubt, Error, Note};

use crate::briefs::{LIMITS, changed, errors, message, quince_cloth, reading, terrace};
use crate::violations::told;

/// The work of a brief without errors.
#[track_caller]
fn work(json: &Value) -> Work {
    let read = reading(json);
    let errors: Vec<_> = errors(&read).collect();
    assert!(errors.is_empty(), "{errors:#?}");
    read.work.expect("no errors, so there is work")
}

/// The one motion of a brief.
#[track_caller]
fn motion(json: &Value) -> MotionGiven {
    let mut motions = work(json).brief.motions;
    assert_eq!(motions.len(), 1);
    motions.remove(0)
}

/// A motion of the terrace that nothing is odd about.
fn calm() -> Value {
    json!({
        "id": "drift", "duration_s": 10, "step_s": 0.01,
        "driven": [{"action": "snow", "ramp": {"start_s": 1, "end_s": 3, "after": 0.5}}],
        "damping": {"ratio": {"ratio": 0.01, "low_hz": 1, "high_hz": 5}}
    })
}

fn with(base: Value, motion: Value) -> Value {
    changed(base, &[("/motions", json!([motion]))])
}

/// The terrace with a calm motion that has other values at some places.
fn drifting(changes: &[(&str, Value)]) -> Value {
    with(terrace(), changed(calm(), changes))
}

/// The cloth of the courtyard in a gust of wind.
fn gusty(wind: Value) -> Value {
    let motion = json!({
        "id": "gust", "duration_s": 4, "step_s": 0.01,
        "driven": [{"wind": wind, "table": {"values": [0, 20, 0], "every_s": 2}}]
    });
    with(quince_cloth(), motion)
}

/// One kind of error, at this place.
#[track_caller]
fn check(brief: &Value, reason: &str, path: &str) -> v1::Finding {
    let read = reading(brief);
    let found = told(&read, Error, reason, path).clone();
    assert!(read.work.is_none());
    let others: Vec<_> = errors(&read).filter(|error| error.reason != reason).collect();
    assert!(others.is_empty(), "also {others:#?}");
    found
}

/// A doubt or a note at this place, while the work can be done.
#[track_caller]
fn check_mild(brief: &Value, severity: v1::FindingSeverity, reason: &str, path: &str) -> v1::Finding {
    let read = reading(brief);
    let found = told(&read, severity, reason, path).clone();
    assert!(read.work.is_some(), "{:#?}", errors(&read).collect::<Vec<_>>());
    found
}

#[track_caller]
fn node(work: &Work, name: &str) -> NodeId {
    let nodes = work.brief.net.nodes();
    NodeId::new(nodes.iter().position(|node| node.name == name).expect("a node"))
}

#[test]
fn the_calm_motion_is_in_order() {
    let told = |brief: &Value| {
        let mut findings = reading(brief).findings;
        findings.retain(|finding| finding.severity() != Note || finding.path.starts_with("motions"));
        findings
    };
    assert_eq!(told(&drifting(&[])), Vec::new());
    let still = told(&gusty(json!({"along": [0, 1, 0], "elsewhere": 0.4})));
    assert!(still.is_empty(), "{still:#?}");
}

#[test]
fn defaults_are_used_and_told() {
    let read = reading(&drifting(&[]));
    let has = |path: &str, value: &str| {
        let found = read.resolved.iter().find(|r| r.path == path);
        let found = found.unwrap_or_else(|| panic!("no {path} in {:#?}", read.resolved));
        assert_eq!((found.value.as_str(), found.origin.as_str()), (value, "default"));
    };
    has("motions[drift].from", "reference");
    has("motions[drift].generalised_alpha", "with its defaults");
    has("motions[drift].frames.every_steps", "5");
    has("motions[drift].compare_with", "at rest under what acts at the end");
    let (mass, stiffness) = DampingGiven::rayleigh(0.01, [1.0, 5.0]);
    assert_eq!(
        motion(&drifting(&[])),
        MotionGiven {
            name: "drift".to_owned(),
            from: None,
            duration: 10.0,
            step: 0.01,
            scheme: Scheme::GeneralisedAlpha {
                spectral_radius: 0.8,
                error: None
            },
            driven: vec![DrivenGiven {
                what: DrivenWhat::Action(1),
                history: History::Ramp {
                    start: 1.0,
                    end: 3.0,
                    before: 0.0,
                    after: 0.5
                }
            }],
            breaks: Vec::new(),
            damping: DampingGiven {
                mass,
                stiffness,
                segments: Vec::new()
            },
            start: StartGiven::default(),
            masses: MassGiven::default(),
            frames: Frames {
                stride: 5,
                nodes: Vec::new(),
                cables: Vec::new()
            },
            watched: Vec::new(),
            spectra: None,
            compare_with: None,
            pieces_of_hanging: 16,
        }
    );
    // About two hundred frames, however many steps there are.
    for (step, stride) in [(10.0, 1), (0.04, 1), (0.02, 3), (1e-4, 500)] {
        assert_eq!(
            motion(&drifting(&[
                ("/step_s", json!(step)),
                ("/driven/0", json!({"action": "snow", "constant": 1}))
            ]))
            .frames
            .stride,
            stride
        );
    }
    // Defaults within parts.
    let brief = drifting(&[
        ("/generalised_alpha", json!({})),
        ("/driven/0", json!({"action": "snow", "step": {"after": 1}})),
        (
            "/driven/-",
            json!({"action": "snow", "table": {"values": [0, 1], "every_s": 10}}),
        ),
        (
            "/driven/-",
            json!({"action": "snow", "harmonic": {"amplitude": 0.1, "frequency_hz": 1}}),
        ),
        (
            "/watched",
            json!([{"id": "sag", "movement": {"node": "m", "along": [0, 0, -2]}}]),
        ),
        ("/spectra", json!({})),
    ]);
    let given = motion(&brief);
    assert_eq!(
        given.driven[0].history,
        History::Step {
            at: 0.0,
            before: 0.0,
            after: 1.0
        }
    );
    assert_eq!(given.driven[1].history, History::Table(vec![(0.0, 0.0), (10.0, 1.0)]));
    let History::Harmonic {
        mean,
        phase,
        start,
        end,
        ..
    } = given.driven[2].history
    else {
        panic!("{given:#?}")
    };
    assert_eq!((mean, phase, start), (0.0, 0.0, 0.0));
    assert!(end > given.duration, "with the motion, and without a jump at its end");
    assert_eq!(given.spectra, Some(SpectraGiven { from: 0.0, up_to: None }));
    let read = reading(&brief);
    for (path, value) in [
        ("generalised_alpha.spectral_radius", "0.8"),
        ("generalised_alpha.error_m", "equal steps"),
        ("driven[0].step.at_s", "0"),
        ("driven[1].table.from_s", "0"),
        ("driven[2].harmonic.end_s", "with the motion"),
        ("spectra.from_s", "0"),
        ("spectra.up_to_hz", "half of one over the step"),
    ] {
        let path = format!("motions[drift].{path}");
        let found = read.resolved.iter().find(|r| r.path == path);
        assert_eq!(found.map(|r| r.value.as_str()), Some(value), "{path}");
    }
    let gust = reading(&gusty(json!({"along": [0, 1, 0], "elsewhere": 0.4})));
    let density = gust
        .resolved
        .iter()
        .find(|r| r.path == "motions[gust].driven[0].wind.air_density_kg_per_m3");
    assert_eq!(density.map(|r| r.value.as_str()), Some("1.25"));
}

#[test]
fn a_motion_with_everything_is_read_as_meant() {
    let base = changed(
        terrace(),
        &[
            ("/net/cables/2/hangs", json!({})),
            (
                "/motions",
                json!([{
                    "id": "storm", "from": "iced", "note": "invented", "duration_s": 20, "step_s": 0.01,
                    "generalised_alpha": {"spectral_radius": 0.5, "error_m": 1e-4, "note": "n"},
                    "driven": [
                        {"action": "snow", "table": {"values": [0, 1, -1, 0], "times_s": [0, 2, 2, 30], "note": "n"}},
                        {"action": "snow", "table": {"values": [1, 2, 0], "every_s": 10, "from_s": 5}},
                        {"action": "snow", "step": {"at_s": 4, "before": 1, "after": 2}},
                        {"action": "snow", "harmonic": {"mean": 1, "amplitude": 0.5, "frequency_hz": 2, "phase_deg": 90,
                         "start_s": 1, "end_s": 9}},
                        {"action": "creep", "ramp": {"start_s": 0, "end_s": 3, "before": 0, "after": 1}, "note": "n"},
                        {"action": "snow", "constant": 0.25}
                    ],
                    "breaks": [
                        {"member": "g1", "at_s": 0, "release_s": 0.02, "note": "n"},
                        {"segment": {"cable": "carrying", "from": "A", "to": "m"}, "at_tension_n": 50e3},
                        {"member": "post", "at_s": 19.9}
                    ],
                    "damping": {"factors": {"mass_per_s": 0.3}, "ropes": [
                        {"on": ["saddle"], "force_per_strain_rate_n_s": 2e4},
                        {"on": ["bracing", "post"], "force_per_strain_rate_n_s": 1e3}]},
                    "start": {"shape_of": "snowed", "moved": [{"on": ["m"], "by_m": [0, 0.1, 0]}],
                        "velocities": [{"on": ["A", "m"], "velocity_m_per_s": [1, 0, 0]},
                                       {"on": ["D"], "velocity_m_per_s": [0, 0, 0.5]}]},
                    "added": [{"on": ["m"], "mass_kg": 80}, {"on": ["bracing"], "mass_per_length_kg_per_m": 0.2}],
                    "frames": {"every_steps": 7, "nodes": ["m", "corner"], "ropes": ["saddle"]},
                    "watched": [
                        {"id": "a", "movement": {"node": "m", "along": [0, 0, -3]}},
                        {"id": "b", "velocity": {"node": "m", "along": [3, 4, 0]}},
                        {"id": "c", "acceleration": {"node": "m", "along": [0, 1, 0]}},
                        {"id": "d", "tension": {"cable": "bracing", "from": "m", "to": "D"}},
                        {"id": "e", "largest_tension": "carrying"},
                        {"id": "f", "support_force": {"node": "G1", "along": [1, 0, 0]}}
                    ],
                    "spectra": {"from_s": 5, "up_to_hz": 20},
                    "compare_with": "snowed", "pieces_of_hanging": 8
                }]),
            ),
        ],
    );
    let work = work(&base);
    let node = |name: &str| node(&work, name);
    let segment = |place| SegmentId::new(place);
    let snow = |history| DrivenGiven {
        what: DrivenWhat::Action(1),
        history,
    };
    let given = &work.brief.motions[0];
    let expected = MotionGiven {
        name: "storm".to_owned(),
        from: Some(1),
        duration: 20.0,
        step: 0.01,
        scheme: Scheme::GeneralisedAlpha {
            spectral_radius: 0.5,
            error: Some(1e-4),
        },
        driven: vec![
            snow(History::Table(vec![(0.0, 0.0), (2.0, 1.0), (2.0, -1.0), (30.0, 0.0)])),
            snow(History::Table(vec![(5.0, 1.0), (15.0, 2.0), (25.0, 0.0)])),
            snow(History::Step {
                at: 4.0,
                before: 1.0,
                after: 2.0,
            }),
            snow(History::Harmonic {
                mean: 1.0,
                amplitude: 0.5,
                frequency: 2.0,
                phase: PI / 2.0,
                start: 1.0,
                end: 9.0,
            }),
            DrivenGiven {
                what: DrivenWhat::Action(4),
                history: History::Ramp {
                    start: 0.0,
                    end: 3.0,
                    before: 0.0,
                    after: 1.0,
                },
            },
            snow(History::Constant(0.25)),
        ],
        breaks: vec![
            BreakGiven {
                segments: vec![segment(4)],
                when: BreakWhen::Time(0.0),
                release: 0.02,
            },
            BreakGiven {
                segments: vec![segment(0)],
                when: BreakWhen::Tension(50e3),
                release: 0.0,
            },
            BreakGiven {
                segments: vec![segment(6)],
                when: BreakWhen::Time(19.9),
                release: 0.0,
            },
        ],
        damping: DampingGiven {
            mass: 0.3,
            stiffness: 0.0,
            segments: [(0, 2e4), (1, 2e4), (2, 2e4), (3, 2e4), (2, 1e3), (3, 1e3), (6, 1e3)]
                .map(|(place, force)| (segment(place), force))
                .to_vec(),
        },
        start: StartGiven {
            shape_of: Some(0),
            moved: vec![(node("m"), Vector3::new(0.0, 0.1, 0.0))],
            velocities: vec![
                (node("A"), Vector3::x()),
                (node("m"), Vector3::x()),
                (node("D"), 0.5 * Vector3::z()),
            ],
        },
        masses: MassGiven {
            nodes: vec![(node("m"), 80.0)],
            segments: vec![(segment(2), 0.2), (segment(3), 0.2)],
            ..MassGiven::default()
        },
        frames: Frames {
            stride: 7,
            nodes: vec![node("m"), node("C")],
            cables: vec![CableId::new(0), CableId::new(1)],
        },
        watched: vec![
            Watched::Movement {
                node: node("m"),
                along: -Vector3::z(),
            },
            Watched::Velocity {
                node: node("m"),
                along: Vector3::new(0.6, 0.8, 0.0),
            },
            Watched::Acceleration {
                node: node("m"),
                along: Vector3::y(),
            },
            Watched::AxialForce { segment: segment(3) },
            Watched::LargestForce {
                segments: vec![segment(0), segment(1)],
            },
            Watched::SupportForce {
                node: node("G1"),
                along: Vector3::x(),
            },
        ],
        spectra: Some(SpectraGiven {
            from: 5.0,
            up_to: Some(20.0),
        }),
        compare_with: Some(0),
        pieces_of_hanging: 8,
    };
    assert_eq!(*given, expected);
    assert_eq!(
        work.motion_in_words(0),
        "from iced: let go from the shape of snowed; 1 node moved; 3 nodes set off with a velocity; 1 snow by a table; \
         2 snow by a table; 1 snow, from 4 s on 2; 1 +-0.5 snow at 2 Hz; creep from 0 at 0 s to 1 at 3 s; 0.25 snow \
         throughout; g1 breaks at 0 s within 0.02 s; carrying from A to m breaks at 50 kN; post breaks at 19.9 s"
    );
    for (scheme, expected) in [
        ("energy_conserving", Scheme::Conserving { error: None }),
        ("central_differences", Scheme::CentralDifferences),
    ] {
        assert_eq!(
            motion(&drifting(&[(&format!("/{scheme}"), json!({}))])).scheme,
            expected
        );
    }
}

#[test]
fn wind_is_read_panel_by_panel() {
    let wind = json!({"along": [0, 2, 0], "coefficients": {"west": -0.8, "cloth": 0.3}, "air_density_kg_per_m3": 1.1});
    let work = work(&gusty(wind));
    let given = &work.brief.motions[0];
    let DrivenWhat::Wind {
        coefficients,
        density,
        along,
    } = &given.driven[0].what
    else {
        panic!("{given:#?}")
    };
    assert_eq!((*density, *along), (1.1, Vector3::y()));
    let panels = work.brief.net.panels();
    assert_eq!(coefficients.len(), panels.len());
    // West of the middle the zone holds, which its corners show: p1 is one of a panel there, p4 of one in the east.
    for (corner, expected) in [("p1", -0.8), ("p4", 0.3)] {
        let corner = node(&work, corner);
        let touching = panels
            .iter()
            .zip(coefficients)
            .filter(|(panel, _)| panel.corners.contains(&corner));
        let values: Vec<f64> = touching.map(|(_, value)| *value).collect();
        assert!(
            !values.is_empty() && values.iter().all(|value| *value == expected),
            "{values:?}"
        );
    }
    assert_eq!(work.motion_in_words(0), "from reference: 20 m/s wind by a table");
}

#[test]
fn wind_that_makes_no_sense_is_told() {
    let at = |field: &str| format!("motions[gust].driven[0].wind{field}");
    let good = || json!({"along": [0, 1, 0], "elsewhere": 0.4});
    for (wind, reason, field) in [
        (json!({"along": [0, 0, 0], "elsewhere": 1}), "ZERO_DIRECTION", ".along"),
        (json!({"along": [0, 1], "elsewhere": 1}), "WRONG_COUNT", ".along"),
        (
            json!({"along": [0, "NaN", 1], "elsewhere": 1}),
            "NOT_FINITE",
            ".along[1]",
        ),
        (json!({"along": [0, 1, 0]}), "COVERS_NOTHING", ".coefficients"),
        (
            json!({"along": [0, 1, 0], "coefficients": {"vest": 1}}),
            "UNKNOWN_ID",
            ".coefficients[vest]",
        ),
        (
            json!({"along": [0, 1, 0], "coefficients": {"c1": 1}}),
            "WRONG_KIND",
            ".coefficients[c1]",
        ),
        (
            json!({"along": [0, 1, 0], "coefficients": {"west": "Infinity"}}),
            "NOT_FINITE",
            ".coefficients[west]",
        ),
        (
            json!({"along": [0, 1, 0], "elsewhere": 1e4}),
            "OUT_OF_RANGE",
            ".elsewhere",
        ),
        (
            json!({"along": [0, 1, 0], "elsewhere": 1, "air_density_kg_per_m3": 0}),
            "NOT_POSITIVE",
            ".air_density_kg_per_m3",
        ),
        (
            json!({"along": [0, 1, 0], "elsewhere": 1, "air_density_kg_per_m3": 101}),
            "OUT_OF_RANGE",
            ".air_density_kg_per_m3",
        ),
    ] {
        check(&gusty(wind), reason, &at(field));
    }
    // A net without panels.
    let wind = json!({"wind": good(), "constant": 20});
    check(
        &drifting(&[("/driven/0", wind)]),
        "COVERS_NOTHING",
        "motions[drift].driven[0].wind.coefficients",
    );
    // Two zones over each other.
    let both = json!({"id": "wide", "skin": "cloth", "outline_xy_m": [-9, -7, 9, -7, 9, 7, -9, 7]});
    let wind = json!({"along": [0, 1, 0], "coefficients": {"west": 1, "wide": 0.5}});
    let brief = changed(gusty(wind), &[("/net/zones/-", both)]);
    check(&brief, "ZONES_CONTRADICT", &at(".coefficients"));
    // Panels without wind.
    let wind = json!({"along": [0, 1, 0], "coefficients": {"west": 1}});
    let found = check_mild(&gusty(wind), Doubt, "PANELS_WITHOUT_VALUE", &at(".coefficients"));
    assert!(
        found
            .message
            .starts_with("motion \"gust\": coefficients for zones west cover"),
        "{found:#?}"
    );
    // Speeds.
    let table = "/motions/0/driven/0/table";
    let still = changed(gusty(good()), &[(table, json!({"values": [0, 0], "every_s": 4}))]);
    check_mild(&still, Note, "HISTORY_ZERO", "motions[gust].driven[0].table");
    let fast = changed(gusty(good()), &[(table, json!({"values": [0, 150], "every_s": 4}))]);
    check_mild(&fast, Doubt, "UNIT_SLIP", "motions[gust].driven[0].table");
    let fast = changed(gusty(good()), &[(table, json!({"values": [0, 1500], "every_s": 4}))]);
    check(&fast, "OUT_OF_RANGE", "motions[gust].driven[0].table.values[1]");
}

#[test]
fn ids_and_states_are_told() {
    for (id, reason) in [
        ("", "BAD_ID"),
        ("a/b", "BAD_ID"),
        ("reference", "RESERVED_ID"),
        ("envelope", "RESERVED_ID"),
        ("snowed", "DUPLICATE_ID"),
        ("winter", "DUPLICATE_ID"),
    ] {
        check(&drifting(&[("/id", json!(id))]), reason, "motions[0].id");
    }
    let twice = changed(terrace(), &[("/motions", json!([calm(), calm()]))]);
    check(&twice, "DUPLICATE_ID", "motions[1].id");
    for (field, value, reason, meant) in [
        ("from", "snowd", "UNKNOWN_ID", "\"snowed\""),
        ("from", "winter", "WRONG_KIND", "set"),
        ("compare_with", "sumer", "UNKNOWN_ID", "\"summer\""),
        ("compare_with", "service", "WRONG_KIND", "set"),
        ("compare_with", "reference", "UNKNOWN_ID", "case"),
        ("start/shape_of", "snowd", "UNKNOWN_ID", "\"snowed\""),
        ("start/shape_of", "winter", "WRONG_KIND", "set"),
    ] {
        let brief = drifting(&[("/start", json!({})), (&format!("/{field}"), json!(value))]);
        let found = check(&brief, reason, &format!("motions[drift].{}", field.replace('/', ".")));
        assert!(found.message.contains(meant) && found.id == value, "{found:#?}");
    }
    assert_eq!(motion(&drifting(&[("/from", json!("reference"))])).from, None);
    let same = drifting(&[("/from", json!("iced")), ("/start", json!({"shape_of": "iced"}))]);
    check_mild(&same, Doubt, "DATA_NOT_USED", "motions[drift].start.shape_of");
}

/// A motion is neither a design effect nor started from one.
#[test]
fn design_effects_are_no_states() {
    let loss = json!([{"set": "loss", "accidental": {"remove_each": ["guy"], "effect_factor": 1.5}}]);
    let factors =
        json!({"source": "example", "classes": [{"id": "permanent", "permanent": {"adverse": 1.35, "favourable": 1}}]});
    let base = |changes: &[(&str, Value)]| {
        changed(
            drifting(changes),
            &[("/combinations", loss.clone()), ("/factors", factors.clone())],
        )
    };
    let effect = work(&base(&[])).brief.effects[0].name.clone();
    check(&base(&[("/id", json!(effect))]), "DUPLICATE_ID", "motions[0].id");
    let found = check(&base(&[("/from", json!(effect))]), "WRONG_KIND", "motions[drift].from");
    assert!(found.message.contains("design effect"), "{found:#?}");
    // Cases that rules make are states.
    let made = work(&base(&[]))
        .brief
        .cases
        .iter()
        .position(|case| case.name.starts_with("loss-"))
        .expect("a case");
    let name = work(&base(&[])).brief.cases[made].name.clone();
    let given = motion(&base(&[
        ("/from", json!(name)),
        ("/compare_with", json!(name)),
        ("/breaks", json!([])),
    ]));
    assert_eq!((given.from, given.compare_with), (Some(made), Some(made)));
}

#[test]
fn numbers_out_of_bounds_are_told() {
    for (pointer, value, reason, path) in [
        ("/duration_s", json!(0), "NOT_POSITIVE", "duration_s"),
        ("/duration_s", json!("Infinity"), "NOT_FINITE", "duration_s"),
        ("/duration_s", json!(2e6), "OUT_OF_RANGE", "duration_s"),
        ("/step_s", json!(-0.1), "NOT_POSITIVE", "step_s"),
        ("/step_s", json!("NaN"), "NOT_FINITE", "step_s"),
        ("/step_s", json!(11), "OUT_OF_RANGE", "step_s"),
        (
            "/generalised_alpha",
            json!({"spectral_radius": 1.1}),
            "OUT_OF_RANGE",
            "generalised_alpha.spectral_radius",
        ),
        (
            "/generalised_alpha",
            json!({"spectral_radius": -0.1}),
            "OUT_OF_RANGE",
            "generalised_alpha.spectral_radius",
        ),
        (
            "/generalised_alpha",
            json!({"error_m": 0}),
            "NOT_POSITIVE",
            "generalised_alpha.error_m",
        ),
        (
            "/generalised_alpha",
            json!({"error_m": 1e4}),
            "OUT_OF_RANGE",
            "generalised_alpha.error_m",
        ),
        ("/air_mass_kg_per_m2", json!(-1), "NEGATIVE", "air_mass_kg_per_m2"),
        ("/pieces_of_hanging", json!(1), "OUT_OF_RANGE", "pieces_of_hanging"),
        ("/pieces_of_hanging", json!(1001), "OUT_OF_RANGE", "pieces_of_hanging"),
        ("/added", json!([{"on": ["m"]}]), "MISSING", "added[0]"),
        (
            "/added",
            json!([{"on": ["m"], "mass_kg": -1}]),
            "NEGATIVE",
            "added[0].mass_kg",
        ),
        ("/added", json!([{"mass_kg": 1}]), "COVERS_NOTHING", "added[0].on"),
        (
            "/frames",
            json!({"every_steps": 0}),
            "OUT_OF_RANGE",
            "frames.every_steps",
        ),
        ("/frames", json!({"nodes": ["mm"]}), "UNKNOWN_ID", "frames.nodes[0]"),
        (
            "/frames",
            json!({"nodes": ["carrying"]}),
            "WRONG_KIND",
            "frames.nodes[0]",
        ),
        ("/frames", json!({"ropes": ["post"]}), "WRONG_KIND", "frames.ropes[0]"),
        (
            "/frames",
            json!({"ropes": ["saddle", "saddle"]}),
            "REPEATED_IN_LIST",
            "frames.ropes[1]",
        ),
    ] {
        check(
            &drifting(&[(pointer, value)]),
            reason,
            &format!("motions[drift].{path}"),
        );
    }
    check_mild(
        &drifting(&[("/pieces_of_hanging", json!(8))]),
        Doubt,
        "DATA_NOT_USED",
        "motions[drift].pieces_of_hanging",
    );
    check_mild(
        &drifting(&[("/air_mass_kg_per_m2", json!(1))]),
        Doubt,
        "DATA_NOT_USED",
        "motions[drift].air_mass_kg_per_m2",
    );
}

#[test]
fn everything_that_is_wrong_is_told_at_once() {
    let motion = json!({
        "id": "reference", "from": "nowhere", "duration_s": -1, "step_s": 0,
        "driven": [{}, {"action": "snw", "ramp": {"start_s": 2, "end_s": 1}}], "breaks": [{}],
        "damping": {"factors": {"mass_per_s": -1}}, "start": {"moved": [{}]}, "watched": [{"id": ""}],
        "frames": {"every_steps": 0}, "spectra": {"up_to_hz": -1}, "compare_with": "never"
    });
    let read = reading(&with(terrace(), motion));
    for (reason, path) in [
        ("RESERVED_ID", "motions[0].id"),
        ("UNKNOWN_ID", "from"),
        ("NOT_POSITIVE", "duration_s"),
        ("NOT_POSITIVE", "step_s"),
        ("MISSING", "driven[0]"),
        ("UNKNOWN_ID", "driven[1].action"),
        ("TIMES_OUT_OF_ORDER", "driven[1].ramp.end_s"),
        ("MISSING", "breaks[0]"),
        ("NEGATIVE", "damping.factors.mass_per_s"),
        ("WRONG_COUNT", "start.moved[0].by_m"),
        ("COVERS_NOTHING", "start.moved[0].on"),
        ("BAD_ID", "watched[0].id"),
        ("MISSING", "watched[0]"),
        ("OUT_OF_RANGE", "frames.every_steps"),
        ("NOT_POSITIVE", "spectra.up_to_hz"),
        ("UNKNOWN_ID", "compare_with"),
    ] {
        let path = if path.starts_with("motions") {
            path.to_owned()
        } else {
            format!("motions[reference].{path}")
        };
        told(&read, Error, reason, &path);
    }
}

#[test]
fn motions_that_are_too_large_are_told_with_their_size() {
    let constant = ("/driven/0", json!({"action": "snow", "constant": 1}));
    let found = check(
        &drifting(&[("/duration_s", json!(1e4)), ("/step_s", json!(1e-5)), constant.clone()]),
        "TOO_MANY",
        "motions[drift].step_s",
    );
    assert_eq!(found.value, "1e9");
    assert!(found.message.contains("1e9 steps, 278 hours"), "{found:#?}");
    assert!(
        found.cure.contains("step_s at least 1e-4") || found.cure.contains("step_s at least 0.0001"),
        "{found:#?}"
    );
    // Just as many as may be.
    let most = drifting(&[("/duration_s", json!(1e4)), ("/step_s", json!(1e-4)), constant.clone()]);
    assert_eq!(motion(&most).frames.stride, 500_000);
    let each = [
        ("/duration_s", json!(1e4)),
        ("/step_s", json!(1e-3)),
        constant,
        (
            "/frames",
            json!({"every_steps": 1, "nodes": ["m", "A"], "ropes": ["saddle"]}),
        ),
    ];
    // 10 000 001 frames: 80 bytes, two nodes of six numbers, two ropes of three points with seven and two segments with two.
    let found = check(&drifting(&each), "TOO_LARGE", "motions[drift].frames");
    assert!(found.message.contains("of 576 bytes each"), "{found:#?}");
    let stride: u32 = found
        .cure
        .split(' ')
        .find_map(|word| word.trim_end_matches(',').parse().ok())
        .expect("a number");
    let mut fits = each.clone();
    fits[3].1["every_steps"] = json!(stride);
    assert_eq!(motion(&drifting(&fits)).frames.stride, u64::from(stride));
    fits[3].1["every_steps"] = json!(stride - 1);
    check(&drifting(&fits), "TOO_LARGE", "motions[drift].frames");
    let many: Vec<Value> = (0..101)
        .map(|place| changed(calm(), &[("/id", json!(format!("m{place}")))]))
        .collect();
    check(&changed(terrace(), &[("/motions", json!(many))]), "TOO_MANY", "motions");
    let many: Vec<Value> = many[..100].to_vec();
    assert_eq!(
        work(&changed(terrace(), &[("/motions", json!(many))]))
            .brief
            .motions
            .len(),
        100
    );
}

#[test]
fn histories_that_make_no_sense_are_told() {
    for (history, reason, field) in [
        (json!({"constant": "NaN"}), "NOT_FINITE", ".constant"),
        (json!({"constant": 1e7}), "OUT_OF_RANGE", ".constant"),
        (json!({"table": {}}), "MISSING", ".table.values"),
        (json!({"table": {"values": [1, 2]}}), "MISSING", ".table.every_s"),
        (
            json!({"table": {"values": [1, 2], "every_s": 0}}),
            "NOT_POSITIVE",
            ".table.every_s",
        ),
        (
            json!({"table": {"values": [1, "NaN"], "every_s": 10}}),
            "NOT_FINITE",
            ".table.values[1]",
        ),
        (
            json!({"table": {"values": [1], "every_s": 1, "from_s": "Infinity"}}),
            "NOT_FINITE",
            ".table.from_s",
        ),
        (
            json!({"table": {"values": [1, 2], "times_s": [0]}}),
            "WRONG_COUNT",
            ".table.times_s",
        ),
        (
            json!({"table": {"values": [1, 2], "times_s": [0, 10], "every_s": 1}}),
            "TIMES_TWICE",
            ".table.every_s",
        ),
        (
            json!({"table": {"values": [1, 2], "times_s": [0, 10], "from_s": 1}}),
            "TIMES_TWICE",
            ".table.from_s",
        ),
        (
            json!({"table": {"values": [1, 2], "times_s": [0, "Infinity"]}}),
            "NOT_FINITE",
            ".table.times_s[1]",
        ),
        (
            json!({"ramp": {"start_s": 3, "end_s": 3, "after": 1}}),
            "TIMES_OUT_OF_ORDER",
            ".ramp.end_s",
        ),
        (
            json!({"ramp": {"start_s": "NaN", "end_s": 3, "after": 1}}),
            "NOT_FINITE",
            ".ramp.start_s",
        ),
        (json!({"step": {"at_s": "NaN", "after": 1}}), "NOT_FINITE", ".step.at_s"),
        (
            json!({"step": {"before": "NaN", "after": 1}}),
            "NOT_FINITE",
            ".step.before",
        ),
        (
            json!({"harmonic": {"amplitude": 1}}),
            "NOT_POSITIVE",
            ".harmonic.frequency_hz",
        ),
        (
            json!({"harmonic": {"amplitude": "NaN", "frequency_hz": 1}}),
            "NOT_FINITE",
            ".harmonic.amplitude",
        ),
        (
            json!({"harmonic": {"amplitude": 1, "frequency_hz": 1, "phase_deg": "NaN"}}),
            "NOT_FINITE",
            ".harmonic.phase_deg",
        ),
        (
            json!({"harmonic": {"amplitude": 1, "frequency_hz": 1, "start_s": 5, "end_s": 4}}),
            "TIMES_OUT_OF_ORDER",
            ".harmonic.end_s",
        ),
        (json!({}), "MISSING", ""),
    ] {
        let mut load = history;
        load["action"] = json!("snow");
        check(
            &drifting(&[("/driven/0", load)]),
            reason,
            &format!("motions[drift].driven[0]{field}"),
        );
    }
    let table = |table: Value| drifting(&[("/driven/0", json!({"action": "snow", "table": table}))]);
    let back = table(json!({"values": [0, 1, 2, 3], "times_s": [0, 4, 3.5, 10]}));
    let found = check(&back, "TIMES_OUT_OF_ORDER", "motions[drift].driven[0].table.times_s[2]");
    assert!(found.message.contains("3.5 s at place 2 comes after 4 s"), "{found:#?}");
    let crowded = table(json!({"values": [0, 1, 2, 3, 4], "times_s": [0, 4, 4, 4, 10]}));
    check(
        &crowded,
        "TIMES_OUT_OF_ORDER",
        "motions[drift].driven[0].table.times_s[3]",
    );
    let long: Vec<f64> = vec![0.5; 1_000_001];
    check(
        &table(json!({"values": long, "every_s": 1})),
        "TOO_MANY",
        "motions[drift].driven[0].table.values",
    );
}

#[test]
fn points_of_a_record_that_fall_together_are_told() {
    let record = |from: f64| {
        let table = json!({"values": [0, 1, 2], "every_s": 1e-9, "from_s": from});
        drifting(&[("/driven/0", json!({"action": "snow", "table": table}))])
    };
    let found = check(
        &record(1e9),
        "TIMES_OUT_OF_ORDER",
        "motions[drift].driven[0].table.every_s",
    );
    assert!(found.message.contains("1e-9 s apart"), "{found:#?}");
    assert!(reading(&record(1.0)).work.is_some());
}

#[test]
fn histories_that_are_odd_are_doubted() {
    let at = |field: &str| format!("motions[drift].driven[0].{field}");
    let driven = |history: Value| {
        let mut load = history;
        load["action"] = json!("snow");
        drifting(&[("/driven/0", load)])
    };
    // One that stays, one that has passed, one that comes too late.
    let stays = driven(json!({"table": {"values": [0, 1, 0.3], "every_s": 2}}));
    let found = check_mild(&stays, Doubt, "HISTORY_SHORT", &at("table"));
    assert!(
        found.message.contains("ends at 4 s") && found.message.contains("0.3"),
        "{found:#?}"
    );
    let passed = driven(json!({"table": {"values": [0, 1, 0], "every_s": 2}}));
    check_mild(&passed, Note, "HISTORY_SHORT", &at("table"));
    let late = driven(json!({"table": {"values": [0.5, 1, 0], "every_s": 2, "from_s": 11}}));
    check_mild(&late, Doubt, "HISTORY_SHORT", &at("table"));
    for (history, field) in [
        (json!({"constant": 0}), "constant"),
        (json!({"step": {"at_s": 11, "after": 1}}), "step"),
        (json!({"ramp": {"end_s": 1}}), "ramp"),
        (json!({"harmonic": {"frequency_hz": 1}}), "harmonic"),
        (json!({"table": {"values": [0, 0], "every_s": 10}}), "table"),
    ] {
        let found = check_mild(&driven(history), Doubt, "HISTORY_ZERO", &at(field));
        assert!(found.message.contains("to 10 s"), "{found:#?}");
    }
    for (history, field, needed) in [
        (
            json!({"harmonic": {"amplitude": 1, "frequency_hz": 10}}),
            "harmonic",
            "0.005",
        ),
        (
            json!({"table": {"values": [0, 1, 0], "times_s": [0, 0.002, 10]}}),
            "table",
            "0.002",
        ),
        (
            json!({"ramp": {"start_s": 1, "end_s": 1.001, "after": 1}}),
            "ramp",
            "0.001",
        ),
    ] {
        let found = check_mild(&driven(history), Doubt, "STEPS_TOO_LONG", &at(field));
        assert!(found.cure.ends_with(needed) && found.value == "0.01", "{found:#?}");
    }
    // Steps that just do, however their sums are rounded.
    let values: Vec<f64> = (0..=1000).map(|place| f64::from(place % 3)).collect();
    for history in [
        json!({"harmonic": {"amplitude": 1, "frequency_hz": 5}}),
        json!({"table": {"values": values, "every_s": 0.01}}),
    ] {
        let read = reading(&driven(history));
        assert!(read.findings.iter().all(|finding| finding.reason != "STEPS_TOO_LONG"));
    }
}

#[test]
fn actions_that_cannot_vary_are_told() {
    let at = "motions[drift].driven[0].action";
    let driven = |action: &str, history: Value| {
        let mut load = history;
        load["action"] = json!(action);
        drifting(&[("/driven/0", load)])
    };
    check(&driven("snw", json!({"constant": 1})), "UNKNOWN_ID", at);
    for (action, load) in [
        ("hot", "actions[hot].loads[0].temperature"),
        ("weak", "actions[weak].loads[0].prestress"),
    ] {
        let found = check(&driven(action, json!({"constant": 1})), "NOT_DRIVABLE", at);
        assert!(found.message.contains(load) && found.id == action, "{found:#?}");
    }
    let turned = changed(
        driven("turned", json!({"constant": 1})),
        &[
            (
                "/net/adjusters",
                json!([{"id": "t1", "cable": "g1", "at": "G1", "in_m": 0.1, "out_m": 0.1}]),
            ),
            (
                "/actions/-",
                json!({"id": "turned", "loads": [{"nodes": {"on": ["m"], "force_n": [0, 0, -1]}}, {"adjust": {"adjuster": "t1", "open_m": 0.01}}]}),
            ),
        ],
    );
    let found = check(&turned, "NOT_DRIVABLE", at);
    assert!(found.message.contains("actions[turned].loads[1].adjust"), "{found:#?}");
    let nothing = check(
        &drifting(&[("/driven/0", json!({"constant": 1}))]),
        "MISSING",
        "motions[drift].driven[0]",
    );
    assert!(nothing.cure.contains("wind"));
    // What acts already acts twice.
    check_mild(&driven("self", json!({"constant": 0.1})), Doubt, "ACTS_TWICE", at);
    let again = changed(
        driven("snow", json!({"constant": 1})),
        &[("/motions/0/from", json!("snowed"))],
    );
    check_mild(&again, Doubt, "ACTS_TWICE", at);
    let read = reading(&driven("snow", json!({"constant": 1})));
    assert!(read.findings.iter().all(|finding| finding.reason != "ACTS_TWICE"));
    // An action that acts in a motion alone is used.
    let alone = changed(
        terrace(),
        &[(
            "/actions/-",
            json!({"id": "kick", "loads": [{"nodes": {"on": ["m"], "force_n": [0, 900, 0]}}]}),
        )],
    );
    told(&reading(&alone), Note, "ACTION_UNUSED", "actions");
    let used = reading(&with(alone, changed(calm(), &[("/driven/0/action", json!("kick"))])));
    assert!(used.findings.iter().all(|finding| finding.reason != "ACTION_UNUSED"));
}

#[test]
fn supports_move_smoothly_and_without_damping_by_stiffness() {
    let at = "motions[drift].driven[0]";
    let moved = |history: Value| {
        let mut load = history;
        load["action"] = json!("creep");
        drifting(&[
            ("/driven/0", load),
            ("/damping", json!({"factors": {"mass_per_s": 0.1}})),
        ])
    };
    for (history, says) in [
        (json!({"constant": 1}), "begins with 1"),
        (json!({"step": {"at_s": 2, "after": 0.5}}), "jumps by 0.5 at 2 s"),
        (
            json!({"table": {"values": [0, 1, 0, 0], "times_s": [0, 3, 3, 10]}}),
            "jumps by -1 at 3 s",
        ),
        (
            json!({"ramp": {"start_s": -1, "end_s": 1, "after": 1}}),
            "begins with 0.5",
        ),
        (
            json!({"harmonic": {"amplitude": 1, "frequency_hz": 1, "phase_deg": 90}}),
            "jumps by 1 at 0 s",
        ),
        (
            json!({"harmonic": {"amplitude": 2, "frequency_hz": 1, "end_s": 5.25}}),
            "jumps by -2 at 5.25 s",
        ),
    ] {
        let found = check(&moved(history), "SUPPORT_JUMPS", at);
        assert!(found.message.contains(says), "{found:#?}");
    }
    for history in [
        json!({"ramp": {"end_s": 1, "after": 1}}),
        json!({"harmonic": {"amplitude": 1, "frequency_hz": 1.7}}),
        // Whole periods, but for rounding.
        json!({"harmonic": {"amplitude": 1, "frequency_hz": 1.1, "end_s": 10}}),
        json!({"step": {"at_s": 11, "after": 1}}),
    ] {
        assert_eq!(motion(&moved(history)).driven.len(), 1);
    }
    let ramp = json!({"ramp": {"end_s": 1, "after": 1}});
    for (damping, field) in [
        (json!({"factors": {"stiffness_s": 1e-3}}), "factors.stiffness_s"),
        (
            json!({"ratio": {"ratio": 0.01, "low_hz": 1, "high_hz": 2}}),
            "ratio.ratio",
        ),
    ] {
        let brief = changed(moved(ramp.clone()), &[("/motions/0/damping", damping)]);
        check(&brief, "DAMPED_GROUND", &format!("motions[drift].damping.{field}"));
    }
}

#[test]
fn breaks_that_make_no_sense_are_told() {
    let part = |from: &str, to: &str| json!({"cable": "carrying", "from": from, "to": to});
    for (given, reason, field) in [
        (json!([{"at_s": 1}]), "MISSING", "[0]"),
        (json!([{"member": "g1"}]), "MISSING", "[0]"),
        (json!([{"member": "g3", "at_s": 1}]), "UNKNOWN_ID", "[0].member"),
        (json!([{"member": "guy", "at_s": 1}]), "WRONG_KIND", "[0].member"),
        (json!([{"member": "m", "at_s": 1}]), "WRONG_KIND", "[0].member"),
        (
            json!([{"segment": part("A", "C"), "at_s": 1}]),
            "NOT_ONE_SEGMENT",
            "[0].segment",
        ),
        (
            json!([{"segment": part("m", "A"), "at_s": 1}]),
            "NO_SUCH_STRETCH",
            "[0].segment",
        ),
        (
            json!([{"segment": part("A", "B"), "at_s": 1}]),
            "NO_SUCH_STRETCH",
            "[0].segment.to",
        ),
        (
            json!([{"segment": {"cable": "post", "from": "F", "to": "A"}, "at_s": 1}]),
            "WRONG_KIND",
            "[0].segment.cable",
        ),
        (json!([{"member": "g1", "at_s": -1}]), "NEGATIVE", "[0].at_s"),
        (json!([{"member": "g1", "at_s": 10}]), "OUT_OF_RANGE", "[0].at_s"),
        (json!([{"member": "g1", "at_s": "NaN"}]), "NOT_FINITE", "[0].at_s"),
        (
            json!([{"member": "g1", "at_tension_n": 0}]),
            "NOT_POSITIVE",
            "[0].at_tension_n",
        ),
        (
            json!([{"member": "g1", "at_s": 1, "release_s": -0.1}]),
            "NEGATIVE",
            "[0].release_s",
        ),
        (
            json!([{"member": "g1", "at_s": 1}, {"member": "g1", "at_tension_n": 1e5}]),
            "BREAKS_TWICE",
            "[1]",
        ),
        (
            json!([{"segment": part("A", "m"), "at_s": 1}, {"member": "carrying", "at_s": 2}]),
            "BREAKS_TWICE",
            "[1]",
        ),
    ] {
        let found = check(
            &drifting(&[("/breaks", given)]),
            reason,
            &format!("motions[drift].breaks{field}"),
        );
        if reason == "NOT_ONE_SEGMENT" {
            assert!(
                found.message.contains("has 2 segments") && found.value == "2",
                "{found:#?}"
            );
        }
    }
    let long = drifting(&[("/breaks", json!([{"member": "g1", "at_s": 9, "release_s": 1.5}]))]);
    let found = check_mild(&long, Doubt, "RELEASE_TOO_LONG", "motions[drift].breaks[0].release_s");
    assert_eq!(found.value, "1.5");
    let without = json!({"id": "slack", "factors": {"self": 1}, "remove": ["g2", "bracing"]});
    for breaks in [
        json!([{"member": "g2", "at_s": 1}]),
        json!([{"segment": {"cable": "bracing", "from": "B", "to": "m"}, "at_s": 1}]),
    ] {
        let brief = drifting(&[("/breaks", breaks), ("/from", json!("slack"))]);
        let brief = changed(brief, &[("/cases/-", without.clone())]);
        let found = check(&brief, "BREAK_NOT_THERE", "motions[drift].breaks[0]");
        assert!(found.message.contains("\"slack\""), "{found:#?}");
    }
}

#[test]
fn damping_that_makes_no_sense_is_told() {
    let ratio = |ratio: f64, low: f64, high: f64| json!({"ratio": {"ratio": ratio, "low_hz": low, "high_hz": high}});
    for (damping, reason, field) in [
        (json!({"factors": {"mass_per_s": -1}}), "NEGATIVE", "factors.mass_per_s"),
        (
            json!({"factors": {"stiffness_s": -1}}),
            "NEGATIVE",
            "factors.stiffness_s",
        ),
        (
            json!({"factors": {"stiffness_s": 1e4}}),
            "OUT_OF_RANGE",
            "factors.stiffness_s",
        ),
        (ratio(-0.01, 1.0, 2.0), "OUT_OF_RANGE", "ratio.ratio"),
        (ratio(1.5, 1.0, 2.0), "OUT_OF_RANGE", "ratio.ratio"),
        (ratio(0.01, 0.0, 2.0), "NOT_POSITIVE", "ratio.low_hz"),
        (ratio(0.01, 3.0, 2.0), "OUT_OF_RANGE", "ratio.high_hz"),
        (
            json!({"ropes": [{"force_per_strain_rate_n_s": 1}]}),
            "COVERS_NOTHING",
            "ropes[0].on",
        ),
        (
            json!({"ropes": [{"on": ["none"], "force_per_strain_rate_n_s": 1}]}),
            "COVERS_NOTHING",
            "ropes[0].on",
        ),
        (
            json!({"ropes": [{"on": ["gui"], "force_per_strain_rate_n_s": 1}]}),
            "UNKNOWN_ID",
            "ropes[0].on[0]",
        ),
        (
            json!({"ropes": [{"on": ["m"], "force_per_strain_rate_n_s": 1}]}),
            "WRONG_KIND",
            "ropes[0].on[0]",
        ),
        (
            json!({"ropes": [{"on": ["guy"], "force_per_strain_rate_n_s": -1}]}),
            "NEGATIVE",
            "ropes[0].force_per_strain_rate_n_s",
        ),
    ] {
        let brief = drifting(&[("/damping", damping)]);
        let brief = changed(brief, &[("/net/groups/-", json!({"id": "none"}))]);
        check(&brief, reason, &format!("motions[drift].damping.{field}"));
    }
    for damping in [Value::Null, json!({}), json!({"factors": {}}), ratio(0.0, 1.0, 2.0)] {
        check_mild(
            &drifting(&[("/damping", damping)]),
            Note,
            "NO_DAMPING",
            "motions[drift].damping",
        );
    }
}

#[test]
fn starts_that_make_no_sense_are_told() {
    let moved = |on: &str, by: [f64; 3]| json!({"moved": [{"on": [on], "by_m": by}]});
    let off = |on: &str, by: [f64; 3]| json!({"velocities": [{"on": [on], "velocity_m_per_s": by}]});
    for (start, reason, field) in [
        (json!({"moved": [{"by_m": [0, 0, 1]}]}), "COVERS_NOTHING", "moved[0].on"),
        (
            json!({"moved": [{"on": ["m"], "by_m": [0, 1]}]}),
            "WRONG_COUNT",
            "moved[0].by_m",
        ),
        (json!({"moved": [{"on": ["m"]}]}), "WRONG_COUNT", "moved[0].by_m"),
        (moved("mm", [0.0, 0.0, 1.0]), "UNKNOWN_ID", "moved[0].on[0]"),
        (moved("carrying", [0.0, 0.0, 1.0]), "WRONG_KIND", "moved[0].on[0]"),
        (moved("m", [0.0, 0.0, 2e3]), "OUT_OF_RANGE", "moved[0].by_m[2]"),
        (moved("B", [0.0, 0.0, 0.1]), "START_ALONG_HELD", "moved[0].on"),
        (moved("D", [0.1, 0.0, 0.1]), "START_ALONG_HELD", "moved[0].on"),
        (
            json!({"moved": [{"on": ["m"], "by_m": [0, 0, 1]}, {"on": ["m"], "by_m": [0, 1, 0]}]}),
            "REPEATED_IN_LIST",
            "moved[1].on",
        ),
        (off("anchors", [0.0, 0.0, 1.0]), "START_ALONG_HELD", "velocities[0].on"),
        (
            off("m", [f64::MAX, 0.0, 0.0]),
            "OUT_OF_RANGE",
            "velocities[0].velocity_m_per_s[0]",
        ),
        (
            json!({"velocities": [{"velocity_m_per_s": [0, 0, 1]}]}),
            "COVERS_NOTHING",
            "velocities[0].on",
        ),
    ] {
        check(
            &drifting(&[("/start", start)]),
            reason,
            &format!("motions[drift].start.{field}"),
        );
    }
    // C, in a support group, and D, on a spring along z, can move that way; B, of the group, cannot.
    let found = check(
        &drifting(&[("/start", off("anchors", [0.0, 0.0, 1.0]))]),
        "START_ALONG_HELD",
        "motions[drift].start.velocities[0].on",
    );
    assert_eq!((found.id.as_str(), found.value.as_str()), ("B", "1"));
    for (start, field) in [
        (moved("m", [0.0; 3]), "moved[0].by_m"),
        (off("m", [0.0; 3]), "velocities[0].velocity_m_per_s"),
    ] {
        let path = format!("motions[drift].start.{field}");
        check_mild(&drifting(&[("/start", start)]), Doubt, "COVERS_NOTHING", &path);
    }
    check_mild(
        &drifting(&[("/driven", json!([]))]),
        Doubt,
        "NOTHING_MOVES",
        "motions[drift]",
    );
    let moves = drifting(&[("/driven", json!([])), ("/start", json!({"shape_of": "snowed"}))]);
    assert!(
        reading(&moves)
            .findings
            .iter()
            .all(|finding| finding.reason != "NOTHING_MOVES")
    );
    assert_eq!(
        work(&moves).motion_in_words(0),
        "from reference: let go from the shape of snowed"
    );
}

#[test]
fn watched_quantities_and_spectra_are_told() {
    let at = |node: &str, along: [f64; 3]| json!({"node": node, "along": along});
    for (watched, reason, field) in [
        (json!([{"id": "a"}]), "MISSING", "[a]"),
        (json!([{"id": "a]", "largest_tension": "g1"}]), "BAD_ID", "[0].id"),
        (
            json!([{"id": "a", "largest_tension": "g1"}, {"id": "a", "largest_tension": "g2"}]),
            "DUPLICATE_ID",
            "[1].id",
        ),
        (
            json!([{"id": "a", "movement": at("mm", [0.0, 0.0, 1.0])}]),
            "UNKNOWN_ID",
            "[a].movement.node",
        ),
        (
            json!([{"id": "a", "velocity": at("g1", [0.0, 0.0, 1.0])}]),
            "WRONG_KIND",
            "[a].velocity.node",
        ),
        (
            json!([{"id": "a", "acceleration": at("m", [0.0; 3])}]),
            "ZERO_DIRECTION",
            "[a].acceleration.along",
        ),
        (
            json!([{"id": "a", "movement": {"node": "m"}}]),
            "WRONG_COUNT",
            "[a].movement.along",
        ),
        (
            json!([{"id": "a", "support_force": at("m", [0.0, 0.0, 1.0])}]),
            "NO_SUPPORT_FORCE",
            "[a].support_force.node",
        ),
        (
            json!([{"id": "a", "tension": {"cable": "carrying", "from": "A", "to": "C"}}]),
            "NOT_ONE_SEGMENT",
            "[a].tension",
        ),
        (
            json!([{"id": "a", "largest_tension": "guy"}]),
            "WRONG_KIND",
            "[a].largest_tension",
        ),
        (
            json!([{"id": "a", "largest_tension": "g3"}]),
            "UNKNOWN_ID",
            "[a].largest_tension",
        ),
    ] {
        check(
            &drifting(&[("/watched", watched)]),
            reason,
            &format!("motions[drift].watched{field}"),
        );
    }
    let spectra = |spectra: Value| {
        let watched = json!([{"id": "a", "largest_tension": "g1"}]);
        drifting(&[("/watched", watched), ("/spectra", spectra)])
    };
    check(
        &drifting(&[("/spectra", json!({}))]),
        "COVERS_NOTHING",
        "motions[drift].spectra",
    );
    for (given, reason, field) in [
        (json!({"from_s": -1}), "NEGATIVE", "from_s"),
        (json!({"from_s": 12}), "TOO_FEW_SAMPLES", "from_s"),
        (json!({"from_s": 9.86}), "TOO_FEW_SAMPLES", "from_s"),
        (json!({"up_to_hz": 0}), "NOT_POSITIVE", "up_to_hz"),
        (json!({"up_to_hz": 50.1}), "OUT_OF_RANGE", "up_to_hz"),
    ] {
        let found = check(&spectra(given), reason, &format!("motions[drift].spectra.{field}"));
        match reason {
            "TOO_FEW_SAMPLES" => assert!(found.message.contains(" samples, one every 0.01 s"), "{found:#?}"),
            "OUT_OF_RANGE" => assert!(found.message.contains("above 50 Hz"), "{found:#?}"),
            _ => {}
        }
    }
    // Sixteen samples from 9.85 s to 10 s, and half of one over the step, just do.
    let just = motion(&spectra(json!({"from_s": 9.85, "up_to_hz": 50})));
    assert_eq!(
        just.spectra,
        Some(SpectraGiven {
            from: 9.85,
            up_to: Some(50.0)
        })
    );
    let long = changed(
        spectra(json!({})),
        &[
            ("/motions/0/duration_s", json!(6e4)),
            ("/motions/0/step_s", json!(1e-3)),
            ("/motions/0/driven/0", json!({"action": "snow", "constant": 1})),
        ],
    );
    let found = check(&long, "TOO_LARGE", "motions[drift].spectra");
    assert!(found.cure.contains("at most 3.368421e6 samples"), "{found:#?}");
    // 2.56e8 bytes by 64 and 12 for the one that is watched: so many and no more, the moment of the start among them.
    for (steps, fits) in [(3_368_420, true), (3_368_421, false)] {
        let just = changed(
            long.clone(),
            &[("/motions/0/duration_s", json!(f64::from(steps) * 1e-3))],
        );
        if fits {
            assert!(motion(&just).spectra.is_some());
        } else {
            check(&just, "TOO_LARGE", "motions[drift].spectra");
        }
    }
    let many: Vec<Value> = (0..1001)
        .map(|place| json!({"id": format!("w{place}"), "largest_tension": "g1"}))
        .collect();
    let found = check(
        &drifting(&[("/watched", json!(many))]),
        "TOO_MANY",
        "motions[drift].watched",
    );
    assert_eq!(found.value, "1001");
    assert_eq!(motion(&drifting(&[("/watched", json!(many[1..]))])).watched.len(), 1000);
}

#[test]
fn the_net_that_moves_is_as_small_as_any() {
    let hanging = |pieces: u32| {
        message(&changed(
            drifting(&[("/pieces_of_hanging", json!(pieces))]),
            &[("/net/cables/2/hangs", json!({}))],
        ))
    };
    let segments = |message: &v1::Brief| match &message.net_source {
        Some(v1::brief::NetSource::Net(net)) => {
            let of_cables: usize = net.cables.iter().map(|cable| cable.nodes.len() - 1).sum();
            let of_hanging = net.cables[2].nodes.len() - 1;
            (
                u32::try_from(of_cables + net.struts.len()).expect("few"),
                u32::try_from(of_hanging).expect("few"),
            )
        }
        _ => panic!("a net"),
    };
    let (all, hang) = segments(&hanging(10));
    let most = all + 9 * hang;
    let read = |pieces, most| {
        let limits = ropewalk_service::config::Limits {
            segments: most,
            ..LIMITS
        };
        ropewalk_service::decode::read(hanging(pieces), &limits)
    };
    assert!(errors(&read(10, most)).next().is_none());
    let refused = read(10, most - 1);
    let found = told(&refused, Error, "TOO_MANY", "motions[drift].pieces_of_hanging");
    assert_eq!(found.value, most.to_string());
    assert!(refused.work.is_none());
}

#[test]
fn lists_that_cover_too_much_are_told() {
    // A rope of 4000 segments.
    let between = (1..4000).map(|place| format!("x{place}"));
    let nodes: Vec<String> = ["A".to_owned()]
        .into_iter()
        .chain(between)
        .chain(["C".to_owned()])
        .collect();
    let long = json!({"id": "long", "role": "rope", "nodes": nodes});
    let refused = |change: &dyn Fn(&mut v1::Motion)| {
        let mut message = message(&changed(drifting(&[]), &[("/net/cables/-", long.clone())]));
        change(&mut message.motions[0]);
        let reading = ropewalk_service::decode::read(message, &LIMITS);
        let too_many = errors(&reading).filter(|error| error.reason == "TOO_MANY").count();
        (reading, too_many)
    };
    let (read, count) = refused(&|motion| {
        let ropes = v1::RopeDamping {
            on: vec!["long".to_owned()],
            force_per_strain_rate_n_s: 10.0,
            ..v1::RopeDamping::default()
        };
        motion.damping.as_mut().expect("damped").ropes = vec![ropes; 2600];
    });
    // 2500 of them are just enough.
    let found = told(&read, Error, "TOO_MANY", "motions[drift].damping.ropes[2500]");
    assert_eq!((found.value.as_str(), count), ("10004000", 1));
    let (read, count) = refused(&|motion| {
        let velocity = v1::StartVelocity {
            on: vec!["m".to_owned()],
            velocity_m_per_s: vec![0.0, 0.0, 1.0],
            ..v1::StartVelocity::default()
        };
        motion.start = Some(v1::MotionStart {
            velocities: vec![velocity; 2600],
            ..v1::MotionStart::default()
        });
    });
    assert_eq!(count, 0, "{:#?}", errors(&read).collect::<Vec<_>>());

    // Loads that vary in time, each for the whole net.
    let (read, count) = refused(&|motion| motion.driven = vec![motion.driven[0].clone(); 5000]);
    let found = told(&read, Error, "TOO_MANY", "motions[drift].driven");
    assert_eq!((found.value.as_str(), count), ("5000", 1));
    assert!(found.message.contains("at most 20000000"), "{found:#?}");
    let (_, count) = refused(&|motion| motion.driven = vec![motion.driven[0].clone(); 4900]);
    assert_eq!(count, 0);
}

#[test]
fn what_moves_has_a_mass() {
    let massless = |changes: &[(&str, Value)]| {
        changed(
            drifting(changes),
            &[
                ("/net/sections/0/mass_kg_per_m", json!(0)),
                ("/net/sections/1/mass_kg_per_m", json!(0)),
                ("/net/sections/2/mass_kg_per_m", json!(0)),
            ],
        )
    };
    // A has an attached mass; C and D give way.
    let found = check(&massless(&[]), "NO_MASS", "motions[drift]");
    assert!(found.message.contains("3 nodes"), "{found:#?}");
    assert_eq!(found.value, "3");
    let added = json!([{"on": ["carrying", "bracing"], "mass_per_length_kg_per_m": 0.5}]);
    assert_eq!(motion(&massless(&[("/added", added)])).masses.segments.len(), 4);
    let added = json!([{"on": ["m", "anchors"], "mass_kg": 1}]);
    assert_eq!(motion(&massless(&[("/added", added)])).masses.nodes.len(), 4);
    let added = json!([{"on": ["m"], "mass_kg": 0}, {"on": ["anchors"], "mass_kg": 1}]);
    let found = check(&massless(&[("/added", added)]), "NO_MASS", "motions[drift]");
    assert_eq!((found.id.as_str(), found.value.as_str()), ("m", "1"));
    // What the start takes out has no mass.
    let lost = [
        (
            "/cases/-",
            json!({"id": "lost", "factors": {"self": 1}, "remove": ["carrying", "bracing"]}),
        ),
        ("/motions/0/from", json!("lost")),
    ];
    check(&changed(drifting(&[]), &lost), "NO_MASS", "motions[drift]");
    // Ropes that hang have nodes of their own.
    let added = json!([{"on": ["m", "anchors"], "mass_kg": 1}]);
    let hanging = changed(massless(&[("/added", added)]), &[("/net/cables/2/hangs", json!({}))]);
    let found = check(&hanging, "NO_MASS", "motions[drift]");
    assert_eq!(found.id, "g1");
    // A skin gives a mass to its corners.
    let cloth = |mass: f64| {
        let mut brief = gusty(json!({"along": [0, 1, 0], "elsewhere": 0.4}));
        for section in brief["net"]["sections"].as_array_mut().expect("sections") {
            section["mass_kg_per_m"] = json!(0);
        }
        changed(brief, &[("/net/skins/0/mass_kg_per_m2", json!(mass))])
    };
    assert_eq!(work(&cloth(1.1)).brief.motions.len(), 1);
    check(&cloth(0.0), "NO_MASS", "motions[gust]");
}

#[test]
fn ropes_that_slide_are_refused() {
    let brief = changed(drifting(&[]), &[("/net/cables/0/slides", json!({}))]);
    let found = check(&brief, "SLIDES_IN_MOTION", "motions[drift]");
    assert_eq!(found.id, "carrying");
    assert!(found.message.contains("\"carrying\""), "{found:#?}");
}

#[test]
fn a_run_may_name_motions() {
    let second = changed(calm(), &[("/id", json!("second"))]);
    let work = work(&changed(terrace(), &[("/motions", json!([calm(), second]))]));
    let select = |only: &[&str]| {
        let only: Vec<String> = only.iter().map(|name| (*name).to_owned()).collect();
        work.select(&only)
            .map(|selected| (selected.cases, selected.motions))
            .map_err(Box::new)
    };
    assert_eq!(select(&[]), Ok((vec![0, 1, 2], vec![0, 1])));
    assert_eq!(select(&["second"]), Ok((vec![], vec![1])));
    assert_eq!(select(&["second", "iced", "drift"]), Ok((vec![1], vec![0, 1])));
    // A set does not bring along what starts from its cases.
    assert_eq!(select(&["winter"]), Ok((vec![0, 1], vec![])));
    assert_eq!(select(&["reference"]), Ok((vec![], vec![])));
    let error = select(&["secnd"]).expect_err("no such motion");
    assert!(error.message.contains("\"second\""), "{}", error.message);
}

/// The example briefs with motions.
#[test]
fn the_examples_are_in_order() {
    for (text, words) in [
        (
            include_str!("../../client-example/briefs/rill-footbridge-motion.json"),
            &[
                "from walked: +-1 steps at 2.5 Hz",
                "from gale: wind-left from C1 to u1 breaks at 0.5 s within 0.01 s",
            ][..],
        ),
        (
            include_str!("../../client-example/briefs/quince-yard-motion.json"),
            &["from reference: 24 m/s wind by a table", "from reference: 1 node moved"],
        ),
        (
            include_str!("../../client-example/briefs/alder-stay-motion.json"),
            &["from reference: 1 knock by a table"],
        ),
    ] {
        let brief: Value = serde_json::from_str(text).expect("valid JSON");
        let read = reading(&brief);
        assert!(
            read.findings.iter().all(|finding| finding.severity() == Note),
            "{:#?}",
            read.findings
        );
        let work = work(&brief);
        let said: Vec<String> = (0..work.brief.motions.len())
            .map(|motion| work.motion_in_words(motion))
            .collect();
        assert_eq!(said, words);
    }
}
