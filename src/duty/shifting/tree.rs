//! Lengths in a fixed order, with sums of the first few: a tree of partial sums.

/// Non-negative lengths at places 0, 1, ...; every sum is that of its two halves, so that what was added and taken away again
/// leaves no trace.
#[derive(Debug)]
pub(super) struct Lengths {
    /// A heap: the children of k are 2k and 2k + 1; the last `places` entries are the lengths.
    sums: Vec<f64>,
    places: usize,
}

impl Lengths {
    /// All zero.
    pub(super) fn new(count: usize) -> Self {
        let places = count.next_power_of_two().max(1);
        Self { sums: vec![0.0; 2 * places], places }
    }

    /// The length at a place.
    pub(super) fn at(&self, place: usize) -> f64 {
        self.sums[self.places + place]
    }

    /// Sets the length at a place.
    pub(super) fn set(&mut self, place: usize, length: f64) {
        let mut k = self.places + place;
        self.sums[k] = length;
        while k > 1 {
            k /= 2;
            self.sums[k] = self.sums[2 * k] + self.sums[2 * k + 1];
        }
    }

    /// The sum of all lengths.
    pub(super) fn total(&self) -> f64 {
        self.sums[1]
    }

    /// The sum of the lengths before a place.
    pub(super) fn before(&self, place: usize) -> f64 {
        let mut k = self.places + place;
        if k >= self.sums.len() {
            return self.total();
        }
        let mut sum = 0.0;
        while k > 1 {
            if k % 2 == 1 {
                sum += self.sums[k - 1];
            }
            k /= 2;
        }
        sum
    }

    /// The first place of a length above zero; none if there is none.
    pub(super) fn first(&self) -> Option<usize> {
        self.end(|k| if self.sums[2 * k] > 0.0 { 2 * k } else { 2 * k + 1 })
    }

    /// The last place of a length above zero.
    pub(super) fn last(&self) -> Option<usize> {
        self.end(|k| if self.sums[2 * k + 1] > 0.0 { 2 * k + 1 } else { 2 * k })
    }

    fn end(&self, down: impl Fn(usize) -> usize) -> Option<usize> {
        if self.total() <= 0.0 {
            return None;
        }
        let mut k = 1;
        while k < self.places {
            k = down(k);
        }
        Some(k - self.places)
    }

    /// Multiplies all lengths.
    pub(super) fn scale(&mut self, factor: f64) {
        for k in self.places..self.sums.len() {
            self.sums[k] *= factor;
        }
        for k in (1..self.places).rev() {
            self.sums[k] = self.sums[2 * k] + self.sums[2 * k + 1];
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn sums_and_ends_are_those_of_a_list(changes in prop::collection::vec((0usize..13, 0u8..4), 1..60)) {
            let mut tree = Lengths::new(13);
            let mut list = [0.0; 13];
            for (place, length) in changes {
                tree.set(place, f64::from(length));
                list[place] = f64::from(length);
                for k in 0..=13 {
                    prop_assert_eq!(tree.before(k), list[..k].iter().sum::<f64>());
                }
                prop_assert_eq!(tree.first(), list.iter().position(|length| *length > 0.0));
                prop_assert_eq!(tree.last(), list.iter().rposition(|length| *length > 0.0));
            }
        }
    }
}
