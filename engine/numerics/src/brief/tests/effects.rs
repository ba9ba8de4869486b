//! Design effects, losses and paths.

use super::*;
use crate::check::CaseDigest;
use crate::model::{CableId, Member};

/// Two bars of 6 m in one line, EA 2400 kN, pulled to 18 kN, with a load of 1.5 kN across at the middle.
fn two_bars() -> (Net, Prestress, Vec<Action>) {
    let mut sketch = Sketch::default();
    sketch.held("A", [-6.0, 0.0, 0.0]);
    sketch.node("m", [0.0, 0.0, 0.0]);
    sketch.held("B", [6.0, 0.0, 0.0]);
    sketch.cable("left", section(2.4e6, 0.0), "A m");
    sketch.cable("right", section(2.4e6, 0.0), "m B");
    let net = sketch.net();
    let prestress = densities(&net, 18e3 / 6.0);
    let load = action("load", vec![force(&[node(&net, "m")], [0.0, 0.0, -1500.0])]);
    (net, prestress, vec![load])
}

/// Each case of a brief, solved and made small.
fn digests(plan: &Plan, reference: &ReferenceOutcome) -> Vec<CaseDigest> {
    let cases = 0..plan.brief().cases.len();
    cases
        .map(|case| plan.case(reference, case, &mut run_on).digest())
        .collect()
}

/// Numbers worked out before by bisection on the load: 19.74606 kN and 0.228058 m under 1.5 kN, 21.36055 kN under 2.25 kN,
/// so that both ways to factor differ by 0.721.
#[test]
fn two_bars_grow_more_slowly_than_their_load() {
    let (net, prestress, actions) = two_bars();
    let cases = vec![case("factored", &[(0, 1.5)]), case("as-it-is", &[(0, 1.0)])];
    let mut brief = brief(net, prestress, actions, cases);
    brief.effects = vec![DesignEffect {
        name: "on-effect".to_owned(),
        sets: Vec::new(),
        rule: EffectRule::OnEffect { factor: 1.5 },
        terms: vec![(1, 1.5)],
        beside: Some(0),
    }];
    let plan = Plan::new(brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let digests = digests(&plan, &reference);
    for order in [[0, 1], [1, 0]] {
        let mut tally = Tally::new(&plan, &reference, &[0, 1]);
        let effects: Vec<Effect> = order
            .iter()
            .flat_map(|case| tally.add(*case, &digests[*case]))
            .collect();
        let [effect] = &effects[..] else { panic!("{effects:?}") };
        let (digest, beside) = (
            effect.digest.as_ref().expect("an effect"),
            effect.beside.as_ref().expect("a case"),
        );
        for segment in 0..2 {
            close(beside.axial_forces[segment], 21_360.55, 0.01);
            close(digest.axial_forces[segment], 29_619.08, 0.02);
        }
        close(beside.axial_forces[0] / digest.axial_forces[0], 0.721, 5e-4);
        close(digests[1].axial_forces[0], 19_746.06, 0.01);
        close(digests[1].displacements[1].z, -0.228_058, 1e-6);
        close(digest.displacements[1].z, -1.5 * 0.228_058, 2e-6);
        let summary = tally.finish();
        let rules = summary.factor_rules.expect("ways to factor");
        assert!(rules.on_effect[0] > rules.on_action[0] && rules.on_parts == [0.0, 0.0]);
    }
}

/// The effects of a loss with `k = 1.5`, put together by hand from states that were solved one by one.
#[test]
fn a_loss_is_factored_per_quantity_in_any_order() {
    let net = crossing().net();
    let m = node(&net, "m");
    let snow = action("snow", vec![force(&[m], [0.0, 0.0, -5000.0])]);
    let prestress = densities(&net, 3000.0);
    let without = |name: &str, cable: usize| CaseGiven {
        removed: vec![Member::Cable(CableId::new(cable))],
        ..case(name, &[(0, 1.0)])
    };
    let cases = vec![case("intact", &[(0, 1.0)]), without("no-bracing", 1)];
    let mut brief = brief(net, prestress, vec![snow], cases);
    let effect = DesignEffect {
        name: "effect".to_owned(),
        sets: vec!["loss".to_owned()],
        rule: EffectRule::Loss { factor: 1.5 },
        terms: vec![(0, -0.5), (1, 1.5)],
        beside: None,
    };
    brief.effects = vec![effect];
    // The breaking force is 82 kN; the effect alone is read.
    brief.checks = vec![Check {
        cables: vec![CableId::new(0), CableId::new(1)],
        struts: Vec::new(),
        panels: Vec::new(),
        nodes: Vec::new(),
        cases: vec![2],
        kind: CheckKind::Safety { factor: 2.0 },
    }];
    let plan = Plan::new(brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let digests = digests(&plan, &reference);
    let expected = -0.5 * digests[0].axial_forces[0] + 1.5 * digests[1].axial_forces[0];
    let mut summaries = Vec::new();
    for order in [[0, 1], [1, 0]] {
        let mut tally = Tally::new(&plan, &reference, &[0, 1]);
        let effects: Vec<Effect> = order
            .iter()
            .flat_map(|case| tally.add(*case, &digests[*case]))
            .collect();
        let digest = effects[0].digest.as_ref().expect("an effect");
        close(digest.axial_forces[0], expected, 1e-9);
        let moved = -0.5 * digests[0].displacements[m.index()] + 1.5 * digests[1].displacements[m.index()];
        assert!((digest.displacements[m.index()] - moved).norm() < 1e-12);
        // What is lost has no force, and is not judged.
        assert_eq!(digest.axial_forces[2..], [0.0, 0.0]);
        summaries.push(tally.finish());
    }
    assert_eq!(summaries[0], summaries[1]);
    let [check] = &summaries[0].checks[..] else {
        panic!("one check")
    };
    assert_eq!((check.judgements.len(), check.judgements[0].case), (1, Some(2)));
    close(check.judgements[0].demand, 2.0 * expected, 1e-9);
    let [loss] = &summaries[0].losses[..] else {
        panic!("one loss")
    };
    assert_eq!(
        (loss.factor, &loss.cases[..], loss.unanswered.len()),
        (1.5, &[1][..], 0)
    );
    // Without the bracing the carrying rope slackens: the state itself is worse than what the factor makes of it.
    assert!(expected < digests[1].axial_forces[0]);
    let [worst] = loss.worst[..] else {
        panic!("one member is left: {loss:?}")
    };
    assert_eq!((worst.member, worst.case), (Member::Cable(CableId::new(0)), 1));
    assert_eq!(
        (worst.force, worst.share),
        (digests[1].axial_forces[0], Some(worst.force / 82e3))
    );
    // The envelope over states does not take what is out of the net for slack.
    assert!(summaries[0].envelopes[2].least.value > 1000.0);
}

/// Without both ropes nothing keeps the crossing, which bears a load.
#[test]
fn a_removal_that_leaves_a_mechanism_is_named_and_ends_nothing() {
    let net = crossing().net();
    let m = node(&net, "m");
    let pull = action("pull", vec![force(&[m], [0.0, 0.0, -5000.0])]);
    let prestress = densities(&net, 3000.0);
    let both = CaseGiven {
        removed: [0, 1].map(|cable| Member::Cable(CableId::new(cable))).to_vec(),
        ..case("both", &[(0, 1.0)])
    };
    let mut brief = brief(net, prestress, vec![pull], vec![both, case("intact", &[(0, 1.0)])]);
    brief.effects = vec![DesignEffect {
        name: "effect".to_owned(),
        sets: Vec::new(),
        rule: EffectRule::Loss { factor: 1.5 },
        terms: vec![(1, -0.5), (0, 1.5)],
        beside: None,
    }];
    let plan = Plan::new(brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let outcome = plan.case(&reference, 0, &mut run_on);
    let CaseOutcome::None { error, .. } = &outcome else {
        panic!("{outcome:?}")
    };
    assert!(
        matches!(error, crate::equilibrium::SolveError::NotHeld { nodes, .. } if nodes[..] == [m]),
        "{error:?}"
    );
    let mut tally = Tally::new(&plan, &reference, &[0, 1]);
    for (case, digest) in digests(&plan, &reference).iter().enumerate() {
        for effect in tally.add(case, digest) {
            assert!(effect.digest.is_none());
        }
    }
    let summary = tally.finish();
    assert_eq!(
        (summary.verdict, &summary.losses[0].unanswered[..]),
        (Verdict::NoAnswer, &[0][..])
    );
}

#[test]
fn what_is_taken_out_takes_its_weight_with_it() {
    let mut sketch = crossing();
    for cable in &mut sketch.given.cables {
        cable
            .sections
            .iter_mut()
            .for_each(|section| section.mass_per_length = 2.0);
    }
    let net = sketch.net();
    let prestress = densities(&net, 3000.0);
    let without = CaseGiven {
        removed: vec![Member::Cable(CableId::new(1))],
        ..case("without", &[(0, 1.0)])
    };
    let plan = Plan::new(brief(
        net,
        prestress,
        vec![action("self", vec![own_weight()])],
        vec![case("whole", &[(0, 1.0)]), without],
    ));
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let sums: Vec<f64> = (0..2)
        .map(|case| state(plan.case(&reference, case, &mut run_on)).load_sum.z)
        .collect();
    let lengths = &reference.state.unstressed_lengths;
    let weight = |lengths: &[f64]| -lengths.iter().sum::<f64>() * 2.0 * 9.80665;
    close(sums[0], weight(lengths), 1e-9);
    close(sums[1], weight(&lengths[..2]), 1e-9);
}

/// The same two bars along their load: at 1 and 1.5 of it the numbers above, at 0 the reference state; what acts in the
/// reference state does not grow.
#[test]
fn a_path_leads_through_the_cases() {
    let (net, prestress, mut actions) = two_bars();
    let m = node(&net, "m");
    actions.push(action("dead", vec![force(&[m], [0.0, 0.0, -300.0])]));
    let with_path = CaseGiven {
        path: Some(LoadPath {
            to_factor: 1.5,
            steps: 3,
        }),
        ..case("path", &[(0, 1.0)])
    };
    let over_dead = CaseGiven {
        factors: vec![(0, 1.0), (1, 1.0)],
        ..with_path.clone()
    };
    let mut brief = brief(
        net,
        prestress,
        actions,
        vec![with_path, over_dead, case("none", &[(0, 1.0)])],
    );
    let plan = Plan::new(brief.clone());
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let path = plan.path(&reference, 0, &mut run_on).expect("a path");
    assert!(path.complete);
    assert_eq!(path.load_factors, [0.0, 0.5, 1.0, 1.5]);
    close(path.tensions[0][0], 18_000.0, 1e-3);
    close(path.movements[0], 0.0, 1e-9);
    close(path.tensions[2][1], 19_746.06, 0.01);
    close(path.movements[2], 0.228_058, 1e-6);
    close(path.tensions[3][0], 21_360.55, 0.01);
    assert_eq!(plan.path(&reference, 2, &mut run_on), None);
    brief.prestress.under = vec![1];
    let plan = Plan::new(brief);
    let reference = plan.reference(&mut run_on).expect("a reference state");
    let path = plan.path(&reference, 1, &mut run_on).expect("a path");
    close(path.movements[0], 0.0, 1e-9);
    close(path.tensions[0][0], reference.state.axial_forces[0], 1e-3);
}

/// Many ropes and cases, in two orders: a row keeps the worst ropes, each with the case that comes first in the brief.
#[test]
fn the_worst_of_a_loss_do_not_depend_on_the_order_of_cases() {
    let mut sketch = Sketch::default();
    for rope in 0..30 {
        let (from, to) = (format!("a{rope}"), format!("b{rope}"));
        sketch.held(&from, [0.0, f64::from(rope), 0.0]);
        sketch.held(&to, [1.0, f64::from(rope), 0.0]);
        sketch.cable(&format!("c{rope}"), section(1e6, 0.0), &format!("{from} {to}"));
    }
    let net = sketch.net();
    let prestress = densities(&net, 1000.0);
    let lacks = |number: usize| CaseGiven {
        removed: vec![Member::Cable(CableId::new(0))],
        ..case(&format!("case-{number}"), &[])
    };
    let plan = Plan::new(brief(net, prestress, Vec::new(), (0..40).map(lacks).collect()));
    let reference = plan.reference(&mut run_on).expect("a reference state");
    // Forces that repeat between ropes and cases, so that equals meet.
    let digest = |number: usize| CaseDigest {
        answered: true,
        audited: true,
        axial_forces: (0..30)
            .map(|rope| f64::from(u32::try_from((rope * 7 + number * 11) % 13).expect("small")))
            .collect(),
        displacements: vec![Vector3::zeros(); 60],
        support_forces: vec![None; 60],
        removed: vec![crate::model::SegmentId::new(0)],
        ..CaseDigest::default()
    };
    let all: Vec<usize> = (0..40).collect();
    let rows = |order: &[usize]| {
        let mut tally = Tally::new(&plan, &reference, &all);
        for case in order {
            tally.add(*case, &digest(*case));
        }
        tally.finish().losses
    };
    let forward = rows(&all);
    let mut other: Vec<usize> = all.iter().map(|case| case * 17 % 40).collect();
    assert_eq!(rows(&other), forward);
    other.reverse();
    assert_eq!(rows(&other), forward);
    // By hand: of each rope the largest force and its first case, then the first twenty.
    let mut expected: Vec<(f64, usize, usize)> = (1..30)
        .map(|rope| {
            let forces = all.iter().map(|case| (digest(*case).axial_forces[rope], *case));
            let (force, case) = forces.fold((-1.0, 0), |best, next| if next.0 > best.0 { next } else { best });
            (force, rope, case)
        })
        .collect();
    expected.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    let found: Vec<(f64, usize, usize)> = (forward[0].worst.iter())
        .map(|worst| match worst.member {
            Member::Cable(cable) => (worst.force, cable.index(), worst.case),
            Member::Strut(_) => panic!("no strut"),
        })
        .collect();
    assert_eq!(found, expected[..20]);
}
