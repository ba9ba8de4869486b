//! The rope ledger and the list of struts.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Head, Mark, Place, Row, Sheet, envelope_case, file_head, head};
use crate::run::Run;

/// The extreme of some numbers at some places, with its place; none where there are no numbers.
fn extreme(places: &[usize], numbers: &[f64], better: impl Fn(f64, f64) -> bool) -> Option<(usize, f64)> {
    let mut found: Option<(usize, f64)> = None;
    for &place in places {
        let number = *numbers.get(place)?;
        if found.is_none_or(|(_, best)| better(number, best)) {
            found = Some((place, number));
        }
    }
    found
}

fn least(places: &[usize], numbers: &[f64]) -> Option<(usize, f64)> {
    extreme(places, numbers, |number, best| number < best)
}

fn most(places: &[usize], numbers: &[f64]) -> Option<(usize, f64)> {
    extreme(places, numbers, |number, best| number > best)
}

fn rope_heads() -> Vec<Head> {
    vec![
        head("rope", ""),
        head("role", ""),
        head("section", ""),
        head("ref. least", "kN"),
        head("ref. most", "kN"),
        head("min", "kN"),
        head("max", "kN"),
        head("of breaking, ref.", "%"),
        head("of breaking, max", "%"),
        head("least of ref.", "%"),
        head("case of min", ""),
        head("case of max", ""),
        head("unstressed length", "m"),
        Head {
            title: "0 to 100 % of breaking",
            unit: "",
            place: Place::PageOnly,
        },
        file_head("segments", ""),
        file_head("least breaking force with fittings", "kN"),
    ]
}

/// Ropes by role, then by the largest share of their breaking force.
pub(crate) fn ropes(run: &Run) -> Sheet {
    let lengths = run.unstressed_lengths();
    let mut keyed: Vec<(usize, f64, Row)> = Vec::new();
    for (cable, segments) in run.cable_segments().iter().enumerate() {
        let length = lengths.as_ref().map(|[ropes, _]| ropes[cable]);
        keyed.push(rope(run, cable, segments, length));
    }
    keyed.sort_by(|a, b| a.0.cmp(&b.0).then(b.1.total_cmp(&a.1)));
    Sheet {
        file: "cables".into(),
        title: "Rope ledger".into(),
        heads: rope_heads(),
        rows: keyed.into_iter().map(|(_, _, row)| row).collect(),
        note: "Tensions over all segments of a rope and all answered cases, the reference state among them. \
               Breaking force with end fittings. Least of reference: the lowest tension of a segment over its own in \
               the reference state (ref.); 0 is slack. Lengths are unstressed. On the page the bar runs from least to most \
               tension, the tick is the reference state.",
    }
}

fn rope(run: &Run, cable: usize, segments: &[usize], length: Option<f64>) -> (usize, f64, Row) {
    let id = &run.cables[cable];
    let given = run.cable(id);
    let role = given.map(|cable| cable.role.clone()).unwrap_or_default();
    let rank = run
        .net()
        .and_then(|net| net.roles.iter().position(|known| known.id == role))
        .unwrap_or(usize::MAX);
    let mut sections = given.map(|cable| run.cable_sections(cable)).unwrap_or_default();
    sections.dedup();
    let breaking = given.map(|cable| run.breaking_forces(cable)).unwrap_or_default();

    let reference = run.reference().filter(|state| state.answered());
    let at_rest = reference.and_then(|state| state.numbers("tension_n"));
    let envelope = |name: &str| run.envelope.get(name).map(|column| column.values.as_slice());
    let (lows, highs) = (envelope("tension_min_n"), envelope("tension_max_n"));
    let low = lows.and_then(|lows| least(segments, lows));
    let high = highs.and_then(|highs| most(segments, highs));
    let of_breaking = |tensions: Option<&[f64]>| -> Option<f64> {
        let tensions = tensions?;
        let pairs = segments.iter().zip(&breaking);
        pairs
            .map(|(&segment, force)| Some(tensions.get(segment)? / (*force)?))
            .try_fold(0.0_f64, |worst, share| Some(worst.max(share?)))
    };
    let share_max = of_breaking(highs);
    let share_rest = of_breaking(at_rest);
    // The bar ends where its rope works least and most; its own least share, not that of another segment.
    let share_min = lows.and_then(|lows| {
        let shares = segments
            .iter()
            .zip(&breaking)
            .map(|(&at, force)| Some(lows.get(at)? / (*force)?));
        shares.collect::<Option<Vec<f64>>>()?.into_iter().min_by(f64::total_cmp)
    });
    let bar = share_min
        .zip(share_rest)
        .zip(share_max)
        .map(|((least, rest), most)| [least, rest, most]);
    let least_share = at_rest.zip(lows).and_then(|(rest, lows)| {
        let shares = segments
            .iter()
            .filter(|&&segment| rest[segment] > 0.0)
            .map(|&segment| lows[segment] / rest[segment]);
        shares.min_by(f64::total_cmp)
    });
    let case_of = |name: &str, place: Option<(usize, f64)>| {
        let position = envelope(name)?.get(place?.0).copied()?;
        Some(Cell::text(envelope_case(run, position)))
    };
    let least_breaking = breaking
        .iter()
        .copied()
        .try_fold(f64::INFINITY, |least, force| Some(least.min(force?)));
    let kn = |found: Option<(usize, f64)>| Cell::maybe(found.map(|(_, force)| Cell::three(force / 1e3)));
    let mark = if share_max.is_some_and(|share| share > 1.0) {
        Mark::Bad
    } else {
        Mark::Plain
    };
    let row = Row {
        cells: vec![
            Cell::text(id),
            Cell::text(&role),
            Cell::text(sections.join(", ")),
            kn(at_rest.and_then(|rest| least(segments, rest))),
            kn(at_rest.and_then(|rest| most(segments, rest))),
            kn(low),
            kn(high),
            Cell::maybe(share_rest.map(Cell::percent)),
            Cell::maybe(share_max.map(Cell::percent)),
            Cell::maybe(least_share.map(Cell::percent)),
            Cell::maybe(case_of("tension_min_case", low)),
            Cell::maybe(case_of("tension_max_case", high)),
            Cell::maybe(length.map(Cell::three)),
            Cell::maybe(bar.map(Cell::Range)),
            Cell::Count(segments.len().try_into().expect("a count fits 64 bits")),
            Cell::maybe(
                least_breaking
                    .filter(|force| force.is_finite())
                    .map(|force| Cell::three(force / 1e3)),
            ),
        ],
        mark,
        group: if role.is_empty() {
            "ropes without role".to_owned()
        } else {
            role
        },
    };
    (
        rank,
        share_max.or(high.map(|(_, force)| force * 1e-12)).unwrap_or(-1.0),
        row,
    )
}

/// Struts in brief order: their forces over all answered states.
pub(crate) fn struts(run: &Run) -> Sheet {
    let lengths = run.unstressed_lengths();
    let rows = (0..run.struts.len())
        .map(|strut| strut_row(run, strut, lengths.as_ref().map(|[_, struts]| struts[strut])))
        .collect();
    Sheet {
        file: "struts".into(),
        title: "Masts and struts".into(),
        heads: vec![
            head("strut", ""),
            head("role", ""),
            head("section", ""),
            head("reference", "kN"),
            head("lowest", "kN"),
            head("case of lowest", ""),
            head("highest", "kN"),
            head("case of highest", ""),
            head("unstressed length", "m"),
        ],
        rows,
        note: "Tension positive: a mast under pressure has negative numbers. Buckling is judged only where a check asks for it.",
    }
}

fn strut_row(run: &Run, strut: usize, length: Option<f64>) -> Row {
    let id = &run.struts[strut];
    let given: Option<&v1::Strut> = run.strut(id);
    let forces: Vec<(&str, f64)> = run
        .states
        .iter()
        .filter(|state| state.answered())
        .filter_map(|state| Some((state.id.as_str(), *state.numbers("axial_force_n")?.get(strut)?)))
        .collect();
    let low = forces.iter().min_by(|a, b| a.1.total_cmp(&b.1));
    let high = forces.iter().rev().max_by(|a, b| a.1.total_cmp(&b.1));
    let rest = forces.iter().find(|(case, _)| *case == "reference");
    let kn = |found: Option<&(&str, f64)>| Cell::maybe(found.map(|(_, force)| Cell::three(force / 1e3)));
    let case = |found: Option<&(&str, f64)>| Cell::maybe(found.map(|(case, _)| Cell::text(*case)));
    Row {
        cells: vec![
            Cell::text(id),
            Cell::maybe(given.map(|strut| Cell::text(&strut.role))),
            Cell::maybe(given.map(|strut| Cell::text(run.strut_section(strut)))),
            kn(rest),
            kn(low),
            case(low),
            kn(high),
            case(high),
            Cell::maybe(length.map(Cell::three)),
        ],
        mark: Mark::Plain,
        group: String::new(),
    }
}
