//! Rules of checks in words: what is asked, by which clause and edition, with which factors.

use ropewalk_numerics::brief::CheckKind;
use ropewalk_numerics::check::{Judgement, Lack, Measure, MovementLimit, Stage};

use crate::decode::Work;
use crate::words::{Quoted, force, length, number, rounded, shown};

/// Edition whose clauses are named here, and how they were known.
const KNOWN: &str = "EN 1993-1-11:2006";

/// The rule of a check with its factors, and its source.
pub(super) fn source(work: &Work, number_in_brief: usize, kind: &CheckKind) -> String {
    let message = &work.message.checks[number_in_brief];
    let by = |clause: &str| match crate::decode::edition_of(message) {
        Some(KNOWN) => format!("{KNOWN}, {clause} (from memory: verify)"),
        Some(edition) => format!("{}, factors of the brief", shown(edition)),
        None => "limits of the brief".to_owned(),
    };
    match kind {
        CheckKind::Safety { .. } => {
            "factor of the brief times largest tension, against the breaking force with end fittings".to_owned()
        }
        CheckKind::Slackness { .. } => {
            "least tension over the tension in the reference state, against the share of the brief".to_owned()
        }
        CheckKind::Resistance {
            gamma_r,
            strength_divisor,
        } => format!(
            "largest tension against F_Rd = min(F_uk / ({} gamma_R), F_k / gamma_R), gamma_R {}, F_uk with end fittings: {}",
            number(*strength_divisor),
            number(*gamma_r),
            by("6.2")
        ),
        CheckKind::ShareOfStrength { share, stage } => format!(
            "largest tension against {} F_uk {}, F_uk with end fittings: {}",
            number(*share),
            match stage {
                Stage::Service => "in service",
                Stage::Construction => "during construction",
            },
            by("7.2")
        ),
        CheckKind::Buckling {
            length_factor, safety, ..
        } => format!(
            "largest compression against Euler's critical force pi^2 EI / ({} L)^2 over a safety of {}, L in the reference \
             state: limits of the brief",
            number(*length_factor),
            number(*safety)
        ),
        CheckKind::Movement { limit, from } => {
            let from = match from {
                None => "the place in the reference state".to_owned(),
                Some(_) => match &message.kind {
                    Some(ropewalk_api::ropewalk::v1::check::Kind::Movement(check)) => {
                        format!("the place in case {}", Quoted(&check.from))
                    }
                    _ => "the place in another case".to_owned(),
                },
            };
            let limit = match limit {
                MovementLimit::Length(_) => "the limit of the brief".to_owned(),
                MovementLimit::OfChord { between, divided_by } => {
                    let [a, b] = between.map(|node| work.brief.net.node_name(node));
                    format!(
                        "the chord from {} to {} over {}",
                        Quoted(a),
                        Quoted(b),
                        number(*divided_by)
                    )
                }
            };
            format!("distance from {from}, against {limit}")
        }
        CheckKind::Clearance(clearance) => {
            let [x, y, z] = [clearance.point.x, clearance.point.y, clearance.point.z].map(number);
            let what = match clearance.height_within {
                None => "distance".to_owned(),
                Some(within) => format!("height, of members within {} in plan,", length(within)),
            };
            format!("{what} from the point ({x}, {y}, {z}), against the least one of the brief")
        }
        CheckKind::AnchorPull(_) => "pull on the anchor, against the limits of the brief".to_owned(),
        CheckKind::Clamp(clamp) => format!(
            "difference of tensions against ({} F_perp + F_r) mu / gamma_M,fr, F_r {}, mu {}, gamma_M,fr {}: {}",
            number(clamp.deviation_share),
            force(clamp.clamp_force),
            number(clamp.friction),
            number(clamp.gamma),
            by("6.4")
        ),
        CheckKind::Saddle(saddle) => {
            let mut parts = Vec::new();
            if let Some(radius) = &saddle.radius {
                let wires = match radius.of_wires {
                    0.0 => String::new(),
                    wires => format!(" and at least {}, asked for by the wires", length(wires)),
                };
                parts.push(format!("radius at least {} d{wires}", number(radius.over_diameter)));
            }
            if let Some(slip) = &saddle.slip {
                parts.push(format!(
                    "F1/F2 at most exp(mu alpha / gamma_M,fr), mu {}, gamma_M,fr {}",
                    number(slip.friction),
                    number(slip.gamma)
                ));
            }
            format!("{}: {}", parts.join("; "), by("6.3"))
        }
        CheckKind::Drainage { .. } => {
            "slope of the steepest line of the flattest triangle of the panel, against the least fall of the brief"
                .to_owned()
        }
    }
}

/// What the rule leaves out, and what else comes of it for the worst part.
pub(super) fn notes(work: &Work, kind: &CheckKind, worst: Option<&Judgement>) -> Vec<String> {
    let net = &work.brief.net;
    let section = worst
        .and_then(|worst| worst.segment)
        .map(|id| &net.segments()[id.index()].section);
    let mut notes = Vec::new();
    match kind {
        CheckKind::Resistance { .. } if section.is_some_and(|section| section.proof_force.is_none()) => {
            notes
                .push("no proof force is given for the section of the worst: the term with F_k is left out".to_owned());
        }
        CheckKind::Buckling { eccentricity, .. } => {
            notes.push(
                "not covered: other imperfections, stresses, plasticity, local and torsional buckling, loads along the strut"
                    .to_owned(),
            );
            if let (Some(eccentricity), Some(worst)) = (eccentricity, worst) {
                notes.push(match worst.moment {
                    Some(moment) => format!(
                        "compressed {} off its axis, the worst bends by {} kN m (C e / cos(pi/2 sqrt(C/N_cr))); not judged",
                        length(*eccentricity),
                        rounded(moment / 1e3, 3)
                    ),
                    None => format!("compressed {} off its axis, the worst buckles", length(*eccentricity)),
                });
            }
        }
        CheckKind::Clearance(_) => {
            notes.push(
                "ropes are taken straight between their nodes: the sag of single ropes is not covered".to_owned(),
            );
        }
        CheckKind::Clamp(_) => {
            notes.push(
                "not covered: pressure under the clamp, loss of grip as the rope thins, the clamp itself".to_owned(),
            );
        }
        CheckKind::Saddle(saddle) => {
            if saddle.radius.is_some_and(|radius| radius.of_wires == 0.0) {
                notes.push("the wires' own term of the radius is left out".to_owned());
            }
            notes.push("not covered: pressure on the bed, the saddle itself".to_owned());
        }
        CheckKind::Drainage { .. } => notes.push("not covered: depressions between panels".to_owned()),
        _ => {}
    }
    notes
}

/// Unit of a kind of check whose worst part is not known.
pub(super) fn usual_measure(kind: &CheckKind) -> Measure {
    match kind {
        CheckKind::Safety { .. } | CheckKind::Resistance { .. } | CheckKind::ShareOfStrength { .. } => Measure::Tension,
        CheckKind::Slackness { .. } => Measure::TensionShare,
        CheckKind::Buckling { .. } => Measure::Compression,
        CheckKind::Movement { .. } => Measure::Movement,
        CheckKind::Clearance(_) => Measure::Distance,
        CheckKind::AnchorPull(_) => Measure::Pull,
        CheckKind::Clamp(_) => Measure::TensionDifference,
        CheckKind::Saddle(saddle) if saddle.slip.is_some() => Measure::TensionRatio,
        CheckKind::Saddle(_) => Measure::Radius,
        CheckKind::Drainage { .. } => Measure::Fall,
    }
}

/// What was measured in words, its unit on the wire, and the factor from the kernel's unit.
pub(super) fn measure(measure: Measure) -> (&'static str, &'static str, f64) {
    let degrees = 180.0 / std::f64::consts::PI;
    match measure {
        Measure::Tension => ("tension", "N", 1.0),
        Measure::TensionShare => ("tension over reference tension", "", 1.0),
        Measure::Compression => ("compression", "N", 1.0),
        Measure::Movement => ("movement", "m", 1.0),
        Measure::Distance => ("distance", "m", 1.0),
        Measure::Height => ("height", "m", 1.0),
        Measure::Pull => ("pull", "N", 1.0),
        Measure::HorizontalPull => ("horizontal pull", "N", 1.0),
        Measure::Uplift => ("uplift", "N", 1.0),
        Measure::UpAngle => ("angle above the horizontal", "deg", degrees),
        Measure::PlanAngle => ("angle off the direction in plan", "deg", degrees),
        Measure::TensionDifference => ("difference of tension", "N", 1.0),
        Measure::Radius => ("radius wanted", "m", 1.0),
        Measure::TensionRatio => ("ratio of tensions", "", 1.0),
        Measure::Fall => ("fall", "", 1.0),
    }
}

/// Why a part could not be judged.
pub(super) fn lack(lack: Lack) -> &'static str {
    match lack {
        Lack::Answer => "no case with a sound answer",
        Lack::Rope => "struts are not judged by this check",
        Lack::Strut => "cables are not judged by this check",
        Lack::BreakingForce => "no breaking force is given",
        Lack::BendingStiffness => "no bending stiffness is given",
        Lack::Diameter => "no diameter is given",
        Lack::TautReference => "slack in the reference state",
        Lack::Support => "not supported",
        Lack::ClampedRope => "no rope runs on through it, clamped",
        Lack::PassingRope => "no rope runs on through it",
        Lack::Over => "nothing lies above or below the point",
        Lack::Base => "the case that movements are measured from has no sound answer",
        Lack::Place => "only slack ropes lead there: the place is not determined",
        Lack::State => "a design effect is no state and has no places",
        Lack::Finite => "the numbers give no finite ratio",
    }
}
