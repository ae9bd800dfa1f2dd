//! **Is this site file whole and sound, and if not, what is wrong and where?**
//!
//! Reads `site.toml` and `licence.toml` of a site folder, checks them into a [`model::Site`], or
//! says every fault of both at once: its code, file, line, the value, the rule and the remedy. It
//! guesses nothing, passes over no key, and puts every level on the site datum and every time in
//! UTC on the way in. It does not judge whether the plant is well designed, and it does not decide
//! what may move.
//!
//! ```no_run
//! use std::path::Path;
//! match site::load(Path::new("deploy/sites/tarrow-works")) {
//!     Ok(site) => println!("{}: {} clauses", site.title, site.licence.clauses.len()),
//!     Err(report) => eprintln!("{report}"),
//! }
//! ```

use std::cell::RefCell;
use std::path::{Path, PathBuf};

mod assets;
mod clauses;
mod codes;
mod constituents;
mod cross;
mod decode;
mod explanations;
mod fields;
mod keeping;
mod names;
mod notes;
mod places;
mod port;
mod raw;
mod report;
mod schedule;
mod settings;
mod signals;
mod storages;
mod text;
mod zone;

pub use codes::{Explanation, explain, explanations};
pub use notes::{Note, check_notes};
pub use report::{Fault, Report};
pub use schedule::Schedule;

use crate::raw::Source;
use crate::report::fault_at;

/// The largest file that is read, bytes: twenty times the example, and small enough that a file
/// in which every line is wrong is still reported in a moment.
const FILE_BYTES_MAX: u64 = 1 << 18;

/// Reads and checks a site. `path` is its folder, or the `site.toml` in it; the licence is the
/// `licence.toml` beside that.
pub fn load(path: &Path) -> Result<model::Site, Report> {
    let (site_path, licence_path) = paths(path);
    let faults = RefCell::new(Vec::new());
    let read_or_note = |path: &Path| match read(path) {
        Ok(text) => Some(text),
        Err(why) => {
            let name = path.display().to_string();
            let words = (
                format!("the file must be there and readable, but {why}"),
                "name a folder with site.toml and licence.toml in it".to_owned(),
            );
            let value = Some(name.clone());
            faults.borrow_mut().push(fault_at(codes::READ, (&name, ""), 0..0, value, words));
            None
        }
    };
    let texts = [read_or_note(&site_path), read_or_note(&licence_path)];
    let names = [site_path.display().to_string(), licence_path.display().to_string()];
    let site = check(&names, &texts, &faults);
    let faults = faults.into_inner();
    match site {
        Some(site) if faults.is_empty() => Ok(site),
        _ => {
            debug_assert!(!faults.is_empty(), "a site is refused without a reason");
            let texts = names.into_iter().zip(texts.into_iter().map(Option::unwrap_or_default));
            Err(Report::new(faults, texts.collect()))
        }
    }
}

fn check(
    names: &[String; 2],
    texts: &[Option<String>; 2],
    faults: &RefCell<Vec<Fault>>,
) -> Option<model::Site> {
    let text = |i: usize| texts[i].as_deref().unwrap_or_default();
    let source = |i: usize| Source { file: &names[i], text: text(i), faults };
    let digest = |i: usize| blake3::hash(text(i).as_bytes()).to_hex().to_string();
    let (site, law) = (source(0), source(1));
    let site_table = texts[0].as_ref().and_then(|_| site.parse());
    let law_table = texts[1].as_ref().and_then(|_| law.parse());
    let law_root = law_table.as_ref().map(|t| law.root(t, "the licence file"));
    let root = site.root(site_table.as_ref()?, "the site file");
    let digests = decode::Digests { site: digest(0), licence: digest(1) };
    decode::site(&root, law_root.as_ref(), digests)
}

fn paths(path: &Path) -> (PathBuf, PathBuf) {
    if path.extension().is_some_and(|e| e == "toml") {
        return (path.to_owned(), path.with_file_name("licence.toml"));
    }
    (path.join("site.toml"), path.join("licence.toml"))
}

/// The text of a file, not larger than it may be.
fn read(path: &Path) -> Result<String, String> {
    let about = std::fs::metadata(path).map_err(|e| e.to_string())?;
    if !about.is_file() {
        return Err("it is not a file".to_owned());
    }
    if about.len() > FILE_BYTES_MAX {
        return Err(format!("it is larger than {FILE_BYTES_MAX} bytes"));
    }
    std::fs::read_to_string(path).map_err(|e| e.to_string())
}
