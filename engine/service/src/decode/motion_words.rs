//! A motion in words: "from storm: 1 gust by a table; gW1 breaks at 0.5 s".

use ropewalk_numerics::brief::{BreakGiven, Brief, DrivenGiven, DrivenWhat, StartGiven};
use ropewalk_numerics::model::{Member, Net};
use ropewalk_numerics::motion::transient::{BreakWhen, History};

use super::cases::REFERENCE;
use crate::words::{force, number, rounded, shown};

/// Things that are written out.
const WRITTEN_OUT: usize = 100;

/// What acts and happens in a motion.
pub(super) fn in_words(brief: &Brief, motion: usize) -> String {
    let given = &brief.motions[motion];
    let from = given.from.map_or(REFERENCE, |case| brief.cases[case].name.as_str());
    let mut parts = start(brief, &given.start);
    parts.extend(given.driven.iter().map(|driven| load(brief, driven)));
    parts.extend(given.breaks.iter().map(|given| breaks(&brief.net, given)));
    let more = parts.len().saturating_sub(WRITTEN_OUT);
    parts.truncate(WRITTEN_OUT);
    if more > 0 {
        parts.push(format!("{more} more"));
    }
    let what = if parts.is_empty() {
        "nothing".to_owned()
    } else {
        parts.join("; ")
    };
    format!("from {}: {what}", shown(from))
}

fn start(brief: &Brief, start: &StartGiven) -> Vec<String> {
    let mut parts = Vec::new();
    if let Some(case) = start.shape_of {
        parts.push(format!("let go from the shape of {}", shown(&brief.cases[case].name)));
    }
    let count = |count: usize| match count {
        1 => "1 node".to_owned(),
        count => format!("{count} nodes"),
    };
    if !start.moved.is_empty() {
        parts.push(format!("{} moved", count(start.moved.len())));
    }
    if !start.velocities.is_empty() {
        let mut nodes: Vec<_> = start.velocities.iter().map(|(node, _)| *node).collect();
        nodes.sort_unstable();
        nodes.dedup();
        parts.push(format!("{} set off with a velocity", count(nodes.len())));
    }
    parts
}

/// A load with its history: a table by its value of the largest size.
fn load(brief: &Brief, driven: &DrivenGiven) -> String {
    let (name, unit) = match &driven.what {
        DrivenWhat::Action(action) => (shown(&brief.actions[*action].name), ""),
        DrivenWhat::Wind { .. } => ("wind".to_owned(), " m/s"),
    };
    let value = |value: f64| format!("{}{unit}", number(value));
    match &driven.history {
        History::Constant(constant) => format!("{} {name} throughout", value(*constant)),
        History::Table(points) => {
            let larger = |most: f64, (_, value): &(f64, f64)| if value.abs() > most.abs() { *value } else { most };
            format!("{} {name} by a table", value(points.iter().fold(0.0, larger)))
        }
        History::Step { at, before, after } => {
            format!("{} {name}, from {} s on {}", value(*before), number(*at), value(*after))
        }
        History::Ramp {
            start,
            end,
            before,
            after,
        } => format!(
            "{name} from {} at {} s to {} at {} s",
            value(*before),
            number(*start),
            value(*after),
            number(*end)
        ),
        History::Harmonic {
            mean,
            amplitude,
            frequency,
            ..
        } => {
            let mean = if *mean == 0.0 {
                String::new()
            } else {
                format!("{} ", number(*mean))
            };
            format!("{mean}+-{} {name} at {} Hz", value(*amplitude), rounded(*frequency, 4))
        }
    }
}

fn breaks(net: &Net, given: &BreakGiven) -> String {
    let mut text = String::new();
    if let Some(first) = given.segments.first() {
        text.push_str(&shown(net.member_name(*first)));
        let whole = match net.segments()[first.index()].member {
            Member::Cable(cable) => net.cables()[cable.index()].segments.len(),
            Member::Strut(_) => 1,
        };
        if given.segments.len() < whole {
            let [from, to] = net.segments()[first.index()].ends.map(|end| shown(net.node_name(end)));
            text.push_str(&format!(" from {from} to {to}"));
        }
    }
    match given.when {
        BreakWhen::Time(time) => text.push_str(&format!(" breaks at {} s", number(time))),
        BreakWhen::Tension(tension) => text.push_str(&format!(" breaks at {}", force(tension))),
    }
    if given.release > 0.0 {
        text.push_str(&format!(" within {} s", rounded(given.release, 4)));
    }
    text
}
