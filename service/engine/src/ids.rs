//! Dense identifiers, and the vector that they index.
//!
//! Names from outside become these numbers once, when a day is built. Within one day they follow
//! the order of the names, so "the first by name" is "the smallest id", and answers do not depend
//! on the order of the input.

use std::fmt;
use std::marker::PhantomData;
use std::ops::{Index, IndexMut};

/// A dense identifier: a position in an [`IdVec`].
pub trait Id: Copy {
    /// The identifier of a position.
    fn from_index(index: usize) -> Self;
    /// The position of an identifier.
    fn index(self) -> usize;
}

macro_rules! id {
    ($(#[$doc:meta])* $name:ident) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub struct $name(pub u32);

        impl Id for $name {
            fn from_index(index: usize) -> Self {
                debug_assert!(u32::try_from(index).is_ok(), "more than u32::MAX entries");
                Self(index as u32)
            }
            fn index(self) -> usize {
                self.0 as usize
            }
        }
    };
}

id!(
    /// A flight of the day; ids follow the order of flight names.
    FlightId
);
id!(
    /// A sector of the day; ids follow the order of sector names.
    SectorId
);
id!(
    /// An airport of the day; ids follow the order of airport codes.
    AirportId
);
id!(
    /// A proposal of the day; ids follow the order of proposal names.
    ProposalId
);
id!(
    /// A restriction of the day; ids follow the order of their names.
    RestrictionId
);
id!(
    /// An aircraft class of the day.
    ClassId
);

/// A vector indexed by one kind of identifier.
#[derive(Clone, PartialEq, Eq)]
pub struct IdVec<I, T> {
    items: Vec<T>,
    id: PhantomData<fn(I)>,
}

impl<I: Id, T> IdVec<I, T> {
    /// The entries, in the order of their identifiers.
    pub fn iter(&self) -> std::slice::Iter<'_, T> {
        self.items.iter()
    }
    /// Identifiers and entries, in order.
    pub fn iter_with_id(&self) -> impl ExactSizeIterator<Item = (I, &T)> {
        self.items.iter().enumerate().map(|(i, item)| (I::from_index(i), item))
    }
    /// All identifiers, in order.
    pub fn ids(&self) -> impl ExactSizeIterator<Item = I> + use<I, T> {
        (0..self.items.len()).map(I::from_index)
    }
    /// How many entries there are.
    #[must_use]
    pub fn len(&self) -> usize {
        self.items.len()
    }
    /// Whether there is no entry.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.items.is_empty()
    }
    /// The entry, or `None` where the identifier is of another day.
    #[must_use]
    pub fn get(&self, id: I) -> Option<&T> {
        self.items.get(id.index())
    }
    /// The entries as a slice in the order of identifiers.
    #[must_use]
    pub fn as_slice(&self) -> &[T] {
        &self.items
    }
}

impl<I: Id, T> From<Vec<T>> for IdVec<I, T> {
    fn from(items: Vec<T>) -> Self {
        Self { items, id: PhantomData }
    }
}

impl<I: Id, T> FromIterator<T> for IdVec<I, T> {
    fn from_iter<It: IntoIterator<Item = T>>(iter: It) -> Self {
        Self::from(iter.into_iter().collect::<Vec<_>>())
    }
}

impl<I: Id, T> Index<I> for IdVec<I, T> {
    type Output = T;
    fn index(&self, id: I) -> &T {
        &self.items[id.index()]
    }
}

impl<I: Id, T> IndexMut<I> for IdVec<I, T> {
    fn index_mut(&mut self, id: I) -> &mut T {
        &mut self.items[id.index()]
    }
}

impl<'a, I: Id, T> IntoIterator for &'a IdVec<I, T> {
    type Item = &'a T;
    type IntoIter = std::slice::Iter<'a, T>;
    fn into_iter(self) -> Self::IntoIter {
        self.items.iter()
    }
}

impl<I, T: fmt::Debug> fmt::Debug for IdVec<I, T> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_list().entries(&self.items).finish()
    }
}
