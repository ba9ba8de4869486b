//! Invented briefs of any size.

use ropewalk_api::ropewalk::v1;
use v1::load::Kind as LoadKind;

pub(crate) fn run(brief: v1::Brief) -> v1::RunRequest {
    v1::RunRequest {
        brief: Some(brief),
        only: Vec::new(),
    }
}

/// Two ropes that cross between two high and two low points: the smallest brief of the contract.
pub(crate) fn first_net() -> v1::Brief {
    let node = |id: &str, xyz_m: [f64; 3]| v1::Node {
        id: id.to_owned(),
        xyz_m: xyz_m.to_vec(),
        support: Some(v1::Support::default()),
        ..v1::Node::default()
    };
    let net = v1::Net {
        nodes: vec![
            node("A", [0.0, 0.0, 3.0]),
            node("B", [9.0, 0.0, 0.0]),
            node("C", [9.0, 9.0, 3.0]),
            node("D", [0.0, 9.0, 0.0]),
        ],
        sections: vec![rope()],
        cables: vec![cable("carrying", &["A", "m", "C"]), cable("bracing", &["B", "m", "D"])],
        ..v1::Net::default()
    };
    v1::Brief {
        id: "first-net".to_owned(),
        net_source: Some(v1::brief::NetSource::Net(net)),
        prestress: Some(force_density(&["carrying", "bracing"], 3000.0)),
        actions: vec![push("snow", &["m"], -5000.0)],
        cases: vec![case("full-snow", "snow", 1.0)],
        ..v1::Brief::default()
    }
}

/// A saddle of `ropes` ropes each way, all ends held, with `cases` cases `case-0`, `case-1`, of growing load.
pub(crate) fn saddle(ropes: usize, cases: usize) -> v1::Brief {
    let last = ropes + 1;
    let name = |i: usize, j: usize| format!("n{i}-{j}");
    let rim = |i: usize, j: usize| {
        let (x, y) = (i as f64 * 2.0, j as f64 * 2.0);
        let half = last as f64;
        v1::Node {
            id: name(i, j),
            // Height of a hyperbolic paraboloid, as steep for large nets as for small ones.
            xyz_m: vec![x, y, ((x - half).powi(2) - (y - half).powi(2)) / half / 8.0],
            support: Some(v1::Support::default()),
            ..v1::Node::default()
        }
    };
    let mut nodes = Vec::new();
    let mut cables = Vec::new();
    for i in 1..=ropes {
        nodes.extend([rim(i, 0), rim(i, last), rim(0, i), rim(last, i)]);
        let along: Vec<String> = (0..=last).map(|j| name(i, j)).collect();
        let across: Vec<String> = (0..=last).map(|j| name(j, i)).collect();
        for (id, path) in [(format!("a{i}"), along), (format!("b{i}"), across)] {
            let path: Vec<&str> = path.iter().map(String::as_str).collect();
            cables.push(cable(&id, &path));
        }
    }
    let members: Vec<String> = cables.iter().map(|cable| cable.id.clone()).collect();
    let members: Vec<&str> = members.iter().map(String::as_str).collect();
    let inner: Vec<String> = (1..=ropes).flat_map(|i| (1..=ropes).map(move |j| name(i, j))).collect();
    let inner: Vec<&str> = inner.iter().map(String::as_str).collect();
    let net = v1::Net {
        nodes,
        sections: vec![rope()],
        cables,
        ..v1::Net::default()
    };
    let factor = |number: usize| 0.2 + number as f64 / cases as f64;
    v1::Brief {
        id: format!("saddle-{ropes}"),
        net_source: Some(v1::brief::NetSource::Net(net)),
        prestress: Some(force_density(&members, 10_000.0)),
        actions: vec![push("snow", &inner, -2000.0)],
        cases: (0..cases)
            .map(|number| case(&format!("case-{number}"), "snow", factor(number)))
            .collect(),
        ..v1::Brief::default()
    }
}

fn rope() -> v1::Section {
    v1::Section {
        id: "r10".to_owned(),
        axial_stiffness_n: Some(6.5e6),
        breaking_force_n: Some(82e3),
        ..v1::Section::default()
    }
}

fn cable(id: &str, nodes: &[&str]) -> v1::Cable {
    v1::Cable {
        id: id.to_owned(),
        section: "r10".to_owned(),
        nodes: owned(nodes),
        ..v1::Cable::default()
    }
}

fn force_density(on: &[&str], force_density_n_per_m: f64) -> v1::Prestress {
    v1::Prestress {
        rules: vec![v1::PrestressRule {
            on: owned(on),
            rule: Some(v1::prestress_rule::Rule::ForceDensityNPerM(force_density_n_per_m)),
            ..v1::PrestressRule::default()
        }],
        ..v1::Prestress::default()
    }
}

pub(crate) fn push(id: &str, on: &[&str], down_n: f64) -> v1::Action {
    let kind = LoadKind::Nodes(v1::NodeLoad {
        on: owned(on),
        force_n: vec![0.0, 0.0, down_n],
        ..v1::NodeLoad::default()
    });
    v1::Action {
        id: id.to_owned(),
        loads: vec![v1::Load {
            kind: Some(kind),
            ..v1::Load::default()
        }],
        ..v1::Action::default()
    }
}

pub(crate) fn case(id: &str, action: &str, factor: f64) -> v1::Case {
    v1::Case {
        id: id.to_owned(),
        factors: [(action.to_owned(), factor)].into(),
        ..v1::Case::default()
    }
}

/// The brief with a mass in its ropes and these motions.
pub(crate) fn moving(mut brief: v1::Brief, motions: Vec<v1::Motion>) -> v1::Brief {
    if let Some(v1::brief::NetSource::Net(net)) = &mut brief.net_source {
        net.sections[0].mass_kg_per_m = Some(0.4);
    }
    brief.motions = motions;
    brief
}

/// A motion of `duration_s` in steps of `step_s`, damped a little, in which snow of the net falls at the start and stays.
pub(crate) fn motion(id: &str, duration_s: f64, step_s: f64) -> v1::Motion {
    let factors = v1::RayleighFactors {
        mass_per_s: 0.5,
        ..v1::RayleighFactors::default()
    };
    v1::Motion {
        id: id.to_owned(),
        duration_s,
        step_s,
        driven: vec![v1::DrivenLoad {
            what: Some(v1::driven_load::What::Action("snow".to_owned())),
            history: Some(v1::driven_load::History::Constant(1.0)),
            ..v1::DrivenLoad::default()
        }],
        damping: Some(v1::MotionDamping {
            rayleigh: Some(v1::motion_damping::Rayleigh::Factors(factors)),
            ..v1::MotionDamping::default()
        }),
        ..v1::Motion::default()
    }
}

/// Frames every so many steps, with these nodes and ropes.
pub(crate) fn frames(every_steps: u32, nodes: &[&str], ropes: &[&str]) -> v1::MotionFrames {
    v1::MotionFrames {
        every_steps: Some(every_steps),
        nodes: owned(nodes),
        ropes: owned(ropes),
        ..v1::MotionFrames::default()
    }
}

/// The movement of a node downwards.
pub(crate) fn sag(id: &str, node: &str) -> v1::WatchedQuantity {
    v1::WatchedQuantity {
        id: id.to_owned(),
        of: Some(v1::watched_quantity::Of::Movement(v1::NodeAlong {
            node: node.to_owned(),
            along: vec![0.0, 0.0, -1.0],
            ..v1::NodeAlong::default()
        })),
        ..v1::WatchedQuantity::default()
    }
}

fn owned(ids: &[&str]) -> Vec<String> {
    ids.iter().map(|id| (*id).to_owned()).collect()
}
