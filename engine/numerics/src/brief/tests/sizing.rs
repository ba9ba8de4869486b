//! Sections chosen from lists, beside every assignment tried one by one.

use super::*;
use crate::check::MovementLimit;
use crate::model::{CableId, Section, SegmentId};

/// Four ropes of a family, invented: `EA`, mass and strength grow together.
fn list() -> Vec<Section> {
    [
        (2.3e6, 0.14, 22e3),
        (4.1e6, 0.25, 39e3),
        (6.5e6, 0.39, 61e3),
        (9.3e6, 0.57, 88e3),
    ]
    .map(|(stiffness, mass, strength)| Section {
        mass_per_length: mass,
        breaking_force: Some(strength),
        ..section(stiffness, 0.0)
    })
    .to_vec()
}

/// Two carrying ropes over one bracing rope under snow on one side; every member its own unit, and its own weight acts.
fn given(strength: f64, movement: f64) -> (Brief, Sizing) {
    let mut sketch = Sketch::default();
    for (name, place) in [
        ("A", [0.0, 0.0, 3.0]),
        ("B", [0.0, 8.0, 3.0]),
        ("C", [5.0, 0.0, 3.0]),
        ("D", [5.0, 8.0, 3.0]),
        ("E", [-4.0, 4.0, 0.0]),
        ("F", [9.0, 4.0, 0.0]),
    ] {
        sketch.held(name, place);
    }
    let rope = list()[1];
    sketch.cable("west", rope, "A m B");
    sketch.cable("east", rope, "C n D");
    sketch.cable("over", rope, "E m n F");
    let net = sketch.net();
    let snowed = [net.segments()[0].ends[1], net.segments()[2].ends[1]];
    let all: Vec<CableId> = (0..3).map(CableId::new).collect();
    let check = |kind, cables: &[CableId], nodes: &[NodeId]| Check {
        kind,
        cables: cables.to_vec(),
        struts: Vec::new(),
        nodes: nodes.to_vec(),
        panels: Vec::new(),
        cases: vec![0, 1],
    };
    let mut prestress = densities(&net, 1500.0);
    prestress.under = vec![0];
    let mut brief = brief(
        net,
        prestress,
        vec![
            action("self", vec![own_weight()]),
            action(
                "snow",
                vec![
                    force(&snowed[..1], [0.0, 0.0, -9e3]),
                    force(&snowed[1..], [0.0, 0.0, -3e3]),
                ],
            ),
            action("lift", vec![force(&snowed, [0.0, 0.0, 4e3])]),
        ],
        vec![case("snow", &[(0, 1.0), (1, 1.0)]), case("lift", &[(0, 1.0), (2, 1.0)])],
    );
    let limit = MovementLimit::Length(movement);
    brief.checks = vec![
        check(CheckKind::Safety { factor: strength }, &all, &[]),
        check(CheckKind::Movement { limit, from: None }, &[], &snowed),
    ];
    let units = brief.net.cables().iter().map(|cable| SizingUnit {
        segments: cable.segments.clone().map(SegmentId::new).collect(),
        candidates: list()
            .into_iter()
            .map(|section| vec![section; cable.segments.len()])
            .collect(),
    });
    let sizing = Sizing {
        units: units.collect(),
        max_evaluations: 200,
    };
    (brief, sizing)
}

/// Whether every check holds in every case with one section a cable.
fn holds(brief: &Brief, choice: &[usize]) -> bool {
    let sections: Vec<Section> = (brief.net.cables().iter().zip(choice))
        .flat_map(|(cable, position)| vec![list()[*position]; cable.segments.len()])
        .collect();
    let brief = Brief {
        net: Arc::new(brief.net.with_sections(&sections).expect("valid sections")),
        ..brief.clone()
    };
    let plan = Plan::new(brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let mut tally = Tally::new(&plan, &reference, &[0, 1]);
    for case in [0, 1] {
        tally.add(case, &plan.case(&reference, case, &mut run_on).digest());
    }
    tally.finish().verdict == Verdict::Passes
}

/// The lightest of all 64 assignments that pass, by trying each.
fn brute_force(brief: &Brief) -> Option<(f64, Vec<usize>)> {
    let plan = Plan::new(brief.clone());
    let lengths = plan.reference(&mut run_on).expect("a reference state").result.lengths;
    let mut best: Option<(f64, Vec<usize>)> = None;
    for number in 0..64 {
        let choice = vec![number % 4, number / 4 % 4, number / 16];
        if !holds(brief, &choice) {
            continue;
        }
        let mass: f64 = (brief.net.cables().iter().zip(&choice))
            .map(|(cable, position)| {
                list()[*position].mass_per_length * lengths[cable.segments.clone()].iter().sum::<f64>()
            })
            .sum();
        if best.as_ref().is_none_or(|(least, _)| mass < *least) {
            best = Some((mass, choice));
        }
    }
    best
}

fn sized(brief: &Brief, sizing: &Sizing) -> SizingOutcome {
    let outcome = size(brief, sizing, &mut |_, _| ControlFlow::Continue(()));
    outcome.expect("valid sections").expect("not broken off")
}

#[test]
fn the_lightest_choice_is_that_of_brute_force() {
    for (strength, movement) in [
        (1.0, 1.0),
        (2.0, 0.22),
        (2.5, 0.12),
        (1.0, 0.055),
        (1.0, 0.05),
        (1.2, 0.045),
        (2.0, 0.04),
        (1.0, 0.035),
        (1.0, 0.03),
        (1.0, 0.01),
    ] {
        let (brief, sizing) = given(strength, movement);
        let best = brute_force(&brief);
        let outcome = sized(&brief, &sizing);
        match best {
            Some((mass, choice)) => {
                assert!(outcome.passes && outcome.proven, "{strength} {movement}");
                assert_eq!(outcome.choice, choice);
                close(outcome.masses.iter().sum(), mass, 1e-9);
                assert!(holds(&outcome.brief, &outcome.choice) && outcome.needs.is_empty());
            }
            None => assert!(!outcome.passes && outcome.proven && !outcome.needs.is_empty()),
        }
        // Whatever is tried is tried once.
        for (position, round) in outcome.rounds.iter().enumerate() {
            assert!(
                outcome.rounds[..position]
                    .iter()
                    .all(|other| other.choice != round.choice)
            );
        }
        assert_eq!(sized(&brief, &sizing).rounds, outcome.rounds);
    }
}

#[test]
fn what_cannot_pass_says_who_needs_what() {
    let (brief, sizing) = given(20.0, 1.0);
    let outcome = sized(&brief, &sizing);
    assert!(!outcome.passes && outcome.choice == [3, 3, 3]);
    let worst = outcome.needs[0].found.expect("a judged member");
    assert_eq!((outcome.needs[0].check, worst.passes), (0, false));
    assert!(worst.demand > worst.limit && outcome.governing.iter().all(Option::is_some));
}

#[test]
fn runs_are_limited_and_can_be_broken_off() {
    let (brief, mut sizing) = given(2.0, 0.22);
    sizing.max_evaluations = 2;
    let outcome = sized(&brief, &sizing);
    assert!(outcome.rounds.len() == 2 && !outcome.proven);
    let broken = size(&brief, &sizing, &mut |task, _| match task {
        Task::Case(1) => ControlFlow::Break(()),
        _ => ControlFlow::Continue(()),
    });
    assert!(broken.expect("valid sections").is_none());
}

#[test]
fn a_candidate_that_cannot_be_judged_is_passed_over() {
    let (brief, mut sizing) = given(1.0, 1.0);
    for section in sizing.units[0].candidates[0].iter_mut() {
        section.breaking_force = None;
    }
    let outcome = sized(&brief, &sizing);
    assert!(outcome.passes && outcome.choice[0] > 0, "{:?}", outcome.choice);
}
