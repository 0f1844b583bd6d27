"""What is reviewed at a commit: the staged content of what the commit concerns, and no more."""

import sys

import pytest

from tests.gauge import CLIPPED, SOUND

LOAD = "RL out 0 {}\n"
INCLUDING = SOUND.replace(LOAD.format("10k"), '.include "{}"\n')


def test_first_commit(repository):
    """There is nothing to compare with yet; a clipped stage stops it, a sound one does not."""
    repository.add("gauge.cir", CLIPPED)
    made, told = repository.commit()
    assert not made
    assert "headroom-output" in told
    assert "commit stopped; 1 of 1 netlist on hold" in told
    repository.add("gauge.cir", SOUND)
    made, told = repository.commit()
    assert made
    assert "railguard: 1 netlist reviewed, nothing at major or above" in told


def test_only_what_matters_is_shown(repository):
    """No list of what was read, of what is minor, or of what was not checked."""
    repository.add("gauge.cir", CLIPPED)
    _, told = repository.check()
    for word in ("How it was read", "minor", "Not checked", "Settings"):
        assert word not in told


def test_no_verify_commits(repository):
    """Git's own way past a hook."""
    repository.add("gauge.cir", CLIPPED)
    assert repository.commit("--no-verify")[0]


def test_no_netlist_staged(repository):
    """A text and a program are committed without a word."""
    repository.add("notes.txt", "the gauge of the upper weir")
    repository.add("tool.py", "print(1)\n")
    made, told = repository.commit()
    assert made
    assert "railguard" not in told


def test_netlist_that_is_committed_already_is_let_alone(repository):
    """A clipped netlist from before does not stop a commit that does not concern it."""
    repository.add("old.cir", CLIPPED)
    repository.keep()
    repository.add("gauge.cir", SOUND)
    made, told = repository.check()
    assert made
    assert "1 netlist reviewed" in told


def test_amended_commit(repository):
    """What is amended is reviewed; a new message alone is not held up."""
    repository.add("gauge.cir", SOUND)
    repository.keep()
    repository.add("gauge.cir", CLIPPED)
    assert not repository.commit("--amend")[0]
    repository.add("gauge.cir", SOUND.replace("gauge", "level gauge"))
    assert repository.commit("--amend")[0]
    repository.add("gauge.cir", CLIPPED)
    repository.keep()
    assert repository.commit("--amend", "-m", "a better message")[0]


def test_partial_staging(repository):
    """The index counts, whatever the working tree has become since."""
    repository.add("gauge.cir", SOUND)
    repository.write("gauge.cir", CLIPPED)
    assert repository.check()[0]
    repository.keep()
    repository.git("add", "gauge.cir")
    repository.write("gauge.cir", SOUND)
    made, told = repository.commit()
    assert not made
    assert "headroom-output" in told


def test_a_path_given_to_commit(repository):
    """`git commit PATH` makes an index for itself; that one is reviewed."""
    repository.add("gauge.cir", SOUND)
    repository.add("other.cir", SOUND)
    repository.keep()
    repository.write("gauge.cir", CLIPPED)
    repository.add("other.cir", SOUND.replace("10k", "12k"))
    assert repository.commit("other.cir")[0]
    assert not repository.commit("gauge.cir")[0]
    assert not repository.commit("-a")[0]


def test_rename(repository):
    """A netlist is reviewed at its new place: what it includes may no longer be beside it."""
    repository.add("boards/gauge.cir", INCLUDING.format("load.inc"))
    repository.add("boards/load.inc", LOAD.format("10k"))
    repository.keep()
    repository.git("mv", "boards/gauge.cir", "gauge.cir")
    made, told = repository.commit()
    assert not made
    assert "load.inc is not there" in told
    repository.git("mv", "boards/load.inc", "load.inc")
    assert repository.check()[0]


def test_deletion(repository):
    """A netlist that goes is not reviewed; one whose include goes is."""
    repository.add("gauge.cir", INCLUDING.format("load.inc"))
    repository.add("load.inc", LOAD.format("10k"))
    repository.add("old.cir", CLIPPED)
    repository.keep()
    repository.git("rm", "-q", "old.cir")
    assert repository.check()[0]
    repository.keep()
    repository.git("rm", "-q", "load.inc")
    made, told = repository.check()
    assert not made
    assert "load.inc is not there" in told


@pytest.mark.parametrize("name", ["load.inc", "loads.txt", "LOAD.INC", "sub/load"])
def test_staged_include_that_differs_from_the_working_tree(repository, name):
    """A netlist that did not change is reviewed with the include as it is staged."""
    repository.add("gauge.cir", INCLUDING.format(name))
    repository.add(name.lower(), LOAD.format("10k"))
    repository.keep()
    repository.add(name.lower(), LOAD.format("20"))
    repository.write(name.lower(), LOAD.format("10k"))
    made, told = repository.commit()
    assert not made
    assert "drive-current" in told
    repository.git("add", name.lower())
    repository.write(name.lower(), LOAD.format("20"))
    assert repository.check()[0]


def test_an_include_of_an_include(repository):
    """Two steps away, the inner one under a name that says nothing."""
    repository.add("gauge.cir", INCLUDING.format("all.lib"))
    repository.add("all.lib", ".inc parts/loads\n")
    repository.add("parts/loads", LOAD.format("10k"))
    assert repository.check()[0]
    repository.keep()
    repository.add("parts/loads", LOAD.format("20"))
    assert not repository.check()[0]


def test_an_include_in_utf_16(repository):
    """A netlist that a Windows program wrote."""
    repository.add("gauge.cir", INCLUDING.format("load.inc").encode("utf-16"))
    repository.add("load.inc", LOAD.format("10k"))
    assert repository.check()[0]
    repository.keep()
    repository.add("load.inc", LOAD.format("20"))
    assert not repository.check()[0]


def test_an_untracked_include_is_not_there(repository):
    """What only the working tree holds will be missing for everybody else."""
    repository.write("load.inc", LOAD.format("10k"))
    repository.add("gauge.cir", INCLUDING.format("load.inc"))
    made, told = repository.check()
    assert not made
    assert "load.inc is not there" in told


def test_an_include_beside_the_folder_needs_the_root(repository):
    """As for `railguard review`: below the netlist's own folder, unless the user says more."""
    repository.add("boards/gauge.cir", INCLUDING.format("../common/load.inc"))
    repository.add("common/load.inc", LOAD.format("10k"))
    made, told = repository.check()
    assert not made
    assert "lies outside" in told
    assert repository.check("--root", ".")[0]
    repository.keep()
    repository.add("common/load.inc", LOAD.format("20"))
    made, told = repository.check("--root", ".")
    assert not made
    assert "drive-current" in told


def test_staged_settings(repository):
    """The settings of the commit are obeyed, not those of the working tree."""
    waiver = '[[waivers]]\nrule = "headroom-output"\nreason = "bench only"\n'
    repository.add("boards/gauge.cir", CLIPPED)
    repository.add("boards/railguard.toml", waiver)
    repository.write("boards/railguard.toml", "")
    assert repository.check()[0]
    repository.keep()
    repository.git("add", "boards/railguard.toml")
    repository.write("boards/railguard.toml", waiver)
    made, told = repository.check()
    assert not made
    assert "headroom-output" in told


def test_settings_that_cannot_be_obeyed_stop_the_commit(repository):
    """With the line at fault, and no traceback."""
    repository.add("gauge.cir", SOUND)
    repository.add("railguard.toml", "[review]\nhold_at = 3\n")
    made, told = repository.check()
    assert not made
    assert "railguard.toml, line 2" in told
    assert "Traceback" not in told


def test_settings_that_are_not_committed_are_named(repository):
    """A file the others will not have is not obeyed, and it is said."""
    repository.write("railguard.toml", '[review]\nhold-at = "critical"\n')
    repository.add("gauge.cir", SOUND)
    made, told = repository.check()
    assert made
    assert "railguard.toml is not in the index" in told


def test_path_with_blanks_and_non_ascii(repository):
    """In the netlist's name, its folder and its include."""
    repository.add("Pegel Süd/Mess verstärker Ω.cir", INCLUDING.format("Last größe.inc"))
    repository.add("Pegel Süd/Last größe.inc", LOAD.format("10k"))
    assert repository.check()[0]
    repository.keep()
    repository.add("Pegel Süd/Last größe.inc", LOAD.format("20"))
    made, told = repository.commit()
    assert not made
    assert "Pegel Süd/Mess verstärker Ω.cir" in told


@pytest.mark.skipif(sys.platform == "win32", reason="Windows has no such names")
def test_path_with_a_line_break_and_a_quote(repository):
    """Nothing a name may hold breaks the talk with git, or is shown as it is."""
    repository.add('a"b\nc\t.cir', CLIPPED)
    made, told = repository.check()
    assert not made
    assert "headroom-output" in told
    assert "b\nc" not in told


def test_file_of_another_format_under_a_netlists_name(repository):
    """Board editors call theirs `.net` as well; the commit goes on, and it is said."""
    repository.add("board.net", '(export (version "E"))\n')
    made, told = repository.check()
    assert made
    assert "board.net is a board netlist in another format, not a SPICE netlist" in told


def test_merge_with_conflicts(repository):
    """What the merge makes is reviewed; what either side had already is not."""
    repository.add("gauge.cir", SOUND)
    repository.keep()
    repository.git("checkout", "-q", "-b", "side")
    repository.add("gauge.cir", SOUND.replace("20k", "22k"))
    repository.add("side.cir", CLIPPED)
    repository.keep()
    repository.git("checkout", "-q", "main")
    repository.add("gauge.cir", SOUND.replace("20k", "18k"))
    repository.keep()
    assert repository.run("git", "merge", "side").returncode != 0
    repository.add("gauge.cir", CLIPPED)
    made, told = repository.commit()
    assert not made
    assert "gauge.cir" in told
    assert "side.cir" not in told
    repository.add("gauge.cir", SOUND.replace("20k", "22k"))
    passes, told = repository.check()
    assert passes
    assert told == ""


def test_merge_without_conflicts(repository):
    """Each side alone is sound; the load of one is too much for the supply of the other."""
    lines = SOUND.replace(LOAD.format("10k"), ".include load.inc\n")
    repository.add("gauge.cir", lines)
    repository.add("load.inc", LOAD.format("10k"))
    repository.keep()
    repository.git("checkout", "-q", "-b", "side")
    repository.add("load.inc", LOAD.format("470"))
    assert repository.check()[0]
    repository.keep()
    repository.git("checkout", "-q", "main")
    repository.add("gauge.cir", lines.replace("20k", "150k"))
    assert repository.check()[0]
    repository.keep()
    done = repository.run("git", "merge", "--no-edit", "side")
    assert done.returncode != 0
    assert "drive-current" in done.stdout
    assert repository.commit("--no-verify")[0]


def test_merge_of_what_either_side_reviewed(repository):
    """Nothing is reviewed twice: a clean merge of separate netlists says nothing."""
    repository.add("gauge.cir", SOUND)
    repository.keep()
    repository.git("checkout", "-q", "-b", "side")
    repository.add("side.cir", CLIPPED)
    repository.keep()
    repository.git("checkout", "-q", "main")
    repository.add("gauge.cir", SOUND.replace("20k", "18k"))
    repository.keep()
    done = repository.run("git", "merge", "--no-edit", "side")
    assert done.returncode == 0
    assert "railguard:" not in done.stdout


def test_submodule(new):
    """A new submodule, one that moves on, and a netlist that includes a file out of it."""
    library = new("library")
    library.add("load.inc", LOAD.format("10k"))
    library.add("gauge.cir", CLIPPED)
    library.keep()
    outer = new("outer")
    outer.hook("install")
    outer.git("submodule", "add", "-q", str(library.folder), "models")
    outer.add("gauge.cir", INCLUDING.format("models/load.inc"))
    made, told = outer.check()
    assert made, told
    outer.keep()
    assert "1 netlist reviewed" in told
    library.add("load.inc", LOAD.format("20"))
    library.keep()
    outer.git("-C", "models", "pull", "-q")
    outer.git("add", "models")
    made, told = outer.commit()
    assert not made
    assert "drive-current" in told


def test_inside_a_submodule(new):
    """A submodule is a repository: its hooks are its own."""
    library = new("library")
    library.add("notes.txt", "models")
    library.keep()
    outer = new("outer")
    outer.git("submodule", "add", "-q", str(library.folder), "models")
    inner = new("outer/models")
    inner.hook("install")
    inner.add("gauge.cir", CLIPPED)
    assert not inner.commit()[0]


def test_a_worktree(new):
    """A further working tree has the same hooks and an index of its own."""
    first = new()
    first.hook("install")
    first.add("gauge.cir", SOUND)
    first.keep()
    first.git("worktree", "add", "-q", "../second")
    second = new("second")
    assert "installed" in second.hook("status")
    second.add("gauge.cir", CLIPPED)
    assert not second.commit()[0]
    assert first.commit("--allow-empty")[0]


@pytest.mark.skipif(sys.platform == "win32", reason="links need rights there")
def test_an_include_through_a_link(repository):
    """The folder of the models is a symbolic link that is committed as such."""
    repository.add("common/load.inc", LOAD.format("10k"))
    (repository.folder / "models").symlink_to("common")
    repository.git("add", "models")
    repository.add("gauge.cir", INCLUDING.format("models/load.inc"))
    assert repository.check()[0]
    repository.keep()
    repository.add("common/load.inc", LOAD.format("20"))
    made, told = repository.check()
    assert not made
    assert "drive-current" in told


@pytest.mark.skipif(sys.platform == "win32", reason="links need rights there")
def test_a_link_out_of_the_repository_is_not_followed(repository, tmp_path):
    """Neither as a netlist nor as what one includes."""
    (tmp_path / "outside.inc").write_text(LOAD.format("10k"))
    for name in ("link.inc", "link.cir"):
        (repository.folder / name).symlink_to(tmp_path / "outside.inc")
        repository.git("add", name)
    repository.add("gauge.cir", INCLUDING.format("link.inc"))
    made, told = repository.check()
    assert not made
    assert "link.inc is not there" in told


def test_large_file_whose_content_is_elsewhere(repository):
    """A pointer of a large-file store is no netlist, and no reason to stop."""
    pointer = "version https://git-lfs.github.com/spec/v1\noid sha256:00\nsize 1\n"
    repository.add("gauge.cir", pointer)
    made, told = repository.check()
    assert made
    assert "gauge.cir is not reviewed: the content of gauge.cir is not here" in told


def test_line_ends_as_a_checkout_writes_them(repository):
    """A filter that makes a file longer than git says it is."""
    repository.add(".gitattributes", "*.cir text eol=crlf\n*.inc text eol=crlf\n")
    repository.add("gauge.cir", INCLUDING.format("load.inc"))
    repository.add("load.inc", LOAD.format("20"))
    made, told = repository.check()
    assert not made
    assert "drive-current" in told


def test_a_repository_cannot_bring_its_own_modules(repository):
    """What lies in the folder is reviewed, never imported."""
    repository.add("click.py", "raise SystemExit(0)\n")
    repository.add("railguard/__init__.py", "raise SystemExit(0)\n")
    repository.add("gauge.cir", CLIPPED)
    made, told = repository.commit()
    assert not made
    assert "headroom-output" in told


def test_hold_level_of_the_hook(repository):
    """What the hook was installed with goes over the settings."""
    repository.hook("install", "--hold-at", "remark")
    bare = SOUND.replace("CN vn 0 100n", "CN vn 0 100n\nR9 out x 1k")
    repository.add("gauge.cir", bare)
    made, told = repository.commit()
    assert not made
    assert "netlist-dangling" in told


def test_paths_that_are_named_are_taken_as_changed(repository):
    """As the framework hands them over; one outside of the repository is refused."""
    repository.add("boards/gauge.cir", INCLUDING.format("load.inc"))
    repository.add("boards/load.inc", LOAD.format("20"))
    repository.add("other.cir", SOUND)
    repository.keep()
    assert repository.check() == (True, "")
    assert "drive-current" in repository.check("boards/load.inc")[1]
    assert "1 netlist reviewed" in repository.check("other.cir")[1]
    assert "is not in the repository" in repository.check("/elsewhere/gauge.cir")[1]


def test_a_thousand_staged_files_are_one_question(repository):
    """Command lines have their bounds; so many paths go through none."""
    names = [f"models/part {number:04}.txt" for number in range(1200)]
    for number, name in enumerate(names):
        repository.write(name, f"RX{number} out 0 100meg\n")
    includes = "".join(f'.include "{name}"\n' for name in names)
    repository.add("gauge.cir", SOUND.replace(".end\n", f"{includes}.end\n"))
    repository.git("add", "models")
    passed, told = repository.check()
    assert passed
    assert "1 netlist reviewed" in told
    repository.keep()
    repository.git("rm", "-q", names[-1])
    passed, told = repository.check()
    assert not passed
    assert "part 1199.txt is not there" in told


def test_what_a_user_has_set_for_git_changes_nothing(repository):
    """Colours, line numbers, orders and the like are for eyes."""
    for name, value in (
        ("color.ui", "always"),
        ("grep.lineNumber", "true"),
        ("grep.column", "true"),
        ("grep.patternType", "perl"),
        ("diff.renames", "false"),
        ("diff.noprefix", "true"),
        ("diff.relative", "true"),
        ("core.quotePath", "true"),
        ("submodule.recurse", "true"),
    ):
        repository.git("config", name, value)
    repository.add("böards/gauge.cir", INCLUDING.format("load.txt"))
    repository.add("böards/load.txt", LOAD.format("10k"))
    assert repository.check()[0]
    repository.keep()
    repository.add("böards/load.txt", LOAD.format("20"))
    passed, told = repository.check()
    assert not passed
    assert "drive-current" in told


def test_what_is_added_by_intent_only(repository):
    """`git add -N` commits nothing yet."""
    repository.write("gauge.cir", CLIPPED)
    repository.git("add", "-N", "gauge.cir")
    repository.add("other.cir", SOUND)
    passed, told = repository.check()
    assert passed
    assert "1 netlist reviewed" in told
