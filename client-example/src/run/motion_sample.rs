//! A recorded motion for tests: a rope of 40 segments between two supports, whose middle tie breaks.
//!
//! Its movement is d'Alembert's solution for a string: half of the first shape runs each way and turns over at the ends; its
//! pull of 20 kN over 0.45 kg/m makes a speed of 210.8 m/s. Natural frequencies are those of the string, `n c / 2 L`. Its tension
//! has a pulse that runs at 3900 m/s. Energies are sums over points.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::motion_part::Part;
use ropewalk_api::ropewalk::v1::run_response::Event;

use super::{Collector, Run};

pub(crate) const N_SEGMENTS: u32 = 40;
/// Unstressed length of a segment (m), 1 m under tension.
pub(crate) const PIECE_M: f64 = 0.99;
pub(crate) const TENSION_N: f64 = 20e3;
pub(crate) const MASS_KG_PER_M: f64 = 0.45;
const AXIAL_M_PER_S: f64 = 3900.0;
/// The point where the tie breaks, at the start.
pub(crate) const BREAK_AT: u32 = 10;
pub(crate) const STEP_S: f64 = 0.002;
const N_FRAMES: u32 = 201;

/// Speed of transverse waves over unstressed length (m/s).
pub(crate) fn speed() -> f64 {
    (TENSION_N / MASS_KG_PER_M).sqrt()
}

fn length() -> f64 {
    PIECE_M * f64::from(N_SEGMENTS)
}

/// A shape that turns over at both ends, and so repeats after twice the length.
fn mirrored(shape: &dyn Fn(f64) -> f64, at: f64) -> f64 {
    let at = at.rem_euclid(2.0 * length());
    if at <= length() {
        shape(at)
    } else {
        -shape(2.0 * length() - at)
    }
}

/// Height of a point at a time (m): what moves is let in over the first 8 ms, so that the rope starts straight.
pub(crate) fn height(material: f64, time: f64) -> f64 {
    let first = |at: f64| {
        let off = (at - PIECE_M * f64::from(BREAK_AT)) / 1.6;
        0.16 * (-off * off).exp()
    };
    let way = speed() * time;
    let let_in = (time / 0.008).clamp(0.0, 1.0);
    0.5 * let_in * (mirrored(&first, material - way) + mirrored(&first, material + way))
}

fn tension(material: f64, time: f64) -> f64 {
    let from = PIECE_M * f64::from(BREAK_AT);
    let pulse = |at: f64| -> f64 {
        let off = (at - from) / 2.5;
        (-off * off).exp()
    };
    let way = AXIAL_M_PER_S * time;
    let fold = |at: f64| {
        let at = at.rem_euclid(2.0 * length());
        if at <= length() { at } else { 2.0 * length() - at }
    };
    let axial = 6e3
        * (time / 0.002).min(1.0)
        * (-8.0 * time).exp()
        * 0.5
        * (pulse(fold(material - way)) + pulse(fold(material + way)));
    let slope = (height(material + 0.1, time) - height(material - 0.1, time)) / 0.2;
    TENSION_N + axial + 1.2e6 * slope * slope
}

fn frame(number: u32) -> v1::MotionFrame {
    let time = STEP_S * f64::from(number);
    let points: Vec<f64> = (0..=N_SEGMENTS).map(|at| PIECE_M * f64::from(at)).collect();
    let speed_of = |at: f64| (height(at, time + 1e-5) - height(at, time - 1e-5)) / 2e-5;
    let mut rope = v1::RopeFrame::default();
    let mut kinetic = 0.0;
    for (at, material) in (0..).zip(&points) {
        rope.positions_m.extend([f64::from(at), 0.0, height(*material, time)]);
        rope.velocities_m_per_s.extend([0.0, 0.0, speed_of(*material)]);
        kinetic += 0.5 * MASS_KG_PER_M * PIECE_M * speed_of(*material).powi(2);
    }
    for material in points.iter().take(points.len() - 1) {
        let tension = tension(material + PIECE_M / 2.0, time);
        rope.tension_n.push(tension);
        rope.stretch.push(1.0 / PIECE_M + (tension - TENSION_N) / 6.5e6);
    }
    let middle = [20.0, 0.0, height(20.0 * PIECE_M, time)];
    v1::MotionFrame {
        step: (10 * number).into(),
        time_s: time,
        continues: false,
        energy: Some(v1::EnergyLedger {
            kinetic_j: kinetic,
            elastic_j: 5000.0 - 0.96 * kinetic,
            potential_j: 0.0,
            work_j: 0.0,
            dissipated_j: 0.04 * kinetic,
            released_j: 12.0,
            error_j: 0.02 * (40.0 * time).sin(),
        }),
        slack_segments: u32::from(number % 90 > 80),
        watched: vec![middle[2], tension(PIECE_M / 2.0, time), speed_of(20.0 * PIECE_M)],
        positions_m: middle.to_vec(),
        velocities_m_per_s: vec![0.0, 0.0, speed_of(20.0 * PIECE_M)],
        ropes: vec![rope],
    }
}

/// A frame in two messages.
fn in_two(whole: v1::MotionFrame) -> [v1::MotionFrame; 2] {
    let (mut first, mut second) = (whole.clone(), v1::MotionFrame::default());
    second.continues = true;
    let rope = &mut first.ropes[0];
    second.ropes.push(v1::RopeFrame {
        rope: 0,
        from: 17,
        positions_m: rope.positions_m.split_off(51),
        velocities_m_per_s: rope.velocities_m_per_s.split_off(51),
        stretch: rope.stretch.split_off(17),
        tension_n: rope.tension_n.split_off(17),
    });
    [first, second]
}

/// Amplitudes with a Hann window, and their distance (Hz).
fn spectrum(samples: &[f64]) -> (Vec<f64>, f64) {
    let count = f64::from(u32::try_from(samples.len()).unwrap());
    let mean = samples.iter().sum::<f64>() / count;
    let turn = std::f64::consts::TAU / count;
    let lines = (0..80).map(|line| {
        let (mut real, mut imaginary) = (0.0, 0.0);
        for (at, sample) in (0..).map(f64::from).zip(samples) {
            let value = (sample - mean) * (1.0 - (turn * at).cos());
            real += value * (turn * at * f64::from(line)).cos();
            imaginary += value * (turn * at * f64::from(line)).sin();
        }
        2.0 / count * f64::hypot(real, imaginary)
    });
    (lines.collect(), 1.0 / (count * STEP_S))
}

pub(crate) fn brief(id: &str) -> v1::Brief {
    let nodes: Vec<serde_json::Value> = (0..=N_SEGMENTS)
        .map(|at| {
            if at == 0 || at == N_SEGMENTS {
                serde_json::json!({"id": format!("n{at}"), "xyz_m": [at, 0, 0], "support": {}})
            } else {
                serde_json::json!({"id": format!("n{at}"), "xyz_m": [at, 0, 0]})
            }
        })
        .collect();
    let path: Vec<String> = (0..=N_SEGMENTS).map(|at| format!("n{at}")).collect();
    let json = serde_json::json!({
        "id": "long-rope", "title": "Long rope",
        "net": {
            "nodes": nodes,
            "sections": [{"id": "r10", "axial_stiffness_n": 6.5e6, "mass_kg_per_m": MASS_KG_PER_M}],
            "cables": [{"id": "main", "section": "r10", "nodes": path}]
        },
        "motions": [{"id": id, "duration_s": 0.4, "step_s": 0.0002}]
    });
    crate::brief_file::parse("sample", &json.to_string()).unwrap()
}

fn part(id: &str, part: Part) -> Event {
    Event::Motion(v1::MotionPart {
        motion: id.to_owned(),
        part: Some(part),
    })
}

fn ids(over: v1::Range, ids: Vec<String>) -> v1::IdTable {
    v1::IdTable {
        over: over.into(),
        total: u32::try_from(ids.len()).unwrap(),
        ids,
        ..Default::default()
    }
}

fn column(case: &str, name: &str, unit: &str, over: v1::Range, components: u32, values: Vec<f64>) -> Event {
    Event::Columns(v1::Columns {
        case: case.to_owned(),
        name: name.to_owned(),
        unit: unit.to_owned(),
        over: over.into(),
        components,
        total: u32::try_from(values.len()).unwrap(),
        values,
        ..Default::default()
    })
}

fn reference() -> Vec<Event> {
    let ropes = usize::try_from(N_SEGMENTS).unwrap();
    let places: Vec<f64> = (0..=N_SEGMENTS).flat_map(|at| [f64::from(at), 0.0, 0.0]).collect();
    let mut events = vec![
        Event::CaseBegin(v1::CaseBegin {
            case: "reference".to_owned(),
            ..Default::default()
        }),
        column(
            "reference",
            "displacement_m",
            "m",
            v1::Range::Node,
            3,
            vec![0.0; places.len()],
        ),
        column("reference", "position_m", "m", v1::Range::Node, 3, places),
        column(
            "reference",
            "tension_n",
            "N",
            v1::Range::RopeSegment,
            1,
            vec![TENSION_N; ropes],
        ),
        column("reference", "length_m", "m", v1::Range::Segment, 1, vec![1.0; ropes]),
    ];
    for number in 0..6 {
        let mode = v1::Mode {
            number,
            kind: v1::ModeKind::Vibrates.into(),
            frequency_hz: f64::from(number + 1) * speed() / (2.0 * length()),
            nodes: vec!["n20".to_owned()],
            ..Default::default()
        };
        events.push(Event::Modes(v1::StateModes {
            case: "reference".to_owned(),
            part: Some(v1::state_modes::Part::Mode(mode)),
        }));
    }
    events.push(Event::CaseSummary(v1::CaseSummary {
        case: "reference".to_owned(),
        outcome: v1::CaseOutcome::Answered.into(),
        load_factor: 1.0,
        audited: true,
        ..Default::default()
    }));
    events
}

/// The events of a run with one motion.
pub(crate) fn events(id: &str) -> Vec<Event> {
    let nodes: Vec<String> = (0..=N_SEGMENTS).map(|at| format!("n{at}")).collect();
    let mut events = vec![
        Event::Started(v1::Started {
            brief_id: "long-rope".to_owned(),
            digest: "00".repeat(32),
            ..Default::default()
        }),
        Event::Ids(ids(v1::Range::Node, nodes.clone())),
        Event::Ids(ids(v1::Range::Cable, vec!["main".to_owned()])),
        Event::Ids(v1::IdTable {
            from_nodes: (0..N_SEGMENTS).collect(),
            to_nodes: (1..=N_SEGMENTS).collect(),
            ..ids(v1::Range::Segment, (0..N_SEGMENTS).map(|_| "main".to_owned()).collect())
        }),
        Event::Ids(ids(v1::Range::Support, vec!["n0".to_owned(), format!("n{N_SEGMENTS}")])),
    ];
    events.extend(reference());
    events.extend(motion(id, nodes));
    events.push(Event::Summary(v1::Summary {
        verdict: v1::Verdict::NotJudged.into(),
        answered: Some(v1::Share { count: 1, of: 1 }),
        audited: Some(v1::Share { count: 1, of: 1 }),
        cautions: vec!["Motions: an aid.".to_owned()],
        digest: "00".repeat(32),
        motions: Some(v1::Share { count: 1, of: 1 }),
        ..Default::default()
    }));
    events
}

fn beginning(nodes: Vec<String>) -> Vec<Part> {
    let quantity = |id: &str, unit: &str, words: &str| v1::ShownQuantity {
        id: id.to_owned(),
        unit: unit.to_owned(),
        in_words: words.to_owned(),
    };
    let mut main = v1::ShownRope {
        cable: "main".to_owned(),
        material_m: (0..=N_SEGMENTS).map(|at| PIECE_M * f64::from(at)).collect(),
        nodes,
        from: 0,
    };
    // A rope may come in parts.
    let goes_on = v1::ShownRope {
        cable: "main".to_owned(),
        material_m: main.material_m.split_off(25),
        nodes: main.nodes.split_off(25),
        from: 25,
    };
    vec![
        Part::Begin(v1::MotionBegin {
            from: "reference".to_owned(),
            in_words: "from reference: tie breaks at 0 s".to_owned(),
            steps: 2000,
            divided_steps: 2000.0,
            frames: N_FRAMES.into(),
            stable_step_s: 0.000_25,
            moving_mass_kg: 17.4,
            damping_mass_per_s: 0.1,
            compared_with: "at rest under what acts at the end".to_owned(),
            ..Default::default()
        }),
        Part::Shown(v1::MotionShown {
            nodes: vec!["n20".to_owned()],
            ..Default::default()
        }),
        Part::Shown(v1::MotionShown {
            ropes: vec![main, goes_on],
            watched: vec![
                quantity("middle", "m", "movement of n20 along (0, 0, 1)"),
                quantity("first-piece", "N", "tension of main from n0 to n1"),
                quantity("speed", "m/s", "velocity of n20 along (0, 0, 1)"),
            ],
            ..Default::default()
        }),
        Part::Waves(v1::MotionWaves {
            ropes: vec![v1::RopeWaves {
                cable: "main".to_owned(),
                transverse_least_m_per_s: speed(),
                transverse_most_m_per_s: speed(),
                axial_m_per_s: AXIAL_M_PER_S,
                transverse_step_s: Some(PIECE_M / speed()),
                axial_step_s: PIECE_M / AXIAL_M_PER_S,
            }],
        }),
    ]
}

fn motion(id: &str, nodes: Vec<String>) -> Vec<Event> {
    let frames: Vec<v1::MotionFrame> = (0..N_FRAMES).map(frame).collect();
    let largest_kinetic = frames
        .iter()
        .map(|frame| frame.energy.unwrap().kinetic_j)
        .fold(0.0, f64::max);
    let energy = frames.last().unwrap().energy;
    let spectra: Vec<(Vec<f64>, f64)> = (0..3)
        .map(|at| spectrum(&frames.iter().map(|frame| frame.watched[at]).collect::<Vec<f64>>()))
        .collect();
    let mut parts = beginning(nodes);
    for (number, frame) in frames.into_iter().enumerate() {
        if number % 50 == 1 {
            parts.extend(in_two(frame).map(Part::Frame));
        } else {
            parts.push(Part::Frame(frame));
        }
    }
    let event = |time_s: f64, kind: v1::MotionEventKind, member: &str, from: u32, to: &str| v1::MotionEvent {
        time_s,
        kind: kind.into(),
        segment: from,
        member: member.to_owned(),
        from: format!("n{from}"),
        to: to.to_owned(),
    };
    parts.push(Part::Events(v1::MotionEvents {
        events: vec![event(0.0, v1::MotionEventKind::Break, "tie", BREAK_AT, "low")],
    }));
    parts.push(Part::Events(v1::MotionEvents {
        events: (0..24)
            .map(|at| {
                let kind = [v1::MotionEventKind::Slack, v1::MotionEventKind::Snatch][usize::from(at % 2 == 1)];
                event(0.16 + 0.003 * f64::from(at), kind, "main", 38, "n39")
            })
            .collect(),
    }));
    for ((lines, apart), (watched, unit)) in
        spectra
            .iter()
            .zip([("middle", "m"), ("first-piece", "N"), ("speed", "m/s")])
    {
        let top: f64 = lines.iter().copied().fold(0.0, f64::max);
        let mut peaks: Vec<v1::SpectrumPeak> = (1..lines.len() - 1)
            .filter(|&at| lines[at] > lines[at - 1] && lines[at] > lines[at + 1] && lines[at] > 1e-3 * top)
            .map(|at| v1::SpectrumPeak {
                frequency_hz: apart * f64::from(u32::try_from(at).unwrap()),
                amplitude: lines[at],
            })
            .collect();
        peaks.sort_by(|a, b| b.amplitude.total_cmp(&a.amplitude));
        peaks.truncate(20);
        parts.push(Part::Spectrum(v1::MotionSpectrum {
            watched: watched.to_owned(),
            unit: unit.to_owned(),
            samples: 2001,
            resolution_hz: *apart,
            mean: 0.001,
            rms: 0.02,
            peaks,
        }));
    }
    let extreme = |value: f64, time_s: f64, id: &str| {
        Some(v1::MotionExtreme {
            value,
            time_s,
            id: id.to_owned(),
        })
    };
    let end = Part::End(v1::MotionEnd {
        outcome: v1::MotionOutcome::Finished.into(),
        time_s: 0.4,
        steps: 2003,
        smallest_step_s: 0.000_05,
        iterations: 5210,
        factorisations: 5210,
        energy,
        largest_error_j: 0.02,
        largest_kinetic_j: largest_kinetic,
        slackenings: 12,
        snatches: 12,
        largest_tension_n: extreme(28_140.0, 0.014, "main"),
        largest_movement_m: extreme(0.160, 0.0, "n10"),
        largest_support_force_n: extreme(27_300.0, 0.0146, "n0"),
        largest_tension_factor: extreme(1.407, 0.014, "main"),
        largest_movement_factor: extreme(1.98, 0.188, "n30"),
        ..Default::default()
    });
    let mut events: Vec<Event> = parts.into_iter().map(|what| part(id, what)).collect();
    let key = format!("motion/{id}");
    let all = (0..spectra[0].0.len()).flat_map(|line| spectra.iter().map(move |(lines, _)| lines[line]));
    events.push(column(
        &key,
        "spectrum_amplitude",
        "",
        v1::Range::Frequency,
        3,
        all.collect(),
    ));
    let ropes = usize::try_from(N_SEGMENTS).unwrap();
    events.push(column(
        &key,
        "tension_max_n",
        "N",
        v1::Range::RopeSegment,
        1,
        vec![28_140.0; ropes],
    ));
    events.push(column(
        &key,
        "tension_max_time_s",
        "s",
        v1::Range::RopeSegment,
        1,
        vec![0.014; ropes],
    ));
    events.push(part(id, end));
    events
}

/// A run with one motion.
pub(crate) fn run_named(id: &str) -> Run {
    collected_of(id, events(id)).unwrap()
}

/// The run of some events.
pub(crate) fn collected(events: Vec<Event>) -> Result<Run, String> {
    collected_of("gust", events)
}

fn collected_of(id: &str, events: Vec<Event>) -> Result<Run, String> {
    let brief = brief(id);
    let mut collector = Collector::of(&v1::RunRequest {
        brief: Some(brief.clone()),
        only: Vec::new(),
    });
    for event in events {
        collector.take(event).map_err(|odd| odd.to_string())?;
    }
    collector.finish(brief).map_err(|odd| odd.to_string())
}
