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
        let entry = self.entry.take().filter(|(known, _)| *known == key).unwrap_or_else(|| {
            let value = compute(&key);
            (key, value)
        });
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
}
