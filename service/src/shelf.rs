//! Named things held whole: days, and the plans kept under a day.
//!
//! Readers take an `Arc` and keep it for as long as their call lasts; replacing or deleting waits
//! for nobody. The lock is held only to look up or change map entries.

use std::collections::BTreeMap;
use std::fmt::Display;
use std::ops::Bound::{Excluded, Unbounded};
use std::sync::{Arc, PoisonError, RwLock, RwLockReadGuard};

use crate::error::{Kind, ServiceError};

/// Whether a resource that is there already may be replaced.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Replace {
    /// Yes.
    Allowed,
    /// No: it is an error.
    Refused,
}

impl From<bool> for Replace {
    /// From the field `allow_replace`.
    fn from(allow_replace: bool) -> Self {
        if allow_replace { Self::Allowed } else { Self::Refused }
    }
}

/// Things of one kind by name, at most so many.
#[derive(Debug)]
pub(crate) struct Shelf<N, T> {
    kind: Kind,
    most: usize,
    by_name: RwLock<BTreeMap<N, Arc<T>>>,
}

impl<N: Ord + Clone + Display, T> Shelf<N, T> {
    /// Nothing yet.
    pub(crate) fn new(kind: Kind, most: usize) -> Self {
        Self { kind, most, by_name: RwLock::new(BTreeMap::new()) }
    }

    /// The thing of that name.
    pub(crate) fn get(&self, name: &N) -> Result<Arc<T>, ServiceError> {
        self.read().get(name).cloned().ok_or_else(|| self.not_found(name))
    }

    /// Up to `most` things by name, from the first after `after` on.
    pub(crate) fn page(&self, after: Option<&N>, most: usize) -> Vec<Arc<T>> {
        let start = after.map_or(Unbounded, Excluded);
        self.read().range((start, Unbounded)).take(most).map(|(_, item)| Arc::clone(item)).collect()
    }

    /// Whether things could be put under these names now.
    pub(crate) fn check_room(&self, names: &[N], replace: Replace) -> Result<(), ServiceError> {
        self.check(&self.read(), names, replace)
    }

    /// Puts things under their names: all or none.
    pub(crate) fn put(
        &self,
        items: Vec<(N, Arc<T>)>,
        replace: Replace,
    ) -> Result<(), ServiceError> {
        let names: Vec<N> = items.iter().map(|(name, _)| name.clone()).collect();
        let mut by_name = self.by_name.write().unwrap_or_else(PoisonError::into_inner);
        self.check(&by_name, &names, replace)?;
        let replaced: Vec<_> =
            items.into_iter().filter_map(|(name, item)| by_name.insert(name, item)).collect();
        drop(by_name);
        // Freed outside the lock: a day is large.
        drop(replaced);
        Ok(())
    }

    /// Deletes the thing of that name.
    pub(crate) fn delete(&self, name: &N) -> Result<(), ServiceError> {
        let mut by_name = self.by_name.write().unwrap_or_else(PoisonError::into_inner);
        let deleted = by_name.remove(name);
        drop(by_name);
        deleted.map(drop).ok_or_else(|| self.not_found(name))
    }

    fn read(&self) -> RwLockReadGuard<'_, BTreeMap<N, Arc<T>>> {
        self.by_name.read().unwrap_or_else(PoisonError::into_inner)
    }

    fn not_found(&self, name: &N) -> ServiceError {
        ServiceError::NotFound { kind: self.kind, name: name.to_string() }
    }

    fn check(
        &self,
        held: &BTreeMap<N, Arc<T>>,
        names: &[N],
        replace: Replace,
    ) -> Result<(), ServiceError> {
        let there = names.iter().filter(|name| held.contains_key(name));
        if let (Replace::Refused, Some(name)) = (replace, there.clone().next()) {
            return Err(ServiceError::AlreadyExists { kind: self.kind, name: name.to_string() });
        }
        if held.len() + names.len() - there.count() > self.most {
            return Err(ServiceError::Exhausted {
                subject: self.kind.plural(),
                problem: format!("at most {} are held; delete one", self.most),
            });
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn several_are_put_whole_or_not_at_all() {
        let shelf: Shelf<&str, u32> = Shelf::new(Kind::Plan, 3);
        shelf.put(vec![("a", Arc::new(1))], Replace::Refused).unwrap();
        let two = || vec![("a", Arc::new(2)), ("b", Arc::new(3))];
        assert!(matches!(
            shelf.put(two(), Replace::Refused),
            Err(ServiceError::AlreadyExists { .. })
        ));
        assert!(shelf.get(&"b").is_err());
        shelf.put(two(), Replace::Allowed).unwrap();
        assert_eq!(*shelf.get(&"a").unwrap(), 2);
        let more = vec![("b", Arc::new(0)), ("c", Arc::new(0)), ("d", Arc::new(0))];
        assert!(matches!(
            shelf.put(more, Replace::Allowed),
            Err(ServiceError::Exhausted { subject: "plans", .. })
        ));
        assert_eq!(*shelf.get(&"b").unwrap(), 3);
    }

    #[test]
    fn a_reader_keeps_what_it_took() {
        let shelf: Shelf<&str, u32> = Shelf::new(Kind::Day, 1);
        shelf.put(vec![("a", Arc::new(1))], Replace::Refused).unwrap();
        let taken = shelf.get(&"a").unwrap();
        shelf.put(vec![("a", Arc::new(2))], Replace::Allowed).unwrap();
        shelf.delete(&"a").unwrap();
        assert_eq!(*taken, 1);
        assert!(shelf.delete(&"a").is_err());
    }
}
