//! How the reference state meets what was wanted of it.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::shape::{Quantity, ShapeReport, WITHIN};
use v1::run_response::Event;

use super::doubts::target_path;
use super::parts::{count, event, first_ids, split};

/// Forces left over that are listed.
const LEFT: usize = 20;
/// Members at a bound that are listed.
const AT_BOUNDS: usize = 100;

/// The report in parts; nothing where nothing was wanted.
pub(super) fn report(report: &ShapeReport) -> Vec<v1::RunResponse> {
    if report.targets.is_empty() {
        return Vec::new();
    }
    let ranked = report.ranked();
    let mut place = vec![0; ranked.len()];
    for (position, target) in ranked.iter().enumerate() {
        place[*target] = position;
    }
    let wishes = ranked.iter().map(|index| {
        let target = &report.targets[*index];
        v1::WishResult {
            path: target.name.as_ref().map_or_else(String::new, |name| target_path(name)),
            on: target.on.clone(),
            quantity: quantity(target.quantity).into(),
            wanted: target.wanted,
            found: target.found,
            miss: target.miss,
            met: target.met,
        }
    });
    let mut first = v1::ShapeReport {
        total: count(report.targets.len()),
        met: count(report.targets.iter().filter(|target| target.met).count()),
        nearly_met: count(
            report
                .targets
                .iter()
                .filter(|target| target.miss.abs() <= WITHIN)
                .count(),
        ),
        rank: Some(count(report.targets.len())),
        ..v1::ShapeReport::default()
    };
    if let Some(unmet) = &report.unmet {
        first.rank = unmet.rank.map(count);
        first.fights = (unmet.fights.iter())
            .map(|fight| v1::WishFight {
                first: count(place[fight.targets[0]]),
                second: count(place[fight.targets[1]]),
                first_alone: fight.alone[0],
                second_alone: fight.alone[1],
                first_left_out: fight.left_out[0],
                second_left_out: fight.left_out[1],
            })
            .collect();
        first.left = (unmet.left.iter().take(LEFT))
            .map(|left| v1::ForceLeftOver {
                node: left.node.clone(),
                force_n: left.force.iter().copied().collect(),
                towards: left.towards.clone().unwrap_or_default(),
            })
            .collect();
        first.at_bounds = first_ids(unmet.at_bounds.iter().map(String::as_str), AT_BOUNDS);
    }
    let mut offset = 0;
    let parts = split(wishes.collect()).into_iter().map(|wishes| {
        let length = count(wishes.len());
        let part = v1::ShapeReport {
            wishes,
            offset,
            // What is told of the whole stands in the first part.
            ..std::mem::take(&mut first)
        };
        offset += length;
        event(Event::ShapeReport(part))
    });
    parts.collect()
}

fn quantity(quantity: Quantity) -> v1::TargetQuantity {
    match quantity {
        Quantity::Tension => v1::TargetQuantity::Tension,
        Quantity::MeanTension => v1::TargetQuantity::MeanTension,
        Quantity::Length => v1::TargetQuantity::Length,
        Quantity::UnstressedLength => v1::TargetQuantity::UnstressedLength,
        Quantity::X => v1::TargetQuantity::X,
        Quantity::Y => v1::TargetQuantity::Y,
        Quantity::Z => v1::TargetQuantity::Z,
        Quantity::Sag => v1::TargetQuantity::Sag,
        Quantity::SagNormal => v1::TargetQuantity::SagNormal,
        Quantity::MeshWidth => v1::TargetQuantity::MeshWidth,
        Quantity::Radius => v1::TargetQuantity::Radius,
        Quantity::Surface => v1::TargetQuantity::Surface,
    }
}
