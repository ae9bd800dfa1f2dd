//! From names in rows to small indices and back: by the site file, or by a list gathered on the way.

use model::{AdapterId, AssetId, ClauseId, SignalId, Site};

use crate::RecordError;

/// Gives an index for each name of a row.
pub(crate) trait Names {
    fn asset(&mut self, name: &str) -> Result<AssetId, RecordError>;
    fn signal(&mut self, name: &str) -> Result<SignalId, RecordError>;
    fn adapter(&mut self, name: &str) -> Result<AdapterId, RecordError>;
    fn clause(&mut self, number: &str) -> Result<ClauseId, RecordError>;
}

/// Gives the name of each index. An index that was never given out is a fault of ours and panics.
pub(crate) trait Named {
    fn asset_name(&self, id: AssetId) -> &str;
    fn signal_name(&self, id: SignalId) -> &str;
    fn adapter_name(&self, id: AdapterId) -> &str;
    fn clause_number(&self, id: ClauseId) -> &str;
}

impl Named for Site {
    fn asset_name(&self, id: AssetId) -> &str {
        &self.asset(id).name
    }
    fn signal_name(&self, id: SignalId) -> &str {
        &self.signal(id).name
    }
    fn adapter_name(&self, id: AdapterId) -> &str {
        &self.adapters[id.index()].name
    }
    fn clause_number(&self, id: ClauseId) -> &str {
        &self.licence.clause(id).number
    }
}

fn missing(what: &'static str, name: &str) -> RecordError {
    RecordError::NoSuchName { what, name: name.to_owned() }
}

/// The names that the site file has; any other is an error.
impl Names for &Site {
    fn asset(&mut self, name: &str) -> Result<AssetId, RecordError> {
        self.asset_named(name).map(|a| a.id).ok_or_else(|| missing("asset", name))
    }
    fn signal(&mut self, name: &str) -> Result<SignalId, RecordError> {
        self.signal_named(name).map(|s| s.id).ok_or_else(|| missing("signal", name))
    }
    fn adapter(&mut self, name: &str) -> Result<AdapterId, RecordError> {
        let found = self.adapters.iter().find(|a| a.name == name);
        found.map(|a| a.id).ok_or_else(|| missing("adapter", name))
    }
    fn clause(&mut self, number: &str) -> Result<ClauseId, RecordError> {
        let found = self.licence.clauses.iter().find(|c| c.number == number);
        found.map(|c| c.id).ok_or_else(|| missing("clause", number))
    }
}

/// Every name is good and gets the next index: for reading rows without the site file, or with one
/// that has changed since.
#[derive(Clone, Default, Debug)]
pub(crate) struct Gathered {
    assets: Vec<String>,
    signals: Vec<String>,
    adapters: Vec<String>,
    clauses: Vec<String>,
}

impl Gathered {
    pub(crate) fn assets(&self) -> &[String] {
        &self.assets
    }
}

impl Named for Gathered {
    fn asset_name(&self, id: AssetId) -> &str {
        &self.assets[id.index()]
    }
    fn signal_name(&self, id: SignalId) -> &str {
        &self.signals[id.index()]
    }
    fn adapter_name(&self, id: AdapterId) -> &str {
        &self.adapters[id.index()]
    }
    fn clause_number(&self, id: ClauseId) -> &str {
        &self.clauses[id.index()]
    }
}

fn gather(list: &mut Vec<String>, what: &'static str, name: &str) -> Result<u16, RecordError> {
    let no = list.iter().position(|n| n == name).unwrap_or_else(|| {
        list.push(name.to_owned());
        list.len() - 1
    });
    u16::try_from(no).map_err(|_| missing(what, name))
}

impl Names for Gathered {
    fn asset(&mut self, name: &str) -> Result<AssetId, RecordError> {
        gather(&mut self.assets, "asset", name).map(AssetId)
    }
    fn signal(&mut self, name: &str) -> Result<SignalId, RecordError> {
        gather(&mut self.signals, "signal", name).map(SignalId)
    }
    fn adapter(&mut self, name: &str) -> Result<AdapterId, RecordError> {
        gather(&mut self.adapters, "adapter", name).map(AdapterId)
    }
    fn clause(&mut self, number: &str) -> Result<ClauseId, RecordError> {
        gather(&mut self.clauses, "clause", number).map(ClauseId)
    }
}
