//! What a name in a dive file may lead to: other folders, links, pipes, devices, nothing.

use std::ffi::OsStr;
use std::fs;
use std::os::unix::ffi::OsStrExt;
use std::os::unix::fs::{PermissionsExt, symlink};
use std::process::Command;

use fixability::bounds::FILE_SIZE_MAX;
use fixability::dive::Dive;

use crate::load::{REEF, Scene, holds};
use crate::support::program::{Ran, Workplace};

const OUTSIDE: &str = "lies outside the folder of the dive file";

fn with_landmarks(name: &str) -> Scene {
    Scene::new().swap("reef.csv", name)
}

#[test]
fn names_that_lead_out_of_the_folder_are_read_and_reported() {
    let other = tempfile::tempdir().unwrap();
    let outside = other.path().join("reef.csv");
    fs::write(&outside, REEF).unwrap();
    let absolute = outside.to_str().unwrap();
    holds(
        &with_landmarks(absolute).notices(),
        &[&format!(
            "information: {absolute}: {OUTSIDE}: a copy of that folder alone does not hold every input"
        )],
    );

    let scene = with_landmarks("../reef.csv");
    let folder = scene.path().parent().unwrap().join("inner");
    fs::create_dir(&folder).unwrap();
    scene.read().unwrap_err();
    fs::copy(scene.path(), folder.join("dive.toml")).unwrap();
    fs::write(scene.path().with_file_name("reef.csv"), REEF).unwrap();
    fs::copy(scene.path().with_file_name("lines.csv"), folder.join("lines.csv")).unwrap();
    let dive = Dive::read(&folder.join("dive.toml")).unwrap();
    let notices: Vec<String> = dive.notices.iter().map(|notice| notice.text.clone()).collect();
    assert_eq!(notices.iter().filter(|text| text.contains(OUTSIDE)).count(), 1, "{notices:#?}");
    // The name as the dive file writes it goes into the outputs, with the fingerprint.
    assert_eq!(dive.inputs[1].name, "../reef.csv");
}

#[test]
fn names_that_stay_are_not_reported() {
    for name in ["./reef.csv", "inner/../reef.csv", "inner/reef.csv"] {
        let scene = with_landmarks(name);
        let folder = scene.path().parent().unwrap().join("inner");
        fs::create_dir(&folder).unwrap();
        fs::write(folder.join("reef.csv"), REEF).unwrap();
        let notices = scene.notices();
        assert!(!notices.contains(OUTSIDE), "{name}: {notices}");
    }
}

#[test]
fn symbolic_links_are_followed_and_reported_when_they_lead_out() {
    let scene = with_landmarks("link.csv");
    let link = scene.path().with_file_name("link.csv");
    symlink("reef.csv", &link).unwrap();
    assert!(!scene.notices().contains(OUTSIDE));

    let other = tempfile::tempdir().unwrap();
    fs::write(other.path().join("reef.csv"), REEF).unwrap();
    fs::remove_file(&link).unwrap();
    symlink(other.path().join("reef.csv"), &link).unwrap();
    holds(&scene.notices(), &[&format!("information: link.csv: {OUTSIDE}")]);
}

#[test]
fn links_in_a_ring_or_to_nothing_are_errors() {
    let scene = with_landmarks("a.csv");
    symlink("b.csv", scene.path().with_file_name("a.csv")).unwrap();
    symlink("a.csv", scene.path().with_file_name("b.csv")).unwrap();
    holds(&scene.errors(), &["a.csv: cannot be read: ", "symbolic links"]);
    let scene = with_landmarks("a.csv");
    symlink("nowhere.csv", scene.path().with_file_name("a.csv")).unwrap();
    holds(&scene.errors(), &["a.csv: no such file"]);
}

#[test]
fn what_is_no_regular_file_is_refused_at_once() {
    let scene = with_landmarks("inner.csv");
    fs::create_dir(scene.path().with_file_name("inner.csv")).unwrap();
    holds(
        &scene.errors(),
        &["inner.csv: is a folder; accepted: a regular file; copy its content into a file, and name that"],
    );
    for device in ["/dev/zero", "/dev/null", "/dev/stdin"] {
        // Standard input may be a file or closed, depending on who runs the tests.
        if fs::metadata(device).is_ok_and(|kind| !kind.is_file()) {
            holds(&with_landmarks(device).errors(), &[device, ": is a pipe, a socket or a device"]);
        }
    }
    // Opening a pipe would wait for somebody to write into it.
    let scene = with_landmarks("pipe.csv");
    let made = Command::new("mkfifo").arg(scene.path().with_file_name("pipe.csv")).status().unwrap();
    assert!(made.success());
    holds(&scene.errors(), &["pipe.csv: is a pipe, a socket or a device; accepted: a regular file"]);
    let place = Workplace::new();
    let made = Command::new("mkfifo").arg(place.path("dive.toml")).status().unwrap();
    assert!(made.success());
    let ran = place.run("check dive.toml").expect(3);
    holds(&ran.stderr, &["dive.toml: is a pipe, a socket or a device"]);
    let ran = place.run("check .").expect(3);
    holds(&ran.stderr, &["is a folder"]);
    let ran = place.run("check /dev/zero").expect(3);
    holds(&ran.stderr, &["is a pipe, a socket or a device"]);
}

#[test]
fn files_that_may_not_be_read_are_errors() {
    let scene = Scene::new();
    let reef = scene.path().with_file_name("reef.csv");
    fs::set_permissions(&reef, fs::Permissions::from_mode(0o000)).unwrap();
    if fs::read(&reef).is_ok() {
        println!("not checked: the superuser may read every file");
        return;
    }
    holds(&scene.errors(), &["reef.csv: cannot be read: "]);
}

#[test]
fn a_file_above_the_limit_is_refused_unread() {
    let scene = Scene::new();
    let reef = fs::OpenOptions::new().write(true).open(scene.path().with_file_name("reef.csv")).unwrap();
    // Nothing but a length: the disk holds no byte of it.
    reef.set_len(FILE_SIZE_MAX + 1).unwrap();
    holds(&scene.errors(), &["reef.csv: is too large; accepted: files of at most 256 MiB; leave out what"]);
    reef.set_len(64 << 20).unwrap();
    holds(&scene.errors(), &["reef.csv:6: byte 111 (0x00) is a control character"]);
}

#[test]
fn a_dive_file_is_small() {
    let place = Workplace::with_small_dive();
    let mut text = fs::read_to_string(place.path("dive.toml")).unwrap();
    text += &"# x\n".repeat(70_000);
    let place = place.write("dive.toml", &text);
    holds(
        &place.run("check dive.toml").expect(3).stderr,
        &[
            "dive.toml: is too large for a dive file; accepted: at most 256 KiB of TOML; landmarks and lines go",
        ],
    );
}

#[test]
fn the_dive_file_may_have_any_name() {
    let place = Workplace::with_small_dive();
    let name = OsStr::from_bytes(b"dive \xFF\x1B[2J.toml");
    fs::rename(place.path("dive.toml"), place.path(name)).unwrap();
    for arguments in [&["check"][..], &["check", "--json"]] {
        let ran = place.command(arguments.iter().map(OsStr::new).chain([name])).output().unwrap();
        let ran = Ran::of(ran).expect(0);
        assert!(!ran.stdout.contains('\x1B') && !ran.stderr.contains('\x1B'), "{ran:?}");
    }
    fs::write(place.path(name), "x").unwrap();
    let ran = Ran::of(place.command([OsStr::new("check"), name]).output().unwrap()).expect(3);
    holds(&ran.stderr, &["dive \u{fffd}\\u{1b}[2J.toml:1: "]);
    assert!(!ran.stderr.contains('\x1B'));
}

#[test]
fn empty_files_are_named() {
    holds(&Scene::new().file("reef.csv", "").errors(), &["reef.csv: is empty"]);
    holds(&Scene::new().file("lines.csv", "").errors(), &["lines.csv: is empty"]);
    let place = Workplace::new().write("dive.toml", "");
    holds(&place.run("check dive.toml").expect(3).stderr, &["dive.toml: key name: is missing"]);
}
