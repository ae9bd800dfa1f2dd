//! Findings: what stands against a movement, without allocation.

/// The interlocks, by id. Ids are never reused.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum Id {
    /// The asset is locked out by a person.
    LockedOut,
    /// The local panel has the asset.
    Local,
    /// The asset is tripped, or the site's safe latch is set.
    Latched,
    /// A signal that the movement rests on is missing, stale, frozen or out of range.
    SignalBad,
    /// Two signals of one quantity disagree.
    SignalsDisagree,
    /// Water outside would come in.
    Backflow,
    /// An opening anchored on time with a clock that may not be believed.
    ClockDistrusted,
    /// Too soon after the last movement.
    MinimumRest,
    /// A pump without an open way.
    NoOpenWay,
    /// A pump started too often.
    TooManyStarts,
    /// A pump with nothing to pump.
    DryRun,
    /// A setting outside 0 to 100.
    BadSetting,
    /// A lease of no length, or too long.
    BadLease,
}

impl Id {
    pub const fn code(self) -> &'static str {
        match self {
            Self::LockedOut => "IC-01",
            Self::Local => "IC-02",
            Self::Latched => "IC-03",
            Self::SignalBad => "IC-04",
            Self::SignalsDisagree => "IC-05",
            Self::Backflow => "IC-06",
            Self::ClockDistrusted => "IC-07",
            Self::MinimumRest => "IC-08",
            Self::NoOpenWay => "IC-09",
            Self::TooManyStarts => "IC-10",
            Self::DryRun => "IC-11",
            Self::BadSetting => "IC-12",
            Self::BadLease => "IC-13",
        }
    }
    pub const fn words(self) -> &'static str {
        match self {
            Self::LockedOut => "locked out by a person",
            Self::Local => "in local control",
            Self::Latched => "tripped or latched, not reset",
            Self::SignalBad => "a signal it rests on is not good",
            Self::SignalsDisagree => "two signals of one level disagree",
            Self::Backflow => "water outside would come in",
            Self::ClockDistrusted => "anchored on time, and the clock is not trusted",
            Self::MinimumRest => "too soon after its last movement",
            Self::NoOpenWay => "no open way for the pump",
            Self::TooManyStarts => "too many starts in an hour",
            Self::DryRun => "storage too low to pump",
            Self::BadSetting => "setting out of range",
            Self::BadLease => "lease out of bounds",
        }
    }
    /// Whether losing it ends a movement that is under way; the others bar a start only.
    pub(crate) const fn must_stay(self) -> bool {
        !matches!(
            self,
            Self::ClockDistrusted | Self::MinimumRest | Self::TooManyStarts | Self::BadSetting
        )
    }
}

/// Which reading or state a finding is about.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Subject {
    Asset,
    Clock,
    Position,
    Selector,
    /// The first or second level of the storage.
    Inner(u8),
    Outer,
    Way,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Finding {
    pub id: Id,
    pub subject: Subject,
    /// What it is, and the limit it must keep; NaN where neither is a number.
    pub value: f64,
    pub limit: f64,
    pub words: &'static str,
}

/// At most sixteen findings, in a fixed order.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Findings {
    list: [Option<Finding>; Self::MOST],
    len: usize,
}

impl Default for Findings {
    fn default() -> Self {
        Self { list: [None; Self::MOST], len: 0 }
    }
}

impl Findings {
    /// One for each interlock and a second storage level, with room to spare.
    pub const MOST: usize = 16;

    pub(crate) fn add(&mut self, id: Id, subject: Subject, value: f64, limit: f64) {
        self.add_with(id, subject, value, limit, id.words());
    }
    pub(crate) fn add_with(
        &mut self,
        id: Id,
        subject: Subject,
        value: f64,
        limit: f64,
        words: &'static str,
    ) {
        assert!(self.len < Self::MOST, "an asset has fewer checks than there is room for");
        self.list[self.len] = Some(Finding { id, subject, value, limit, words });
        self.len += 1;
    }
    pub fn iter(&self) -> impl Iterator<Item = &Finding> {
        self.list[..self.len].iter().flatten()
    }
    pub const fn is_empty(&self) -> bool {
        self.len == 0
    }
    pub fn any_must_stay(&self) -> bool {
        self.iter().any(|f| f.id.must_stay())
    }
    pub fn has(&self, id: Id) -> bool {
        self.iter().any(|f| f.id == id)
    }
}
