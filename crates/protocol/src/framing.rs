//! One message a line.

use core::fmt;

use serde::Serialize;
use serde_json::{Value, json};

use crate::{LINE_MAX, RpcError};

/// A line, understood.
#[derive(Clone, PartialEq, Debug)]
pub enum Message {
    Request {
        id: u64,
        method: String,
        params: Value,
    },
    Notification {
        method: String,
        params: Value,
    },
    Answer {
        id: u64,
        result: Value,
    },
    /// The id is absent when the request could not be read.
    Failure {
        id: Option<u64>,
        error: RpcError,
    },
}

/// A line that is no message.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum BadLine {
    TooLong {
        bytes: usize,
    },
    NotUtf8,
    NotJson(String),
    /// JSON, but not a message of this protocol.
    NotMessage(&'static str),
}

impl fmt::Display for BadLine {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::TooLong { bytes } => {
                write!(f, "a line of {bytes} bytes; {LINE_MAX} is the most, split the message")
            }
            Self::NotUtf8 => write!(f, "a line that is not UTF-8"),
            Self::NotJson(e) => {
                write!(f, "a line that is not JSON ({e}); print logs to standard error")
            }
            Self::NotMessage(why) => write!(f, "a line that is no JSON-RPC 2.0 message: {why}"),
        }
    }
}
impl std::error::Error for BadLine {}

/// Reads one line, with or without its end. Batches, other versions, ids that are no whole number,
/// NaN and the infinities (which JSON cannot say) are refused.
pub fn parse(line: &[u8]) -> Result<Message, BadLine> {
    if line.len() > LINE_MAX {
        return Err(BadLine::TooLong { bytes: line.len() });
    }
    let text = core::str::from_utf8(line).map_err(|_| BadLine::NotUtf8)?;
    let value: Value =
        serde_json::from_str(text.trim_end()).map_err(|e| BadLine::NotJson(e.to_string()))?;
    let Value::Object(mut map) = value else {
        return Err(BadLine::NotMessage("a single object is wanted, no batch"));
    };
    if map.get("jsonrpc").and_then(Value::as_str) != Some("2.0") {
        return Err(BadLine::NotMessage("\"jsonrpc\" must be \"2.0\""));
    }
    let id = match map.get("id") {
        None | Some(Value::Null) => None,
        Some(v) => Some(v.as_u64().ok_or(BadLine::NotMessage("\"id\" must be a whole number"))?),
    };
    if let Some(method) = map.get("method").and_then(Value::as_str).map(str::to_owned) {
        let params = map.remove("params").unwrap_or(Value::Null);
        return Ok(match id {
            Some(id) => Message::Request { id, method, params },
            None => Message::Notification { method, params },
        });
    }
    match (map.remove("result"), map.remove("error"), id) {
        (Some(result), None, Some(id)) => Ok(Message::Answer { id, result }),
        (None, Some(error), id) => {
            let error = serde_json::from_value(error)
                .map_err(|_| BadLine::NotMessage("\"error\" needs a code and a message"))?;
            Ok(Message::Failure { id, error })
        }
        _ => Err(BadLine::NotMessage("neither a method, a result with its id, nor an error")),
    }
}

fn line(value: &Value) -> String {
    format!("{value}\n")
}

/// A request as a line.
pub fn request(
    id: u64,
    method: &str,
    params: &impl Serialize,
) -> Result<String, serde_json::Error> {
    let params = serde_json::to_value(params)?;
    Ok(line(&json!({ "jsonrpc": "2.0", "id": id, "method": method, "params": params })))
}

/// A notification as a line.
pub fn notification(method: &str, params: &impl Serialize) -> Result<String, serde_json::Error> {
    let params = serde_json::to_value(params)?;
    Ok(line(&json!({ "jsonrpc": "2.0", "method": method, "params": params })))
}

/// A good answer as a line.
pub fn answer(id: u64, result: &impl Serialize) -> Result<String, serde_json::Error> {
    let result = serde_json::to_value(result)?;
    Ok(line(&json!({ "jsonrpc": "2.0", "id": id, "result": result })))
}

/// A refusal as a line.
pub fn failure(id: Option<u64>, error: &RpcError) -> String {
    line(&json!({ "jsonrpc": "2.0", "id": id, "error": error }))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{Drive, method};

    #[test]
    fn a_message_reads_back_as_it_was_written() {
        let drive = Drive {
            point: "gate".to_owned(),
            setpoint: 34.5,
            command: 7,
            term: 3,
            sequence: 9,
            expires_boottime_ns: 123,
        };
        let text = request(4, method::DRIVE, &drive).unwrap();
        assert!(text.ends_with('\n') && text.matches('\n').count() == 1);
        let Message::Request { id, method, params } = parse(text.as_bytes()).unwrap() else {
            panic!("a request");
        };
        assert_eq!((id, method.as_str()), (4, "drive"));
        assert_eq!(serde_json::from_value::<Drive>(params).unwrap(), drive);
    }

    #[test]
    fn what_is_no_message_is_refused_with_the_reason() {
        let long = vec![b' '; LINE_MAX + 1];
        assert!(matches!(parse(&long), Err(BadLine::TooLong { .. })));
        assert!(matches!(parse(&[0xff, 0xfe]), Err(BadLine::NotUtf8)));
        for bad in [
            "hello",
            "{",
            "NaN",
            r#"{"jsonrpc":"2.0","id":1,"result":Infinity}"#,
            r#"{"jsonrpc":"2.0","id":1,"result":1e999}"#,
        ] {
            assert!(matches!(parse(bad.as_bytes()), Err(BadLine::NotJson(_))), "{bad}");
        }
        for bad in [
            "[]",
            "7",
            r#"{"id":1,"result":1}"#,
            r#"{"jsonrpc":"2.0","id":"x","result":1}"#,
            r#"{"jsonrpc":"2.0","result":1}"#,
            r#"{"jsonrpc":"2.0","id":1}"#,
        ] {
            assert!(matches!(parse(bad.as_bytes()), Err(BadLine::NotMessage(_))), "{bad}");
        }
    }

    #[test]
    fn unknown_fields_are_ignored() {
        let text =
            r#"{"jsonrpc":"2.0","id":1,"method":"sense","params":{"points":[],"new":1},"x":2}"#;
        let Ok(Message::Request { params, .. }) = parse(text.as_bytes()) else { panic!() };
        assert!(serde_json::from_value::<crate::Sense>(params).is_ok());
    }
}
