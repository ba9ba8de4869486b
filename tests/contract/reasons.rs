//! The manual lists every reason that a finding can have, with its meaning.

use ropewalk_service::decode::reasons;

/// Reasons and meanings as the comment of `Finding` tells them.
fn told() -> Vec<(String, String)> {
    let text = include_str!("../../proto/ropewalk/v1/finding.proto");
    let (_, list) = text.split_once("// The reasons:\n").expect("the comment has the list");
    let (list, _) = list.split_once("message Finding {").expect("the message follows");
    let mut told: Vec<(String, String)> = Vec::new();
    for line in list.lines().map(|line| line.trim_start_matches("//").trim()) {
        if let Some(entry) = line.strip_prefix("- `") {
            let (reason, meaning) = entry.split_once("`: ").expect("a reason and its meaning");
            told.push((reason.to_owned(), meaning.to_owned()));
        } else if !line.is_empty() {
            let (_, meaning) = told.last_mut().expect("an entry before its second line");
            meaning.push(' ');
            meaning.push_str(line);
        }
    }
    told
}

#[test]
fn the_manual_lists_every_reason() {
    let known: Vec<(String, String)> = reasons::ALL
        .iter()
        .map(|(reason, meaning)| ((*reason).to_owned(), meaning.trim().to_owned()))
        .collect();
    assert_eq!(told(), known);
}
