//! A small recorded run for tests: the two crossing ropes of `briefs/first-net.json`, under snow, and a case without answer.
//!
//! Numbers of the reference state and of snow: own Newton solve stated with that brief (m sinks 22.59 mm, 24.820 and
//! 14.484 kN); the pulls follow from them by hand.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::run_response::Event;

use super::{Collector, Column, Run};

/// Ids that tests may replace by nasty ones.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Names<'a> {
    pub(crate) middle: &'a str,
    pub(crate) rope: &'a str,
    pub(crate) case: &'a str,
    pub(crate) title: &'a str,
}

const PLAIN: Names<'static> = Names {
    middle: "m",
    rope: "carrying",
    case: "full-snow",
    title: "First net",
};

pub(crate) fn brief() -> v1::Brief {
    brief_named(PLAIN)
}

pub(crate) fn events() -> Vec<Event> {
    events_named(PLAIN)
}

pub(crate) fn run() -> Run {
    run_named(PLAIN)
}

pub(crate) fn run_named(names: Names) -> Run {
    let mut collector = Collector::of(&v1::RunRequest {
        brief: Some(brief_named(names)),
        only: Vec::new(),
    });
    for event in events_named(names) {
        collector.take(event).unwrap();
    }
    collector.finish(brief_named(names)).unwrap()
}

fn brief_named(names: Names) -> v1::Brief {
    let json = serde_json::json!({
        "id": "first-net", "title": names.title,
        "net": {
            "nodes": [
                {"id": "A", "xyz_m": [0, 0, 3], "support": {}}, {"id": "B", "xyz_m": [9, 0, 0], "support": {}},
                {"id": "C", "xyz_m": [9, 9, 3], "support": {}}, {"id": "D", "xyz_m": [0, 9, 0], "support": {}}
            ],
            "sections": [{"id": "r10", "axial_stiffness_n": 6.5e6, "breaking_force_n": 82e3}],
            "cables": [
                {"id": names.rope, "section": "r10", "nodes": ["A", names.middle, "C"]},
                {"id": "bracing", "section": "r10", "nodes": ["B", names.middle, "D"]}
            ]
        },
        "checks": [{"anchor_pull": {"limit_n": 20e3}, "on": ["A"]}],
        "cases": [{"id": names.case, "factors": {"snow": 1}}]
    });
    crate::brief_file::parse("sample", &json.to_string()).unwrap()
}

fn column(case: &str, name: &str, unit: &str, over: v1::Range, components: u32, values: &[f64]) -> Event {
    Event::Columns(v1::Columns {
        case: case.to_owned(),
        name: name.to_owned(),
        unit: unit.to_owned(),
        over: over.into(),
        components,
        total: u32::try_from(values.len()).unwrap(),
        values: values.to_vec(),
        ..Default::default()
    })
}

fn ids(over: v1::Range, ids: &[&str]) -> v1::IdTable {
    v1::IdTable {
        over: over.into(),
        total: u32::try_from(ids.len()).unwrap(),
        ids: ids.iter().map(ToString::to_string).collect(),
        ..Default::default()
    }
}

fn state(case: &str, words: &str, middle: &str, sink: f64, tensions: [f64; 2], load: f64) -> Vec<Event> {
    let [carrying, bracing] = tensions;
    let z = 1.5 - sink;
    let positions = [0.0, 0.0, 3.0, 9.0, 0.0, 0.0, 9.0, 9.0, 3.0, 0.0, 9.0, 0.0, 4.5, 4.5, z];
    let mut moves = [0.0; 15];
    moves[14] = -sink;
    let supports = [[0.0, 0.0, 3.0], [9.0, 0.0, 0.0], [9.0, 9.0, 3.0], [0.0, 9.0, 0.0]];
    let mut forces = Vec::new();
    let mut lengths = Vec::new();
    for (support, tension) in supports.iter().zip([carrying, bracing, carrying, bracing]) {
        let along = [support[0] - 4.5, support[1] - 4.5, support[2] - z];
        let length = along.iter().map(|part| part * part).sum::<f64>().sqrt();
        lengths.push(length);
        forces.extend(along.iter().map(|part| part / length * tension));
    }
    let node = v1::Range::Node;
    let rope = v1::Range::RopeSegment;
    let lengths = [lengths[0], lengths[2], lengths[1], lengths[3]];
    let stretches = lengths.map(|length| length / 6.518_677);
    let mut sum = [0.0; 3];
    forces
        .chunks(3)
        .for_each(|force| (0..3).for_each(|axis| sum[axis] += force[axis]));
    vec![
        Event::CaseBegin(v1::CaseBegin {
            case: case.to_owned(),
            in_words: words.to_owned(),
            sets: Vec::new(),
            again: false,
        }),
        column(case, "position_m", "m", node, 3, &positions),
        column(case, "displacement_m", "m", node, 3, &moves),
        column(case, "tension_n", "N", rope, 1, &[carrying, carrying, bracing, bracing]),
        column(case, "slack", "", rope, 1, &[0.0; 4]),
        column(case, "length_m", "m", v1::Range::Segment, 1, &lengths),
        column(case, "stretch", "", v1::Range::Segment, 1, &stretches),
        column(case, "unstressed_length_m", "m", v1::Range::Reach, 1, &[6.518_677; 4]),
        column(case, "support_force_n", "N", v1::Range::Support, 3, &forces),
        column(
            case,
            "iteration_residual_n",
            "N",
            v1::Range::Iteration,
            1,
            &[5e3, 120.0, 0.04, 3e-9],
        ),
        Event::CaseSummary(v1::CaseSummary {
            case: case.to_owned(),
            outcome: v1::CaseOutcome::Answered.into(),
            way: v1::SolutionWay::Newton.into(),
            load_factor: 1.0,
            iterations: 4,
            audited: true,
            imbalance_n: 3e-9,
            imbalance_node: middle.to_owned(),
            imbalance_allowed_n: 1e-5,
            load_sum_n: vec![0.0, 0.0, load],
            support_force_sum_n: sum.to_vec(),
            largest_movement_m: sink,
            largest_movement_node: middle.to_owned(),
            worst_ratio: (case != "reference").then_some(1.24),
            certificate: Some(v1::Certificate {
                certified: true,
                tension_within_n: if case == "reference" { 2e-7 } else { 3e-7 },
                ..Default::default()
            }),
            ..Default::default()
        }),
    ]
}

fn events_named(names: Names) -> Vec<Event> {
    let mut events = vec![
        Event::Started(v1::Started {
            brief_id: "first-net".to_owned(),
            digest: "00".repeat(32),
            ..Default::default()
        }),
        Event::Ids(ids(v1::Range::Node, &["A", "B", "C", "D", names.middle])),
        Event::Ids(ids(v1::Range::Cable, &[names.rope, "bracing"])),
        Event::Ids(v1::IdTable {
            from_nodes: vec![0, 4, 1, 4],
            to_nodes: vec![4, 2, 4, 3],
            ..ids(v1::Range::Segment, &[names.rope, names.rope, "bracing", "bracing"])
        }),
        Event::Ids(ids(v1::Range::Support, &["A", "B", "C", "D"])),
        Event::Ids(v1::IdTable {
            from_nodes: vec![0, 2, 1, 3],
            segments: vec![0, 1, 2, 3],
            ..ids(v1::Range::End, &[names.rope, names.rope, "bracing", "bracing"])
        }),
        Event::Ids(ids(v1::Range::Case, &[names.case, "lamp"])),
    ];
    events.extend(state("reference", "", names.middle, 0.0, [19_615.0, 19_615.0], 0.0));
    events.extend(state(
        names.case,
        "snow",
        names.middle,
        0.022_59,
        [24_820.0, 14_484.0],
        -5000.0,
    ));
    events.extend([
        Event::CaseBegin(v1::CaseBegin {
            case: "lamp".to_owned(),
            in_words: "lamp".to_owned(),
            sets: Vec::new(),
            again: false,
        }),
        Event::CaseSummary(v1::CaseSummary {
            case: "lamp".to_owned(),
            outcome: v1::CaseOutcome::NoEquilibrium.into(),
            failure: Some(v1::Failure {
                group: String::new(),
                reason: "NOT_HELD".to_owned(),
                message: "nothing holds the lamp".to_owned(),
                cure: "tie it to the net".to_owned(),
                nodes: vec![names.middle.to_owned()],
                members: vec![names.rope.to_owned()],
            }),
            ..Default::default()
        }),
    ]);
    let rope = v1::Range::RopeSegment;
    events.extend([
        column(
            "envelope",
            "tension_min_n",
            "N",
            rope,
            1,
            &[19_615.0, 19_615.0, 14_484.0, 14_484.0],
        ),
        column(
            "envelope",
            "tension_max_n",
            "N",
            rope,
            1,
            &[24_820.0, 24_820.0, 19_615.0, 19_615.0],
        ),
        column("envelope", "tension_min_case", "", rope, 1, &[-1.0, -1.0, 0.0, 0.0]),
        column("envelope", "tension_max_case", "", rope, 1, &[0.0, 0.0, -1.0, -1.0]),
        Event::Summary(v1::Summary {
            verdict: v1::Verdict::NoAnswer.into(),
            answered: Some(v1::Share { count: 2, of: 3 }),
            audited: Some(v1::Share { count: 2, of: 2 }),
            judged: Some(v1::Share { count: 1, of: 1 }),
            passes: Some(v1::Share { count: 0, of: 1 }),
            checks: vec![v1::CheckResult {
                path: "checks[0]".to_owned(),
                kind: "anchor_pull".to_owned(),
                judged: 1,
                worst: "A".to_owned(),
                demand: 24_820.0,
                limit: 20_000.0,
                unit: "N".to_owned(),
                ratio: 1.241,
                governing_case: names.case.to_owned(),
                verdict: v1::Verdict::Exceeds.into(),
                ..Default::default()
            }],
            cautions: vec!["Ropewalk is an aid.".to_owned()],
            digest: "00".repeat(32),
            ..Default::default()
        }),
    ]);
    events
}

/// Gives the reference state of a sample three modes, the last of which does not vibrate.
pub(crate) fn give_modes(run: &mut Run, nodes: &[String]) {
    let part = |part| v1::StateModes {
        case: "reference".to_owned(),
        part: Some(part),
    };
    run.modes.push(part(v1::state_modes::Part::Found(v1::ModesFound {
        modes: 3,
        complete: true,
        counted: Some(3),
        moving_mass_kg: vec![8.0; 3],
        lowest_tension_share: Some(1.0),
        lowest_frequency_hz: Some(2.5),
        ..v1::ModesFound::default()
    })));
    let kinds = [v1::ModeKind::Vibrates, v1::ModeKind::Vibrates, v1::ModeKind::Rigid];
    for ((number, kind), frequency_hz) in (0..).zip(kinds).zip([2.5, 4.0, 0.0]) {
        run.modes.push(part(v1::state_modes::Part::Mode(v1::Mode {
            number,
            kind: kind.into(),
            frequency_hz,
            modal_mass_kg: 8.0,
            effective_mass_kg: vec![0.0, 2.0, 8.0],
            nodes: nodes.to_vec(),
            ..v1::Mode::default()
        })));
    }
    let shapes = Column {
        unit: String::new(),
        over: v1::Range::Node,
        components: 9,
        baseline: String::new(),
        values: (0..9 * run.nodes.len())
            .map(|place| if place % 9 % 4 == 0 { 1.0 } else { 0.0 })
            .collect(),
    };
    run.states[0].columns.insert("mode_shape".to_owned(), shapes);
}

/// Gives the case of a sample a path: movements in proportion, a carrying rope on a line, a bracing one that goes slack.
pub(crate) fn give_path(run: &mut Run, factors: &[f64]) {
    let column = |over: v1::Range, components: usize, values: Vec<f64>| Column {
        unit: String::new(),
        over,
        components,
        baseline: String::new(),
        values,
    };
    let each = |number: &dyn Fn(f64) -> f64| factors.iter().map(|factor| number(*factor)).collect::<Vec<f64>>();
    let mut tensions = each(&|factor| 20e3 + 6e3 * factor);
    tensions.extend(each(&|factor| {
        if factor < 0.5 { 20e3 * (1.0 - 2.0 * factor) } else { 0.0 }
    }));
    let columns = &mut run.states[1].columns;
    columns.insert(
        "path_load_factor".to_owned(),
        column(v1::Range::Unspecified, 1, factors.to_vec()),
    );
    columns.insert(
        "path_movement_m".to_owned(),
        column(v1::Range::Unspecified, 1, each(&|factor| 0.02 * factor)),
    );
    columns.insert(
        "path_tension_n".to_owned(),
        column(v1::Range::Cable, factors.len(), tensions),
    );
}
