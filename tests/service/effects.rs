//! Rules that make cases and design effects, over the network: in order, to the bit, in bounded memory.

use ropewalk_api::ropewalk::v1;
use v1::run_response::Event;

use crate::briefs;
use crate::client::{case_summaries, collect, lasting_bytes};
use crate::engine::Engine;

/// Classes with so many alternatives each, every action a small push at `on`.
fn classified(mut brief: v1::Brief, on: &str, alternatives: &[usize]) -> v1::Brief {
    let mut factors = v1::Factors {
        source: "invented".to_owned(),
        ..v1::Factors::default()
    };
    brief.actions.clear();
    brief.cases.clear();
    for (class, count) in alternatives.iter().enumerate() {
        let id = format!("class-{class}");
        for alternative in 0..*count {
            let push = -100.0 * (class + 1) as f64 - 10.0 * alternative as f64;
            let mut action = briefs::push(&format!("{id}-{alternative}"), &[on], push);
            action.class.clone_from(&id);
            brief.actions.push(action);
        }
        factors.classes.push(v1::ActionClass {
            id,
            behaviour: Some(v1::action_class::Behaviour::Variable(v1::VariableClass {
                gamma: 1.5,
                psi0: 0.6,
                psi1: 0.5,
                psi2: 0.3,
                note: String::new(),
            })),
            note: String::new(),
        });
    }
    brief.factors = Some(factors);
    brief
}

fn rule(set: &str, rule: v1::combination::Rule) -> v1::Combination {
    v1::Combination {
        set: set.to_owned(),
        rule: Some(rule),
        ..v1::Combination::default()
    }
}

fn loss(members: &[&str]) -> v1::combination::Rule {
    v1::combination::Rule::Accidental(v1::AccidentalRule {
        remove_each: members.iter().map(|&id| id.to_owned()).collect(),
        effect_factor: Some(1.5),
        ..v1::AccidentalRule::default()
    })
}

/// Losses and factors on effects of a saddle: equal bytes on one thread and on two, each effect after its last case.
#[tokio::test]
async fn design_effects_follow_their_cases_with_equal_bytes() {
    let mut brief = classified(briefs::saddle(6, 1), "n2-3", &[1, 2]);
    let on_effect = v1::FundamentalRule {
        on_effect: Some(v1::FactorOnEffect {
            set: "ultimate".to_owned(),
            ..v1::FactorOnEffect::default()
        }),
        ..v1::FundamentalRule::default()
    };
    brief.combinations = vec![
        rule("ultimate", v1::combination::Rule::Fundamental(on_effect)),
        rule("loss", loss(&["a2", "b3"])),
    ];
    let mut answers = Vec::new();
    for threads in ["1", "2"] {
        let engine = Engine::start(&["--threads", threads]);
        let stream = engine
            .briefs()
            .await
            .run(briefs::run(brief.clone()))
            .await
            .expect("a run");
        let (events, end) = collect(stream.into_inner()).await;
        end.expect("ends well");
        let mut closed: Vec<&str> = Vec::new();
        let mut effects = 0;
        for event in &events {
            match &event.event {
                Some(Event::CaseSummary(summary)) => closed.push(&summary.case),
                Some(Event::DesignEffect(effect)) => {
                    assert!(effect.answered, "{effect:?}");
                    assert!(
                        effect.terms.iter().all(|term| closed.contains(&term.case.as_str())),
                        "{effect:?}"
                    );
                    effects += 1;
                }
                _ => {}
            }
        }
        // Three actions alone, factored on their effects; 8 selections with two members lost, and none of them without any.
        assert_eq!(effects, 3 + 2 * 8);
        answers.push(lasting_bytes(&events));
    }
    assert!(answers[0] == answers[1], "answers differ");
}

/// More than 10 000 cases of a small net, each a solve of its own: what the engine keeps of them does not grow.
#[tokio::test]
async fn ten_thousand_cases_take_bounded_memory() {
    let mut brief = classified(briefs::first_net(), "m", &[7, 7, 6, 6]);
    let characteristic = v1::combination::Rule::Characteristic(v1::CharacteristicRule::default());
    brief.combinations = vec![rule("service", characteristic)];
    let engine = Engine::start(&["--threads", "2"]);
    let stream = engine.briefs().await.run(briefs::run(brief)).await.expect("a run");
    let mut stream = stream.into_inner();
    let (mut states, mut early, mut summary) = (0, 0, None);
    while let Some(event) = stream.message().await.expect("ends well") {
        match event.event {
            Some(Event::CaseSummary(case)) => {
                assert!(case.audited, "{case:?}");
                states += 1;
                if states == 1000 {
                    early = engine.resident_bytes();
                }
            }
            Some(Event::Summary(last)) => summary = Some(last),
            _ => {}
        }
    }
    // 2 · 7 · 8 · 7 · 7 + 2 · 6 · 8 · 8 · 7 leading with others beside them, none, and the reference state.
    let expected = 2 * 7 * 8 * 7 * 7 + 2 * 6 * 8 * 8 * 7 + 1 - 1;
    assert_eq!(states, expected + 1);
    assert_eq!(
        summary.expect("a summary").answered.expect("a share").count,
        expected + 1
    );
    let grown = engine.resident_bytes().saturating_sub(early);
    assert!(grown < 32 << 20, "{grown} bytes more than after the first thousand");
}

/// A part of a run: what a set's design effects need runs with it.
#[tokio::test]
async fn only_a_set_runs_with_what_its_effects_need() {
    let mut brief = classified(briefs::first_net(), "m", &[2]);
    brief.combinations = vec![
        rule(
            "service",
            v1::combination::Rule::Characteristic(v1::CharacteristicRule::default()),
        ),
        rule("loss", loss(&["bracing"])),
    ];
    let engine = Engine::start(&[]);
    let request = v1::RunRequest {
        brief: Some(brief),
        only: vec!["loss".to_owned()],
    };
    let stream = engine.briefs().await.run(request).await.expect("a run");
    let (events, end) = collect(stream.into_inner()).await;
    end.expect("ends well");
    let names: Vec<&str> = case_summaries(&events)
        .iter()
        .map(|summary| summary.case.as_str())
        .collect();
    assert_eq!(
        names,
        [
            "reference",
            "loss-001",
            "loss-001-without-bracing",
            "loss-002",
            "loss-002-without-bracing",
            "loss-003",
            "loss-003-without-bracing"
        ]
    );
}
