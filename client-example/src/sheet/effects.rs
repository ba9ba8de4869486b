//! Design effects: sums of effects by rules that standards state on effects; never states.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, head, page_head};
use crate::run::Run;

fn rule_words(rule: v1::EffectRule) -> &'static str {
    match rule {
        v1::EffectRule::Loss => "loss: E1 + k (E2 - E1)",
        v1::EffectRule::OnEffect => "factor on the effect",
        v1::EffectRule::OnParts => "factors on parts",
        v1::EffectRule::Unspecified => "",
    }
}

/// All design effects, those without an answer and with the worst ratio first; none where there are none.
pub(crate) fn effects(run: &Run) -> Option<Sheet> {
    let mut effects: Vec<&v1::DesignEffect> = run.effects.iter().map(|effect| &effect.effect).collect();
    let ratio = |effect: &v1::DesignEffect| effect.worst_ratio.unwrap_or(-1.0);
    effects.sort_by(|a, b| a.answered.cmp(&b.answered).then(ratio(b).total_cmp(&ratio(a))));
    (!effects.is_empty()).then(|| Sheet {
        file: "design-effects".into(),
        title: "Design effects".into(),
        heads: vec![
            head("design effect", ""),
            head("rule", ""),
            page_head("what it is", ""),
            head("sets", ""),
            head("factor", ""),
            page_head("beside", ""),
            head("answer", ""),
            head("worst ratio", "%"),
            head("largest movement", "mm"),
            head("at node", ""),
        ],
        rows: effects.into_iter().map(row).collect(),
        note: "Sums of effects of whole cases, quantity by quantity, by a rule that a standard states on effects. They are no states: \
               nothing is in balance in them.",
    })
}

fn row(effect: &v1::DesignEffect) -> Row {
    let when_answered = |cell: Cell| if effect.answered { cell } else { Cell::Empty };
    Row {
        cells: vec![
            Cell::text(&effect.id),
            Cell::text(rule_words(effect.rule())),
            Cell::text(&effect.in_words),
            Cell::text(effect.sets.join(", ")),
            Cell::three(effect.factor),
            Cell::text(&effect.beside),
            Cell::text(if effect.answered {
                "of answered cases"
            } else {
                "none: a case has no answer"
            }),
            Cell::maybe(effect.worst_ratio.map(Cell::percent)),
            when_answered(Cell::three(effect.largest_movement_m * 1e3)),
            when_answered(Cell::text(&effect.largest_movement_node)),
        ],
        mark: match effect.worst_ratio {
            _ if !effect.answered => Mark::Gone,
            Some(ratio) if ratio > 1.0 => Mark::Bad,
            _ => Mark::Plain,
        },
        group: rule_words(effect.rule()).to_owned(),
    }
}

/// Ropes whose tension does not grow as its action does, beside which factor governs; those that depart most first.
pub(crate) fn over_linearity(run: &Run) -> Option<Sheet> {
    let mut found: Vec<(&v1::DesignEffect, &v1::OverLinearity)> = Vec::new();
    for effect in &run.effects {
        found.extend(effect.effect.members.iter().map(|member| (&effect.effect, member)));
    }
    // An index of nothing, -1, departs least.
    let off = |member: &v1::OverLinearity| {
        if member.index > 0.0 {
            member.index.ln().abs()
        } else {
            0.0
        }
    };
    found.sort_by(|a, b| off(b.1).total_cmp(&off(a.1)));
    (!found.is_empty()).then(|| Sheet {
        file: "over-linearity".into(),
        title: "Factor on the action or on the effect".into(),
        heads: vec![
            head("rope", ""),
            head("case", ""),
            page_head("design effect", ""),
            head("E(γF)", "kN"),
            head("γE(F)", "kN"),
            head("index", ""),
            head("factor belongs", ""),
        ],
        rows: found.into_iter().map(|(effect, member)| index_row(effect, member)).collect(),
        note: "Largest tension with factors on the actions and with the factor on the effect. The larger one governs: above 1 the tension \
               grows faster than the action. Each design effect lists the ropes that depart most.",
    })
}

fn index_row(effect: &v1::DesignEffect, member: &v1::OverLinearity) -> Row {
    Row {
        cells: vec![
            Cell::text(&member.member),
            Cell::text(&effect.beside),
            Cell::text(&effect.id),
            Cell::three(member.on_action_n / 1e3),
            Cell::three(member.on_effect_n / 1e3),
            if member.index > 0.0 {
                Cell::three(member.index)
            } else {
                Cell::Empty
            },
            Cell::text(if member.on_action_n > member.on_effect_n {
                "on the action"
            } else {
                "on the effect"
            }),
        ],
        mark: Mark::Plain,
        group: "ropes".to_owned(),
    }
}
