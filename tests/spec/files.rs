//! Files on disk: nothing outside the folder of the spec is read, and nothing that is no file.

use std::fs;
use std::path::Path;
use std::time::{Duration, Instant};

use sufficit::spec::{DiskFolder, Folder, InputFile, LARGEST_FILE, LARGEST_SPEC, load};

use super::{SOUND, with};

fn scene() -> tempfile::TempDir {
    let scene = tempfile::tempdir().expect("a folder");
    fs::create_dir_all(scene.path().join("study/data")).expect("a folder");
    fs::write(scene.path().join("secret.csv"), "a\n1\n2\n").expect("a file");
    fs::write(scene.path().join("study/data/pilot.csv"), "a\n1\n2\n").expect("a file");
    fs::write(scene.path().join("study/study.yaml"), SOUND).expect("a file");
    scene
}

fn folder(scene: &Path) -> DiskFolder {
    DiskFolder::new(&scene.join("study")).expect("the folder opens")
}

#[test]
fn a_spec_is_read_with_the_files_beside_it() {
    let scene = scene();
    let text = with("spread: 0.8", "spread: {file: data/pilot.csv, column: a}");
    let path = scene.path().join("study/study.yaml");
    fs::write(&path, text).expect("a file");
    let (spec, beside) = InputFile::open_spec(&path).expect("a spec");
    assert_eq!(spec.name, "study.yaml");
    let loaded = load(spec, &beside).unwrap_or_else(|problems| panic!("{problems}"));
    assert_eq!(loaded.inputs.files[0].name, "data/pilot.csv");
}

#[test]
fn names_that_leave_the_folder_are_refused() {
    let scene = scene();
    let absolute = scene.path().join("study/data/pilot.csv").display().to_string();
    let names = [
        "../secret.csv",
        "data/../../secret.csv",
        absolute.as_str(),
        "data",
        "nothing.csv",
        "..",
        "",
    ];
    for name in names {
        assert!(folder(scene.path()).read(name).is_err(), "{name}");
    }
    assert!(folder(scene.path()).read("data/pilot.csv").is_ok());
    assert!(DiskFolder::new(&scene.path().join("none")).is_err());
    assert!(InputFile::open_spec(&scene.path().join("none.yaml")).is_err());
    assert!(InputFile::open_spec(&scene.path().join("study")).is_err());
}

#[cfg(unix)]
#[test]
fn links_may_not_leave_the_folder() {
    use std::os::unix::fs::symlink;
    let scene = scene();
    let study = scene.path().join("study");
    symlink(scene.path().join("secret.csv"), study.join("file.csv")).expect("a link");
    symlink(scene.path(), study.join("folder")).expect("a link");
    symlink("/etc", study.join("etc")).expect("a link");
    symlink("data/pilot.csv", study.join("inside.csv")).expect("a link");
    symlink("nowhere.csv", study.join("broken.csv")).expect("a link");
    symlink("loop.csv", study.join("loop.csv")).expect("a link");
    for name in ["file.csv", "folder/secret.csv", "etc/passwd"] {
        let error = folder(scene.path()).read(name).expect_err(name);
        assert!(error.reason.contains("leaves the folder"), "{name}: {}", error.reason);
    }
    assert!(folder(scene.path()).read("inside.csv").is_ok());
    assert!(folder(scene.path()).read("broken.csv").is_err());
    assert!(folder(scene.path()).read("loop.csv").is_err());
}

#[cfg(unix)]
#[test]
fn pipes_and_devices_are_not_waited_for() {
    let scene = scene();
    let pipe = scene.path().join("study/pipe.csv");
    let made = std::process::Command::new("mkfifo").arg(&pipe).status().expect("mkfifo runs");
    assert!(made.success());
    let start = Instant::now();
    let error = folder(scene.path()).read("pipe.csv").expect_err("a pipe");
    assert!(error.reason.contains("pipe"), "{}", error.reason);
    assert!(InputFile::open_spec(&pipe).is_err());
    assert!(InputFile::open_spec(Path::new("/dev/zero")).is_err());
    assert!(start.elapsed() < Duration::from_secs(1));
}

#[test]
fn sizes_are_limited_before_a_file_is_read() {
    let scene = scene();
    let large = |name: &str, size: u64| {
        let file = fs::File::create(scene.path().join("study").join(name)).expect("a file");
        file.set_len(size).expect("a sparse file");
    };
    large("huge.yaml", 100_000_000);
    large("over.yaml", LARGEST_SPEC + 1);
    large("most.yaml", LARGEST_SPEC);
    large("over.csv", LARGEST_FILE + 1);
    large("most.csv", LARGEST_FILE);
    let start = Instant::now();
    let spec = |name: &str| InputFile::open_spec(&scene.path().join("study").join(name));
    assert!(spec("huge.yaml").expect_err("huge").reason.contains("larger than 1 MiB"));
    assert!(spec("over.yaml").is_err());
    assert!(spec("most.yaml").is_ok());
    assert!(folder(scene.path()).read("over.csv").expect_err("over").reason.contains("16 MiB"));
    assert_eq!(folder(scene.path()).read("most.csv").map(|b| b.len() as u64), Ok(LARGEST_FILE));
    assert!(start.elapsed() < Duration::from_secs(1));
}

#[test]
fn a_stream_without_an_end_is_cut_off() {
    let error = InputFile::from_reader("-", std::io::repeat(b'#')).expect_err("endless");
    assert!(error.reason.contains("larger than 1 MiB"));
    let file = InputFile::from_reader("-", SOUND.as_bytes()).expect("a spec");
    assert_eq!((file.name.as_str(), file.bytes.as_slice()), ("-", SOUND.as_bytes()));
}
