//! Writing: whole files or none, inputs safe, refusals with path and reason.
#![expect(
    clippy::disallowed_methods,
    reason = "the tests prepare and read files of their own"
)]

use std::fs;
use std::path::Path;

use etchwise::report::{OutputFile, WriteError, check_target, write_file, write_files};

fn names_in(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    names
}

#[test]
fn a_file_is_replaced_whole_and_nothing_is_left_beside_it() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.json");
    write_file(&path, b"first and longer", &[]).unwrap();
    check_target(&path, &[]).unwrap();
    assert_eq!(
        fs::read(&path).unwrap(),
        b"first and longer",
        "the check changes nothing"
    );
    write_file(&path, b"second", &[]).unwrap();
    assert_eq!(fs::read(&path).unwrap(), b"second");
    assert_eq!(names_in(folder.path()), ["out.json"]);
}

#[test]
fn an_input_is_never_overwritten_by_whatever_name() {
    let folder = tempfile::tempdir().unwrap();
    let input = folder.path().join("section.toml");
    fs::write(&input, "kept").unwrap();
    let hard = folder.path().join("hard.toml");
    fs::hard_link(&input, &hard).unwrap();
    for target in [input.clone(), folder.path().join("./section.toml"), hard] {
        for error in [
            check_target(&target, &[&input]).unwrap_err(),
            write_file(&target, b"lost", &[&input]).unwrap_err(),
        ] {
            assert!(matches!(error, WriteError::IsInput { .. }), "{error}");
            assert!(error.to_string().contains(&*target.to_string_lossy()));
        }
    }
    assert_eq!(fs::read(&input).unwrap(), b"kept");
}

#[test]
fn targets_that_cannot_be_written_are_refused_up_front_with_path_and_reason() {
    let folder = tempfile::tempdir().unwrap();
    let missing = folder.path().join("none/out.csv");
    assert!(matches!(
        check_target(&missing, &[]),
        Err(WriteError::NoFolder { .. })
    ));
    assert!(matches!(
        check_target(folder.path(), &[]),
        Err(WriteError::IsFolder { .. })
    ));
    let file = folder.path().join("file");
    fs::write(&file, "x").unwrap();
    let below = check_target(&file.join("out.csv"), &[]).unwrap_err();
    assert!(below.to_string().contains("out.csv"), "{below}");
    let mut permissions = fs::metadata(&file).unwrap().permissions();
    permissions.set_readonly(true);
    fs::set_permissions(&file, permissions).unwrap();
    assert!(matches!(
        write_file(&file, b"y", &[]),
        Err(WriteError::ReadOnly { .. })
    ));
    assert_eq!(fs::read(&file).unwrap(), b"x");
    assert_eq!(names_in(folder.path()), ["file"]);
}

#[test]
fn files_that_belong_together_are_written_all_or_none() {
    let folder = tempfile::tempdir().unwrap();
    let good = folder.path().join("a.vti");
    let bad = folder.path().join("none/a.vtp");
    let files = |second: &'static [u8]| {
        [
            OutputFile {
                path: &good,
                bytes: b"field",
            },
            OutputFile {
                path: &bad,
                bytes: second,
            },
        ]
    };
    assert!(write_files(&files(b"wall"), &[]).is_err());
    assert!(names_in(folder.path()).is_empty());
    let twice = [
        OutputFile {
            path: &good,
            bytes: b"1",
        },
        OutputFile {
            path: &good,
            bytes: b"2",
        },
    ];
    assert!(matches!(
        write_files(&twice, &[]),
        Err(WriteError::NamedTwice { .. })
    ));
    assert!(names_in(folder.path()).is_empty());
    fs::create_dir(folder.path().join("none")).unwrap();
    write_files(&files(b"wall"), &[]).unwrap();
    assert_eq!(fs::read(&bad).unwrap(), b"wall");
}

#[cfg(unix)]
#[test]
fn devices_are_written_directly_links_are_followed_and_permissions_kept() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    write_file("/dev/null".as_ref(), b"gone", &[]).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let (real, link) = (
        folder.path().join("real.svg"),
        folder.path().join("link.svg"),
    );
    fs::write(&real, "old").unwrap();
    fs::set_permissions(&real, fs::Permissions::from_mode(0o640)).unwrap();
    symlink(&real, &link).unwrap();
    write_file(&link, b"new", &[]).unwrap();
    assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
    assert_eq!(fs::read(&real).unwrap(), b"new");
    assert_eq!(
        fs::metadata(&real).unwrap().permissions().mode() & 0o777,
        0o640
    );
}
