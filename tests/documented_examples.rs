//! Does every command printed in the documents run? Lines of `sh` blocks in README.md and docs/ that start with
//! `bandwright` (or `cargo run --release --`) are run from the project's root; other lines are cargo commands that would
//! run this very test.

use std::fs;
use std::path::PathBuf;
use std::process::Command;

fn documents() -> Vec<PathBuf> {
    let mut list = vec![PathBuf::from("README.md")];
    if let Ok(folder) = fs::read_dir("docs") {
        list.extend(folder.map(|e| e.unwrap().path()).filter(|p| p.extension().is_some_and(|e| e == "md")));
    }
    list.sort();
    list
}

/// A command line cut at blanks; single and double quotes keep blanks.
fn words(line: &str) -> Vec<String> {
    let (mut list, mut word, mut quote, mut open) = (Vec::new(), String::new(), None, false);
    for c in line.chars() {
        match (quote, c) {
            (None, '\'' | '"') => {
                quote = Some(c);
                open = true;
            }
            (Some(q), c) if c == q => quote = None,
            (None, c) if c.is_whitespace() => {
                if open || !word.is_empty() {
                    list.push(std::mem::take(&mut word));
                    open = false;
                }
            }
            (_, c) => word.push(c),
        }
    }
    if open || !word.is_empty() {
        list.push(word);
    }
    list
}

fn commands() -> Vec<(PathBuf, String)> {
    let mut list = Vec::new();
    for path in documents() {
        let text = fs::read_to_string(&path).unwrap();
        let mut inside = false;
        for line in text.lines() {
            if line.starts_with("```") {
                inside = line.trim_end() == "```sh";
            } else if inside && !line.trim().is_empty() {
                list.push((path.clone(), line.trim().to_owned()));
            }
        }
    }
    list
}

#[test]
fn every_printed_command_runs() {
    let folder = tempfile::tempdir().unwrap();
    let mut ran = 0;
    for (path, line) in commands() {
        let plain = line.replace("cargo run --release -- ", "bandwright ");
        let mut words = words(&plain);
        if words.first().map(String::as_str) != Some("bandwright") {
            assert!(line.starts_with("cargo "), "{}: neither bandwright nor cargo: {line}", path.display());
            continue;
        }
        // Files that a command writes go into a folder of their own, and are read from there by later commands.
        for word in &mut words {
            if word.starts_with("out/") {
                *word = folder.path().join(&word[4..]).display().to_string();
            }
        }
        let into = words.iter().position(|w| w == ">").map(|at| words.split_off(at)[1].clone());
        let run = Command::new(env!("CARGO_BIN_EXE_bandwright")).args(&words[1..]).output().unwrap();
        let code = run.status.code();
        let told = String::from_utf8_lossy(&run.stderr);
        assert!(matches!(code, Some(0 | 1)), "{}: `{line}` ended with {code:?}: {told}", path.display());
        let wrote_file = words.iter().any(|w| w == "--out");
        assert!(wrote_file || !run.stdout.is_empty(), "{}: `{line}` says nothing", path.display());
        if let Some(into) = into {
            fs::write(into, run.stdout).unwrap();
        }
        ran += 1;
    }
    assert!(ran >= 5, "only {ran} commands were found in the documents");
}
