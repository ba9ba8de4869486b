//! What to doubt of a motion.

use super::begun::Whole;
use crate::model::{CableId, NodeId, SegmentId};
use crate::motion::transient::{BreakWhen, Caution, Driven, History, Outcome, Outlook, Scheme, WaveSpeeds};

/// Something to be doubted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum MotionDoubt {
    /// The steps do not resolve transverse waves: they cross a segment in less than a step.
    Waves {
        /// The rope that needs the smallest step.
        cable: CableId,
        /// Step as given (s).
        step: f64,
        /// Step that resolves its waves (s).
        needed: f64,
        /// Ropes whose waves are not resolved.
        count: usize,
    },
    /// The steps do not follow histories.
    Histories {
        /// The driven load that needs the smallest step, from 0.
        driven: usize,
        /// Step as given (s).
        step: f64,
        /// Step that follows it (s).
        needed: f64,
        /// Driven loads that are not followed.
        count: usize,
    },
    /// The steps made energy, or took much of it: above 1 % of the largest kinetic energy by size where the scheme is meant to
    /// conserve, above 10 % of it at the end with any.
    Energy {
        /// Error of the ledger (J): the largest by size, or that at the end.
        error: f64,
        /// Largest kinetic energy (J).
        kinetic: f64,
    },
    /// A series is shorter than 20 periods of the largest peak of its spectrum.
    ShortSpectrum {
        /// The watched quantity, from 0, with the fewest periods.
        watched: usize,
        /// Frequency of its largest peak (Hz).
        frequency: f64,
        /// Periods of it in the series.
        periods: f64,
        /// Quantities whose series are short.
        count: usize,
    },
    /// Damping by stiffness is that of the start, and holds back what is slack or broken since.
    DampingOfStart {
        /// How many times segments went slack.
        slackenings: u64,
        /// Segments that were to break.
        breaks: usize,
    },
    /// Pieces of a divided rope are longer than what varies: a wave crosses one in more time than the load changes in.
    LongPieces {
        /// The rope that needs the most pieces.
        cable: CableId,
        /// Time in which a wave crosses one piece (s).
        crossing: f64,
        /// Time in which a load changes (s).
        finest: f64,
        /// Pieces of each segment that would do.
        needed: f64,
    },
    /// What was to break at a tension never reached it.
    NotBroken {
        /// Its first segment.
        segment: SegmentId,
        /// The tension (N).
        tension: f64,
        /// The largest that it had (N).
        largest: f64,
        /// How many such breaks there are.
        count: usize,
    },
    /// A node moves by more than half of the extent of the net.
    LargeMovement {
        /// The node.
        node: NodeId,
        /// Its largest movement (m).
        movement: f64,
        /// Extent of the net at the start (m): the diagonal of the box around it.
        extent: f64,
    },
    /// A rope is pulled beyond its breaking force.
    OverBreaking {
        /// The segment with the largest ratio.
        segment: SegmentId,
        /// Its largest tension (N).
        tension: f64,
        /// Its breaking force (N).
        breaking: f64,
    },
}

/// Share of the kinetic energy from which the error of a conserving scheme is to be doubted.
const CONSERVES: f64 = 0.01;
/// The same for energy made by any scheme.
const MAKES: f64 = 0.1;
/// Share of the elastic energy below which an error is rounding, and nothing is said of a net that hardly moves.
const ROUNDING: f64 = 1e-12;
/// Periods from which a spectrum tells a peak well.
const PERIODS: f64 = 20.0;
/// Movement over the extent of the net from which units or loads are to be doubted.
const LARGE_MOVEMENT: f64 = 0.5;

/// All that is to be doubted, each kind once, with its worst.
pub(super) fn doubts(whole: &Whole, outlook: &Outlook, outcome: &Outcome) -> Vec<MotionDoubt> {
    let found = [
        waves(outlook),
        histories(outlook),
        energy(whole.motion.scheme, outcome),
        short_spectrum(outcome),
        damping_of_start(whole, outcome),
        long_pieces(whole, outlook),
        not_broken(whole, outcome),
        large_movement(whole, outcome),
        over_breaking(whole, outcome),
    ];
    found.into_iter().flatten().collect()
}

fn waves(outlook: &Outlook) -> Option<MotionDoubt> {
    let all = outlook.cautions.iter().filter_map(|caution| match caution {
        Caution::Wave { cable, step, needed } => Some((*cable, *step, *needed)),
        Caution::History { .. } => None,
    });
    let (count, worst) = count_and_least(all);
    let (cable, step, needed) = worst?;
    Some(MotionDoubt::Waves {
        cable,
        step,
        needed,
        count,
    })
}

fn histories(outlook: &Outlook) -> Option<MotionDoubt> {
    let all = outlook.cautions.iter().filter_map(|caution| match caution {
        Caution::History { driven, step, needed } => Some((*driven, *step, *needed)),
        Caution::Wave { .. } => None,
    });
    let (count, worst) = count_and_least(all);
    let (driven, step, needed) = worst?;
    Some(MotionDoubt::Histories {
        driven,
        step,
        needed,
        count,
    })
}

/// How many, and the first of those with the least last number.
fn count_and_least<Place: Copy>(all: impl Iterator<Item = (Place, f64, f64)>) -> (usize, Option<(Place, f64, f64)>) {
    all.fold((0, None), |(count, least), next| match least {
        Some((_, _, known)) if known <= next.2 => (count + 1, least),
        _ => (count + 1, Some(next)),
    })
}

fn energy(scheme: Scheme, outcome: &Outcome) -> Option<MotionDoubt> {
    let kinetic = outcome.largest_kinetic;
    let conserves = match scheme {
        Scheme::GeneralisedAlpha { spectral_radius, .. } => spectral_radius == 1.0,
        Scheme::Conserving { .. } => true,
        Scheme::CentralDifferences => false,
    };
    let doubt = |error| Some(MotionDoubt::Energy { error, kinetic });
    let counts = |error: f64, share: f64| error > share * kinetic && error > ROUNDING * outcome.ledger.elastic;
    if conserves && counts(outcome.largest_error, CONSERVES) {
        doubt(outcome.largest_error)
    } else if counts(outcome.ledger.error, MAKES) {
        doubt(outcome.ledger.error)
    } else {
        None
    }
}

fn short_spectrum(outcome: &Outcome) -> Option<MotionDoubt> {
    let series = outcome.spectra.iter().enumerate().filter_map(|(watched, spectrum)| {
        let frequency = spectrum.peaks.first()?.frequency;
        Some((watched, frequency, frequency / spectrum.resolution))
    });
    let (count, worst) = count_and_least(series.filter(|(_, _, periods)| *periods < PERIODS));
    let (watched, frequency, periods) = worst?;
    Some(MotionDoubt::ShortSpectrum {
        watched,
        frequency,
        periods,
        count,
    })
}

fn damping_of_start(whole: &Whole, outcome: &Outcome) -> Option<MotionDoubt> {
    let motion = &whole.motion;
    let breaks = motion.breaks.iter().map(|given| given.segments.len()).sum();
    let slackenings = outcome.events.slackenings;
    (motion.damping.stiffness > 0.0 && (breaks > 0 || slackenings > 0))
        .then_some(MotionDoubt::DampingOfStart { slackenings, breaks })
}

fn long_pieces(whole: &Whole, outlook: &Outlook) -> Option<MotionDoubt> {
    /// Pieces that a wave of a sine should have.
    const PIECES_OF_WAVE: f64 = 5.0;
    let division = whole.division.as_ref()?;
    let times = whole.motion.driven.iter().filter_map(|driven| {
        let history = match driven {
            Driven::Case { history, .. } | Driven::Wind { speed: history, .. } => history,
        };
        match history {
            History::Harmonic { frequency, .. } => Some(1.0 / (PIECES_OF_WAVE * frequency)),
            other => other.finest(),
        }
    });
    let finest = times.reduce(f64::min)?;
    let is_divided = |waves: &&WaveSpeeds| {
        let mut segments = whole.net.cables()[waves.cable.index()].segments.clone();
        segments.any(|segment| division.pieces(SegmentId::new(segment)).len() > 1)
    };
    let crossings = outlook.waves.iter().filter(is_divided);
    let crossings = crossings.filter(|waves| waves.transverse_step.is_finite());
    let slowest = crossings.reduce(|known, next| {
        if next.transverse_step > known.transverse_step {
            next
        } else {
            known
        }
    })?;
    let crossing = slowest.transverse_step;
    let pieces = whole.net.cables()[slowest.cable.index()].segments.clone();
    let pieces = pieces
        .map(|segment| division.pieces(SegmentId::new(segment)).len())
        .max()?;
    (crossing > finest * (1.0 + 1e-9)).then(|| MotionDoubt::LongPieces {
        cable: slowest.cable,
        crossing,
        finest,
        needed: (pieces as f64 * crossing / finest).ceil(),
    })
}

fn not_broken(whole: &Whole, outcome: &Outcome) -> Option<MotionDoubt> {
    let whole_segment = |segment: &SegmentId| match &whole.division {
        Some(division) => division.segment(*segment),
        None => *segment,
    };
    let unreached = whole.motion.breaks.iter().filter_map(|given| {
        let BreakWhen::Tension(tension) = given.when else {
            return None;
        };
        let peaks = given.segments.iter().map(whole_segment);
        let largest = peaks.map(|segment| outcome.peaks.largest_forces[segment.index()].value);
        let largest = largest.fold(f64::NEG_INFINITY, f64::max);
        (largest < tension).then(|| (whole_segment(&given.segments[0]), tension, largest))
    });
    let all: Vec<_> = unreached.collect();
    let (segment, tension, largest) = *all.first()?;
    Some(MotionDoubt::NotBroken {
        segment,
        tension,
        largest,
        count: all.len(),
    })
}

fn large_movement(whole: &Whole, outcome: &Outcome) -> Option<MotionDoubt> {
    let start = &whole.motion.positions[..whole.net.nodes().len()];
    let first = *start.first()?;
    let (least, largest) = start
        .iter()
        .fold((first, first), |(least, largest), x| (least.inf(x), largest.sup(x)));
    let extent = (largest - least).norm();
    let moved = outcome.peaks.movements.iter().map(|peak| peak.value).enumerate();
    let (node, movement) = moved.reduce(|known, next| if next.1 > known.1 { next } else { known })?;
    (movement > LARGE_MOVEMENT * extent).then_some(MotionDoubt::LargeMovement {
        node: NodeId::new(node),
        movement,
        extent,
    })
}

fn over_breaking(whole: &Whole, outcome: &Outcome) -> Option<MotionDoubt> {
    let mut worst: Option<(f64, MotionDoubt)> = None;
    let segments = whole.net.segments().iter().zip(&outcome.peaks.largest_forces);
    for (index, (segment, peak)) in segments.enumerate() {
        let Some(breaking) = segment.section.breaking_force else {
            continue;
        };
        let (tension, ratio) = (peak.value, peak.value / breaking);
        if ratio > worst.map_or(1.0, |(known, _)| known) {
            let segment = SegmentId::new(index);
            let doubt = MotionDoubt::OverBreaking {
                segment,
                tension,
                breaking,
            };
            worst = Some((ratio, doubt));
        }
    }
    worst.map(|(_, doubt)| doubt)
}
