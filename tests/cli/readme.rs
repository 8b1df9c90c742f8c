//! Words that promise are run: every `ebbmark` line of the README, in its order, from a folder that looks like the repository's top.

use crate::cli::bench::Bench;

/// The commands of the README's code blocks: lines that begin with `ebbmark ` in `sh`, or with `$ ebbmark ` in `console`.
fn commands() -> Vec<Vec<String>> {
    let text = include_str!("../../README.md");
    let mut language = None;
    let mut list = Vec::new();
    for line in text.lines().map(str::trim) {
        if let Some(opened) = line.strip_prefix("```") {
            language = language.is_none().then_some(opened);
            continue;
        }
        let command = match language {
            Some("sh") => Some(line),
            Some("console") => line.strip_prefix("$ "),
            _ => None,
        };
        if let Some(arguments) = command.and_then(|command| command.strip_prefix("ebbmark ")) {
            list.push(arguments.split_whitespace().map(str::to_owned).collect());
        }
    }
    list
}

#[test]
fn every_command_of_the_readme_works() {
    let bench = Bench::new();
    let fixtures = concat!(env!("CARGO_MANIFEST_DIR"), "/fixtures");
    std::os::unix::fs::symlink(fixtures, bench.path("fixtures")).unwrap();
    let commands = commands();
    assert!(commands.len() >= 8, "{commands:?}");
    for verb in ["measure", "inspect", "refit", "rehearse", "demo"] {
        assert!(
            commands.iter().any(|command| command[0] == verb),
            "no example of {verb}"
        );
    }
    for command in commands {
        println!("ebbmark {}", command.join(" "));
        bench.run(&command).succeeds();
    }
}
