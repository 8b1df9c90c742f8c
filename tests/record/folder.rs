//! The folder appears whole or not at all, and replaces nothing that is not ours.

use std::fs;
use std::path::Path;

use ebbmark::record::{RecordError, check_destination, write};

use crate::record::double::Double;

/// The sheet beside a result; what it says is not this room's business.
const RUN: &str = "clip = \"../rail-7.mp4\"\n";

fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    names
}

#[test]
fn a_film_leaves_six_files_and_a_table_five() {
    let room = tempfile::tempdir().unwrap();
    let (film, table) = (
        room.path().join("film.ebbmark"),
        room.path().join("table.ebbmark"),
    );
    write(&Double::film(300).build(), RUN, &film).unwrap();
    write(&Double::table(300).build(), RUN, &table).unwrap();
    assert_eq!(
        names(&film),
        [
            "cycles.csv",
            "positions.csv",
            "report.html",
            "result.json",
            "run.toml",
            "streak.png"
        ]
    );
    assert_eq!(
        names(&table),
        [
            "cycles.csv",
            "positions.csv",
            "report.html",
            "result.json",
            "run.toml"
        ]
    );
    assert_eq!(
        names(room.path()),
        ["film.ebbmark", "table.ebbmark"],
        "no staging folder stays behind"
    );
    let sheet = fs::read_to_string(film.join("run.toml")).unwrap();
    assert_eq!(sheet, RUN);
}

#[test]
fn the_same_measurement_gives_the_same_bytes() {
    let room = tempfile::tempdir().unwrap();
    let measurement = Double::film(900).with_mass().build();
    let (one, two) = (room.path().join("one"), room.path().join("two"));
    write(&measurement, RUN, &one).unwrap();
    write(&measurement, RUN, &two).unwrap();
    for name in names(&one) {
        assert!(
            fs::read(one.join(&name)).unwrap() == fs::read(two.join(&name)).unwrap(),
            "{name} differs"
        );
    }
}

#[test]
fn an_earlier_result_is_replaced_whole() {
    let room = tempfile::tempdir().unwrap();
    let out = room.path().join("run.ebbmark");
    write(&Double::film(300).build(), RUN, &out).unwrap();
    write(&Double::table(300).build(), RUN, &out).unwrap();
    assert!(
        !out.join("streak.png").exists(),
        "the old film's streak belongs to no table"
    );
}

#[test]
fn an_empty_folder_may_be_filled() {
    let room = tempfile::tempdir().unwrap();
    let out = room.path().join("empty");
    fs::create_dir(&out).unwrap();
    write(&Double::table(300).build(), RUN, &out).unwrap();
    assert!(out.join("result.json").is_file());
}

#[test]
fn a_folder_with_anything_else_in_it_is_refused_and_untouched() {
    let room = tempfile::tempdir().unwrap();
    let out = room.path().join("thesis");
    fs::create_dir(&out).unwrap();
    fs::write(out.join("result.json"), "mine").unwrap();
    fs::write(out.join("chapter.tex"), "years of work").unwrap();
    for error in [
        check_destination(&out).unwrap_err(),
        write(&Double::table(300).build(), RUN, &out).unwrap_err(),
    ] {
        assert!(
            matches!(&error, RecordError::ForeignFolder { stranger, .. } if stranger == "chapter.tex"),
            "{error}"
        );
        assert!(
            error.to_string().contains("chapter.tex") && error.to_string().contains("--out"),
            "{error}"
        );
    }
    assert_eq!(fs::read(out.join("chapter.tex")).unwrap(), b"years of work");
    assert_eq!(fs::read(out.join("result.json")).unwrap(), b"mine");
}

#[test]
fn a_folder_that_only_carries_one_of_our_names_is_foreign() {
    let room = tempfile::tempdir().unwrap();
    let out = room.path().join("odd");
    fs::create_dir_all(out.join("result.json")).unwrap();
    assert!(matches!(
        check_destination(&out),
        Err(RecordError::ForeignFolder { .. })
    ));
}

#[test]
fn a_plain_file_and_a_missing_parent_are_refused_before_the_work() {
    let room = tempfile::tempdir().unwrap();
    let file = room.path().join("notes.txt");
    fs::write(&file, "keep").unwrap();
    assert!(matches!(
        check_destination(&file),
        Err(RecordError::DestinationIsFile { .. })
    ));
    assert!(matches!(
        check_destination(&file.join("run")),
        Err(RecordError::ParentMissing { .. })
    ));
    assert!(matches!(
        check_destination(&room.path().join("no/run")),
        Err(RecordError::ParentMissing { .. })
    ));
    assert!(matches!(
        check_destination(Path::new("/")),
        Err(RecordError::NoName { .. })
    ));
    assert_eq!(fs::read(&file).unwrap(), b"keep");
}

#[test]
fn a_check_of_a_good_destination_leaves_nothing() {
    let room = tempfile::tempdir().unwrap();
    check_destination(&room.path().join("run.ebbmark")).unwrap();
    assert_eq!(names(room.path()), Vec::<String>::new());
}

#[cfg(unix)]
#[test]
fn a_link_keeps_pointing_at_the_folder_that_was_replaced() {
    let room = tempfile::tempdir().unwrap();
    let (real, link) = (room.path().join("real"), room.path().join("link"));
    fs::create_dir(&real).unwrap();
    std::os::unix::fs::symlink(&real, &link).unwrap();
    write(&Double::table(300).build(), RUN, &link).unwrap();
    assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
    assert!(real.join("result.json").is_file());
}

#[cfg(unix)]
#[test]
fn a_result_folder_is_as_readable_as_any_other_new_folder() {
    use std::os::unix::fs::PermissionsExt as _;
    let room = tempfile::tempdir().unwrap();
    let (out, plain) = (room.path().join("run.ebbmark"), room.path().join("plain"));
    write(&Double::table(300).build(), RUN, &out).unwrap();
    fs::create_dir(&plain).unwrap();
    let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode() & 0o777;
    assert_eq!(
        mode(&out),
        mode(&plain),
        "a temporary folder's privacy must not stay with the result"
    );
}
