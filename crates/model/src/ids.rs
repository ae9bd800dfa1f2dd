//! Small indices that stand for names of the site file, in the order of the file.

macro_rules! id {
    ($($(#[$doc:meta])* $name:ident),* $(,)?) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
        pub struct $name(pub u16);
        impl $name {
            pub const fn index(self) -> usize {
                self.0 as usize
            }
        }
    )*};
}

id!(
    /// Index into [`crate::Site::places`].
    PlaceId,
    /// Index into [`crate::Site::storages`].
    StorageId,
    /// Index into [`crate::Site::assets`].
    AssetId,
    /// Index into [`crate::Site::signals`].
    SignalId,
    /// Index into [`crate::Site::adapters`].
    AdapterId,
    /// Index into [`crate::Licence::clauses`].
    ClauseId,
);

/// The number of a tide, counted by the moon: see `tide::number`.
pub type TideNumber = i64;

/// The number of a plan: one more than its parent's, gapless within a term of a site.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct PlanId(pub u64);

/// The number of a job that a worker does.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct JobId(pub u64);

/// Which life of the daemon speaks: a durable count of starts.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Term(pub u64);
