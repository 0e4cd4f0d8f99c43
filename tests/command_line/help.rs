//! What help says: widths, units, defaults, examples that work.

use clap::{Arg, Command};

use crate::Folder;

const WIDTH: usize = 79;

/// Every command with the words that lead to it.
fn commands(command: &Command, path: &[String], found: &mut Vec<(Vec<String>, Command)>) {
    found.push((path.to_vec(), command.clone()));
    for inner in command.get_subcommands().filter(|c| c.get_name() != "help") {
        let path = [path, &[inner.get_name().to_owned()]].concat();
        commands(inner, &path, found);
    }
}

fn all_commands() -> Vec<(Vec<String>, Command)> {
    let mut command = etchwise::cli::command();
    command.build();
    let mut found = Vec::new();
    commands(&command, &[], &mut found);
    assert!(found.len() > 20, "{}", found.len());
    found
}

fn options(command: &Command) -> impl Iterator<Item = &Arg> {
    command
        .get_arguments()
        .filter(|arg| !matches!(arg.get_id().as_str(), "help" | "version"))
}

fn long_help(arg: &Arg) -> String {
    arg.get_long_help().unwrap_or_default().to_string()
}

#[test]
fn short_help_of_every_command_fits_and_goes_to_standard_output() {
    let folder = Folder::new();
    for (path, _) in all_commands() {
        for flag in ["-h", "--help"] {
            let mut words: Vec<&str> = path.iter().map(String::as_str).collect();
            words.push(flag);
            let run = folder.run(&words);
            assert_eq!((run.status, run.err.as_str()), (0, ""), "{words:?}");
            for line in run.out.lines() {
                assert!(line.chars().count() <= WIDTH, "{words:?}: {line}");
            }
        }
    }
}

#[test]
fn every_option_has_help_and_those_with_a_value_an_example() {
    for (path, command) in all_commands() {
        assert!(command.get_about().is_some(), "{path:?}");
        for arg in options(&command) {
            let name = arg.get_id();
            assert!(arg.get_help().is_some(), "{path:?} {name}");
            if arg.get_action().takes_values() && !arg.is_positional() {
                assert!(long_help(arg).contains("Example: "), "{path:?} {name}");
            }
        }
    }
}

#[test]
fn options_of_solve_say_their_units_ranges_and_defaults() {
    let found = all_commands();
    let (_, solve) = found.iter().find(|(path, _)| *path == ["solve"]).unwrap();
    for (name, parts) in [
        ("unit", &["mm", "um", "nm"][..]),
        ("scale", &["Default: "]),
        ("cells-across", &["At least 4", "Default: "]),
        ("temperature", &["-20 to 110 C"]),
        ("gas-pressure", &["Default: 101325 Pa"]),
        ("viscosity", &["above 0", "mPa"]),
        ("density", &["above 0", "kg/m^3"]),
        ("length", &["above 0", "mm"]),
        ("pressure-drop", &["above 0", "kPa"]),
        ("flow-rate", &["above 0", "uL/min"]),
        ("threads", &["1 to 256", "Default: "]),
        ("allow-any-size", &["10 nm to 50 mm"]),
    ] {
        let arg = options(solve).find(|arg| arg.get_id() == name).unwrap();
        for part in parts {
            assert!(long_help(arg).contains(part), "{name}: {part}");
        }
    }
}

/// Examples of `draw` are typed as they are printed.
#[test]
fn examples_of_every_kind_are_accepted() {
    let folder = Folder::new();
    for (path, command) in all_commands() {
        if path.len() != 2 || path[0] != "draw" {
            continue;
        }
        for arg in options(&command).filter(|a| a.get_action().takes_values()) {
            let help = long_help(arg);
            let example = help.split("Example: ").nth(1).unwrap().trim();
            let (flag, typed) = example.split_once(' ').unwrap();
            let typed = typed.trim_matches('"');
            let run = folder.run(&["draw", &path[1], flag, typed]);
            // Other parameters are missing, but this one was understood.
            assert!(
                !run.err.contains("unexpected") && !run.err.contains(" not a"),
                "{example}: {}",
                run.err
            );
            assert!(!run.err.contains("unit"), "{example}: {}", run.err);
            assert!(!run.err.contains("column"), "{example}: {}", run.err);
        }
    }
}

#[test]
fn the_help_of_the_program_lists_the_statuses() {
    let run = Folder::new().run(&["--help"]);
    for status in 0..=5 {
        assert!(run.out.contains(&format!("\n  {status}  ")), "{status}");
    }
    let version = Folder::new().run(&["--version"]);
    assert_eq!(version.out, "etchwise 0.1.0\n");
}
