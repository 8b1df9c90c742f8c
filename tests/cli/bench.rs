//! A small language for "this folder, this command, this output".

use ebbmark::rehearsal::{Scene, Truth, rehearse};
use std::ffi::OsStr;
use std::path::{Path, PathBuf};
use std::process::Command;

/// A folder of its own in which commands are run.
pub(crate) struct Bench {
    folder: tempfile::TempDir,
}

/// What a command did.
pub(crate) struct Done {
    pub(crate) code: i32,
    pub(crate) stdout: String,
    pub(crate) stderr: String,
}

impl Bench {
    pub(crate) fn new() -> Self {
        Self {
            folder: tempfile::tempdir().unwrap(),
        }
    }

    pub(crate) fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub(crate) fn write(&self, name: &str, bytes: impl AsRef<[u8]>) -> PathBuf {
        let path = self.path(name);
        std::fs::File::create(&path)
            .and_then(|mut file| std::io::Write::write_all(&mut file, bytes.as_ref()))
            .unwrap();
        path
    }

    /// Everything in the folder, sorted, hidden files too.
    pub(crate) fn names(&self) -> Vec<String> {
        names(self.folder.path())
    }

    /// Runs `ebbmark` in the folder.
    pub(crate) fn run<I: IntoIterator<Item = S>, S: AsRef<OsStr>>(&self, arguments: I) -> Done {
        let output = Command::new(env!("CARGO_BIN_EXE_ebbmark"))
            .args(arguments)
            .current_dir(self.folder.path())
            .output()
            .unwrap();
        Done {
            code: output.status.code().unwrap(),
            stdout: String::from_utf8(output.stdout).unwrap(),
            stderr: String::from_utf8(output.stderr).unwrap(),
        }
    }

    /// Films a scene into the folder.
    pub(crate) fn film(&self, name: &str, scene: &str) -> Truth {
        let scene = Scene::from_toml(scene).unwrap_or_else(|error| panic!("{error}\n{scene}"));
        rehearse(&scene, &self.path(name)).unwrap()
    }

    pub(crate) fn read(&self, name: &str) -> Vec<u8> {
        std::fs::read(self.path(name)).unwrap()
    }

    pub(crate) fn json(&self, name: &str) -> serde_json::Value {
        serde_json::from_slice(&self.read(name)).unwrap()
    }
}

impl Done {
    /// The command did what it was asked, without a word on stderr.
    #[track_caller]
    pub(crate) fn succeeds(self) -> Self {
        assert_eq!(
            (self.code, self.stderr.as_str()),
            (0, ""),
            "stdout: {}",
            self.stdout
        );
        self
    }

    /// The command failed with a code and one sentence that holds all of `words`.
    #[track_caller]
    pub(crate) fn fails(self, code: i32, words: &[&str]) {
        assert_eq!(self.code, code, "stderr: {}", self.stderr);
        assert_eq!(self.stdout, "", "a failure writes nothing to stdout");
        assert!(
            self.stderr.starts_with("ebbmark: ") && self.stderr.ends_with('\n'),
            "{}",
            self.stderr
        );
        assert_eq!(
            self.stderr.matches('\n').count(),
            1,
            "one sentence on one line: {}",
            self.stderr
        );
        for word in words {
            assert!(
                self.stderr.contains(word),
                "`{word}` is not in: {}",
                self.stderr
            );
        }
    }
}

pub(crate) fn names(folder: &Path) -> Vec<String> {
    let entries = std::fs::read_dir(folder).unwrap();
    let mut names: Vec<String> = entries
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}

/// The small scene: 320 × 180, six seconds.
pub(crate) const SMALL: &str = include_str!("../../fixtures/scenes/small.toml");

/// The small scene with some of its text replaced; each replacement must find its text.
pub(crate) fn small_with(changes: &[(&str, &str)]) -> String {
    changes.iter().fold(SMALL.to_owned(), |text, (from, to)| {
        assert!(text.contains(from), "`{from}` is not in the scene");
        text.replace(from, to)
    })
}

/// Marker, scale bar and length of a rehearsed film as flags.
pub(crate) fn flags(truth: &Truth) -> Vec<String> {
    let marker = truth.marker_box_px;
    let bar = truth.scale_bar.as_ref().unwrap();
    let [[x1, y1], [x2, y2]] = bar.ends_px;
    vec![
        "--marker".to_owned(),
        format!("{},{},{},{}", marker.x, marker.y, marker.w, marker.h),
        "--scale-bar".to_owned(),
        format!("{x1},{y1},{x2},{y2}"),
        "--length".to_owned(),
        format!("{}", bar.length_m),
    ]
}

/// `ebbmark measure CLIP` with the flags of a truth and more.
pub(crate) fn measure(clip: &str, truth: &Truth, more: &[&str]) -> Vec<String> {
    let mut arguments = vec!["measure".to_owned(), clip.to_owned()];
    arguments.extend(flags(truth));
    arguments.extend(more.iter().map(|&word| word.to_owned()));
    arguments
}
