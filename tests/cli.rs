//! The command line: arguments and standard input to standard output, standard error, files and exit status, exactly.

use std::fs;
use std::io::{Read, Write};
use std::path::Path;
use std::process::{Command, Stdio};

/// What a run of the program gave.
#[derive(PartialEq, Eq, Debug)]
struct Ran {
    status: i32,
    out: String,
    err: String,
}

fn ketwork(folder: &Path, arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_ketwork"));
    command.args(arguments).current_dir(folder).env("KETWORK_DATA", folder.join("data")).env_remove("NO_COLOR");
    command
}

fn ran_with(folder: &Path, arguments: &[&str], input: &[u8]) -> Ran {
    let mut child = ketwork(folder, arguments)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program starts");
    let mut stdin = child.stdin.take().expect("a pipe");
    let input = input.to_vec();
    // A program that refuses its input early closes the pipe.
    let writer = std::thread::spawn(move || drop(stdin.write_all(&input)));
    let output = child.wait_with_output().expect("the program ends");
    writer.join().expect("the writer ends");
    Ran {
        status: output.status.code().unwrap_or(-1),
        out: String::from_utf8(output.stdout).expect("UTF-8"),
        err: String::from_utf8(output.stderr).expect("UTF-8"),
    }
}

fn ran(folder: &Path, arguments: &[&str]) -> Ran {
    ran_with(folder, arguments, b"")
}

fn folder() -> tempfile::TempDir {
    tempfile::tempdir().expect("a temporary folder")
}

/// The provenance of this version.
fn by() -> String {
    format!("#@ recorded by ketwork {}", env!("CARGO_PKG_VERSION"))
}

const SMALL: &str = "ketwork session 1
#@ recorded by somebody else
# Numbers, **exactly**

define a = 3/2   # the first
a^2 +
  1
  = 1
sqrt(2) + exp(0)
# the end
";

#[test]
fn run_prints_the_session_with_its_records() {
    let folder = folder();
    fs::write(folder.path().join("small.ketwork"), SMALL).unwrap();
    let wanted = format!(
        "ketwork session 1\n{}\n# Numbers, **exactly**\n\ndefine a = 3/2   # the first\na^2 +\n  1\n  = 13/4\nsqrt(2) + exp(0)\n  = 1 + sqrt(2)\n# the end\n",
        by()
    );
    let first = ran(folder.path(), &["run", "small.ketwork"]);
    assert_eq!(first, Ran { status: 0, out: wanted.clone(), err: String::new() });
    // Its output is a session again, and runs to the same bytes.
    let again = ran_with(folder.path(), &["run", "-"], wanted.as_bytes());
    assert_eq!(again, Ran { status: 0, out: wanted.clone(), err: String::new() });
    fs::write(folder.path().join("again.ketwork"), &wanted).unwrap();
    let replayed = ran(folder.path(), &["replay", "again.ketwork"]);
    let agree =
        "    2  agrees exactly          = 13/4\n    3  agrees exactly          = 1 + sqrt(2)\nagain.ketwork: 2 agree\n";
    assert_eq!(replayed, Ran { status: 0, out: agree.into(), err: String::new() });
}

#[test]
fn a_line_end_is_added_and_foreign_line_ends_are_kept() {
    let folder = folder();
    let unix = ran_with(folder.path(), &["run", "-"], b"ketwork session 1\n1+1");
    assert_eq!(unix.out, format!("ketwork session 1\n{}\n1+1\n  = 2\n", by()));
    let other = ran_with(folder.path(), &["run", "-"], b"\xef\xbb\xbfketwork session 1\r\n1+1\r\n# x\r\n");
    assert_eq!(other.out, format!("ketwork session 1\r\n{}\r\n1+1\r\n  = 2\r\n# x\r\n", by()));
    let empty = ran_with(folder.path(), &["run", "-"], b"ketwork session 1");
    assert_eq!((empty.status, empty.out), (0, format!("ketwork session 1\n{}\n", by())));
}

#[test]
fn a_wrong_entry_is_told_with_file_and_line_and_the_others_are_evaluated() {
    let folder = folder();
    fs::write(folder.path().join("wrong.ketwork"), "ketwork session 1\n# prose\n2 + 2\n(2 + 3\nexpect 2 = 3\n4\n")
        .unwrap();
    let run = ran(folder.path(), &["run", "wrong.ketwork"]);
    assert_eq!(run.status, 1);
    assert_eq!(
        run.out,
        format!("ketwork session 1\n{}\n# prose\n2 + 2\n  = 4\n(2 + 3\nexpect 2 = 3\n4\n  = 4\n", by())
    );
    assert!(run.err.contains("--> wrong.ketwork:4:"), "{}", run.err);
    assert!(run.err.contains("--> wrong.ketwork:5:8"), "{}", run.err);
    assert!(run.err.contains("expected 3, and the value is 2"), "{}", run.err);
    assert!(!run.err.contains('\u{1b}'), "no colours outside a terminal");
}

#[test]
fn json_has_an_object_for_every_entry() {
    let folder = folder();
    let text = "ketwork session 1\n# prose\ndefine a = 2\na/3  # why\ndigits 5\nexp(1)\nfoo + \"\n";
    let run = ran_with(folder.path(), &["run", "--json", "-"], text.as_bytes());
    assert_eq!(run.status, 1);
    let objects: Vec<serde_json::Value> =
        run.out.lines().map(|line| serde_json::from_str(line).expect("an object a line")).collect();
    assert_eq!(objects.len(), 5);
    let fields = [
        "version",
        "number",
        "line",
        "text",
        "kind",
        "value",
        "digits",
        "unit",
        "decimal",
        "verdict",
        "record",
        "notes",
        "diagnostics",
    ];
    for (position, object) in objects.iter().enumerate() {
        let object = object.as_object().expect("an object");
        assert!(fields.iter().all(|field| object.contains_key(*field)) && object.len() == fields.len(), "{object:?}");
        assert_eq!(object["version"], 1);
        assert_eq!(object["number"], position + 1);
    }
    assert_eq!((&objects[0]["kind"], &objects[0]["value"]), (&"declaration".into(), &serde_json::Value::Null));
    assert_eq!((&objects[1]["kind"], &objects[1]["value"]), (&"exact".into(), &"2/3".into()));
    assert_eq!((&objects[1]["text"], &objects[1]["line"]), (&"a/3".into(), &4.into()));
    assert_eq!((&objects[3]["kind"], &objects[3]["digits"]), (&"approximate".into(), &5.into()));
    // e = 2.71828182845904... (DLMF 4.2.11)
    assert_eq!((&objects[3]["value"], &objects[3]["record"][0]), (&"2.7183".into(), &"~ 2.7183".into()));
    assert_eq!((&objects[4]["kind"], &objects[4]["diagnostics"][0]["line"]), (&"failed".into(), &7.into()));
    assert_eq!(objects[4]["diagnostics"][0]["severity"], "error");
}

#[test]
fn replay_tells_differences_in_full() {
    let folder = folder();
    let text =
        "ketwork session 1\ndigits 8\n1/2 + 1/3\n  = 2/3\nexp(1)\n  ~ 2.718\nexp(1)\n  ~ 2.7191\n1 + 1\ndefine a = 1\n";
    fs::write(folder.path().join("theirs.ketwork"), text).unwrap();
    let replayed = ran(folder.path(), &["replay", "theirs.ketwork"]);
    let wanted = "    2  differs
       entry       1/2 + 1/3
       recorded    = 2/3
       recomputed  = 5/6
       in common   no digits
    3  agrees to 4 digits      ~ 2.718
    4  differs
       entry       exp(1)
       recorded    ~ 2.7191
       recomputed  ~ 2.7182818
       in common   3 digits
    5  has no record           = 2
theirs.ketwork: 1 agrees, 2 differ, 1 has no record
";
    assert_eq!(replayed, Ran { status: 1, out: wanted.into(), err: String::new() });
}

#[test]
fn replay_goes_on_with_the_next_file_and_the_gravest_status_counts() {
    let folder = folder();
    fs::write(folder.path().join("good.ketwork"), "ketwork session 1\n1+1\n  = 2\n").unwrap();
    fs::write(folder.path().join("bad.ketwork"), "ketwork session 1\n1+1\n  = 3\n").unwrap();
    fs::write(folder.path().join("broken.ketwork"), "ketwork session 1\n1+\n  = 3\n").unwrap();
    let status = |files: &[&str]| ran(folder.path(), &[&["replay"], files].concat()).status;
    assert_eq!(status(&["good.ketwork"]), 0);
    assert_eq!(status(&["bad.ketwork", "good.ketwork"]), 1);
    assert_eq!(status(&["broken.ketwork", "good.ketwork"]), 2);
    assert_eq!(status(&["missing.ketwork", "bad.ketwork"]), 2);
    // An expectation that is not met was evaluated: it disagrees.
    fs::write(folder.path().join("unmet.ketwork"), "ketwork session 1\nexpect 2 = 3\n  = holds\n").unwrap();
    assert_eq!(status(&["unmet.ketwork"]), 1);
    let both = ran(folder.path(), &["replay", "missing.ketwork", "good.ketwork"]);
    assert_eq!(both.out, "    1  agrees exactly          = 2\ngood.ketwork: 1 agrees\n");
    assert_eq!(both.err, "error: there is no file missing.ketwork\n");
}

#[test]
fn help_explains_words_and_lists_groups() {
    let folder = folder();
    for word in ["", "resolvent", "hydrogenic", "sqrt", "entries", "operators", "functions", "systems", "prompt"] {
        let arguments: Vec<&str> = ["help"].into_iter().chain((!word.is_empty()).then_some(word)).collect();
        let help = ran(folder.path(), &arguments);
        assert_eq!((help.status, help.err.as_str()), (0, ""), "{word}");
        assert!(
            help.out.contains(if word.is_empty() { "resolvent" } else { word.trim_end_matches('s') }),
            "{}",
            help.out
        );
        assert!(help.out.lines().all(|line| line.chars().count() <= 130), "{}", help.out);
    }
    let unknown = ran(folder.path(), &["help", "resolvant"]);
    assert_eq!(
        unknown,
        Ran {
            status: 2,
            out: String::new(),
            err: "there is no help about `resolvant`; did you mean `resolvent`?\n".into()
        }
    );
}

#[test]
fn wrong_usage_has_status_2_and_the_version_is_told() {
    let folder = folder();
    for arguments in
        [&["bogus"][..], &["run"], &["replay"], &["run", "a", "b"], &["export", "a.ketwork"], &["open"], &["--bogus"]]
    {
        let wrong = ran(folder.path(), arguments);
        assert_eq!((wrong.status, wrong.out.as_str()), (2, ""), "{arguments:?}");
        assert!(!wrong.err.is_empty(), "{arguments:?}");
    }
    let version = ran(folder.path(), &["--version"]);
    assert_eq!(version, Ran { status: 0, out: format!("ketwork {}\n", env!("CARGO_PKG_VERSION")), err: String::new() });
    let export = ran(folder.path(), &["export", "a.ketwork", "--to", "a.html"]);
    assert_eq!((export.status, export.out.as_str()), (2, ""));
    assert!(export.err.starts_with("not available yet: "), "{}", export.err);
}

#[test]
fn whole_files_that_cannot_be_taken_are_refused() {
    let folder = folder();
    let place = |name: &str| folder.path().join(name);
    fs::create_dir(place("folder.ketwork")).unwrap();
    fs::write(place("nul.ketwork"), b"ketwork session 1\n1\n2\0\n").unwrap();
    fs::write(place("bytes.ketwork"), b"ketwork session 1\n\xc3\x28\n").unwrap();
    fs::write(place("version.ketwork"), "ketwork session 7\n1\n").unwrap();
    fs::write(place("plain.ketwork"), "1 + 1\n").unwrap();
    // Holes take no room: a line of one GB.
    fs::File::create(place("huge.ketwork")).unwrap().set_len(1 << 30).unwrap();
    let cases = [
        ("folder.ketwork", "is a folder"),
        ("nul.ketwork", "there is a NUL byte in line 3"),
        ("bytes.ketwork", "byte 0xc3 in line 2 is not UTF-8"),
        ("version.ketwork", "version.ketwork:1"),
        ("plain.ketwork", "plain.ketwork:1"),
        ("huge.ketwork", "is longer than the 16 MiB"),
        ("missing.ketwork", "there is no file"),
    ];
    for (name, told) in cases {
        for arguments in [&["run", name][..], &["run", "--json", name], &["replay", name], &["open", name]] {
            let refused = ran(folder.path(), arguments);
            assert_eq!((refused.status, refused.out.as_str()), (2, ""), "{arguments:?} {}", refused.err);
            assert!(refused.err.contains(told), "{arguments:?} {}", refused.err);
        }
    }
}

#[cfg(unix)]
#[test]
fn pipes_and_devices_are_not_waited_for() {
    let folder = folder();
    let pipe = folder.path().join("pipe.ketwork");
    assert!(Command::new("mkfifo").arg(&pipe).status().is_ok_and(|status| status.success()));
    for name in ["pipe.ketwork", "/dev/zero", "/dev/null"] {
        let refused = ran(folder.path(), &["run", name]);
        assert_eq!(refused.status, 2);
        assert!(refused.err.contains("is not an ordinary file"), "{}", refused.err);
    }
}

#[test]
fn an_endless_standard_input_is_left_in_time() {
    let folder = folder();
    let mut child = ketwork(folder.path(), &["run", "-"])
        .stdin(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program starts");
    let mut stdin = child.stdin.take().expect("a pipe");
    let piece = vec![b'x'; 1 << 20];
    let mut written = 0_u64;
    // Ends when the program closes the pipe; a GB would have been read by a program without a limit.
    while written < 1 << 30 && stdin.write_all(&piece).is_ok() {
        written += 1 << 20;
    }
    assert!(written < 1 << 26, "{written}");
    let output = child.wait_with_output().expect("the program ends");
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("standard input is longer than the 16 MiB"));
}

#[test]
fn hostile_entries_are_refused_one_by_one() {
    let folder = folder();
    let brackets = "(".repeat(100_000);
    let minus = "-".repeat(100_000);
    let closed = format!("{}1{}", "(".repeat(50_000), ")".repeat(50_000));
    let text = format!(
        "ketwork session 1\ndigits 10^12\n2^(10^12)\n2^2^2^2^2^2\n{closed}\n{minus}1\n1/0\n9^9^9^9\nsystem m = matrix(H = [[1,2],[3]])\n2 + 2\ndefine x = 1\n{brackets}\n"
    );
    let run = ran_with(folder.path(), &["run", "-"], text.as_bytes());
    assert_eq!(run.status, 1, "{}", run.err);
    assert!(run.out.contains("2 + 2\n  = 4\n"));
    assert!(run.err.contains("the number of digits is a whole number from 1 to"), "{}", run.err);
    for line in [2, 3, 4, 5, 6, 7, 8, 9, 12] {
        assert!(run.err.contains(&format!("--> standard input:{line}:")), "line {line} in\n{}", run.err);
    }
    assert!(run.err.len() < 20_000, "messages stay short");
}

#[test]
fn very_many_errors_are_cut_short() {
    let folder = folder();
    let text = format!("ketwork session 1\n{}", "1/0\n".repeat(500));
    let run = ran_with(folder.path(), &["run", "-"], text.as_bytes());
    assert_eq!(run.status, 1);
    assert!(run.err.ends_with("and 470 more errors, not shown\n"), "{}", run.err);
}

#[test]
fn data_files_come_from_below_the_session_only() {
    let outer = folder();
    let inner = outer.path().join("inner");
    fs::create_dir_all(inner.join("data")).unwrap();
    let matrix = "%%MatrixMarket matrix coordinate real symmetric\n2 2 2\n1 1 1\n2 2 3\n";
    fs::write(outer.path().join("out.mtx"), matrix).unwrap();
    fs::write(inner.join("data/in.mtx"), matrix).unwrap();
    #[cfg(unix)]
    std::os::unix::fs::symlink(outer.path().join("out.mtx"), inner.join("link.mtx")).unwrap();
    let text = format!(
        "ketwork session 1\nsystem a = matrix(H = \"../out.mtx\")\nsystem b = matrix(H = \"{}\")\nsystem c = matrix(H = \"link.mtx\")\nsystem d = matrix(H = \"data/none.mtx\")\nsystem e = matrix(H = \"data\")\n",
        outer.path().join("out.mtx").display()
    );
    fs::write(inner.join("s.ketwork"), &text).unwrap();
    // Run from another folder: what counts is where the session stands.
    let run = ran(outer.path(), &["run", "inner/s.ketwork"]);
    assert_eq!(run.status, 1);
    assert_eq!(
        run.err.matches("is not inside the session's folder").count(),
        if cfg!(unix) { 3 } else { 2 },
        "{}",
        run.err
    );
    assert!(run.err.contains("there is no file \"data/none.mtx\""), "{}", run.err);
    assert!(run.err.contains("\"data\" is a folder"), "{}", run.err);
    let piped = ran_with(&inner, &["run", "-"], b"ketwork session 1\nsystem d = matrix(H = \"data/in.mtx\")\n");
    assert!(piped.err.contains("standard input has no folder"), "{}", piped.err);
}

#[test]
fn a_reader_that_has_enough_ends_the_program_quietly() {
    let folder = folder();
    let text = format!("ketwork session 1\n{}", "12345678901234567890 + 1\n".repeat(20_000));
    fs::write(folder.path().join("long.ketwork"), text).unwrap();
    for arguments in [&["run", "long.ketwork"][..], &["run", "--json", "long.ketwork"], &["replay", "long.ketwork"]] {
        let mut child = ketwork(folder.path(), arguments)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program starts");
        let mut stdout = child.stdout.take().expect("a pipe");
        let mut first = [0_u8; 10];
        stdout.read_exact(&mut first).expect("some output");
        drop(stdout);
        let output = child.wait_with_output().expect("the program ends");
        assert_eq!(output.status.code(), Some(3), "{arguments:?}");
        assert_eq!(String::from_utf8_lossy(&output.stderr), "", "{arguments:?}");
    }
}

#[cfg(target_os = "linux")]
#[test]
fn output_that_cannot_be_written_is_told() {
    let folder = folder();
    let full = fs::OpenOptions::new().write(true).open("/dev/full").expect("the full device");
    let output = ketwork(folder.path(), &["help"]).stdout(full).output().expect("the program ends");
    assert_eq!(output.status.code(), Some(3));
    assert!(String::from_utf8_lossy(&output.stderr).starts_with("the output cannot be written"));
}

#[cfg(unix)]
#[test]
fn an_interrupt_ends_a_run_and_keeps_what_is_printed() {
    let folder = folder();
    let mut child = ketwork(folder.path(), &["run", "-"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program starts");
    let text = b"ketwork session 1\n1 + 1\nsum(n in 1 .. 1000000000, 1/n^2)\n3\n";
    child.stdin.take().expect("a pipe").write_all(text).expect("room in the pipe");
    let mut stdout = child.stdout.take().expect("a pipe");
    let mut seen = Vec::new();
    let mut byte = [0_u8; 1];
    while !seen.ends_with(b"  = 2\n") && stdout.read(&mut byte).is_ok_and(|count| count == 1) {
        seen.push(byte[0]);
    }
    let kill = Command::new("kill").args(["-INT", &child.id().to_string()]).status();
    assert!(kill.is_ok_and(|status| status.success()));
    stdout.read_to_end(&mut seen).expect("the rest");
    let output = child.wait_with_output().expect("the program ends");
    assert_eq!(output.status.code(), Some(1));
    assert_eq!(String::from_utf8_lossy(&seen), format!("ketwork session 1\n{}\n1 + 1\n  = 2\n", by()));
    assert_eq!(String::from_utf8_lossy(&output.stderr), "stopped at entry 2 of 3; what is printed above is whole\n");
}

#[test]
fn the_prompt_reads_from_a_pipe_without_noise() {
    let folder = folder();
    let input = "# prose\n2 + 3\ndefine a = (1 +\n 2)\na^2\ndefine a = 4\nsave kept\nhelp resolvant\n";
    let talk = ran_with(folder.path(), &[], input.as_bytes());
    assert_eq!(talk.out, "  = 5\n  = 9\n  2  define a = 4\n  3  a^2\n       = 16\n");
    assert_eq!(talk.status, 1, "a wrong command counts");
    let place = folder.path().join("kept.ketwork").display().to_string();
    let wanted = format!(
        "entry 2 is revised, and 1 more evaluated again\nsaved in {place}\nthere is no help about `resolvant`; did you mean `resolvent`?\n"
    );
    assert_eq!(talk.err, wanted);
    let kept = fs::read_to_string(folder.path().join("kept.ketwork")).unwrap();
    assert_eq!(kept, format!("ketwork session 1\n{}\n# prose\n2 + 3\n  = 5\ndefine a = 4\na^2\n  = 16\n", by()));
    assert!(ran_with(folder.path(), &["open", "kept.ketwork"], b"").out.contains("  3  a^2\n       = 16\n"));
}

#[test]
fn saving_never_loses_what_somebody_else_wrote() {
    let folder = folder();
    let theirs = "ketwork session 1\n1 + 1\n";
    fs::write(folder.path().join("theirs.ketwork"), theirs).unwrap();
    let talk = ran_with(folder.path(), &[], b"2 + 2\nsave theirs\n");
    assert!(
        talk.err.contains("already") && talk.err.contains("`save over theirs.ketwork` replaces it"),
        "{}",
        talk.err
    );
    assert_eq!(fs::read_to_string(folder.path().join("theirs.ketwork")).unwrap(), theirs);
    let talk = ran_with(folder.path(), &[], b"2 + 2\nsave over theirs\n");
    assert_eq!(talk.status, 0, "{}", talk.err);
    assert!(fs::read_to_string(folder.path().join("theirs.ketwork")).unwrap().contains("2 + 2\n  = 4\n"));
}

/// The limit on the size of written files stands for a full disk.
#[cfg(unix)]
#[test]
fn a_full_disk_leaves_the_old_file() {
    let folder = folder();
    let old = format!("ketwork session 1\n1 + 1\n# {}\n", "x".repeat(4000));
    fs::write(folder.path().join("old.ketwork"), &old).unwrap();
    let script = format!(
        "trap '' XFSZ; ulimit -f 1; printf '2 + 2\\nsave\\n' | '{}' open old.ketwork",
        env!("CARGO_BIN_EXE_ketwork")
    );
    let output = Command::new("sh")
        .args(["-c", &script])
        .current_dir(folder.path())
        .env("KETWORK_DATA", folder.path().join("data"))
        .output()
        .expect("a shell");
    let err = String::from_utf8_lossy(&output.stderr);
    assert!(err.contains("cannot be written") && err.contains("what was there before is untouched"), "{err}");
    assert_eq!(fs::read_to_string(folder.path().join("old.ketwork")).unwrap(), old);
    let names: Vec<_> = fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert!(names.iter().all(|name| !name.to_string_lossy().starts_with(".ketwork")), "{names:?}");
}

#[test]
fn colours_are_for_terminals_only() {
    let folder = folder();
    let forced = ketwork(folder.path(), &["help"]).env("CLICOLOR_FORCE", "1").output().expect("the program ends");
    assert!(!String::from_utf8_lossy(&forced.stdout).contains('\u{1b}'));
}

#[test]
fn a_byte_order_mark_is_no_change_by_somebody_else() {
    let folder = folder();
    fs::write(folder.path().join("marked.ketwork"), "\u{feff}ketwork session 1\n1 + 1\n").unwrap();
    let talk = ran_with(folder.path(), &["open", "marked.ketwork"], b"2 + 2\nsave\n");
    assert_eq!(talk.status, 0, "{}", talk.err);
    assert!(
        fs::read_to_string(folder.path().join("marked.ketwork")).unwrap().ends_with("1 + 1\n  = 2\n2 + 2\n  = 4\n")
    );
}

#[test]
fn a_session_goes_on_where_work_cannot_be_kept_safe() {
    let folder = folder();
    fs::write(folder.path().join("data"), "a file where the folder should be").unwrap();
    let talk = ran_with(folder.path(), &[], b"1 + 1\n2 + 2\n");
    assert_eq!(talk.out, "  = 2\n  = 4\n");
    assert_eq!(talk.err.matches("would not survive a crash").count(), 1, "{}", talk.err);
}

#[test]
fn a_file_without_a_command_is_asked_about() {
    let folder = folder();
    fs::write(folder.path().join("a.ketwork"), "ketwork session 1\n").unwrap();
    let asked = ran(folder.path(), &["a.ketwork"]);
    assert_eq!(asked.status, 2);
    assert!(asked.err.contains("`ketwork open a.ketwork`"), "{}", asked.err);
}

#[test]
fn long_lines_and_bytes_that_are_no_text_end_a_piped_session() {
    let folder = folder();
    let long = ran_with(folder.path(), &[], &vec![b'1'; 3 << 20]);
    assert_eq!((long.status, long.out.as_str()), (2, ""));
    assert!(long.err.contains("a line of standard input has more than"), "{}", long.err);
    let nul = ran_with(folder.path(), &[], b"1 + 1\n2 + \0\n3 + 3\n");
    assert_eq!((nul.status, nul.out.as_str()), (2, "  = 2\n"));
    assert!(nul.err.contains("NUL byte"), "{}", nul.err);
}
