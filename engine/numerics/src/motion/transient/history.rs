//! How a load varies in time.

use std::f64::consts::PI;

use thiserror::Error;

/// A factor (–, or a speed in m/s where it belongs to wind) over time (s).
#[derive(Clone, Debug, PartialEq)]
pub enum History {
    /// The same throughout.
    Constant(f64),
    /// Straight between points (time, value); the first and the last value hold before and after. Two points at one time
    /// are a jump.
    Table(Vec<(f64, f64)>),
    /// A jump at one moment.
    Step {
        /// When (s).
        at: f64,
        /// Value before.
        before: f64,
        /// Value from then on.
        after: f64,
    },
    /// A straight rise between two moments, with constant values before and after.
    Ramp {
        /// When it begins (s).
        start: f64,
        /// When it ends (s), after the start.
        end: f64,
        /// Value before.
        before: f64,
        /// Value after.
        after: f64,
    },
    /// `mean + amplitude sin(2π f (t − start) + phase)` from `start` to `end`; zero outside.
    Harmonic {
        /// Mean value.
        mean: f64,
        /// Amplitude.
        amplitude: f64,
        /// Frequency `f` (Hz), positive.
        frequency: f64,
        /// Phase (rad).
        phase: f64,
        /// When it begins (s).
        start: f64,
        /// When it ends (s), after the start.
        end: f64,
    },
}

/// On which side of a jump a value is taken.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Side {
    /// Just before the moment.
    Before,
    /// From the moment on.
    After,
}

/// Size of a jump, over that of the history, that still counts as rounding.
const ROUNDING: f64 = 1e-9;

/// What is wrong with a history.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum HistoryError {
    /// A number is not finite.
    #[error("a number of it is not finite")]
    NotFinite,
    /// A table has no points.
    #[error("its table has no points")]
    Empty,
    /// A table goes back in time.
    #[error("its table goes back in time: point {place} is at {time} s, the one before at {before} s")]
    OutOfOrder {
        /// The later point, from 0.
        place: usize,
        /// Its time (s).
        time: f64,
        /// Time of the point before (s).
        before: f64,
    },
    /// Three points of a table stand at one time.
    #[error("its table has more than two points at {time} s: two make a jump, more mean nothing")]
    Crowded {
        /// The time (s).
        time: f64,
    },
    /// It ends before it begins.
    #[error("it ends at {end} s, not after its start at {start} s")]
    Backwards {
        /// Start (s).
        start: f64,
        /// End (s).
        end: f64,
    },
    /// A frequency is not positive.
    #[error("its frequency is {frequency} Hz: it must be positive")]
    Frequency {
        /// The frequency (Hz).
        frequency: f64,
    },
}

impl History {
    /// Whether it means something.
    ///
    /// # Errors
    /// The first [`HistoryError`].
    pub fn check(&self) -> Result<(), HistoryError> {
        let finite = |numbers: &[f64]| {
            let all = numbers.iter().all(|n| n.is_finite());
            if all { Ok(()) } else { Err(HistoryError::NotFinite) }
        };
        let forward = |start: f64, end: f64| {
            if end > start {
                Ok(())
            } else {
                Err(HistoryError::Backwards { start, end })
            }
        };
        match self {
            Self::Constant(value) => finite(&[*value]),
            Self::Table(points) => {
                if points.is_empty() {
                    return Err(HistoryError::Empty);
                }
                for (time, value) in points {
                    finite(&[*time, *value])?;
                }
                for (place, pair) in points.windows(2).enumerate() {
                    if pair[1].0 < pair[0].0 {
                        return Err(HistoryError::OutOfOrder {
                            place: place + 1,
                            time: pair[1].0,
                            before: pair[0].0,
                        });
                    }
                }
                match points.windows(3).find(|three| three[0].0 == three[2].0) {
                    Some(three) => Err(HistoryError::Crowded { time: three[0].0 }),
                    None => Ok(()),
                }
            }
            Self::Step { at, before, after } => finite(&[*at, *before, *after]),
            Self::Ramp {
                start,
                end,
                before,
                after,
            } => finite(&[*start, *end, *before, *after]).and_then(|()| forward(*start, *end)),
            Self::Harmonic {
                mean,
                amplitude,
                frequency,
                phase,
                start,
                end,
            } => {
                finite(&[*mean, *amplitude, *frequency, *phase, *start, *end])?;
                forward(*start, *end)?;
                if *frequency > 0.0 {
                    Ok(())
                } else {
                    Err(HistoryError::Frequency { frequency: *frequency })
                }
            }
        }
    }

    /// Its value at a time (s), at a jump that on one side of it.
    pub(super) fn value(&self, time: f64, side: Side) -> f64 {
        let reached = |at: f64| time > at || (time == at && side == Side::After);
        match self {
            Self::Constant(value) => *value,
            Self::Table(points) => {
                let next = points.partition_point(|(at, _)| reached(*at));
                match (next.checked_sub(1).map(|last| points[last]), points.get(next).copied()) {
                    (None, Some((_, value))) | (Some((_, value)), None) => value,
                    (Some((t0, v0)), Some((t1, v1))) => v0 + (v1 - v0) * ((time - t0) / (t1 - t0)),
                    (None, None) => 0.0,
                }
            }
            Self::Step { at, before, after } => {
                if reached(*at) {
                    *after
                } else {
                    *before
                }
            }
            Self::Ramp {
                start,
                end,
                before,
                after,
            } => before + (after - before) * ((time - start) / (end - start)).clamp(0.0, 1.0),
            Self::Harmonic {
                mean,
                amplitude,
                frequency,
                phase,
                start,
                end,
            } => {
                if reached(*start) && !reached(*end) {
                    mean + amplitude * (2.0 * PI * frequency * (time - start) + phase).sin()
                } else {
                    0.0
                }
            }
        }
    }

    /// Its value as the motion begins.
    #[must_use]
    pub fn at_start(&self) -> f64 {
        self.value(0.0, Side::After)
    }

    /// The first jump of its value from the start up to a time (s): when (s), and by how much.
    #[must_use]
    pub fn first_jump(&self, until: f64) -> Option<(f64, f64)> {
        let jumps = self.jumps().into_iter().filter(|at| (0.0..=until).contains(at));
        let by = |at: f64| {
            let (before, after) = (self.value(at, Side::Before), self.value(at, Side::After));
            // A sine that ends after whole periods comes to zero but for the rounding of its phase.
            let size = match self {
                Self::Harmonic { mean, amplitude, .. } => mean.abs() + amplitude.abs(),
                _ => before.abs().max(after.abs()),
            };
            Some(after - before).filter(|by| by.abs() > ROUNDING * size)
        };
        jumps
            .filter_map(|at| by(at).map(|by| (at, by)))
            .min_by(|a, b| a.0.total_cmp(&b.0))
    }

    /// Whether it is zero throughout, from the start up to a time (s).
    #[must_use]
    pub fn is_zero(&self, until: f64) -> bool {
        match self {
            Self::Harmonic {
                mean,
                amplitude,
                start,
                end,
                ..
            } => (*mean == 0.0 && *amplitude == 0.0) || *start >= until || *end <= 0.0,
            Self::Table(points) => {
                let within = points.iter().filter(|(time, _)| (0.0..=until).contains(time));
                self.at_start() == 0.0
                    && self.value(until, Side::Before) == 0.0
                    && within.into_iter().all(|p| p.1 == 0.0)
            }
            _ => self.at_start() == 0.0 && self.value(until, Side::After) == 0.0,
        }
    }

    /// First derivative by time (1/s), at a kink that on one side of it; jumps left out.
    pub(super) fn first_derivative(&self, time: f64, side: Side) -> f64 {
        let reached = |at: f64| time > at || (time == at && side == Side::After);
        match self {
            Self::Constant(_) | Self::Step { .. } => 0.0,
            Self::Table(points) => {
                let next = points.partition_point(|(at, _)| reached(*at));
                match (next.checked_sub(1).map(|last| points[last]), points.get(next)) {
                    (Some((t0, v0)), Some((t1, v1))) => (v1 - v0) / (t1 - t0),
                    _ => 0.0,
                }
            }
            Self::Ramp {
                start,
                end,
                before,
                after,
            } if reached(*start) && !reached(*end) => (after - before) / (end - start),
            Self::Harmonic {
                amplitude,
                frequency,
                phase,
                start,
                end,
                ..
            } if reached(*start) && !reached(*end) => {
                let omega = 2.0 * PI * frequency;
                amplitude * omega * (omega * (time - start) + phase).cos()
            }
            Self::Ramp { .. } | Self::Harmonic { .. } => 0.0,
        }
    }

    /// Second derivative by time just before a moment (1/s²), without what kinks and jumps do at once.
    pub(super) fn second_derivative(&self, time: f64) -> f64 {
        match self {
            Self::Harmonic {
                amplitude,
                frequency,
                phase,
                start,
                end,
                ..
            } if time >= *start && time <= *end => {
                let omega = 2.0 * PI * frequency;
                -amplitude * omega * omega * (omega * (time - start) + phase).sin()
            }
            _ => 0.0,
        }
    }

    /// Moments at which the value jumps (s).
    pub(super) fn jumps(&self) -> Vec<f64> {
        match self {
            Self::Constant(_) | Self::Ramp { .. } => Vec::new(),
            Self::Table(points) => (points.windows(2).filter(|pair| pair[0].0 == pair[1].0))
                .map(|pair| pair[0].0)
                .collect(),
            Self::Step { at, .. } => vec![*at],
            Self::Harmonic { start, end, .. } => vec![*start, *end],
        }
    }

    /// Shortest time in which it does something (s): a twentieth of a period, a piece of a table, a ramp; none if it
    /// only jumps.
    #[must_use]
    pub fn finest(&self) -> Option<f64> {
        match self {
            Self::Constant(_) | Self::Step { .. } => None,
            Self::Table(points) => {
                let pieces = points.windows(2).map(|pair| pair[1].0 - pair[0].0);
                pieces.filter(|piece| *piece > 0.0).reduce(f64::min)
            }
            Self::Ramp { start, end, .. } => Some(end - start),
            Self::Harmonic { frequency, .. } => Some(1.0 / (20.0 * frequency)),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_on_both_sides_of_jumps() {
        let table = History::Table(vec![(1.0, 2.0), (2.0, 4.0), (2.0, -1.0), (4.0, 1.0)]);
        assert_eq!(table.check(), Ok(()));
        let both = |t| [Side::Before, Side::After].map(|side| table.value(t, side));
        assert_eq!(both(0.0), [2.0, 2.0]);
        assert_eq!(both(1.5), [3.0, 3.0]);
        assert_eq!(both(2.0), [4.0, -1.0]);
        assert_eq!(both(3.0), [0.0, 0.0]);
        assert_eq!(both(4.0), [1.0, 1.0]);
        assert_eq!(both(9.0), [1.0, 1.0]);
        assert_eq!(table.jumps(), [2.0]);
        let slopes = |t| [Side::Before, Side::After].map(|side| table.first_derivative(t, side));
        assert_eq!(slopes(1.0), [0.0, 2.0]);
        assert_eq!(slopes(1.5), [2.0, 2.0]);
        assert_eq!(slopes(2.0), [2.0, 1.0]);
        assert_eq!(slopes(4.0), [1.0, 0.0]);
        let step = History::Step {
            at: 1.0,
            before: 0.0,
            after: 3.0,
        };
        assert_eq!(step.value(1.0, Side::Before), 0.0);
        assert_eq!(step.value(1.0, Side::After), 3.0);
        let wave = History::Harmonic {
            mean: 1.0,
            amplitude: 2.0,
            frequency: 0.25,
            phase: 0.0,
            start: 1.0,
            end: 5.0,
        };
        assert_eq!(wave.value(1.0, Side::Before), 0.0);
        assert!((wave.value(2.0, Side::Before) - 3.0).abs() < 1e-15);
        assert_eq!(wave.value(5.0, Side::After), 0.0);
    }

    #[test]
    fn jumps_and_zeros_within_a_time() {
        let step = |at, before, after| History::Step { at, before, after };
        assert_eq!(step(1.0, 0.0, 3.0).first_jump(2.0), Some((1.0, 3.0)));
        assert_eq!(step(1.0, 0.0, 3.0).first_jump(0.5), None);
        assert_eq!(step(-1.0, 0.0, 3.0).first_jump(0.5), None);
        assert!(step(1.0, 0.0, 3.0).is_zero(0.5) && !step(1.0, 0.0, 3.0).is_zero(1.0));
        assert!(step(0.0, 2.0, 0.0).is_zero(9.0) && !step(0.5, 2.0, 0.0).is_zero(9.0));
        let wave = |mean, start, end| History::Harmonic {
            mean,
            amplitude: 2.0,
            frequency: 1.7,
            phase: 0.0,
            start,
            end,
        };
        // Seventeen whole periods.
        assert_eq!(wave(0.0, 0.0, 10.0).first_jump(20.0), None);
        let (at, by) = wave(0.5, 1.0, 9.0).first_jump(20.0).expect("a jump");
        assert!(at == 1.0 && (by - 0.5).abs() < 1e-12);
        assert!(wave(0.0, 3.0, 4.0).is_zero(3.0) && !wave(0.0, 3.0, 4.0).is_zero(3.5));
        let table = History::Table(vec![(1.0, 0.0), (2.0, 4.0), (3.0, 0.0)]);
        assert!(table.is_zero(1.0) && !table.is_zero(1.5) && !table.is_zero(9.0));
        assert_eq!((table.at_start(), table.first_jump(9.0)), (0.0, None));
    }

    #[test]
    fn senseless_histories_are_named() {
        assert_eq!(History::Table(Vec::new()).check(), Err(HistoryError::Empty));
        assert_eq!(
            History::Table(vec![(0.0, 1.0), (2.0, 1.0), (1.0, 1.0)]).check(),
            Err(HistoryError::OutOfOrder {
                place: 2,
                time: 1.0,
                before: 2.0
            })
        );
        assert_eq!(
            History::Table(vec![(1.0, 1.0); 3]).check(),
            Err(HistoryError::Crowded { time: 1.0 })
        );
        assert_eq!(History::Constant(f64::NAN).check(), Err(HistoryError::NotFinite));
        let ramp = History::Ramp {
            start: 2.0,
            end: 2.0,
            before: 0.0,
            after: 1.0,
        };
        assert_eq!(ramp.check(), Err(HistoryError::Backwards { start: 2.0, end: 2.0 }));
    }
}
