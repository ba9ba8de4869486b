//! Least and largest axial forces over cases.

use super::CaseDigest;
use crate::model::Net;

/// A value and the case that it comes from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extreme {
    /// Axial force (N), tension positive.
    pub value: f64,
    /// The case, by index.
    pub case: usize,
}

/// Least and largest axial force of one segment.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Envelope {
    /// The least.
    pub least: Extreme,
    /// The largest.
    pub largest: Extreme,
}

impl Envelope {
    /// The envelope of both.
    #[must_use]
    pub fn with(self, other: Self) -> Self {
        // Strict comparisons: of equals the first case stays.
        Self {
            least: if other.least.value < self.least.value {
                other.least
            } else {
                self.least
            },
            largest: if other.largest.value > self.largest.value {
                other.largest
            } else {
                self.largest
            },
        }
    }
}

/// Envelopes of the segments and, from theirs, of the cables; `None` where no case has a sound answer.
#[derive(Clone, Debug, PartialEq)]
pub struct CableEnvelope {
    /// One entry a segment.
    pub segments: Vec<Option<Envelope>>,
    /// One entry a cable.
    pub cables: Vec<Option<Envelope>>,
}

/// Least and largest axial force of every segment and cable over `cases`, by index into `digests`.
#[must_use]
pub fn envelope(net: &Net, digests: &[CaseDigest], cases: &[usize]) -> CableEnvelope {
    let mut segments: Vec<Option<Envelope>> = vec![None; net.segments().len()];
    for case in cases.iter().copied().filter(|case| digests[*case].is_sound()) {
        for (entry, force) in segments.iter_mut().zip(&digests[case].axial_forces) {
            let extreme = Extreme { value: *force, case };
            let one = Envelope {
                least: extreme,
                largest: extreme,
            };
            *entry = Some(entry.map_or(one, |e| e.with(one)));
        }
    }
    let cables = net
        .cables()
        .iter()
        .map(|cable| {
            let own = segments[cable.segments.clone()].iter().copied().flatten();
            own.reduce(Envelope::with)
        })
        .collect();
    CableEnvelope { segments, cables }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::check::tests_support::{digest, net};

    #[test]
    fn extremes_name_their_case_and_skip_unsound_ones() {
        let mut digests = vec![
            digest(&[1.0, 5.0, 0.0]),
            digest(&[3.0, 4.0, 0.0]),
            digest(&[-9.0, 99.0, 1.0]),
        ];
        digests[2].audited = false;
        let found = envelope(&net(), &digests, &[1, 0, 2]);
        let cable = found.cables[0].expect("two sound cases");
        assert_eq!(cable.least, Extreme { value: 1.0, case: 0 });
        assert_eq!(cable.largest, Extreme { value: 5.0, case: 0 });
        // Equal in both cases: the first one asked for is named.
        assert_eq!(found.segments[2].expect("two sound cases").largest.case, 1);
        assert!(envelope(&net(), &digests, &[2]).cables.iter().all(Option::is_none));
    }
}
