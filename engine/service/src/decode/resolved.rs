//! Values that a brief left to a default, a role or a rule, as they will be used.

use std::fmt;

use ropewalk_api::ropewalk::v1;

use super::findings::Path;
use crate::words::shown;

/// Values in force, with where they come from.
#[derive(Debug, Default)]
pub(crate) struct Resolved(Vec<v1::ResolvedValue>);

impl Resolved {
    /// A value that was left out.
    pub(crate) fn left_out(&mut self, path: &Path<'_>, value: impl fmt::Display) {
        self.add(path.to_string(), &value, "default".to_owned());
    }

    /// A value that comes from another place in the brief.
    pub(crate) fn inherited(&mut self, path: &Path<'_>, value: impl fmt::Display, origin: &Path<'_>) {
        self.add(path.to_string(), &value, origin.to_string());
    }

    fn add(&mut self, path: String, value: &impl fmt::Display, origin: String) {
        self.0.push(v1::ResolvedValue {
            path,
            value: shown(&value.to_string()),
            origin,
        });
    }

    pub(crate) fn into_list(self) -> Vec<v1::ResolvedValue> {
        self.0
    }
}
