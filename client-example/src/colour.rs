//! Colours for tensions: viridis, the perceptually uniform map of Smith and van der Walt (matplotlib 1.5, 2015; published
//! under CC0), here at 33 of its 256 steps and mixed in between.
//!
//! On white paper the map runs backwards, dark for large, and without its palest eighth, so that every line is seen.

use crate::number;

/// Every eighth colour of the map.
const VIRIDIS: [u32; 33] = [
    0x440154, 0x470d60, 0x48186a, 0x482374, 0x472d7b, 0x453781, 0x424086, 0x3e4989, 0x3b528b, 0x375b8d, 0x33638d,
    0x2f6b8e, 0x2c728e, 0x297a8e, 0x26828e, 0x23898e, 0x21918c, 0x1f978b, 0x1f9f88, 0x21a685, 0x27ad81, 0x31b57b,
    0x3dbc74, 0x4cc26c, 0x5cc863, 0x6ece58, 0x81d34d, 0x95d840, 0xaadc32, 0xc0df25, 0xd5e21a, 0xeae51a, 0xfde725,
];

/// Share of the map that is used, from its dark end.
const USED: f64 = 0.875;

/// The colour at a share from 0, pale, to 1, dark.
pub(crate) fn at(share: f64) -> String {
    let place = (1.0 - share.clamp(0.0, 1.0)) * USED * 32.0;
    #[allow(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "the place is between 0 and 32"
    )]
    let step = (place.floor() as usize).min(31);
    #[allow(clippy::cast_precision_loss, reason = "the step is at most 31")]
    let rest = place - step as f64;
    let mix = |shift: u32| {
        let part = |colour: u32| f64::from((colour >> shift) & 0xff);
        (part(VIRIDIS[step]) * (1.0 - rest) + part(VIRIDIS[step + 1]) * rest).round()
    };
    format!("rgb({},{},{})", mix(16), mix(8), mix(0))
}

/// A map of our own for what has two directions: blue for less, paper for nothing, orange for more, as dark as each other at
/// equal distance.
const TWO_WAYS: [[f64; 3]; 5] = [
    [16.0, 62.0, 102.0],
    [92.0, 155.0, 198.0],
    [247.0, 247.0, 245.0],
    [228.0, 142.0, 78.0],
    [132.0, 48.0, 4.0],
];

/// The colour at a share from -1 over 0 to 1 of the largest size.
pub(crate) fn two_ways(share: f64) -> String {
    let place = (share.clamp(-1.0, 1.0) + 1.0) * 2.0;
    #[allow(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "the place is between 0 and 4"
    )]
    let step = (place.floor() as usize).min(3);
    #[allow(clippy::cast_precision_loss, reason = "the step is at most 3")]
    let rest = place - step as f64;
    let mixed: [f64; 3] =
        std::array::from_fn(|part| (TWO_WAYS[step][part] * (1.0 - rest) + TWO_WAYS[step + 1][part] * rest).round());
    format!("rgb({},{},{})", mixed[0], mixed[1], mixed[2])
}

/// Colour of a force: linear where forces are alike, by their logarithm where they span more than a factor of 20.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Scale {
    low_kn: f64,
    high_kn: f64,
    pub(crate) logarithmic: bool,
}

impl Scale {
    /// A scale for forces (N); those of slack ropes do not count.
    pub(crate) fn over(forces_n: impl IntoIterator<Item = f64>) -> Self {
        let (mut low, mut high) = (f64::INFINITY, 0.0_f64);
        for force in forces_n {
            let size = force.abs() / 1e3;
            if size > 0.0 && size.is_finite() {
                low = low.min(size);
                high = high.max(size);
            }
        }
        if high == 0.0 {
            return Self {
                low_kn: 0.0,
                high_kn: 1.0,
                logarithmic: false,
            };
        }
        if high / low > 20.0 {
            // Three orders are enough; what is smaller takes the palest colour.
            Self {
                low_kn: low.max(high / 1e3),
                high_kn: high,
                logarithmic: true,
            }
        } else {
            Self {
                low_kn: 0.0,
                high_kn: high,
                logarithmic: false,
            }
        }
    }

    /// Place of a force on the scale, 0 to 1.
    pub(crate) fn share(&self, force_n: f64) -> f64 {
        let size = force_n.abs() / 1e3;
        let share = if self.logarithmic {
            (size.max(self.low_kn) / self.low_kn).ln() / (self.high_kn / self.low_kn).ln()
        } else {
            size / self.high_kn
        };
        share.clamp(0.0, 1.0)
    }

    /// Ends of the scale (kN).
    pub(crate) fn ends_kn(&self) -> [f64; 2] {
        [self.low_kn, self.high_kn]
    }

    /// Numbers for the legend (kN) with their texts, ascending, the largest force last.
    pub(crate) fn ticks(&self) -> Vec<(f64, String)> {
        let mut ticks: Vec<(f64, String)> = self
            .round_kn()
            .into_iter()
            .map(|tick| (tick, format!("{tick}")))
            .collect();
        ticks.push((self.high_kn, number::three(self.high_kn)));
        ticks
    }

    fn round_kn(&self) -> Vec<f64> {
        let mut ticks = Vec::new();
        if self.logarithmic {
            let mut decade = 10.0_f64.powf(self.low_kn.log10().floor());
            while decade <= self.high_kn {
                ticks.extend([1.0, 2.0, 5.0].map(|digit| number::clean(digit * decade)));
                decade *= 10.0;
            }
        } else {
            let rough = self.high_kn / 5.0;
            let decade = 10.0_f64.powf(rough.log10().floor());
            let step = [1.0, 2.0, 5.0, 10.0]
                .into_iter()
                .map(|digit| digit * decade)
                .find(|step| *step >= rough);
            let step = step.unwrap_or(rough);
            ticks.extend((0..=6).map(|count| number::clean(step * f64::from(count))));
        }
        // The last round number must not touch the number at the end.
        ticks.retain(|tick| *tick >= self.low_kn && self.share(tick * 1e3) < 0.95);
        ticks
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_dark_end_is_the_dark_end_of_the_map() {
        assert_eq!(at(1.0), "rgb(68,1,84)");
        // 0.875 of the way through 32 steps is step 28.
        assert_eq!(at(0.0), "rgb(170,220,50)");
    }

    #[test]
    fn nothing_is_paper_and_directions_are_told_apart() {
        assert_eq!(two_ways(0.0), "rgb(247,247,245)");
        assert_eq!(
            (two_ways(-1.0).as_str(), two_ways(1.0).as_str()),
            ("rgb(16,62,102)", "rgb(132,48,4)")
        );
        assert_eq!(two_ways(0.75), "rgb(180,95,41)");
    }

    #[test]
    fn ticks_are_round_and_end_at_the_largest() {
        let scale = Scale::over([2e3, 400e3, 0.0]);
        assert!(scale.logarithmic);
        let texts = |scale: Scale| scale.ticks().into_iter().map(|(_, text)| text).collect::<Vec<_>>();
        assert_eq!(texts(scale), ["2", "5", "10", "20", "50", "100", "200", "400"]);
        let scale = Scale::over([14_484.0, 24_820.0]);
        assert_eq!(texts(scale), ["0", "5", "10", "15", "20", "24.8"]);
        assert_eq!(Scale::over([]).share(0.0), 0.0);
    }
}
