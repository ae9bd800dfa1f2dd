//! The plant's Unix socket: one thread accepts, one a connection reads lines and hands them in.

use std::io::{self, BufRead, BufReader, Read, Write};
use std::os::unix::net::{UnixListener, UnixStream};
use std::sync::mpsc::{Receiver, Sender, SyncSender, channel, sync_channel};
use std::thread;

use crate::wire::{Answer, Ask, LINE_MAX};

/// What reaches the plant's own thread.
pub(crate) enum Arrival {
    Joined,
    Left,
    Asked { ask: Ask, reply: Sender<Answer> },
}

/// At most this many asks wait; a connection that asks faster waits for its answers.
const WAITING_MAX: usize = 64;
/// More connections than any use of a plant needs; further ones are closed at once.
const CONNECTIONS_MAX: usize = 16;

/// Accepts from now on. The threads end with the process, or with their connection.
pub(crate) fn listen(listener: UnixListener) -> io::Result<Receiver<Arrival>> {
    let (tx, rx) = sync_channel(WAITING_MAX);
    let places = std::sync::Arc::new(());
    thread::Builder::new().name("plant-accept".to_owned()).spawn(move || {
        for stream in listener.incoming().flatten() {
            if std::sync::Arc::strong_count(&places) > CONNECTIONS_MAX {
                continue;
            }
            let (tx, place) = (tx.clone(), places.clone());
            let talk = move || {
                let _place = place;
                if tx.send(Arrival::Joined).is_ok() {
                    // A broken connection is an adapter that died: the leases take care of it.
                    let _ = converse(stream, &tx);
                    let _ = tx.send(Arrival::Left);
                }
            };
            let started = thread::Builder::new().name("plant-talk".to_owned()).spawn(talk);
            if let Err(e) = started {
                eprintln!("no thread for a connection: {e}");
            }
        }
    })?;
    Ok(rx)
}

fn converse(stream: UnixStream, tx: &SyncSender<Arrival>) -> io::Result<()> {
    let mut out = stream.try_clone()?;
    let mut input = BufReader::new(stream);
    loop {
        let mut line = Vec::new();
        let n = input.by_ref().take(LINE_MAX).read_until(b'\n', &mut line)?;
        if n == 0 || line.last() != Some(&b'\n') {
            return Ok(());
        }
        let answer = match serde_json::from_slice::<Ask>(&line) {
            Err(e) => Answer::Refused { why: format!("not understood: {e}") },
            Ok(ask) => {
                let (reply, answers) = channel();
                let asked = tx.send(Arrival::Asked { ask, reply });
                let Ok(answer) =
                    asked.map_err(|_| ()).and_then(|()| answers.recv().map_err(|_| ()))
                else {
                    return Ok(());
                };
                answer
            }
        };
        let mut text = serde_json::to_vec(&answer)?;
        text.push(b'\n');
        out.write_all(&text)?;
    }
}
