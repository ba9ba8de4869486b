//! From which size on a difference of results is told.

/// Differences up to these are passed over.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Thresholds {
    /// Of forces (N), together with `share`.
    force_n: f64,
    /// Of places, movements and lengths (m).
    length_m: f64,
    /// Of angles (deg).
    angle_deg: f64,
    /// Of ratios and other pure numbers.
    pub(super) ratio: f64,
    /// Of forces and of quantities without a threshold of their own, as a share of the larger number.
    share: f64,
}

impl Default for Thresholds {
    fn default() -> Self {
        Self {
            force_n: 100.0,
            length_m: 1e-3,
            angle_deg: 1.0,
            ratio: 0.01,
            share: 0.01,
        }
    }
}

impl Thresholds {
    /// The usual ones, with those that a user named: `force=0.5`, in the units of [`Self::words`].
    ///
    /// # Errors
    /// What is wrong with one, in words.
    pub(super) fn read(given: &[String]) -> Result<Self, String> {
        let mut limits = Self::default();
        for text in given {
            let wrong = |why: &str| {
                format!(
                    "--above {text}: {why}; known are force (kN), length (mm), angle (deg), ratio (%) and share (%), as in force=0.5"
                )
            };
            let (name, number) = text.split_once('=').ok_or_else(|| wrong("NAME=NUMBER is wanted"))?;
            let number: f64 = number.trim().parse().map_err(|_| wrong("that is no number"))?;
            if !(number >= 0.0 && number.is_finite()) {
                return Err(wrong("zero or a positive number is wanted"));
            }
            match name.trim() {
                "force" => limits.force_n = number * 1e3,
                "length" => limits.length_m = number * 1e-3,
                "angle" => limits.angle_deg = number,
                "ratio" => limits.ratio = number * 1e-2,
                "share" => limits.share = number * 1e-2,
                _ => return Err(wrong("that name is not known")),
            }
        }
        Ok(limits)
    }

    /// Whether a difference is told. `larger`: size of the larger number, of whole vectors where it is a component.
    pub(super) fn passes(&self, unit: &str, difference: f64, larger: f64) -> bool {
        match unit {
            "N" => difference > self.force_n && difference > self.share * larger,
            "m" => difference > self.length_m,
            "deg" => difference > self.angle_deg,
            "" => difference > self.ratio,
            _ => difference > self.share * larger,
        }
    }

    /// In words.
    pub(super) fn words(&self) -> String {
        let clean = crate::number::clean;
        format!(
            "forces by {} kN and {} %, lengths and places by {} mm, angles by {} deg, ratios by {} % points",
            clean(self.force_n / 1e3),
            clean(self.share * 1e2),
            clean(self.length_m * 1e3),
            clean(self.angle_deg),
            clean(self.ratio * 1e2)
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn forces_need_both_and_lengths_their_own() {
        let limits = Thresholds::default();
        for (unit, difference, larger, told) in [
            ("N", 150.0, 10e3, true),
            ("N", 150.0, 100e3, false),
            ("N", 50.0, 60.0, false),
            ("m", 2e-3, 10.0, true),
            ("m", 0.9e-3, 1e-3, false),
            ("", 0.02, 1.0, true),
            ("N/m", 5.0, 400.0, true),
            ("N/m", 0.0, 0.0, false),
        ] {
            assert_eq!(
                limits.passes(unit, difference, larger),
                told,
                "{difference} {unit} of {larger}"
            );
        }
    }

    #[test]
    fn users_name_their_own_and_slips_are_told() {
        let limits = Thresholds::read(&["force=0.5".to_owned(), "share=0".to_owned()]).unwrap();
        assert!(limits.passes("N", 501.0, 1e9) && !limits.passes("N", 499.0, 0.0));
        for slip in ["force", "force=x", "force=-1", "tension=1", "length=inf"] {
            let told = Thresholds::read(&[slip.to_owned()]).unwrap_err();
            assert!(
                told.starts_with(&format!("--above {slip}: ")) && told.contains("force (kN)"),
                "{told}"
            );
        }
    }
}
