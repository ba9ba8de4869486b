//! Least and largest axial forces, and largest movements, over the reference state and cases.

use super::CaseDigest;

/// A value and where it comes from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extreme {
    /// Axial force (N), tension positive; or movement (m).
    pub value: f64,
    /// The case, by index; `None` stands for the reference state.
    pub case: Option<usize>,
}

/// Least and largest axial force of one segment.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Envelope {
    /// The least.
    pub least: Extreme,
    /// The largest.
    pub largest: Extreme,
}

/// Envelopes on their way through the cases, one a segment, whatever the order and number of cases.
#[derive(Clone, Debug)]
pub struct EnvelopeTally {
    segments: Vec<Envelope>,
}

impl EnvelopeTally {
    /// Envelopes of the reference state alone. `reference_forces`: axial force of every segment in it (N).
    #[must_use]
    pub fn new(reference_forces: &[f64]) -> Self {
        let alone = |value: &f64| {
            let extreme = Extreme {
                value: *value,
                case: None,
            };
            Envelope {
                least: extreme,
                largest: extreme,
            }
        };
        Self {
            segments: reference_forces.iter().map(alone).collect(),
        }
    }

    /// Takes in a case; one without a sound answer is not looked at.
    pub fn add(&mut self, case: usize, digest: &CaseDigest) {
        if !digest.is_sound() {
            return;
        }
        let mut removed = vec![false; self.segments.len()];
        digest
            .removed
            .iter()
            .for_each(|segment| removed[segment.index()] = true);
        let present = self.segments.iter_mut().zip(&digest.axial_forces).zip(removed);
        for ((envelope, force), _) in present.filter(|(_, removed)| !removed) {
            let (value, case) = (*force, Some(case));
            // Of equals the reference state, then the first case of the brief: the order of adding leaves no trace.
            let Envelope { least, largest } = envelope;
            if value < least.value || (value == least.value && case < least.case) {
                *least = Extreme { value, case };
            }
            if value > largest.value || (value == largest.value && case < largest.case) {
                *largest = Extreme { value, case };
            }
        }
    }

    /// One envelope a segment.
    #[must_use]
    pub fn finish(self) -> Vec<Envelope> {
        self.segments
    }
}

/// Largest movements from the reference state on their way through the cases, one a node, whatever the order and number
/// of cases.
#[derive(Clone, Debug)]
pub struct MovementTally(Vec<Extreme>);

impl MovementTally {
    /// Movements in the reference state alone: none.
    #[must_use]
    pub fn new(n_nodes: usize) -> Self {
        let none = Extreme { value: 0.0, case: None };
        Self(vec![none; n_nodes])
    }

    /// Takes in a case; one without a sound answer is not looked at, nor is a node whose place is not determined.
    pub fn add(&mut self, case: usize, digest: &CaseDigest) {
        if !digest.is_sound() {
            return;
        }
        let mut determined = vec![true; self.0.len()];
        for node in &digest.loose_nodes {
            determined[node.index()] = false;
        }
        for ((largest, moved), determined) in self.0.iter_mut().zip(&digest.displacements).zip(determined) {
            let (value, case) = (moved.norm(), Some(case));
            if determined && (value > largest.value || (value == largest.value && case < largest.case)) {
                *largest = Extreme { value, case };
            }
        }
    }

    /// One entry a node.
    #[must_use]
    pub fn finish(self) -> Vec<Extreme> {
        self.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::check::tests_support::{digest, reference_forces};

    #[test]
    fn extremes_name_their_case_and_skip_unsound_ones() {
        let mut digests = [
            digest(&[1500.0, 1500.0, 0.0]),
            digest(&[1000.0, 1500.0, -0.0]),
            digest(&[-9.0, 9e9, 1.0]),
        ];
        digests[2].audited = false;
        let found = |order: [usize; 3]| {
            let mut tally = EnvelopeTally::new(&reference_forces());
            order.iter().for_each(|case| tally.add(*case, &digests[*case]));
            tally.finish()
        };
        let forward = found([0, 1, 2]);
        let extreme = |value, case| Extreme { value, case };
        assert_eq!(forward[0].least, extreme(1000.0, Some(1)));
        assert_eq!(forward[0].largest, extreme(2000.0, None));
        // Equal in both cases: the first one is named. As in the reference state: that is named.
        assert_eq!(forward[1].largest, extreme(1500.0, Some(0)));
        assert_eq!(forward[2].least, extreme(0.0, None));
        for order in [[2, 1, 0], [1, 2, 0], [0, 2, 1]] {
            let other = found(order);
            assert_eq!(other, forward);
            let signs = |found: &[Envelope]| found.iter().map(|e| e.least.value.to_bits()).collect::<Vec<_>>();
            assert_eq!(signs(&other), signs(&forward));
        }
    }
}
