//! Error codes: those of JSON-RPC 2.0, and our own range.

use core::fmt;

use serde::{Deserialize, Serialize};

/// Why a request is refused.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Code {
    ParseError = -32700,
    InvalidRequest = -32600,
    MethodNotFound = -32601,
    InvalidParams = -32602,
    InternalError = -32603,
    /// Nothing is done before `introduce`.
    NotIntroduced = -32001,
    UnknownPoint = -32002,
    NotDrivable = -32003,
    OutOfRange = -32004,
    /// The command's end is past.
    Expired = -32005,
    /// A higher term has spoken.
    OldTerm = -32006,
    LeaseTooShort = -32007,
    /// The equipment would not.
    Equipment = -32008,
    WrongVersion = -32009,
}

#[derive(Serialize, Deserialize, Clone, PartialEq, Eq, Debug)]
pub struct RpcError {
    pub code: i32,
    pub message: String,
}

impl RpcError {
    pub fn new(code: Code, message: impl Into<String>) -> Self {
        Self { code: code as i32, message: message.into() }
    }
}

impl fmt::Display for RpcError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} ({})", self.message, self.code)
    }
}
impl std::error::Error for RpcError {}
