//! Room for text: a drawing keeps in mind where words stand, so that none is written over another.

/// A rim of paper around letters, so that they are read on lines.
pub(super) const HALO: &str = "stroke=\"#fff\" stroke-width=\"3.5\" stroke-linejoin=\"round\" paint-order=\"stroke\"";

/// Places that are taken by text.
#[derive(Debug, Default)]
pub(super) struct Taken(Vec<[f64; 4]>);

impl Taken {
    /// Takes a place for a text around a point, if it is free.
    pub(super) fn take(&mut self, x: f64, y: f64, letters: usize) -> bool {
        self.take_box(x, y, letters, 9.0)
    }

    /// The same for a text of two lines.
    pub(super) fn take_lines(&mut self, x: f64, y: f64, letters: usize) -> bool {
        self.take_box(x, y, letters, 16.0)
    }

    pub(super) fn take_box(&mut self, x: f64, y: f64, letters: usize, half_height: f64) -> bool {
        #[allow(clippy::cast_precision_loss, reason = "a label has few letters")]
        let half = 3.9 * letters as f64 + 3.0;
        let place = [x - half, y - half_height, x + half, y + half_height];
        let free = self
            .0
            .iter()
            .all(|other| place[2] < other[0] || other[2] < place[0] || place[3] < other[1] || other[3] < place[1]);
        if free {
            self.0.push(place);
        }
        free
    }
}
