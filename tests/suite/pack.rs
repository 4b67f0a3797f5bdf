//! Packs of `brief` on the built program: what they hold, and that the place of a pack is never half of anything, whatever
//! happens while a new one is made.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

use sha2::{Digest, Sha256};

use crate::support::program::{Ran, Workplace};

/// Coarse cells, so that a run takes a fraction of a second.
const COARSE: &str =
    "[area]\ncell_m = 100\nheadings = 4\nlongest_run_m = 300\n[remap]\ncell_m = 100\ngain_regions = 1\n";

fn place() -> Workplace {
    let place = Workplace::with_small_dive();
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    place.write("dive.toml", &(dive + COARSE))
}

/// The names that a pack lists, after a check that the folder holds these files and no other, each as listed.
fn whole(folder: &Path) -> Vec<String> {
    let bytes = fs::read(folder.join("pack.json")).unwrap_or_else(|e| panic!("{}: {e}", folder.display()));
    let pack: serde_json::Value = serde_json::from_slice(&bytes).expect("pack.json is JSON");
    assert_eq!(pack["schema"], "fixability.brief");
    let mut names: Vec<String> = Vec::new();
    for file in pack["files"].as_array().expect("a list") {
        let name = file["name"].as_str().expect("a name");
        let bytes = fs::read(folder.join(name)).unwrap_or_else(|e| panic!("{name}: {e}"));
        let hash: String = Sha256::digest(&bytes).iter().map(|byte| format!("{byte:02x}")).collect();
        assert_eq!(file["sha256"], hash.as_str(), "{name}");
        assert_eq!(file["bytes"], bytes.len(), "{name}");
        names.push(name.to_owned());
    }
    assert!(names.is_sorted() && names.contains(&"index.html".to_owned()), "{names:?}");
    let mut there: Vec<String> =
        fs::read_dir(folder).unwrap().map(|e| e.unwrap().file_name().into_string().unwrap()).collect();
    there.retain(|name| name != "pack.json");
    there.sort();
    assert_eq!(there, names);
    names
}

/// Seed of the run that made a pack: tells the old one from the new one.
fn seed(folder: &Path) -> u64 {
    let pack: serde_json::Value =
        serde_json::from_slice(&fs::read(folder.join("pack.json")).unwrap()).unwrap();
    pack["seed"].as_u64().unwrap()
}

/// Temporary files and folders left in a folder.
fn leftovers(folder: &Path) -> Vec<PathBuf> {
    fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.file_name().unwrap().to_string_lossy().starts_with(".fixability-"))
        .collect()
}

#[test]
fn a_pack_holds_the_page_and_the_files_of_the_single_commands() {
    let place = place();
    let ran = place.run("brief dive.toml --out pack").expect(0);
    assert!(
        ran.stdout.contains("Abort distance") || ran.stdout.contains("No abort distance"),
        "{}",
        ran.stdout
    );
    assert!(ran.stderr.contains("index.html"), "{}", ran.stderr);
    let names = whole(&place.path("pack"));
    assert!(leftovers(&place.path(".")).is_empty());
    for command in [
        "lines dive.toml --mark-remap",
        "area dive.toml",
        "lookalikes dive.toml",
        "remap dive.toml",
        "suggest dive.toml",
        "sensitivity dive.toml",
    ] {
        place.run(&format!("{command} --out single")).expect(0);
    }
    let singles = place.names("single");
    assert!(singles.len() > 10, "{singles:?}");
    for name in &singles {
        assert!(names.contains(name), "{name} is missing from the pack: {names:?}");
        assert!(
            place.bytes(format!("single/{name}")) == place.bytes(format!("pack/{name}")),
            "{name} is not what the single command writes"
        );
    }
    let json = place.run("brief dive.toml --out pack --force --json").expect(0);
    assert_eq!(json.stdout.as_bytes(), place.bytes("pack/pack.json"));
    place.run("brief dive.toml --out other --threads 1").expect(0);
    for name in names {
        let (one, other) = (place.bytes(format!("pack/{name}")), place.bytes(format!("other/{name}")));
        assert!(one == other, "{name} depends on the run or the number of threads");
    }
}

#[test]
fn requirement_and_undecided_runs_give_their_exit_codes() {
    let place = place();
    let ran = place.run("brief dive.toml --out pack --require 1").expect(1);
    assert!(ran.stderr.contains("below the 100.0 % asked for"), "{}", ran.stderr);
    whole(&place.path("pack"));
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let place = place.write("dive.toml", &dive.replace("[scoring]", "[scoring]\ncell_budget = 100"));
    let ran = place.run("brief dive.toml --out undecided").expect(5);
    assert!(ran.stderr.contains("undecided"), "{}", ran.stderr);
    whole(&place.path("undecided"));
}

#[test]
fn an_earlier_pack_needs_force_and_files_of_others_are_never_touched() {
    let place = place();
    place.run("brief dive.toml --out pack").expect(0);
    let ran = place.run("brief dive.toml --out pack --seed 12").expect(3);
    assert!(ran.stderr.contains("--force") && ran.stdout.is_empty(), "{}", ran.stderr);
    assert_eq!(seed(&place.path("pack")), 11);
    place.run("brief dive.toml --out pack --seed 12 --force").expect(0);
    assert_eq!(seed(&place.path("pack")), 12);
    whole(&place.path("pack"));

    let place = place.write("pack/my notes.txt", "mine").write("pack/sub/also.txt", "mine too");
    let before = place.names("pack");
    let ran = place.run("brief dive.toml --out pack --force").expect(3);
    for word in ["my notes.txt", "sub", "not of an earlier pack", "nothing was written"] {
        assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr);
    }
    assert!(!ran.stderr.contains("index.html"), "only foreign names are listed: {}", ran.stderr);
    assert_eq!(place.names("pack"), before);
    assert_eq!(place.bytes("pack/my notes.txt"), b"mine");

    // Files that look like a pack are none without a list that says so.
    let place = place.write("other/index.html", "mine").write("other/pack.json", "{\"files\": []}");
    let ran = place.run("brief dive.toml --out other --force").expect(3);
    assert!(ran.stderr.contains("index.html") && ran.stderr.contains("pack.json"), "{}", ran.stderr);
    assert_eq!(place.bytes("other/index.html"), b"mine");
}

#[test]
fn places_for_a_pack() {
    let place = place().write("file", "a file");
    let ran = place.run("brief dive.toml --out file").expect(3);
    assert!(ran.stderr.contains("not a folder"), "{}", ran.stderr);
    let ran = place.run("brief dive.toml --out file/below").expect(3);
    assert!(ran.stderr.contains("not a folder"), "{}", ran.stderr);
    // The current folder: it could not be replaced in one step.
    fs::create_dir(place.path("here")).unwrap();
    let mut command = Command::new(crate::support::program::PROGRAM);
    command
        .current_dir(place.path("here"))
        .args(["brief", "../dive.toml", "--out", "."])
        .stdin(Stdio::null());
    let ran = Ran::of(command.output().unwrap()).expect(3);
    assert!(ran.stderr.contains("current folder"), "{}", ran.stderr);
    // An empty folder, a path with folders to be made, a name that is not plain.
    place.run("brief dive.toml --out here").expect(0);
    whole(&place.path("here"));
    place.run("brief dive.toml --out deep/er/påck").expect(0);
    whole(&place.path("deep/er/påck"));
    place.run("brief dive.toml --out deep/er/påck/ --force").expect(0);
    whole(&place.path("deep/er/påck"));
    assert!(leftovers(&place.path("deep/er")).is_empty());
}

#[test]
fn bad_input_leaves_no_trace() {
    let place = place();
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let place = place.write("dive.toml", &dive.replace("turn_radius_m", "turn_radius"));
    place.run("brief dive.toml --out pack").expect(3);
    assert_eq!(place.names("."), ["dive.toml", "landmarks.csv", "lines.csv"]);
}

/// A run in the background.
fn start(place: &Workplace, arguments: &str) -> Child {
    let mut command = place.command(arguments.split(' '));
    command.stdout(Stdio::null()).stderr(Stdio::null()).spawn().expect("the program starts")
}

/// Waits until a temporary folder stands beside the pack; false when the run ended first.
fn wait_for_temporary_folder(place: &Workplace, child: &mut Child) -> bool {
    loop {
        if leftovers(&place.path(".")).iter().any(|path| path.is_dir()) {
            return true;
        }
        if child.try_wait().unwrap().is_some() {
            return false;
        }
    }
}

/// Instants spread over the run by multiplication modulo a prime, and others after the temporary folder appears.
#[test]
fn a_kill_leaves_the_old_pack_or_the_new_one() {
    let place = place();
    let begun = Instant::now();
    place.run("brief dive.toml --out pack --seed 1").expect(0);
    let length = begun.elapsed();
    let target = place.path("pack");
    let (mut old, mut new, mut in_writing) = (0, 0, 0);
    for round in 0..40u64 {
        let before = seed(&target);
        let mut child = start(&place, &format!("brief dive.toml --out pack --force --seed {}", round + 2));
        if round % 2 == 0 {
            std::thread::sleep(length.mul_f64((round * 37 % 101) as f64 / 100.0));
        } else if wait_for_temporary_folder(&place, &mut child) {
            std::thread::sleep(Duration::from_micros(round * 733 % 20_000));
            in_writing += 1;
        }
        let _ = child.kill();
        child.wait().unwrap();
        whole(&target);
        let now = seed(&target);
        assert!(now == before || now == round + 2, "neither the old pack nor the new one");
        if now == before { old += 1 } else { new += 1 }
    }
    assert!(
        old > 0 && in_writing > 0,
        "{old} old, {new} new, {in_writing} killed while a temporary folder stood there"
    );
    // The next run removes what the kills left.
    place.run("brief dive.toml --out pack --force").expect(0);
    assert_eq!(leftovers(&place.path(".")), Vec::<PathBuf>::new());
    whole(&target);
}

/// Waits until the program catches interrupts: where the system tells of it, as soon as it does.
#[cfg(unix)]
fn wait_for_handler(child: &Child) {
    const INTERRUPT: u64 = 1 << 1;
    let catches = || {
        let status = fs::read_to_string(format!("/proc/{}/status", child.id())).ok()?;
        let caught = status.lines().find_map(|line| line.strip_prefix("SigCgt:"))?;
        Some(u64::from_str_radix(caught.trim(), 16).ok()? & INTERRUPT != 0)
    };
    while catches() == Some(false) {
        std::thread::sleep(Duration::from_millis(5));
    }
    if catches().is_none() {
        std::thread::sleep(Duration::from_secs(2));
    }
}

#[cfg(unix)]
#[test]
fn an_interrupt_ends_with_its_code_and_leaves_nothing_half() {
    let place = place();
    place.run("brief dive.toml --out pack --seed 1").expect(0);
    let signal = |child: &Child, name: &str| {
        let sent =
            Command::new("kill").args([name, &child.id().to_string()]).status().expect("kill is there");
        assert!(sent.success());
    };
    // A job of several seconds, interrupted as soon as the program listens.
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let place = place.write("long.toml", &dive.replace("draws = 4", "draws = 4000"));
    for (name, code) in [("-INT", 130), ("-TERM", 143)] {
        let mut child = start(&place, "brief long.toml --out pack --force");
        wait_for_handler(&child);
        signal(&child, name);
        assert_eq!(child.wait().unwrap().code(), Some(code), "{name}");
        assert_eq!(seed(&place.path("pack")), 1);
        whole(&place.path("pack"));
        assert!(leftovers(&place.path(".")).is_empty(), "{name}");
    }
    // Interrupted while the temporary folder stands there: it goes, and either pack is whole.
    for round in 0..10u64 {
        let mut child = start(&place, "brief dive.toml --out pack --force --seed 1");
        if wait_for_temporary_folder(&place, &mut child) {
            std::thread::sleep(Duration::from_micros(round * 1511));
            signal(&child, "-INT");
        }
        let code = child.wait().unwrap().code();
        assert!(matches!(code, Some(0 | 130)), "{code:?}");
        whole(&place.path("pack"));
        assert_eq!(leftovers(&place.path(".")), Vec::<PathBuf>::new(), "round {round}");
    }
}

/// A folder that another process still works on is left alone.
#[test]
fn two_runs_into_one_place_do_not_disturb_each_other() {
    let place = place();
    let mut runs: Vec<Child> = (1..=4)
        .map(|seed| start(&place, &format!("brief dive.toml --out pack --force --seed {seed}")))
        .collect();
    let codes: Vec<Option<i32>> = runs.iter_mut().map(|run| run.wait().unwrap().code()).collect();
    // One that finds the name taken by an equal run in the very instant may fail, and then says so.
    assert!(codes.iter().all(|code| matches!(code, Some(0 | 3))) && codes.contains(&Some(0)), "{codes:?}");
    whole(&place.path("pack"));
    assert_eq!(leftovers(&place.path(".")), Vec::<PathBuf>::new());
}

/// A memory disk mounted for the test; it goes with the value.
struct Disk(PathBuf);

impl Disk {
    /// None, with a word on standard error, where mounting is not allowed.
    fn new(at: PathBuf, options: &str, test: &str) -> Option<Self> {
        fs::create_dir_all(&at).unwrap();
        let mounted = Command::new("mount")
            .args(["-t", "tmpfs", "-o", options, "fixability-test"])
            .arg(&at)
            .stderr(Stdio::null())
            .status();
        if mounted.is_ok_and(|status| status.success()) {
            return Some(Self(at));
        }
        eprintln!("skipped: {test}: a memory disk cannot be mounted here");
        None
    }

    fn remount(&self, options: &str) -> bool {
        let status = Command::new("mount").args(["-o", &format!("remount,{options}")]).arg(&self.0).status();
        status.is_ok_and(|status| status.success())
    }
}

impl Drop for Disk {
    fn drop(&mut self) {
        let _ = Command::new("umount").arg(&self.0).status();
    }
}

#[test]
fn a_full_disk_leaves_the_old_pack_whole() {
    let place = place();
    place.run("brief dive.toml --out sample").expect(0);
    let size: u64 =
        place.names("sample").iter().map(|name| place.bytes(format!("sample/{name}")).len() as u64).sum();
    // Room for one pack and a half.
    let Some(disk) = Disk::new(place.path("disk"), &format!("size={}", size * 3 / 2), "a full disk") else {
        return;
    };
    place.run("brief dive.toml --out disk/pack --seed 1").expect(0);
    let ran = place.run("brief dive.toml --out disk/pack --seed 2 --force").expect(3);
    for word in ["cannot write this file", "free some space"] {
        assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr);
    }
    assert!(ran.stdout.is_empty(), "{}", ran.stdout);
    assert_eq!(seed(&disk.0.join("pack")), 1);
    whole(&disk.0.join("pack"));
    assert!(leftovers(&disk.0).is_empty());
    // A second place on the same disk: nothing appears.
    place.run("brief dive.toml --out disk/second").expect(3);
    assert_eq!(place.names("disk"), ["pack"]);
}

#[test]
fn a_read_only_folder_is_refused_before_the_run() {
    let place = place();
    let Some(disk) = Disk::new(place.path("disk"), "size=64m", "a read-only folder") else { return };
    place.run("brief dive.toml --out disk/pack --seed 1").expect(0);
    assert!(disk.remount("ro"));
    // So many draws that the run would take minutes: the refusal comes first.
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let place = place.write("long.toml", &dive.replace("draws = 4", "draws = 100000"));
    for out in ["disk/pack", "disk/new"] {
        let ran = place.run(&format!("brief long.toml --out {out} --force")).expect(3);
        for word in ["disk", "choose a folder you may write to"] {
            assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr);
        }
    }
    assert_eq!(seed(&disk.0.join("pack")), 1);
    whole(&disk.0.join("pack"));
    assert!(disk.remount("rw"));
    // The top of a disk has no name that could be given to another folder.
    fs::remove_dir_all(disk.0.join("pack")).unwrap();
    let ran = place.run("brief dive.toml --out disk").expect(3);
    assert!(ran.stderr.contains("top of a disk"), "{}", ran.stderr);
}
