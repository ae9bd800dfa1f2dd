//! An adapter built to do everything wrong, one way at a time, for tests of the host.
//!
//! `misbehave HOW`: garbage, silent, twice, wrong-id, exit-early, wrong-version, flood, long-line,
//! half-line, request, die-after (dies once it has been introduced), anchors (does nothing wrong, and wants to be told of them), well (does nothing wrong).

use std::io::{BufRead, Write, stdin, stdout};

/// An answer to `introduce` with one point that can be read.
fn introduced(id: &str, version: &str) -> String {
    format!(
        r#"{{"jsonrpc":"2.0","id":{id},"result":{{"name":"misbehave","version":"{version}","points":[]}}}}"#
    )
}

/// The id of a request, as it stands in the line; good enough for a program that means ill.
fn id_of(line: &str) -> String {
    let after = line.split("\"id\":").nth(1).unwrap_or("0");
    after.chars().take_while(char::is_ascii_digit).collect()
}

fn main() {
    let how = std::env::args().nth(1).unwrap_or_default();
    if how == "exit-early" {
        return;
    }
    let mut out = stdout();
    // Whoever reads may be gone: then there is nobody left to annoy.
    let mut say = |text: &str| {
        let _ = out.write_all(text.as_bytes());
        let _ = out.flush();
    };
    let mut count = 0;
    for line in stdin().lock().lines() {
        let Ok(line) = line else { return };
        count += 1;
        let good = introduced(&id_of(&line), "1");
        match how.as_str() {
            "silent" => {}
            "garbage" => say("this is no JSON\n"),
            "twice" => say(&format!("{good}\n{good}\n")),
            "wrong-id" => say(&format!("{}\n{good}\n", introduced("987654", "1"))),
            "wrong-version" => say(&format!(
                "{{\"jsonrpc\":\"2.0\",\"id\":{},\"error\":{{\"code\":-32009,\"message\":\"I speak 7\"}}}}\n",
                id_of(&line)
            )),
            "flood" => {
                say(&format!("{good}\n"));
                let reading = r#"{"jsonrpc":"2.0","method":"reading","params":{"readings":[]}}"#;
                for _ in 0..200_000 {
                    say(&format!("{reading}\n"));
                }
            }
            "long-line" => say(&format!("{}\n", "x".repeat(1 << 20))),
            "half-line" => say("{\"jsonrpc\":\"2.0\","),
            "request" => say("{\"jsonrpc\":\"2.0\",\"id\":1,\"method\":\"drive\",\"params\":{}}\n"),
            "die-after" => {
                say(&format!("{good}\n"));
                return;
            }
            // Wants anchors, and reads each out as a trouble.
            "anchors" if line.contains("\"method\":\"anchor\"") => {
                let words = line.replace(['"', '\\'], "'");
                let params = format!(r#"{{"point":null,"severity":"info","words":"{words}"}}"#);
                say(&format!(r#"{{"jsonrpc":"2.0","method":"trouble","params":{params}}}"#));
                say("\n");
            }
            "anchors" => say(&format!(
                "{}\n",
                good.replace("\"points\"", "\"features\":[\"anchors\"],\"points\"")
            )),
            _ => say(&format!("{good}\n")),
        }
        if count > 100 {
            return;
        }
    }
}
