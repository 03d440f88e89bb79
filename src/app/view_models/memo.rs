//! A value kept for as long as what it was made from stays the same.

/// Holds one value and the key it was computed for, usually a revision and the parameters.
#[derive(Debug)]
pub struct Memo<K, V> {
    entry: Option<(K, V)>,
}

impl<K, V> Default for Memo<K, V> {
    fn default() -> Self {
        Self { entry: None }
    }
}

impl<K: PartialEq, V> Memo<K, V> {
    /// The value for `key`, computed only if the last call had another key.
    pub fn get_or_compute(&mut self, key: K, compute: impl FnOnce(&K) -> V) -> &V {
        self.get_or_renew(key, |key, _| compute(key))
    }

    /// The same, where a part of the last value may still hold: `renew` gets that value and what it was computed for.
    pub fn get_or_renew(&mut self, key: K, renew: impl FnOnce(&K, Option<(&K, &V)>) -> V) -> &V {
        let entry = match self.entry.take() {
            Some(entry) if entry.0 == key => entry,
            before => {
                let value = renew(&key, before.as_ref().map(|(key, value)| (key, value)));
                (key, value)
            }
        };
        &self.entry.insert(entry).1
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn computes_once_for_a_key_and_again_for_another() {
        let mut memo = Memo::default();
        let mut runs = 0;
        for key in [1, 1, 2, 1] {
            let value = *memo.get_or_compute(key, |key| {
                runs += 1;
                key * 10
            });
            assert_eq!(value, key * 10);
        }
        assert_eq!(runs, 3);
    }

    #[test]
    fn what_renews_sees_the_last_value() {
        let mut memo = Memo::default();
        memo.get_or_compute(1, |key| key * 10);
        let value =
            *memo.get_or_renew(2, |key, before| key * 10 + before.map_or(0, |(key, value)| key + value));
        assert_eq!(value, 20 + 1 + 10);
        assert_eq!(*memo.get_or_renew(2, |_, _| panic!("known")), value);
    }
}
