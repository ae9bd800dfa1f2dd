//! Shared by the integration tests: where data lies, how a run is judged.
