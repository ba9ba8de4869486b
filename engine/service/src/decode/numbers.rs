//! Numbers within their documented ranges. The ranges are wide: they keep out slips that no rope, roof or load reaches
//! and that arithmetic could not carry, not what is merely unusual.

use std::fmt;

use nalgebra::Vector3;

use super::findings::{Findings, Path};
use super::reasons;
use crate::words::{Quoted, number};

/// A physical quantity and the values that it may take.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Quantity {
    name: &'static str,
    unit: &'static str,
    range: Range,
}

#[derive(Clone, Copy, Debug)]
enum Range {
    /// From the first to the second, both positive.
    Positive(f64, f64),
    /// From zero.
    NotNegative(f64),
    /// From minus this to this.
    Signed(f64),
    /// From the first to the second.
    Between(f64, f64),
}

impl Quantity {
    const fn positive(name: &'static str, unit: &'static str, least: f64, largest: f64) -> Self {
        Self {
            name,
            unit,
            range: Range::Positive(least, largest),
        }
    }

    const fn not_negative(name: &'static str, unit: &'static str, largest: f64) -> Self {
        Self {
            name,
            unit,
            range: Range::NotNegative(largest),
        }
    }

    const fn signed(name: &'static str, unit: &'static str, largest: f64) -> Self {
        Self {
            name,
            unit,
            range: Range::Signed(largest),
        }
    }

    const fn between(name: &'static str, unit: &'static str, least: f64, largest: f64) -> Self {
        Self {
            name,
            unit,
            range: Range::Between(least, largest),
        }
    }

    fn bounds(&self) -> (f64, f64) {
        match self.range {
            Range::Positive(least, largest) | Range::Between(least, largest) => (least, largest),
            Range::NotNegative(largest) => (0.0, largest),
            Range::Signed(largest) => (-largest, largest),
        }
    }

    fn written(&self, value: f64) -> String {
        let space = if self.unit.is_empty() { "" } else { " " };
        format!("{}{space}{}", number(value), self.unit)
    }

    fn cure(&self) -> String {
        let (least, largest) = self.bounds();
        format!("give {} from {} to {}", self.name, number(least), self.written(largest))
    }
}

pub(crate) const COORDINATE: Quantity = Quantity::signed("coordinate", "m", 1e12);
pub(crate) const ORIGIN: Quantity = Quantity::signed("world coordinate", "m", 1e12);
pub(crate) const ATTACHED_MASS: Quantity = Quantity::not_negative("attached mass", "kg", 1e9);
pub(crate) const AXIAL_STIFFNESS: Quantity = Quantity::positive("axial stiffness", "N", 1e-3, 1e13);
pub(crate) const MODULUS: Quantity = Quantity::positive("modulus", "Pa", 1.0, 1e13);
pub(crate) const AREA: Quantity = Quantity::positive("area", "m2", 1e-12, 1e3);
pub(crate) const MASS_PER_LENGTH: Quantity = Quantity::not_negative("mass per length", "kg/m", 1e7);
pub(crate) const BREAKING_FORCE: Quantity = Quantity::positive("breaking force", "N", 1e-3, 1e13);
pub(crate) const PROOF_FORCE: Quantity = Quantity::positive("proof force", "N", 1e-3, 1e13);
pub(crate) const EXPANSION: Quantity = Quantity::signed("thermal expansion", "1/K", 0.999_999e-3);
pub(crate) const DIAMETER: Quantity = Quantity::positive("diameter", "m", 1e-6, 1e2);
pub(crate) const BENDING_STIFFNESS: Quantity = Quantity::positive("bending stiffness", "N m2", 1e-9, 1e15);
pub(crate) const TAKE_UP: Quantity = Quantity::not_negative("take-up", "m", 1e3);
pub(crate) const STRENGTH_FACTOR: Quantity = Quantity::positive("strength factor", "", 1e-6, 1.0);
pub(crate) const SPRING_STIFFNESS: Quantity = Quantity::positive("spring stiffness", "N/m", 1e-6, 1e15);
pub(crate) const MATRIX_STIFFNESS: Quantity = Quantity::signed("stiffness", "N/m", 1e15);
pub(crate) const DIRECTION: Quantity = Quantity::signed("direction", "", 1e150);
pub(crate) const REFERENCE_TEMPERATURE: Quantity = Quantity::between("reference temperature", "deg C", -273.15, 1000.0);
pub(crate) const GRAVITY: Quantity = Quantity::not_negative("gravity", "m/s2", 100.0);
pub(crate) const FORCE_DENSITY: Quantity = Quantity::signed("force density", "N/m", 1e12);
pub(crate) const TENSION: Quantity = Quantity::signed("tension", "N", 1e12);
pub(crate) const MEAN_TENSION: Quantity = Quantity::positive("mean tension", "N", 1e-6, 1e12);
pub(crate) const UNSTRESSED_LENGTH: Quantity = Quantity::positive("unstressed length", "m", 1e-6, 1e5);
pub(crate) const LENGTH_TARGET: Quantity = Quantity::positive("length", "m", 1e-6, 1e5);
pub(crate) const SAG: Quantity = Quantity::signed("sag", "m", 1e5);
pub(crate) const SAG_NORMAL: Quantity = Quantity::not_negative("sag across the chord", "m", 1e5);
pub(crate) const CURVATURE_RADIUS: Quantity = Quantity::positive("radius", "m", 1e-6, 1e9);
pub(crate) const WEIGHT: Quantity = Quantity::positive("weight", "", 1e-6, 1e6);
pub(crate) const FORCE_DENSITY_BOUND: Quantity = Quantity::positive("bound of a force density", "N/m", 1e-9, 1e12);
pub(crate) const SHARE_OF_BREAKING: Quantity = Quantity::positive("share of breaking force", "", 1e-9, 0.999_999_999);
pub(crate) const FORCE: Quantity = Quantity::signed("force", "N", 1e12);
pub(crate) const FORCE_PER_LENGTH: Quantity = Quantity::signed("force per length", "N/m", 1e12);
pub(crate) const PRESSURE: Quantity = Quantity::signed("pressure", "Pa", 1e9);
pub(crate) const WIND_PRESSURE: Quantity = Quantity::not_negative("pressure of the wind", "Pa", 1e9);
pub(crate) const PRESSURE_COEFFICIENT: Quantity = Quantity::signed("coefficient", "", 1e3);
pub(crate) const DRAG_COEFFICIENT: Quantity = Quantity::positive("drag coefficient", "", 1e-6, 1e3);
pub(crate) const ICE_THICKNESS: Quantity = Quantity::positive("thickness of ice", "m", 1e-9, 10.0);
pub(crate) const ICE_DENSITY: Quantity = Quantity::positive("density of ice", "kg/m3", 1e-3, 1e5);
pub(crate) const WATER_DENSITY: Quantity = Quantity::positive("density of water", "kg/m3", 1e-3, 1e5);
pub(crate) const MASS_PER_AREA: Quantity = Quantity::not_negative("mass per area", "kg/m2", 1e6);
pub(crate) const TEMPERATURE_CHANGE: Quantity = Quantity::signed("change of temperature", "K", 1e3);
pub(crate) const MOVEMENT: Quantity = Quantity::signed("movement", "m", 1e3);
pub(crate) const ROPE_FRICTION: Quantity = Quantity::not_negative("friction coefficient", "", 2.0);
pub(crate) const TRAVEL: Quantity = Quantity::not_negative("travel", "m", 100.0);
pub(crate) const TRAVEL_PER_TURN: Quantity = Quantity::positive("travel a turn", "m", 1e-6, 10.0);
pub(crate) const OPENING: Quantity = Quantity::signed("opening", "m", 100.0);
pub(crate) const TURNS: Quantity = Quantity::signed("number of turns", "", 1e6);
pub(crate) const PRESTRESS_SHARE: Quantity = Quantity::signed("share of prestress", "", 1e3);
pub(crate) const FACTOR: Quantity = Quantity::signed("factor", "", 1e6);
pub(crate) const PARTIAL_FACTOR: Quantity = Quantity::not_negative("partial factor", "", 1e3);
pub(crate) const PSI: Quantity = Quantity::between("combination factor", "", 0.0, 1.0);
pub(crate) const XI: Quantity = Quantity::positive("factor xi", "", 1e-3, 1.0);
pub(crate) const PRESTRESS_FACTOR: Quantity = Quantity::positive("factor on prestress", "", 1e-3, 10.0);
pub(crate) const EFFECT_FACTOR: Quantity = Quantity::between("factor on the effect", "", 1.0, 10.0);
pub(crate) const PATH_END: Quantity = Quantity::positive("last load factor", "", 1e-6, 100.0);
pub(crate) const PATH_STEPS: Quantity = Quantity::between("number of steps of the path", "", 1.0, 200.0);
pub(crate) const SAFETY_FACTOR: Quantity = Quantity::between("safety factor", "", 1.0, 1e3);
pub(crate) const SHARE_OF_REFERENCE: Quantity = Quantity::between("share of reference tension", "", 0.0, 0.999_999_999);
pub(crate) const MOVEMENT_LIMIT: Quantity = Quantity::positive("limit of movement", "m", 1e-9, 1e5);
pub(crate) const PULL_LIMIT: Quantity = Quantity::positive("limit of anchor pull", "N", 1e-3, 1e13);
pub(crate) const CHORD_DIVISOR: Quantity = Quantity::between("divisor of the chord", "", 1.0, 1e6);
pub(crate) const GAMMA: Quantity = Quantity::between("partial factor", "", 0.5, 10.0);
pub(crate) const STRENGTH_DIVISOR: Quantity = Quantity::between("divisor of the strength", "", 1.0, 10.0);
pub(crate) const SHARE_OF_STRENGTH: Quantity = Quantity::positive("share of strength", "", 1e-6, 1.0);
pub(crate) const LENGTH_FACTOR: Quantity = Quantity::between("length factor", "", 0.1, 10.0);
pub(crate) const ECCENTRICITY: Quantity = Quantity::positive("eccentricity", "m", 1e-9, 1e3);
pub(crate) const CLEARANCE: Quantity = Quantity::positive("distance", "m", 1e-9, 1e5);
pub(crate) const UP_ANGLE: Quantity = Quantity::between("angle above the horizontal", "deg", -90.0, 90.0);
pub(crate) const DIRECTION_ANGLE: Quantity = Quantity::between("direction in plan", "deg", -360.0, 360.0);
pub(crate) const SECTOR_ANGLE: Quantity = Quantity::positive("angle off a direction", "deg", 1e-6, 180.0);
pub(crate) const CLAMP_FORCE: Quantity = Quantity::not_negative("clamp force", "N", 1e12);
pub(crate) const FRICTION: Quantity = Quantity::positive("friction coefficient", "", 1e-6, 10.0);
pub(crate) const DEVIATION_SHARE: Quantity = Quantity::between("share of the deviation force", "", -1.0, 1.0);
pub(crate) const RADIUS: Quantity = Quantity::positive("radius", "m", 1e-6, 1e5);
pub(crate) const RADIUS_OVER_DIAMETER: Quantity = Quantity::between("radius over diameter", "", 1.0, 1e3);
pub(crate) const RADIUS_OVER_WIRE: Quantity = Quantity::between("radius over wire diameter", "", 1.0, 1e4);
pub(crate) const FALL: Quantity = Quantity::positive("fall", "m per m", 1e-9, 10.0);
pub(crate) const SIZING_RUNS: Quantity = Quantity::between("number of runs", "", 1.0, 10_000.0);
pub(crate) const TOLERANCE: Quantity = Quantity::between("tolerance", "", 1e-14, 1e-8);
pub(crate) const LOAD_STEPS: Quantity = Quantity::between("number of load steps", "", 1.0, 1000.0);
pub(crate) const MODES_OF_STIFFNESS: Quantity = Quantity::between("number of modes of stiffness", "", 1.0, 20.0);
pub(crate) const MODES: Quantity = Quantity::between("number of frequencies", "", 1.0, 100.0);
pub(crate) const ADDED_MASS: Quantity = Quantity::not_negative("added mass", "kg", 1e9);
pub(crate) const AIR_MASS: Quantity = Quantity::not_negative("mass of air", "kg/m2", 1e6);
pub(crate) const FREQUENCY: Quantity = Quantity::not_negative("limit of frequency", "Hz", 1e6);
pub(crate) const DURATION: Quantity = Quantity::positive("duration", "s", 1e-9, 1e6);
pub(crate) const TIME_STEP: Quantity = Quantity::positive("step in time", "s", 1e-12, 1e6);
pub(crate) const SPECTRAL_RADIUS: Quantity = Quantity::between("spectral radius", "", 0.0, 1.0);
pub(crate) const STEP_ERROR: Quantity = Quantity::positive("error of a step", "m", 1e-12, 1e3);
pub(crate) const WIND_SPEED: Quantity = Quantity::signed("speed of the wind", "m/s", 1e3);
pub(crate) const MOMENT: Quantity = Quantity::signed("time", "s", 1e9);
pub(crate) const SPACING: Quantity = Quantity::positive("spacing in time", "s", 1e-9, 1e6);
pub(crate) const DRIVEN_FREQUENCY: Quantity = Quantity::positive("frequency", "Hz", 1e-9, 1e6);
pub(crate) const PHASE: Quantity = Quantity::signed("phase", "deg", 1e6);
pub(crate) const AIR_DENSITY: Quantity = Quantity::positive("density of air", "kg/m3", 1e-6, 100.0);
pub(crate) const BREAK_TIME: Quantity = Quantity::not_negative("time", "s", 1e6);
pub(crate) const BREAK_TENSION: Quantity = Quantity::positive("tension", "N", 1e-3, 1e13);
pub(crate) const RELEASE: Quantity = Quantity::not_negative("time of release", "s", 1e6);
pub(crate) const MASS_DAMPING: Quantity = Quantity::not_negative("factor of mass", "1/s", 1e6);
pub(crate) const STIFFNESS_DAMPING: Quantity = Quantity::not_negative("factor of stiffness", "s", 1e3);
pub(crate) const DAMPING_RATIO: Quantity = Quantity::between("damping ratio", "", 0.0, 1.0);
pub(crate) const ROPE_DAMPING: Quantity = Quantity::not_negative("force per rate of strain", "N s", 1e12);
pub(crate) const VELOCITY: Quantity = Quantity::signed("velocity", "m/s", 1e4);
pub(crate) const FRAME_STEPS: Quantity = Quantity::between("number of steps", "", 1.0, 4_294_967_295.0);
pub(crate) const SAMPLES_FROM: Quantity = Quantity::not_negative("time", "s", 1e6);
pub(crate) const PIECES: Quantity = Quantity::between("number of pieces", "", 2.0, 1000.0);
pub(crate) const ITERATIONS: Quantity = Quantity::between("number of iterations", "", 1.0, 100_000.0);

/// Whom a number belongs to.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Of<'a> {
    /// The kind of thing.
    pub(crate) kind: &'static str,
    /// Its id, if it has one.
    pub(crate) id: &'a str,
}

impl<'a> Of<'a> {
    pub(crate) const fn new(kind: &'static str, id: &'a str) -> Self {
        Self { kind, id }
    }
}

impl fmt::Display for Of<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.id.is_empty() {
            write!(f, "this {}", self.kind)
        } else {
            write!(f, "{} {}", self.kind, Quoted(self.id))
        }
    }
}

impl Findings {
    /// The number, if it is one that the quantity may take.
    pub(crate) fn number(&mut self, path: &Path<'_>, of: Of<'_>, quantity: &Quantity, value: f64) -> Option<f64> {
        let (least, largest) = quantity.bounds();
        if (least..=largest).contains(&value) {
            return Some(value);
        }
        let (name, written) = (quantity.name, quantity.written(value));
        let (reason, why) = match quantity.range {
            _ if !value.is_finite() => (reasons::NOT_FINITE, "not a finite number".to_owned()),
            Range::Positive(..) if value <= 0.0 => (reasons::NOT_POSITIVE, "must be greater than zero".to_owned()),
            Range::NotNegative(_) if value < 0.0 => (reasons::NEGATIVE, "must not be negative".to_owned()),
            _ => (
                reasons::OUT_OF_RANGE,
                format!(
                    "outside the range from {} to {}",
                    number(least),
                    quantity.written(largest)
                ),
            ),
        };
        self.error(
            reason,
            path,
            of.id,
            format!("{of}: {name} is {written}, {why}"),
            quantity.cure(),
        )
        .value(number(value));
        None
    }

    /// The number as above, or `default` where it is left out.
    pub(crate) fn number_or(
        &mut self,
        path: &Path<'_>,
        of: Of<'_>,
        quantity: &Quantity,
        value: Option<f64>,
        default: f64,
    ) -> Option<f64> {
        value.map_or(Some(default), |value| self.number(path, of, quantity, value))
    }

    /// Three numbers.
    pub(crate) fn vector(
        &mut self,
        path: &Path<'_>,
        of: Of<'_>,
        quantity: &Quantity,
        values: &[f64],
    ) -> Option<Vector3<f64>> {
        let [x, y, z] = values else {
            let name = quantity.name;
            self.error(
                reasons::WRONG_COUNT,
                path,
                of.id,
                format!("{of}: {name} has {} numbers where three are wanted", values.len()),
                "give three numbers: x, y, z",
            )
            .value(values.len());
            return None;
        };
        let mut valid = |position, value| self.number(&path.number(position), of, quantity, value);
        let (x, y, z) = (valid(0, *x), valid(1, *y), valid(2, *z));
        Some(Vector3::new(x?, y?, z?))
    }

    /// A direction as a unit vector, from three numbers of any length but zero.
    pub(crate) fn direction(&mut self, path: &Path<'_>, of: Of<'_>, along: &[f64]) -> Option<Vector3<f64>> {
        let vector = self.vector(path, of, &DIRECTION, along)?;
        // Scaled first: the square of a very short direction would vanish.
        let largest = vector.amax();
        if largest < 1e-150 {
            self.error(
                reasons::ZERO_DIRECTION,
                path,
                of.id,
                format!(
                    "{of}: the direction ({}, {}, {}) has no length",
                    vector.x, vector.y, vector.z
                ),
                "give the direction as three numbers of which at least one is not zero",
            );
            return None;
        }
        Some((vector / largest).normalize())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_kind_of_bad_number_has_its_reason() {
        let at = Path::root("net.sections[a].axial_stiffness_n");
        for (quantity, value, reason) in [
            (&AXIAL_STIFFNESS, f64::NAN, reasons::NOT_FINITE),
            (&AXIAL_STIFFNESS, f64::INFINITY, reasons::NOT_FINITE),
            (&AXIAL_STIFFNESS, 0.0, reasons::NOT_POSITIVE),
            (&AXIAL_STIFFNESS, -1.0, reasons::NOT_POSITIVE),
            (&AXIAL_STIFFNESS, 1e300, reasons::OUT_OF_RANGE),
            (&GRAVITY, -1.0, reasons::NEGATIVE),
            (&FORCE, -1e13, reasons::OUT_OF_RANGE),
            (&REFERENCE_TEMPERATURE, -300.0, reasons::OUT_OF_RANGE),
        ] {
            let mut findings = Findings::default();
            assert_eq!(findings.number(&at, Of::new("section", "a"), quantity, value), None);
            let list = findings.into_list();
            assert_eq!(list[0].reason, reason);
            assert!(list[0].message.contains("section \"a\"") && !list[0].cure.is_empty());
        }
    }

    #[test]
    fn directions_of_any_length_are_read() {
        let mut findings = Findings::default();
        let at = Path::root("a");
        for scale in [1e-140, 1.0, 1e140] {
            let unit = findings.direction(&at, Of::new("support", ""), &[0.0, 3.0 * scale, 4.0 * scale]);
            assert!((unit.expect("a direction") - Vector3::new(0.0, 0.6, 0.8)).norm() < 1e-15);
        }
        assert_eq!(findings.direction(&at, Of::new("support", ""), &[0.0; 3]), None);
        assert_eq!(findings.into_list()[0].reason, reasons::ZERO_DIRECTION);
    }
}
