//! Room for text: a drawing keeps in mind where words stand, so that none is written over another.

use std::collections::HashSet;

/// A rim of paper around letters, so that they are read on lines.
pub(super) const HALO: &str = "stroke=\"#fff\" stroke-width=\"3.5\" stroke-linejoin=\"round\" paint-order=\"stroke\"";

/// Side of the squares in which lines are kept in mind.
const CELL: f64 = 5.0;

/// Places that are taken by text and signs, and squares that lines run through.
#[derive(Debug, Default)]
pub(super) struct Taken {
    boxes: Vec<[f64; 4]>,
    crossed: HashSet<[i32; 2]>,
}

impl Taken {
    /// Takes a place for a text around a point, if it is free.
    pub(super) fn take(&mut self, x: f64, y: f64, letters: usize) -> bool {
        let place = Self::place(x, y, letters, 9.0);
        let free = self.is_free(place);
        if free {
            self.boxes.push(place);
        }
        free
    }

    /// Room that a text around a point takes.
    pub(super) fn place(x: f64, y: f64, letters: usize, half_height: f64) -> [f64; 4] {
        #[allow(clippy::cast_precision_loss, reason = "a label has few letters")]
        let half = 3.9 * letters as f64 + 3.0;
        [x - half, y - half_height, x + half, y + half_height]
    }

    /// Takes a place, left, top, right and bottom, free or not: a sign stands there already.
    pub(super) fn occupy(&mut self, place: [f64; 4]) {
        self.boxes.push(place);
    }

    /// Whether no text and no sign stands there.
    pub(super) fn is_free(&self, place: [f64; 4]) -> bool {
        self.boxes
            .iter()
            .all(|other| place[2] < other[0] || other[2] < place[0] || place[3] < other[1] || other[3] < place[1])
    }

    /// Keeps a line in mind.
    pub(super) fn cross(&mut self, from: [f64; 2], to: [f64; 2]) {
        let (wide, high) = (to[0] - from[0], to[1] - from[1]);
        let steps = (wide.hypot(high) / CELL * 2.0).ceil().clamp(1.0, 2000.0);
        let mut step = 0.0;
        while step <= steps {
            let share = step / steps;
            self.crossed
                .insert([square(from[0] + share * wide), square(from[1] + share * high)]);
            step += 1.0;
        }
    }

    /// Whether no line runs through a place.
    pub(super) fn is_clear(&self, place: [f64; 4]) -> bool {
        let [left, top, right, bottom] = place.map(square);
        (left..=right).all(|x| (top..=bottom).all(|y| !self.crossed.contains(&[x, y])))
    }
}

fn square(at: f64) -> i32 {
    #[allow(clippy::cast_possible_truncation, reason = "a sheet is a few thousand units wide")]
    let square = (at / CELL).floor() as i32;
    square
}
