//! What comes of a brief beside numbers: verdicts, causes, estimates, support forces.

use super::*;
use crate::check::Share;
use crate::equilibrium::SolveError;
use crate::model::CableId;

fn snow_brief(loads: &[f64], checks: Vec<Check>) -> Plan {
    let net = crossing().net();
    let m = node(&net, "m");
    let prestress = densities(&net, 3000.0);
    let snow = action("snow", vec![force(&[m], [0.0, 0.0, -1000.0])]);
    let cases = loads.iter().map(|load| case("snow", &[(0, *load)])).collect();
    let mut brief = brief(net, prestress, vec![snow], cases);
    brief.checks = checks;
    Plan::new(brief)
}

fn summary(plan: &Plan) -> Summary {
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let cases: Vec<usize> = (0..plan.brief().cases.len()).collect();
    let mut tally = Tally::new(plan, &reference, &cases);
    for case in cases {
        tally.add(case, &plan.case(&reference, case, &mut run_on).digest());
    }
    tally.finish()
}

fn strength(factor: f64) -> Check {
    Check {
        kind: CheckKind::Safety { factor },
        cables: vec![CableId::new(0), CableId::new(1)],
        struts: Vec::new(),
        nodes: Vec::new(),
        panels: Vec::new(),
        cases: vec![0, 1],
    }
}

#[test]
fn a_summary_judges_over_all_cases() {
    let found = summary(&snow_brief(&[1.0, 5.0], vec![strength(3.0)]));
    assert_eq!(found.verdict, Verdict::Passes);
    assert_eq!(found.facts.answered, Share { count: 2, of: 2 });
    // 24.82 kN in the carrying rope under 5 kN, three times below 82 kN.
    let worst = found.checks[0].worst().expect("two ropes were judged");
    assert_eq!(worst.case, Some(1));
    close(worst.demand, 3.0 * 24.820e3, 2.0);
    let carrying = found.envelopes[0];
    assert_eq!((carrying.least.case, carrying.largest.case), (None, Some(1)));
    assert_eq!(
        summary(&snow_brief(&[1.0, 5.0], vec![strength(4.0)])).verdict,
        Verdict::Exceeds
    );
    assert_eq!(summary(&snow_brief(&[1.0, 5.0], vec![])).verdict, Verdict::NotJudged);
}

#[test]
fn a_case_without_an_answer_outranks_what_was_judged() {
    let mut plan_brief = snow_brief(&[1.0, 5.0], vec![strength(3.0)]).brief().clone();
    plan_brief.cases[1].factors[0].1 = f64::INFINITY;
    let plan = Plan::new(plan_brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let outcome = plan.case(&reference, 1, &mut run_on);
    let CaseOutcome::None { error, cause } = &outcome else {
        panic!("{outcome:?}");
    };
    assert!(matches!(error, SolveError::Loading(_)));
    assert!(cause.to_string().contains("\"m\""), "{cause}");
    assert_eq!(summary(&plan).verdict, Verdict::NoAnswer);
}

#[test]
fn the_order_of_adding_cases_leaves_no_trace() {
    // Equal loads in cases 1 and 2: of them the first is named.
    let plan = snow_brief(
        &[1.0, 5.0, 5.0, 3.0],
        vec![
            Check {
                cases: vec![0, 1, 2, 3],
                ..strength(3.0)
            },
            strength(4.0),
        ],
    );
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let mut digests: Vec<_> = (0..4)
        .map(|case| plan.case(&reference, case, &mut run_on).digest())
        .collect();
    digests[3].audited = false;
    let summed_up = |run: &[usize], order: &[usize]| {
        let mut tally = Tally::new(&plan, &reference, run);
        for case in order {
            tally.add(*case, &digests[*case]);
        }
        tally.finish()
    };
    let forward = summed_up(&[0, 1, 2, 3], &[0, 1, 2, 3]);
    assert_eq!(forward.checks[0].worst().expect("judged").case, Some(1));
    assert_eq!(forward.envelopes[0].largest.case, Some(1));
    assert_eq!(forward.checks[0].unanswered, [3]);
    assert_eq!(forward.facts.audited, Share { count: 3, of: 4 });
    for order in [[3, 2, 1, 0], [2, 0, 3, 1], [1, 3, 0, 2]] {
        assert_eq!(summed_up(&[0, 1, 2, 3], &order), forward);
    }
    // Added twice counts once; a case outside the run does not count; one never added has no answer.
    assert_eq!(summed_up(&[0, 1, 2, 3], &[0, 1, 1, 2, 3, 0]), forward);
    let part = summed_up(&[0, 2], &[1, 2]);
    assert_eq!(part.facts.answered, Share { count: 1, of: 2 });
    assert_eq!(part.checks[0].unanswered, [0]);
    assert_eq!(part.envelopes[0].largest.case, Some(2));
    assert_eq!(part.verdict, Verdict::NoAnswer);
}

/// Equal runs give equal bits, whatever ran before.
#[test]
fn the_order_of_cases_does_not_change_a_bit() {
    let plan = snow_brief(&[1.0, 5.0, 40.0], vec![]);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let bits = |case: usize| -> Vec<u64> {
        let state = state(plan.case(&reference, case, &mut run_on));
        state
            .positions
            .iter()
            .flatten()
            .chain(&state.axial_forces)
            .map(|v| v.to_bits())
            .collect()
    };
    let forward: Vec<_> = (0..3).map(bits).collect();
    let backward: Vec<_> = (0..3).rev().map(bits).collect();
    assert!(forward.iter().eq(backward.iter().rev()));
    assert_eq!(plan.tasks().last(), Some(Task::Case(2)));
}

/// An anchor on a spring: what the spring bears is the support force, and the same number stands in both axes.
#[test]
fn support_forces_of_rigid_skew_and_elastic_supports() {
    let mut sketch = Sketch::default();
    sketch.held("slide", [0.0, 0.0, 0.0]);
    let slide = sketch.id("slide").index();
    sketch.given.nodes[slide].support = Some(crate::model::SupportGiven {
        released: vec![Vector3::new(0.0, 1.0, 1.0)],
    });
    sketch.sprung("spring", [8.0, 0.0, 0.0], [3e5, 0.0, 0.0]);
    sketch.held("above", [4.0, 0.0, 3.0]);
    sketch.cable("rope", section(1e6, 0.0), "slide m spring");
    sketch.cable("hanger", section(1e6, 0.0), "m above");
    let net = sketch.net();
    let m = node(&net, "m");
    let prestress = densities(&net, 1000.0);
    let push = action("push", vec![force(&[m], [300.0, 40.0, -700.0])]);
    let plan = Plan::new(brief(net, prestress, vec![push], vec![case("push", &[(0, 1.0)])]));
    let net = &plan.brief().net;
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let state = state(plan.case(&reference, 0, &mut run_on));
    assert!(state.audit.passed);
    assert!((state.load_sum + state.support_sum).norm() < 1e-6);
    let at = |name: &str| {
        let node = node(net, name);
        state.support_forces.iter().find(|s| s.node == node).expect("a support")
    };
    let spring = node(net, "spring");
    close(
        at("spring").force.x,
        -3e5 * (state.positions[spring.index()].x - 8.0),
        1e-6,
    );
    // The slide bears nothing along itself; its free direction comes last among its own axes.
    let along = Vector3::new(0.0, 1.0, 1.0).normalize();
    close(at("slide").force.dot(&along), 0.0, 1e-6);
    close(at("slide").own_axes[2], 0.0, 1e-6);
    close(
        Vector3::from(at("slide").own_axes).norm(),
        at("slide").force.norm(),
        1e-9,
    );
    for support in &state.support_forces {
        let audited = state.audit.support_forces[support.node.index()];
        assert!((support.force - audited).norm() < 1e-6);
    }
    let nodes: Vec<_> = state.support_forces.iter().map(|s| net.node_name(s.node)).collect();
    assert_eq!(nodes, ["slide", "spring", "above"]);
}

/// A rope exactly at its stress-free length is slack; stretch is against the length at the temperature of the case.
#[test]
fn stretch_and_slackness_are_those_of_the_temperature() {
    let mut sketch = Sketch::default();
    sketch.held("a", [0.0, 0.0, 0.0]);
    sketch.held("b", [4.0, 0.0, 0.0]);
    sketch.cable("rope", section(1e6, 0.0), "a b");
    let net = sketch.net();
    let prestress = densities(&net, 0.0);
    let heat = |change| Load::Temperature {
        scope: crate::load::Scope::All,
        change,
    };
    let actions = vec![action("hot", vec![heat(50.0)]), action("cold", vec![heat(-50.0)])];
    let cases = vec![case("none", &[]), case("hot", &[(0, 1.0)]), case("cold", &[(1, 1.0)])];
    let plan = Plan::new(brief(net, prestress, actions, cases));
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let states: Vec<_> = (0..3).map(|c| state(plan.case(&reference, c, &mut run_on))).collect();
    assert_eq!(
        states.iter().map(|s| s.slack[0]).collect::<Vec<_>>(),
        [true, true, false]
    );
    assert_eq!(states[0].stretches[0], 1.0);
    close(states[1].stretches[0], 1.0 / (1.0 + 6e-4), 1e-15);
    close(states[2].axial_forces[0], 1e6 * (1.0 / (1.0 - 6e-4) - 1.0), 1e-6);
}

#[test]
fn a_stop_names_nodes_ropes_and_what_to_change() {
    // A flat, nearly slack net that can not be done in two factorisations.
    let mut brief = snow_brief(&[1e3], vec![]).brief().clone();
    brief.settings.max_iterations = 2;
    let plan = Plan::new(brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let CaseOutcome::State { cause: Some(cause), .. } = plan.case(&reference, 0, &mut run_on) else {
        panic!("two factorisations do not do");
    };
    assert_eq!(cause.worst[0].node, "m");
    assert!(cause.worst[0].imbalance > 0.0);
    assert_eq!(cause.members, ["carrying", "bracing"]);
    assert_eq!(cause.last_good_load_factor, 0.0);
    assert_eq!(cause.likely, LikelyCause::OutOfIterations);
    let text = cause.to_string();
    let worst = format!("Worst at \"m\": {:.3} kN", cause.worst[0].imbalance / 1e3);
    assert!(
        text.contains("allow more") && text.contains("the solver gave up, not the net") && text.contains(&worst),
        "{text}"
    );
}

/// A mast head between four stays; a case heats the two across until they are slack, and the head can fall over.
#[test]
fn a_mechanism_is_told_in_the_clients_ids() {
    let mut sketch = Sketch::default();
    sketch.held("foot", [0.0, 0.0, 0.0]);
    sketch.node("head", [0.0, 0.0, 5.0]);
    for (name, position) in [
        ("w", [-4.0, 0.0, 0.0]),
        ("e", [4.0, 0.0, 0.0]),
        ("n", [0.0, 4.0, 0.0]),
        ("s", [0.0, -4.0, 0.0]),
    ] {
        sketch.held(name, position);
        sketch.cable(&format!("stay-{name}"), section(1e6, 0.0), &format!("head {name}"));
    }
    sketch.strut("mast", section(50e6, 0.0), "foot", "head");
    let net = sketch.net();
    let mut prestress = densities(&net, 0.0);
    prestress.rules = vec![PrestressRule::UnstressedLength(4.0_f64.hypot(5.0) / 1.002); 4];
    prestress.rules.push(PrestressRule::UnstressedLength(5.0));
    let hot = Load::Temperature {
        scope: crate::load::Scope::Segments([2, 3].map(crate::model::SegmentId::new).to_vec()),
        change: 3000.0,
    };
    let plan = Plan::new(brief(
        net,
        prestress,
        vec![action("let-out", vec![hot])],
        vec![case("let-out", &[(0, 1.0)])],
    ));
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let outcome = plan.case(&reference, 0, &mut run_on);
    let CaseOutcome::None { cause, .. } = &outcome else {
        panic!("{outcome:?}");
    };
    let LikelyCause::Mechanism {
        node,
        direction,
        members,
        ..
    } = &cause.likely
    else {
        panic!("{cause:?}");
    };
    assert_eq!(node, "head");
    close(direction.y.abs(), 1.0, 1e-6);
    assert!(members.contains(&"mast".to_owned()), "{members:?}");
    let text = cause.to_string();
    assert!(text.starts_with("nothing holds \"head\" along (0.00, "), "{text}");
    assert!(!outcome.is_answered() && !outcome.digest().answered);
}

#[test]
fn the_estimate_counts_unknowns_and_bytes() {
    let estimate = snow_brief(&[1.0, 2.0], vec![]).estimate();
    assert_eq!((estimate.unknowns, estimate.states), (3, 3));
    // 5 nodes, 4 segments, 4 lengths, 4 supports.
    assert_eq!(estimate.result_bytes, 3 * (8 * (30 + 16 + 4 + 36) + 4));
    assert!(estimate.seconds > 0.0 && estimate.seconds < 1e-3);
}
