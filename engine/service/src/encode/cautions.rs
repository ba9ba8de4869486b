//! Cautions that every client must show.

use ropewalk_numerics::brief::Caution;
use ropewalk_numerics::model::Net;

use crate::decode::Work;

/// Cautions that hold for every result.
#[must_use]
pub fn cautions() -> Vec<String> {
    [
        "This result is an aid. The local code with its national annex and a licensed engineer decide.",
        "The checks are limits set in the brief, or single clauses of the edition that a result names; values marked \"from \
         memory\" must be verified, editions and national annexes differ.",
        "Rope data (stiffness, mass, breaking force) must come from the supplier's certificate or tests; values from tables \
         are first estimates.",
        "Nonlinear results must not be added or scaled: every combination is a case of its own from the same unstressed \
         lengths.",
        "Not covered: fatigue, what wind and vibration do (frequencies and motions, where asked for, are told and not judged; \
         no flutter, no galloping), fire, corrosion, terminations, foundations, glass and cladding, seismic action.",
    ]
    .map(str::to_owned)
    .to_vec()
}

/// Cautions that hold for every result of a net, whatever came of it.
pub(super) fn of_net(work: &Work, net: &Net) -> Vec<String> {
    let own = (!net.panels().is_empty()).then_some(Caution::SkinsPassLoad);
    of_run(work, own.as_slice())
}

/// Cautions of a run: those of every result, then its own.
pub(super) fn of_run(work: &Work, own: &[Caution]) -> Vec<String> {
    let own = own.iter().map(|caution| sentence(&caution.to_string()));
    let factors = work
        .message
        .factors
        .as_ref()
        .filter(|_| !work.message.combinations.is_empty());
    let source = factors.map(|factors| match factors.source.trim() {
        "" => "the factors of combinations come without a source".to_owned(),
        source => format!("the factors of combinations are those of the brief, from: {source}"),
    });
    let effects = (!work.brief.effects.is_empty()).then(|| {
        "design effects are sums of effects by a rule, quantity by quantity, never states: nothing is in balance in them"
            .to_owned()
    });
    let modes = work.brief.modes.is_some().then(|| {
        "natural frequencies are of small undamped movements about a state, with lumped masses; ropes slide in them without \
         friction; a rope near slackness changes them; added mass of air is an input; limits of frequency do not replace a \
         study of the wind"
            .to_owned()
    });
    let of_brief = source
        .into_iter()
        .chain(effects)
        .chain(modes)
        .map(|text| sentence(&text));
    cautions().into_iter().chain(own).chain(of_brief).collect()
}

/// The text as a sentence, cut where it is long: lists of ids may be.
fn sentence(text: &str) -> String {
    /// Characters of one caution.
    const LONGEST: usize = 2000;
    let mut letters = text.chars();
    let first = letters.next().map(|letter| letter.to_uppercase().to_string());
    let rest: String = letters.by_ref().take(LONGEST).collect();
    let end = match (letters.next(), rest.ends_with('?')) {
        (Some(_), _) => " ...",
        (None, true) => "",
        (None, false) => ".",
    };
    format!("{}{rest}{end}", first.unwrap_or_default())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cautions_are_sentences_of_bounded_length() {
        assert_eq!(sentence("the net has struts"), "The net has struts.");
        assert_eq!(sentence("was it in kN?"), "Was it in kN?");
        assert!(sentence(&"x".repeat(5000)).ends_with("x ...") && sentence(&"x".repeat(5000)).len() < 2100);
    }
}
