//! Everything that comes to the loop, in one queue.

use host::HostEvent;
use journal::{Reply, ViewSays};

use super::workers::Done;
use crate::control::Asked;

#[derive(Debug)]
pub enum Input {
    Host(HostEvent),
    Journal(Reply),
    View(ViewSays),
    Asked(Asked),
    Done(Done),
    Stop,
}

impl From<Reply> for Input {
    fn from(r: Reply) -> Self {
        Self::Journal(r)
    }
}
impl From<ViewSays> for Input {
    fn from(s: ViewSays) -> Self {
        Self::View(s)
    }
}
impl From<Asked> for Input {
    fn from(a: Asked) -> Self {
        Self::Asked(a)
    }
}
impl From<Done> for Input {
    fn from(d: Done) -> Self {
        Self::Done(d)
    }
}
