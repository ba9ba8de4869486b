//! The files of cases in `data/`.

use nalgebra::Vector3;
use serde_json::Value;

/// One file.
#[derive(Debug)]
pub(crate) struct Data {
    root: Value,
}

macro_rules! file {
    ($name:literal) => {
        crate::data::Data::read(include_str!(concat!("data/", $name, ".json")))
    };
}
pub(crate) use file;

impl Data {
    /// Reads a file that was compiled in.
    pub(crate) fn read(text: &str) -> Self {
        Self {
            root: serde_json::from_str(text).expect("the file is JSON"),
        }
    }

    /// Its id, its source and what its origin says about how sure the numbers are.
    pub(crate) fn source(&self) -> String {
        let text = |key: &str| self.root[key].as_str().expect("a file says where it comes from");
        format!("{}: {} ({})", text("id"), text("source"), text("origin"))
    }

    /// The id of the file, to begin the names of its checks with.
    pub(crate) fn id(&self) -> &str {
        self.root["id"].as_str().expect("a file has an id")
    }

    /// What is given.
    pub(crate) fn inputs(&self) -> &Value {
        &self.root["inputs"]
    }

    /// The net of a case that has one.
    pub(crate) fn model(&self) -> &Value {
        &self.root["model"]
    }

    /// The expected values whose name begins with `quantity`.
    pub(crate) fn expected(&self, quantity: &str) -> &Value {
        self.root["expected"]
            .as_array()
            .expect("a file has expected values")
            .iter()
            .find(|e| e["quantity"].as_str().is_some_and(|name| name.starts_with(quantity)))
            .unwrap_or_else(|| panic!("{} has no expected {quantity}", self.id()))
    }

    /// Every expected value, in order.
    pub(crate) fn all_expected(&self) -> &[Value] {
        self.root["expected"].as_array().expect("a file has expected values")
    }

    /// The printed values.
    pub(crate) fn published(&self) -> &[Value] {
        self.root["published"]
            .as_array()
            .expect("a file has a list of printed values")
    }
}

/// A number.
#[track_caller]
pub(crate) fn number(value: &Value) -> f64 {
    value.as_f64().expect("a number stands there")
}

/// A list of numbers.
#[track_caller]
pub(crate) fn numbers(value: &Value) -> Vec<f64> {
    value
        .as_array()
        .expect("a list stands there")
        .iter()
        .map(number)
        .collect()
}

/// A point or a vector.
#[track_caller]
pub(crate) fn vector(value: &Value) -> Vector3<f64> {
    Vector3::from_column_slice(&numbers(value))
}

/// An index.
#[track_caller]
pub(crate) fn index(value: &Value) -> usize {
    usize::try_from(value.as_u64().expect("an index stands there")).expect("an index is small")
}

/// A list of points, one coordinate after the other.
#[track_caller]
pub(crate) fn coordinates(value: &Value) -> Vec<f64> {
    value
        .as_array()
        .expect("a list stands there")
        .iter()
        .flat_map(numbers)
        .collect()
}
