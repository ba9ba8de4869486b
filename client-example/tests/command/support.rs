//! Starting the program and reading what it leaves.

use std::collections::HashMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// How the program ended.
pub(crate) struct Ended {
    pub(crate) code: i32,
    pub(crate) out: String,
    pub(crate) told: String,
}

/// The built program; nothing of the caller's settings reaches it.
pub(crate) fn command(args: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_ropewalk"));
    for (name, _) in std::env::vars() {
        if name.starts_with("ROPEWALK_") {
            command.env_remove(name);
        }
    }
    command.args(args);
    command
}

/// Runs the built program.
pub(crate) fn ropewalk(args: &[&str]) -> Ended {
    finish(command(args).output().expect("the program starts"))
}

/// Reads what the program said.
pub(crate) fn finish(output: Output) -> Ended {
    Ended {
        code: output.status.code().expect("the program ends by itself"),
        out: String::from_utf8(output.stdout).expect("text"),
        told: String::from_utf8(output.stderr).expect("text"),
    }
}

/// One of the briefs beside the program.
pub(crate) fn brief(name: &str) -> String {
    format!("{}/briefs/{name}.json", env!("CARGO_MANIFEST_DIR"))
}

/// A folder that goes away with its test.
pub(crate) struct Folder(PathBuf);

impl Folder {
    pub(crate) fn new(name: &str) -> Self {
        let path = std::env::temp_dir().join(format!("ropewalk-test-{name}-{}", std::process::id()));
        fs::create_dir_all(&path).expect("a temporary folder");
        Self(path)
    }

    pub(crate) fn path(&self, name: &str) -> PathBuf {
        self.0.join(name)
    }

    pub(crate) fn write(&self, name: &str, text: &str) -> String {
        fs::write(self.path(name), text).expect("a temporary file");
        self.path(name).to_str().expect("a plain path").to_owned()
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        // A folder that stays behind harms no other test.
        let _ = fs::remove_dir_all(&self.0);
    }
}

/// A JSON file.
pub(crate) fn json(path: &Path) -> serde_json::Value {
    serde_json::from_str(&fs::read_to_string(path).expect("the file is there")).expect("JSON")
}

/// A CSV file, row by row.
pub(crate) fn csv(path: &Path) -> Vec<Vec<String>> {
    let text = fs::read_to_string(path).expect("the file is there");
    let (mut rows, mut row, mut cell, mut quoted) = (Vec::new(), Vec::new(), String::new(), false);
    let mut letters = text.chars().peekable();
    while let Some(letter) = letters.next() {
        match letter {
            '"' if quoted && letters.peek() == Some(&'"') => {
                letters.next();
                cell.push('"');
            }
            '"' => quoted = !quoted,
            ',' if !quoted => row.push(std::mem::take(&mut cell)),
            '\n' if !quoted => {
                row.push(std::mem::take(&mut cell).trim_end_matches('\r').to_owned());
                rows.push(std::mem::take(&mut row));
            }
            letter => cell.push(letter),
        }
    }
    rows
}

/// Attributes of all elements that have a certain one; the text that follows stands under `text`.
pub(crate) fn attributes(svg: &str, wanted: &str) -> Vec<HashMap<String, String>> {
    let mut found = Vec::new();
    for element in svg
        .split('<')
        .filter(|element| element.contains(&format!("{wanted}=\"")))
    {
        let (head, text) = element.split_once('>').expect("an element ends");
        let mut attributes = HashMap::from([("text".to_owned(), text.trim_end().to_owned())]);
        let mut rest = head;
        while let Some((before, after)) = rest.split_once("=\"") {
            let name = before
                .rsplit(char::is_whitespace)
                .next()
                .expect("an attribute has a name");
            let (value, further) = after.split_once('"').expect("a value ends");
            attributes.insert(name.to_owned(), value.to_owned());
            rest = further;
        }
        found.push(attributes);
    }
    found
}
