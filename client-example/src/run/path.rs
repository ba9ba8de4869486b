//! Load paths: how tensions and movements of a case grow with its load.

use super::{Run, State};

/// Factor that is looked at where the brief's classes name none.
const USUAL_FACTOR: f64 = 1.5;

/// States along a path, by their load factor.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct LoadPath {
    /// Load factors (-), ascending from 0.
    pub(crate) factors: Vec<f64>,
    /// Largest movement of a node at each (m).
    pub(crate) movements: Vec<f64>,
    /// Largest tension of each cable at each (N).
    pub(crate) tensions: Vec<Vec<f64>>,
}

/// How a quantity grows with the load, against growing in proportion.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Growth {
    /// Without the load, and under all of it.
    pub(crate) none: f64,
    pub(crate) full: f64,
    /// The factor looked at (-).
    pub(crate) gamma: f64,
    /// `E(gamma F)`: with the factor on the action.
    pub(crate) on_action: f64,
    /// Largest distance from the straight line through `none` and `full`, over the largest number on the path (-).
    pub(crate) departure: f64,
    /// First load factor at which it is zero, though it was not so before.
    pub(crate) slack_from: Option<f64>,
}

impl Growth {
    /// Of numbers at ascending load factors; none where these do not reach 1.
    fn of(factors: &[f64], numbers: &[f64], gamma: f64) -> Option<Self> {
        let (none, full) = (*numbers.first()?, at(factors, numbers, 1.0)?);
        let gamma = gamma.min(*factors.last()?);
        let line = |factor: f64| none + factor * (full - none);
        let largest = numbers.iter().copied().fold(0.0, f64::max);
        let pairs = || factors.iter().zip(numbers);
        let off = pairs()
            .map(|(factor, number)| (number - line(*factor)).abs())
            .fold(0.0, f64::max);
        let slack_from = (none > 0.0)
            .then(|| pairs().find(|(_, number)| **number <= 0.0).map(|(factor, _)| *factor))
            .flatten();
        Some(Self {
            none,
            full,
            gamma,
            on_action: at(factors, numbers, gamma)?,
            departure: if largest > 0.0 { off / largest } else { 0.0 },
            slack_from,
        })
    }

    /// `gamma E(F)`: with the factor on the effect.
    pub(crate) fn on_effect(&self) -> f64 {
        self.gamma * self.full
    }

    /// On the straight line: with the factor on what the load adds.
    pub(crate) fn on_parts(&self) -> f64 {
        self.none + self.gamma * (self.full - self.none)
    }

    /// `E(gamma F) / (gamma E(F))`: above 1 the factor belongs on the action; none where the effect is zero.
    pub(crate) fn index(&self) -> Option<f64> {
        (self.on_effect() > 0.0).then(|| self.on_action / self.on_effect())
    }
}

/// The number at a load factor, straight between two steps; none beyond the path.
fn at(factors: &[f64], numbers: &[f64], wanted: f64) -> Option<f64> {
    let next = factors.iter().position(|factor| *factor >= wanted - 1e-9)?;
    if (factors[next] - wanted).abs() <= 1e-9 || next == 0 {
        return numbers.get(next).copied();
    }
    let share = (wanted - factors[next - 1]) / (factors[next] - factors[next - 1]);
    Some(numbers.get(next - 1)? + share * (numbers.get(next)? - numbers.get(next - 1)?))
}

impl LoadPath {
    pub(crate) fn rope(&self, cable: usize, gamma: f64) -> Option<Growth> {
        Growth::of(&self.factors, self.tensions.get(cable)?, gamma)
    }

    pub(crate) fn movement(&self, gamma: f64) -> Option<Growth> {
        Growth::of(&self.factors, &self.movements, gamma)
    }

    /// Ropes with the largest departure from the straight line first.
    pub(crate) fn by_departure(&self, gamma: f64) -> Vec<(usize, Growth)> {
        let ropes = (0..self.tensions.len()).filter_map(|cable| Some((cable, self.rope(cable, gamma)?)));
        let mut ropes: Vec<(usize, Growth)> = ropes.collect();
        ropes.sort_by(|a, b| b.1.departure.total_cmp(&a.1.departure).then(a.0.cmp(&b.0)));
        ropes
    }
}

impl Run {
    /// The path of a case that asked for one.
    pub(crate) fn load_path(&self, state: &State) -> Option<LoadPath> {
        let factors = state.numbers("path_load_factor")?.to_vec();
        let tensions = state.columns.get("path_tension_n")?;
        let movements = state.numbers("path_movement_m")?.to_vec();
        let steps = factors.len();
        let fits = tensions.components == steps && movements.len() == steps && steps > 1;
        fits.then(|| LoadPath {
            tensions: tensions.values.chunks_exact(steps).map(<[f64]>::to_vec).collect(),
            factors,
            movements,
        })
    }

    /// Cases with a path.
    pub(crate) fn load_paths(&self) -> Vec<(&State, LoadPath)> {
        let states = self.states.iter();
        states
            .filter_map(|state| Some((state, self.load_path(state)?)))
            .collect()
    }

    /// The partial factor to look at: the largest of the brief's variable classes, else 1.5.
    pub(crate) fn looked_at_factor(&self) -> f64 {
        use ropewalk_api::ropewalk::v1::action_class::Behaviour;
        let classes = self.brief.factors.iter().flat_map(|factors| &factors.classes);
        let gammas = classes.filter_map(|class| match &class.behaviour {
            Some(Behaviour::Variable(variable)) => Some(variable.gamma),
            _ => None,
        });
        let largest = gammas.fold(0.0, f64::max);
        if largest > 1.0 { largest } else { USUAL_FACTOR }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_stiffening_rope_grows_more_slowly_than_its_load() {
        // T = sqrt(load): the factor belongs on the effect, 1.5 > sqrt(1.5).
        let factors: Vec<f64> = (0..=15).map(|step| f64::from(step) / 10.0).collect();
        let numbers: Vec<f64> = factors.iter().map(|factor| factor.sqrt()).collect();
        let growth = Growth::of(&factors, &numbers, 1.5).unwrap();
        assert!((growth.index().unwrap() - 1.5_f64.sqrt() / 1.5).abs() < 1e-12);
        // Largest gap to the line T = load: 1/4 at a quarter of the load, or 1.5 - sqrt(1.5) at the end; steps hit 0.2 and 0.3.
        let gap = (1.5 - 1.5_f64.sqrt()).max(0.3_f64.sqrt() - 0.3);
        assert!((growth.departure - gap / 1.5_f64.sqrt()).abs() < 1e-12);
    }

    #[test]
    fn a_rope_that_goes_slack_says_when_and_a_line_departs_from_nothing() {
        let factors = [0.0, 0.5, 1.0, 1.5];
        let growth = Growth::of(&factors, &[10.0, 5.0, 0.0, 0.0], 1.5).unwrap();
        assert_eq!((growth.slack_from, growth.index()), (Some(1.0), None));
        let line = Growth::of(&factors, &[10.0, 20.0, 30.0, 40.0], 1.35).unwrap();
        assert!(line.departure < 1e-12);
        // E(gamma F) = 37 against gamma E(F) = 40.5: prestress is not factored by the load.
        assert!((line.on_action - 37.0).abs() < 1e-12 && (line.on_effect() - 40.5).abs() < 1e-12);
        assert!((line.on_parts() - 37.0).abs() < 1e-12);
    }

    #[test]
    fn a_path_that_ends_early_tells_nothing_beyond_its_end() {
        assert_eq!(Growth::of(&[0.0, 0.5], &[1.0, 2.0], 1.5), None);
        let growth = Growth::of(&[0.0, 1.0, 1.2], &[1.0, 2.0, 3.0], 1.5).unwrap();
        assert_eq!((growth.gamma, growth.on_action), (1.2, 3.0));
    }
}
