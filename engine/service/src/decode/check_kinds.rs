//! Checks: what is checked, with its limits and factors.

use std::f64::consts::PI;

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::check::Kind;
use ropewalk_numerics::brief::CheckKind;
use ropewalk_numerics::check::{Clamp, Clearance, MovementLimit, PullLimits, Saddle, SaddleRadius, SaddleSlip, Stage};
use ropewalk_numerics::model::NodeId;

use super::checks::Context;
use super::editions;
use super::findings::{Findings, Path};
use super::names::Thing;
use super::numbers::{
    CHORD_DIVISOR, CLAMP_FORCE, CLEARANCE, COORDINATE, DEVIATION_SHARE, DIAMETER, DIRECTION_ANGLE, ECCENTRICITY, FALL,
    FRICTION, GAMMA, LENGTH_FACTOR, MOVEMENT_LIMIT, Of, PULL_LIMIT, Quantity, RADIUS, RADIUS_OVER_DIAMETER,
    RADIUS_OVER_WIRE, SAFETY_FACTOR, SECTOR_ANGLE, SHARE_OF_REFERENCE, SHARE_OF_STRENGTH, STRENGTH_DIVISOR, UP_ANGLE,
};
use super::reasons;
use super::resolved::Resolved;
use crate::words::{Quoted, number};

/// Where a check is read: its place, what it is read against, what is told.
struct Reader<'r, 'c, 'a> {
    at: &'r Path<'r>,
    context: &'r Context<'c, 'a>,
    findings: &'r mut Findings,
    resolved: &'r mut Resolved,
}

/// What is checked, where it could be read.
pub(super) fn read(
    kind: &Kind,
    at: &Path<'_>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<CheckKind> {
    let at = at.field(field(kind));
    let mut reader = Reader {
        at: &at,
        context,
        findings,
        resolved,
    };
    match kind {
        Kind::Safety(check) => {
            let factor = reader.number("factor", &SAFETY_FACTOR, check.factor)?;
            Some(CheckKind::Safety { factor })
        }
        Kind::Slackness(check) => {
            let share = check.min_share_of_reference;
            let min_share_of_reference = reader.number("min_share_of_reference", &SHARE_OF_REFERENCE, share)?;
            Some(CheckKind::Slackness { min_share_of_reference })
        }
        Kind::Resistance(check) => reader.resistance(check),
        Kind::ServiceStress(check) => reader.share_of_strength(
            (&check.edition, check.share_of_strength),
            Stage::Service,
            editions::SERVICE_SHARES,
        ),
        Kind::ConstructionStress(check) => reader.share_of_strength(
            (&check.edition, check.share_of_strength),
            Stage::Construction,
            editions::CONSTRUCTION_SHARES,
        ),
        Kind::Buckling(check) => {
            let length_factor = reader.number("length_factor", &LENGTH_FACTOR, check.length_factor);
            let safety = reader.number("safety", &SAFETY_FACTOR, check.safety);
            let eccentricity = reader.optional("eccentricity_m", &ECCENTRICITY, check.eccentricity_m);
            Some(CheckKind::Buckling {
                length_factor: length_factor?,
                safety: safety?,
                eccentricity: eccentricity.ok()?,
            })
        }
        Kind::Movement(check) => reader.movement(check),
        Kind::Clearance(check) => reader.clearance(check),
        Kind::AnchorPull(check) => reader.anchor_pull(check),
        Kind::Clamp(check) => reader.clamp(check),
        Kind::Saddle(check) => reader.saddle(check),
        Kind::Drainage(check) => {
            let least_fall = reader.number("min_fall", &FALL, check.min_fall)?;
            Some(CheckKind::Drainage { least_fall })
        }
    }
}

/// Name of the field that says what is checked.
pub(crate) fn field(kind: &Kind) -> &'static str {
    match kind {
        Kind::Safety(_) => "safety",
        Kind::Slackness(_) => "slackness",
        Kind::Movement(_) => "movement",
        Kind::AnchorPull(_) => "anchor_pull",
        Kind::Resistance(_) => "resistance",
        Kind::ServiceStress(_) => "service_stress",
        Kind::Buckling(_) => "buckling",
        Kind::Clearance(_) => "clearance",
        Kind::ConstructionStress(_) => "construction_stress",
        Kind::Clamp(_) => "clamp",
        Kind::Saddle(_) => "saddle",
        Kind::Drainage(_) => "drainage",
    }
}

impl Reader<'_, '_, '_> {
    fn number(&mut self, field: &str, quantity: &Quantity, value: f64) -> Option<f64> {
        self.findings
            .number(&self.at.field(field), Of::new("check", ""), quantity, value)
    }

    /// A number that may be left out.
    fn optional(&mut self, field: &str, quantity: &Quantity, value: Option<f64>) -> Result<Option<f64>, ()> {
        match value {
            None => Ok(None),
            Some(value) => self.number(field, quantity, value).map(Some).ok_or(()),
        }
    }

    fn missing(&mut self, field: &str, what: &str, cure: &str) {
        self.findings.error(
            reasons::MISSING,
            &self.at.field(field),
            "",
            format!("this check {what}"),
            cure,
        );
    }

    /// A factor, from the brief or else from the edition.
    fn factor(
        &mut self,
        edition: &str,
        field: &str,
        quantity: &Quantity,
        value: Option<f64>,
        known: f64,
    ) -> Option<f64> {
        let at = self.at.field(field);
        editions::factor(edition, &at, quantity, value, known, self.findings, self.resolved)
    }

    fn resistance(&mut self, check: &v1::ResistanceCheck) -> Option<CheckKind> {
        editions::required(&check.edition, self.at, self.findings);
        let gamma_r = self.number("gamma_r", &GAMMA, check.gamma_r);
        let (edition, divisor) = (&check.edition, check.strength_divisor);
        let known = editions::STRENGTH_DIVISOR;
        let strength_divisor = self.factor(edition, "strength_divisor", &STRENGTH_DIVISOR, divisor, known);
        if let Some(gamma_r) = gamma_r {
            let at = self.at.field("gamma_r");
            editions::recommended(edition, &at, gamma_r, editions::GAMMA_R, self.findings);
        }
        Some(CheckKind::Resistance {
            gamma_r: gamma_r?,
            strength_divisor: strength_divisor?,
        })
    }

    fn share_of_strength(
        &mut self,
        (edition, share): (&str, f64),
        stage: Stage,
        recommended: &[f64],
    ) -> Option<CheckKind> {
        editions::required(edition, self.at, self.findings);
        let share = self.number("share_of_strength", &SHARE_OF_STRENGTH, share)?;
        let at = self.at.field("share_of_strength");
        editions::recommended(edition, &at, share, recommended, self.findings);
        Some(CheckKind::ShareOfStrength { share, stage })
    }

    fn movement(&mut self, check: &v1::MovementCheck) -> Option<CheckKind> {
        let from_at = self.at.field("from");
        let from = if check.from.is_empty() {
            Some(None)
        } else {
            self.context.cases.case(&check.from, &from_at, self.findings).map(Some)
        };
        let limit = match (check.limit_m, &check.chord) {
            (Some(limit), None) => self
                .number("limit_m", &MOVEMENT_LIMIT, limit)
                .map(MovementLimit::Length),
            (None, Some(chord)) => self.chord(chord),
            (given, _) => {
                let what = match given {
                    None => "has no limit",
                    Some(_) => "has two limits, limit_m and chord",
                };
                self.missing("limit_m", what, "give either limit_m or chord");
                None
            }
        };
        Some(CheckKind::Movement {
            limit: limit?,
            from: from?,
        })
    }

    fn chord(&mut self, chord: &v1::ChordLimit) -> Option<MovementLimit> {
        let at = self.at.field("chord");
        let divided_by = self.findings.number(
            &at.field("divided_by"),
            Of::new("check", ""),
            &CHORD_DIVISOR,
            chord.divided_by,
        );
        let between_at = at.field("between");
        let [from, to] = &chord.between[..] else {
            self.findings
                .error(
                    reasons::WRONG_COUNT,
                    &between_at,
                    "",
                    format!("a chord has two nodes, and this one names {}", chord.between.len()),
                    "name its two nodes",
                )
                .value(chord.between.len());
            return None;
        };
        let mut node = |number: usize, id: &str| {
            let at = between_at.number(number);
            match self.context.net.names.find(self.findings, &at, "node", id)? {
                Thing::Node(node) => Some(NodeId::new(node)),
                other => {
                    self.findings
                        .error(
                            reasons::WRONG_KIND,
                            &at,
                            id,
                            format!("{} is a {}, and a chord lies between nodes", Quoted(id), other.kind()),
                            "name a node",
                        )
                        .value(id);
                    None
                }
            }
        };
        let between = [node(0, from), node(1, to)];
        if from == to {
            self.findings
                .error(
                    reasons::NO_LENGTH,
                    &between_at,
                    from,
                    format!("this chord goes from {} to itself", Quoted(from)),
                    "name two nodes",
                )
                .value(from);
            return None;
        }
        let [from, to] = between;
        Some(MovementLimit::OfChord {
            between: [from?, to?],
            divided_by: divided_by?,
        })
    }

    fn clearance(&mut self, check: &v1::ClearanceCheck) -> Option<CheckKind> {
        let of = Of::new("check", "");
        let point = self
            .findings
            .vector(&self.at.field("point_m"), of, &COORDINATE, &check.point_m);
        let least = self.number("min_m", &CLEARANCE, check.min_m);
        let height_within = match &check.height {
            None => None,
            Some(height) => {
                let at = self.at.field("height");
                let within_at = at.field("within_m");
                match height.within_m {
                    Some(within) => Some(self.findings.number(&within_at, of, &CLEARANCE, within)?),
                    None => {
                        self.resolved.left_out(&within_at, number(least?));
                        least
                    }
                }
            }
        };
        Some(CheckKind::Clearance(Clearance {
            point: point?,
            least: least?,
            height_within,
        }))
    }

    fn anchor_pull(&mut self, check: &v1::AnchorPullCheck) -> Option<CheckKind> {
        let resultant = self.optional("limit_n", &PULL_LIMIT, check.limit_n);
        let horizontal = self.optional("horizontal_limit_n", &PULL_LIMIT, check.horizontal_limit_n);
        let uplift = self.optional("uplift_limit_n", &PULL_LIMIT, check.uplift_limit_n);
        let of = Of::new("check", "");
        let mut angle = |of_range: &str, field: &str, quantity: &Quantity, value: f64| {
            let range = self.at.field(of_range);
            let degrees = self.findings.number(&range.field(field), of, quantity, value);
            degrees.map(|degrees| degrees * PI / 180.0)
        };
        let up_angle = check.up_angle.as_ref().map(|range| {
            let least = angle("up_angle", "least_deg", &UP_ANGLE, range.least_deg);
            let largest = angle("up_angle", "largest_deg", &UP_ANGLE, range.largest_deg);
            Some([least?, largest?])
        });
        let plan_angle = check.plan_angle.as_ref().map(|sector| {
            let direction = angle("plan_angle", "direction_deg", &DIRECTION_ANGLE, sector.direction_deg);
            let within = angle("plan_angle", "within_deg", &SECTOR_ANGLE, sector.within_deg);
            Some([direction?, within?])
        });
        if let (Some(range), Some(Some([least, largest]))) = (&check.up_angle, up_angle)
            && least >= largest
        {
            let at = self.at.field("up_angle");
            self.findings
                .error(
                    reasons::OUT_OF_RANGE,
                    &at.field("largest_deg"),
                    "",
                    format!(
                        "this range of angles goes from {} to {} deg",
                        number(range.least_deg),
                        number(range.largest_deg)
                    ),
                    "let the largest angle be greater than the least",
                )
                .value(number(range.largest_deg));
            return None;
        }
        let limits = PullLimits {
            resultant: resultant.ok()?,
            horizontal: horizontal.ok()?,
            uplift: uplift.ok()?,
            up_angle: match up_angle {
                None => None,
                Some(range) => Some(range?),
            },
            plan_angle: match plan_angle {
                None => None,
                Some(sector) => Some(sector?),
            },
        };
        if limits == PullLimits::default() {
            self.missing(
                "limit_n",
                "has no limit",
                "give one or more of limit_n, horizontal_limit_n, uplift_limit_n, up_angle, plan_angle",
            );
            return None;
        }
        Some(CheckKind::AnchorPull(limits))
    }

    fn clamp(&mut self, check: &v1::ClampCheck) -> Option<CheckKind> {
        let edition = known_where_empty(&check.edition);
        let clamp_force = match check.clamp_force_n {
            Some(force) => self.number("clamp_force_n", &CLAMP_FORCE, force),
            None => {
                self.missing("clamp_force_n", "has no clamp force", "give clamp_force_n, 0 or more");
                None
            }
        };
        let friction = self.number("friction_coefficient", &FRICTION, check.friction_coefficient);
        let gamma = check.gamma_m_fr;
        let gamma = self.factor(edition, "gamma_m_fr", &GAMMA, gamma, editions::GAMMA_FRICTION);
        let deviation_share = check.deviation_share;
        if deviation_share.is_none() {
            self.resolved.left_out(&self.at.field("deviation_share"), 0);
        }
        let deviation_share = self.optional("deviation_share", &DEVIATION_SHARE, deviation_share);
        Some(CheckKind::Clamp(Clamp {
            clamp_force: clamp_force?,
            friction: friction?,
            gamma: gamma?,
            deviation_share: deviation_share.ok()?.unwrap_or(0.0),
        }))
    }

    fn saddle(&mut self, check: &v1::SaddleCheck) -> Option<CheckKind> {
        let edition = known_where_empty(&check.edition);
        if check.radius_m.is_none() && check.friction_coefficient.is_none() {
            self.missing(
                "radius_m",
                "has neither a radius nor a friction coefficient",
                "give radius_m, friction_coefficient or both",
            );
            return None;
        }
        let radius = self.optional("radius_m", &RADIUS, check.radius_m);
        let wire = self.optional("wire_diameter_m", &DIAMETER, check.wire_diameter_m);
        let friction = self.optional("friction_coefficient", &FRICTION, check.friction_coefficient);
        let slip = match friction.ok()? {
            None => None,
            Some(friction) => {
                let gamma = check.gamma_m_fr;
                let gamma = self.factor(edition, "gamma_m_fr", &GAMMA, gamma, editions::GAMMA_FRICTION);
                Some(gamma.map(|gamma| SaddleSlip { friction, gamma }))
            }
        };
        let radius = match radius.ok()? {
            None => None,
            Some(radius) => {
                let known = if check.soft_bed.is_some() {
                    editions::SOFT_SADDLE_DIAMETERS
                } else {
                    editions::SADDLE_DIAMETERS
                };
                let given = check.radius_over_diameter;
                let over_diameter = self.factor(edition, "radius_over_diameter", &RADIUS_OVER_DIAMETER, given, known);
                let given = check.radius_over_wire_diameter;
                // A soft bed takes the place of the wires' term, unless it is asked for.
                let of_wires = match wire.ok()? {
                    Some(wire) if check.soft_bed.is_none() || given.is_some() => {
                        let known = editions::SADDLE_WIRE_DIAMETERS;
                        let field = "radius_over_wire_diameter";
                        self.factor(edition, field, &RADIUS_OVER_WIRE, given, known)
                            .map(|factor| factor * wire)
                    }
                    _ => Some(0.0),
                };
                Some(
                    over_diameter
                        .zip(of_wires)
                        .map(|(over_diameter, of_wires)| SaddleRadius {
                            radius,
                            over_diameter,
                            of_wires,
                        }),
                )
            }
        };
        let saddle = Saddle {
            radius: match radius {
                None => None,
                Some(radius) => Some(radius?),
            },
            slip: match slip {
                None => None,
                Some(slip) => Some(slip?),
            },
        };
        Some(CheckKind::Saddle(saddle))
    }
}

fn known_where_empty(edition: &str) -> &str {
    if edition.trim().is_empty() {
        editions::KNOWN
    } else {
        edition
    }
}
