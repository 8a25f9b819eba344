//! What was computed before, by what it depends on.

use alloc::vec::Vec;
use core::borrow::Borrow;

/// A sorted list: a tenth of the code of a tree for each type that is kept, and as quick for the hundreds at most that are.
#[derive(Clone, Debug)]
pub struct Kept<K, V>(Vec<(K, V)>);

impl<K, V> Default for Kept<K, V> {
    fn default() -> Self {
        Self(Vec::new())
    }
}

impl<K: Ord, V> Kept<K, V> {
    fn find<Q: Ord + ?Sized>(&self, key: &Q) -> Result<usize, usize>
    where
        K: Borrow<Q>,
    {
        self.0.binary_search_by(|(known, _)| known.borrow().cmp(key))
    }

    /// What is kept for `key`.
    pub fn get<Q: Ord + ?Sized>(&self, key: &Q) -> Option<&V>
    where
        K: Borrow<Q>,
    {
        self.find(key).ok().map(|at| &self.0[at].1)
    }

    /// Keeps `value` in place of what was kept for `key`.
    pub fn insert(&mut self, key: K, value: V) {
        match self.find(&key) {
            Ok(at) => self.0[at].1 = value,
            Err(at) => self.0.insert(at, (key, value)),
        }
    }

    /// How many are kept.
    pub const fn len(&self) -> usize {
        self.0.len()
    }

    /// Forgets them all.
    pub fn clear(&mut self) {
        self.0.clear();
    }
}
