//! The README's program lines run as they stand, with the built binary, in an empty folder.

use std::path::PathBuf;

use crate::bench_of_tests::{printed, program};

fn readme() -> String {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("README.md");
    std::fs::read_to_string(path).unwrap()
}

/// Lines of the README's shell blocks, in order.
fn shell_lines() -> Vec<String> {
    let mut lines = Vec::new();
    let mut inside = false;
    for line in readme().lines() {
        if line.starts_with("```") {
            inside = line == "```sh";
        } else if inside && !line.trim().is_empty() {
            lines.push(line.to_owned());
        }
    }
    lines
}

/// Arguments of a program line; the release build and the tests' build do the same.
fn arguments_of(line: &str) -> Option<Vec<String>> {
    let rest = line
        .strip_prefix("cargo run --release -- ")
        .or_else(|| line.strip_prefix("rateplate "))?;
    Some(rest.split_whitespace().map(str::to_owned).collect())
}

#[test]
fn the_program_lines_do_what_the_readme_says() {
    let folder = tempfile::tempdir().unwrap();
    let lines = shell_lines();
    let programs: Vec<Vec<String>> = lines.iter().filter_map(|line| arguments_of(line)).collect();
    assert!(programs.len() >= 4, "{lines:?}");
    for arguments in &programs {
        let words: Vec<&str> = arguments.iter().map(String::as_str).collect();
        let output = program(folder.path(), &words);
        let text = printed(&output);
        let faulty = words.contains(&"--fault");
        let code = output.status.code().unwrap();
        assert_eq!(code == 0, !faulty, "{words:?} ended with {code}:\n{text}");
        if words[0] == "rehearse" {
            assert!(
                text.contains("VERDICT") && text.contains("record     reports"),
                "{text}"
            );
        }
    }
}

#[test]
fn the_first_paragraph_states_the_job_and_two_commands_do_everything() {
    let text = readme();
    let first = text.split("\n\n").nth(1).unwrap().replace('\n', " ");
    for word in [
        "rating plate",
        "serial lines",
        "thermal-link",
        "uncertainty",
        "record",
    ] {
        assert!(first.contains(word), "{word}");
    }
    let from = text.find("<!-- the two commands -->").unwrap();
    let to = text[from..].find("<!-- end -->").unwrap() + from;
    let commands = text[from..to]
        .lines()
        .filter(|line| line.starts_with("cargo "))
        .count();
    assert_eq!(commands, 2);
}

#[test]
fn every_file_that_the_readme_links_is_there() {
    let root = PathBuf::from(env!("CARGO_MANIFEST_DIR"));
    for part in readme().split("](").skip(1) {
        let target = part.split(')').next().unwrap();
        if !target.starts_with("http") {
            assert!(root.join(target).exists(), "{target}");
        }
    }
}

#[test]
fn the_exit_codes_of_readme_and_help_agree() {
    let text = readme().replace('\n', " ");
    for (exit, _) in rateplate::cli::Exit::TABLE {
        assert!(
            text.contains(&format!("{} ", exit.code())),
            "{exit:?} is not in the README"
        );
    }
    let folder = tempfile::tempdir().unwrap();
    let help = printed(&program(folder.path(), &["--help"]));
    for (exit, meaning) in rateplate::cli::Exit::TABLE {
        let line = help
            .lines()
            .find(|l| l.trim_start().starts_with(&format!("{} ", exit.code())));
        let words: Vec<&str> = meaning.split_whitespace().take(3).collect();
        assert!(
            line.is_some_and(|l| l.contains(&words.join(" "))),
            "{exit:?} is not in --help"
        );
    }
}
