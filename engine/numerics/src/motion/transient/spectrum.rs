//! Spectra of what is watched.
//!
//! ```text
//! w_k = ½ (1 − cos 2πk/N)                          Hann window, whose mean is ½
//! A_m = (2 / (N/2)) |Σ w_k (x_k − mean) e^(−2πi mk/N)|     at m / (N h); the first line and that at 1/(2h) half of that
//! ```
//! A sine whose frequency is that of a line stands there with its amplitude, and with half of it on the lines beside. Between
//! lines it is `δ` lines off the larger of two; the transform of the window, `|sin πδ / (πδ (1 − δ²))|`, gives both from their
//! ratio (Jain, Collins & Davis 1979; Grandke 1983):
//!
//! ```text
//! r = A_beside / A_peak = (1 + δ) / (2 − δ),    δ = (2 r − 1) / (r + 1),    amplitude = A_peak πδ (1 − δ²) / sin πδ
//! ```
//! It is exact for one sine among many lines; others add to it by the third power of their distance in lines. Nothing above
//! the Nyquist frequency `1/(2 h)` can be told: what moves faster shows as something slower.

use std::f64::consts::PI;

use rustfft::FftPlanner;
use rustfft::num_complex::Complex;

/// Samples without which there is no spectrum.
pub(super) const LEAST_SAMPLES: u64 = 16;
/// Peaks told of a spectrum.
const MOST_PEAKS: usize = 20;
/// Least amplitude of a peak over that of the largest (–).
const LEAST_SHARE: f64 = 1e-3;
/// Lines that resolve nothing: the mean that is left by the window, and one period over all the time.
const UNRESOLVED: usize = 2;

/// Which spectra are wanted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SpectraGiven {
    /// Where they begin (s): what is before, as the swing after a sudden start, is left out.
    pub from: f64,
    /// Highest frequency told (Hz), positive, at most the Nyquist frequency `1/(2 step)`; none: that.
    pub up_to: Option<f64>,
}

/// Spectrum of one quantity, sampled at every whole step.
#[derive(Clone, Debug, PartialEq)]
pub struct Spectrum {
    /// Samples.
    pub samples: usize,
    /// Mean, in the unit of the quantity.
    pub mean: f64,
    /// Root mean square about the mean, in the unit of the quantity.
    pub rms: f64,
    /// Distance of two lines (Hz): one over the time sampled. Sines less than about two lines apart are not told apart.
    pub resolution: f64,
    /// Amplitude at every line, from frequency zero on, in the unit of the quantity: that of a sine reads as its amplitude.
    pub amplitudes: Vec<f64>,
    /// Peaks, the largest first, at most 20, none below 1/1000 of the largest.
    pub peaks: Vec<SpectrumPeak>,
}

/// A sine that stands out.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SpectrumPeak {
    /// Its frequency (Hz), between lines.
    pub frequency: f64,
    /// Its amplitude, in the unit of the quantity.
    pub amplitude: f64,
}

/// Spectrum of samples taken every `step` (s), told up to a frequency (Hz).
pub(super) fn spectrum(series: &[f64], step: f64, up_to: Option<f64>) -> Spectrum {
    let n = series.len();
    let mean = series.iter().sum::<f64>() / n as f64;
    let rms = (series.iter().map(|x| (x - mean) * (x - mean)).sum::<f64>() / n as f64).sqrt();
    let mut transform: Vec<Complex<f64>> = (series.iter().enumerate())
        .map(|(k, x)| {
            let window = 0.5 * (1.0 - (2.0 * PI * k as f64 / n as f64).cos());
            Complex::new(window * (x - mean), 0.0)
        })
        .collect();
    FftPlanner::new().plan_fft_forward(n).process(&mut transform);
    let amplitudes: Vec<f64> = (transform[..=n / 2].iter().enumerate())
        .map(|(line, x)| {
            let sides = if line == 0 || 2 * line == n { 1.0 } else { 2.0 };
            sides * x.norm() / (0.5 * n as f64)
        })
        .collect();
    let resolution = 1.0 / (n as f64 * step);
    let told = up_to.map_or(amplitudes.len(), |limit| {
        amplitudes.len().min(lines_up_to(limit / resolution) + 1)
    });
    Spectrum {
        samples: n,
        mean,
        rms,
        resolution,
        peaks: peaks(&amplitudes, told, resolution),
        amplitudes: amplitudes[..told].to_vec(),
    }
}

#[allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "positive; beyond the lines it saturates"
)]
fn lines_up_to(lines: f64) -> usize {
    (lines * (1.0 + 1e-9)).floor() as usize
}

/// Lines below `told` that are the largest of five, refined.
fn peaks(amplitudes: &[f64], told: usize, resolution: f64) -> Vec<SpectrumPeak> {
    let at = |line: usize| amplitudes.get(line).copied().unwrap_or(0.0);
    let is_peak = |line: usize| {
        let a = at(line);
        a > at(line - 1) && a > at(line - 2) && a >= at(line + 1) && a >= at(line + 2)
    };
    let mut peaks: Vec<SpectrumPeak> = (UNRESOLVED..told)
        .filter(|line| is_peak(*line))
        .map(|line| {
            let (before, after) = (at(line - 1), at(line + 1));
            let ratio = before.max(after) / at(line);
            // Beside other sines the ratio may fall below that of a sine on the line.
            let off = ((2.0 * ratio - 1.0) / (ratio + 1.0)).max(0.0);
            let gain = if off == 0.0 {
                1.0
            } else {
                PI * off * (1.0 - off * off) / (PI * off).sin()
            };
            let place = line as f64 + if after >= before { off } else { -off };
            SpectrumPeak {
                frequency: place * resolution,
                amplitude: at(line) * gain,
            }
        })
        .collect();
    peaks.sort_by(|a, b| b.amplitude.total_cmp(&a.amplitude));
    peaks.truncate(MOST_PEAKS);
    let least = LEAST_SHARE * peaks.first().map_or(0.0, |peak| peak.amplitude);
    peaks.retain(|peak| peak.amplitude >= least);
    peaks
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sines(n: usize, step: f64, mean: f64, sines: &[(f64, f64, f64)]) -> Vec<f64> {
        let at = |t: f64| -> f64 {
            let sum = sines.iter().map(|(a, f, phase)| a * (2.0 * PI * f * t + phase).sin());
            mean + sum.sum::<f64>()
        };
        (0..n).map(|k| at(k as f64 * step)).collect()
    }

    #[test]
    fn two_sines_between_lines() {
        // 3000 samples, no power of two: lines 1/30 Hz apart.
        let (n, step) = (3000, 0.01);
        let series = sines(n, step, 7.0, &[(2.0, 4.8127, 0.4), (0.05, 11.2291, 2.0)]);
        let found = spectrum(&series, step, None);
        assert!((found.resolution - 1.0 / 30.0).abs() < 1e-15);
        assert_eq!((found.samples, found.amplitudes.len()), (3000, 1501));
        assert_eq!(found.peaks.len(), 2, "{:?}", found.peaks);
        for (peak, (amplitude, frequency)) in found.peaks.iter().zip([(2.0, 4.8127), (0.05, 11.2291)]) {
            // What one sine adds at the other: 2 / (193³ π) of it, and less of its image.
            assert!(
                (peak.frequency - frequency).abs() < 1e-5 * found.resolution * 40.0,
                "{peak:?}"
            );
            assert!((peak.amplitude - amplitude).abs() < 2e-6 * 2.0, "{peak:?}");
        }
        let limited = spectrum(&series, step, Some(5.0));
        assert_eq!(limited.amplitudes.len(), 151);
        assert_eq!(limited.peaks, found.peaks[..1]);
    }

    #[test]
    fn a_sine_on_a_line_reads_as_its_amplitude_and_its_lines_add_up_to_the_mean_square() {
        for n in [256, 250, 509] {
            let step = 0.02;
            let frequency = 31.0 / (n as f64 * step);
            let found = spectrum(&sines(n, step, -3.0, &[(0.7, frequency, 1.1)]), step, None);
            assert!((found.mean + 3.0).abs() < 1e-12);
            assert!((found.rms - 0.7 / 2.0_f64.sqrt()).abs() < 1e-12);
            assert!((found.amplitudes[31] - 0.7).abs() < 1e-12);
            assert!((found.amplitudes[30] - 0.35).abs() < 1e-12);
            // Parseval: half the squares over the mean square of the window over its squared mean, 3/2.
            let squares: f64 = found.amplitudes.iter().map(|a| 0.5 * a * a).sum();
            assert!((squares / 1.5 - found.rms * found.rms).abs() < 1e-12);
            assert_eq!(found.peaks.len(), 1);
            assert!((found.peaks[0].frequency - frequency).abs() < 1e-10);
            assert!((found.peaks[0].amplitude - 0.7).abs() < 1e-10);
        }
    }

    #[test]
    fn small_peaks_and_slow_drifts_are_no_peaks() {
        let series = sines(512, 0.1, 0.0, &[(1.0, 2.03, 0.0), (5e-4, 4.01, 0.0)]);
        assert_eq!(spectrum(&series, 0.1, None).peaks.len(), 1);
        let drift: Vec<f64> = (0..512).map(|k| f64::from(k) * 0.01).collect();
        assert!(spectrum(&drift, 0.1, None).peaks.is_empty());
        assert!(spectrum(&[2.5; 64], 0.1, None).peaks.is_empty());
    }
}
