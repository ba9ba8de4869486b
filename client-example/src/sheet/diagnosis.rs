//! What was found of states beside their balance: free movements, states of self-stress, least stiffnesses.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::state_diagnosis::Part;

use super::{Cell, Mark, Row, Sheet, head, page_head};
use crate::run::Run;

/// Nodes or members that a line names.
const NAMED: usize = 4;

/// Free movements, states of self-stress and least stiffnesses of each state that was looked into.
pub(crate) fn diagnoses(run: &Run) -> Sheet {
    let rows = run.diagnoses.iter().filter_map(|part| row(run, part));
    Sheet {
        file: "free-movements".into(),
        title: "Free movements and self-stress".into(),
        heads: vec![
            head("state", ""),
            head("what", ""),
            head("where", ""),
            head("stiffness", "N/m"),
            head("stiffened", ""),
            page_head("members looked at", ""),
        ],
        rows: rows.collect(),
        note: "A free movement stretches no member to first order; where prestress does not stiffen it, nothing holds it. \
               Stiffness is for a unit of the root of the squared movements of all nodes.",
    }
}

fn row(run: &Run, part: &v1::StateDiagnosis) -> Option<Row> {
    let considered = |members: v1::MembersConsidered| match members {
        v1::MembersConsidered::Taut => "without slack ropes",
        _ => "all",
    };
    let (what, place, stiffness, stiffened, members, mark) = match part.part.as_ref()? {
        Part::Mobility(of) => (
            format!(
                "{} free movements, {} states of self-stress",
                of.mechanisms, of.self_stresses
            ),
            format!(
                "{} members, {} free directions, rank {}",
                of.members, of.free_directions, of.rank
            ),
            None,
            match of.not_stiffened {
                0 => "all".to_owned(),
                not => format!("all but {not}"),
            },
            considered(of.members_considered()),
            if of.not_stiffened > 0 { Mark::Bad } else { Mark::Plain },
        ),
        Part::Mechanism(of) => (
            format!("free movement {}", of.number + 1),
            moving(&of.nodes, &of.movements, of.nodes_total),
            Some(of.stiffness_n_per_m),
            if of.stiffened { "yes" } else { "no" }.to_owned(),
            considered(of.members_considered()),
            if of.stiffened { Mark::Plain } else { Mark::Bad },
        ),
        Part::SelfStress(of) => (
            format!("self-stress {}", of.number + 1),
            stressed(run, of),
            None,
            String::new(),
            considered(of.members_considered()),
            Mark::Plain,
        ),
        Part::LeastStiffness(of) => (
            format!("least stiffness {}", of.number + 1),
            moving(&of.nodes, &of.movements, of.nodes_total),
            Some(of.stiffness_n_per_m),
            String::new(),
            "",
            if of.stiffness_n_per_m > 0.0 {
                Mark::Plain
            } else {
                Mark::Bad
            },
        ),
    };
    let kind = what.split(' ').next().unwrap_or_default().to_owned();
    Some(Row {
        cells: vec![
            Cell::text(&part.case),
            Cell::text(what),
            Cell::text(place),
            Cell::maybe(stiffness.map(Cell::three)),
            Cell::text(stiffened),
            Cell::text(members),
        ],
        mark,
        group: format!("{} {kind}", part.case),
    })
}

/// The nodes that move most, each with its direction.
fn moving(nodes: &[String], movements: &[f64], total: u32) -> String {
    let named = nodes.iter().zip(movements.chunks_exact(3)).take(NAMED);
    // Adding zero takes the sign from a zero.
    let shown = |component: f64| (component * 100.0).round() / 100.0 + 0.0;
    let named: Vec<String> = named
        .map(|(node, by)| format!("{node} ({:.2}, {:.2}, {:.2})", shown(by[0]), shown(by[1]), shown(by[2])))
        .collect();
    more(&named.join(", "), named.len(), total)
}

/// The members with the largest forces, as shares of the largest.
fn stressed(run: &Run, of: &v1::SelfStress) -> String {
    let segments = of.segments.iter().zip(&of.shares).take(NAMED);
    let named: Vec<String> = segments
        .filter_map(|(segment, share)| {
            let segment = usize::try_from(*segment)
                .ok()
                .filter(|segment| *segment < run.segments.len())?;
            Some(format!("{} {share:.2}", run.member_id(segment)))
        })
        .collect();
    more(&named.join(", "), named.len(), of.segments_total)
}

fn more(text: &str, named: usize, total: u32) -> String {
    match usize::try_from(total).unwrap_or(usize::MAX).saturating_sub(named) {
        0 => text.to_owned(),
        rest => format!("{text} and {rest} more"),
    }
}
