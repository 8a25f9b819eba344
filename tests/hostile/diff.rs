//! `diff`: folders, notes, revisions; what got worse, and what was let out of sight.

use std::process::Command;

use super::{Bench, fenced};

fn stage(name: &str, rf: &str, limits: &str) -> String {
    fenced(&format!(
        "stage = \"non-inverting\"\nname = \"{name}\"\npart = \"oak-1\"\n[components]\nRf = \"{rf}\"\nRg = \"1k\"\n[limits]\n{limits}"
    ))
}

const ASKED: &str = "gain = \"10 ± 3 %\"\n";

#[test]
fn the_same_notes_do_not_differ() {
    let bench = Bench::new("diff-same");
    bench.write("note.md", stage("A", "9k", ASKED));
    let said = bench.run(&["diff", "note.md", "note.md"]);
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(0), "no figure and no verdict differs\n", ""));
}

#[test]
fn a_value_moves_figures_and_verdicts() {
    let bench = Bench::new("diff-value");
    bench.write("old/note.md", stage("A", "9k", ASKED));
    bench.write("new/moved.md", format!("A line more.\n\n{}", stage("A", "19k", ASKED)));
    let said = bench.run(&["diff", "old", "new"]);
    assert_eq!((said.code, said.err.as_str()), (Some(1), ""), "{}", said.out);
    // By hand: 1 + 9 = 10, 1 + 19 = 20, with an open-loop gain of 100 dB 9.999 and 19.996.
    let wanted = "moved.md:4  A\n  components.Rf  9k → 19k\n  holds → breaks  gain  10 ± 3 %\n  gain  9.999 → 20.00 (+100 %); 9.999 to 9.999 → 20.00 to 20.00\n";
    assert!(said.out.starts_with(wanted), "{}", said.out);
    assert!(said.out.ends_with("\n1 stage differs; 1 stage to look at\n"), "{}", said.out);
    assert!(!said.out.contains("gain_error") && bench.run(&["diff", "old", "new", "--all"]).out.contains("gain_error"));
    // The way back mends the verdict.
    let said = bench.run(&["diff", "new", "old"]);
    assert_eq!(said.code, Some(0), "{}", said.out);
    assert!(said.out.contains("breaks → holds") && said.out.ends_with("no verdict got worse, no limit was loosened\n"), "{}", said.out);
}

#[test]
fn what_is_let_out_of_sight_is_told() {
    let bench = Bench::new("diff-loosened");
    bench.write("old.md", stage("A", "9k", ASKED));
    for (limits, word) in [("gain = \"10 ± 5 %\"\n", "(loosened)"), ("", "limit dropped"), ("gain = \"report\"\n", "(loosened)")] {
        bench.write("new.md", stage("A", "9k", limits));
        let said = bench.run(&["diff", "old.md", "new.md"]);
        assert!(said.code == Some(1) && said.out.contains(word), "{word}: {}", said.out);
    }
    bench.write("new.md", stage("A", "9k", "gain = \"10 ± 2 %\"\n"));
    assert_eq!(bench.run(&["diff", "old.md", "new.md"]).code, Some(0), "a tighter limit that holds is no loss");
    bench.write("new.md", stage("B", "9k", ASKED));
    let said = bench.run(&["diff", "old.md", "new.md"]);
    assert!(said.code == Some(1) && said.out.contains("B  added: 1 holds") && said.out.contains("A  removed: 1 holds"), "{}", said.out);
}

#[test]
fn a_part_that_changed_is_seen_through_its_figures() {
    let bench = Bench::new("diff-part");
    bench.write("note.md", stage("A", "9k", "bandwidth = \"report\"\n"));
    let other = Bench::new("diff-part-other");
    other.write("note.md", stage("A", "9k", "bandwidth = \"report\"\n"));
    let part = String::from_utf8(other.read("shelf/oak-1.toml")).expect("text");
    let changed: Vec<String> =
        part.lines().map(|l| if l.trim_start().starts_with("gbw") { "gbw = \"3 MHz\"".to_owned() } else { l.to_owned() }).collect();
    assert_ne!(part.trim_end(), changed.join("\n"), "the corpus's part states a gain-bandwidth product");
    other.write("shelf/oak-1.toml", changed.join("\n"));
    let said = bench.run(&["diff", "note.md", other.0.join("note.md").to_str().expect("a path")]);
    assert_eq!(said.code, Some(0), "{}", said.err);
    assert!(said.out.contains("the block is the same") && said.out.contains("\n  bandwidth  "), "{}", said.out);
}

#[test]
fn what_cannot_be_read_is_told_for_its_side() {
    let bench = Bench::new("diff-bad");
    bench.write("old.md", stage("A", "9k", ASKED));
    bench.write("new.md", stage("A", "9 V", ASKED));
    let said = bench.run(&["diff", "old.md", "new.md"]);
    assert!(said.code == Some(2) && said.err.starts_with("new.md: new.md:"), "{}", said.err);
    for absent in ["absent", "-x", "--all^{tree}"] {
        let said = bench.run(&["diff", "--", absent, "old.md"]);
        assert!(said.code == Some(2) && said.err.contains("revision"), "{absent}: {}", said.err);
    }
}

#[test]
fn a_revision_is_compared_with_what_stands_now() {
    let bench = Bench::new("diff-revision");
    let git = |arguments: &[&str]| Command::new("git").current_dir(&bench.0).args(arguments).output();
    if git(&["init", "-q"]).is_err() {
        let said = bench.run(&["diff", "HEAD", "note.md"]);
        assert!(said.code == Some(2) && said.err.contains("git is not there"), "{}", said.err);
        return;
    }
    let commit = |message: &str| {
        for arguments in [
            &["add", "-A"][..],
            &["-c", "user.name=A", "-c", "user.email=a@localhost", "-c", "commit.gpgsign=false", "commit", "-q", "-m", message],
        ] {
            let output = git(arguments).expect("git starts");
            assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        }
    };
    bench.write("note.md", stage("A", "9k", ASKED));
    commit("first");
    bench.write("note.md", stage("A", "19k", ASKED));
    let said = bench.run(&["diff", "HEAD", "."]);
    assert!(said.code == Some(1) && said.out.contains("components.Rf  9k → 19k"), "{} {}", said.out, said.err);
    commit("second");
    let said = bench.run(&["diff", "HEAD~1", "HEAD", "note.md"]);
    assert!(said.code == Some(1) && said.out.contains("holds → breaks  gain"), "{} {}", said.out, said.err);
    assert_eq!(bench.run(&["diff", "HEAD", "note.md"]).code, Some(0));
    // A note that was not there yet is new.
    bench.write("more.md", stage("B", "9k", ASKED));
    assert!(bench.run(&["diff", "HEAD", "more.md"]).out.contains("B  added: 1 holds"));
}
