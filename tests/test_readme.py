"""What the README says is so: its blocks, its script, its commands, its names, its files."""

import re
import shlex
from pathlib import Path

import pytest

import torsionfe as tf
from torsionfe.cli import main

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language):
    return re.findall(rf"^```{language}\n(.*?)^```", README, flags=re.DOTALL | re.MULTILINE)


def test_two_commands_of_one_line_each():
    run, test = blocks("sh")
    assert run.count("\n") == test.count("\n") == 1
    assert "torsionfe solve" in run
    assert "pytest" in test
    assert "[test]" in test


def test_the_first_command_does_the_main_job(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    command = shlex.split(blocks("sh")[0].split("&&")[-1])
    assert main(command[1:]) == 0
    assert "torsion constant J" in capsys.readouterr().out
    figure = (tmp_path / command[-1]).read_bytes()
    assert figure.startswith(b"\x89PNG")


def test_the_script_runs_and_is_short(capsys):
    (script,) = blocks("python")
    assert len([line for line in script.splitlines() if line and not line.startswith("import")]) <= 5
    exec(compile(script, "README.md", "exec"), {})
    printed = capsys.readouterr().out
    for word in ("torsion constant J", "The hand method beside the answer", "conservative"):
        assert word in printed


def test_every_name_it_gives_exists():
    for name in set(re.findall(r"`tf\.(\w+)", README)):
        assert getattr(tf, name) is not None
    for name in set(re.findall(r"`\.(\w+)", README)):
        known = {*dir(tf.TorsionSolution), *dir(tf.Outline), *tf.TorsionSolution.__dataclass_fields__}
        assert name in known


def test_every_command_it_shows_is_one(capsys):
    for command in set(re.findall(r"torsionfe (solve|run|starter|sweep|sections)\b", README)):
        assert main([command, "--help"]) == 0
        assert command in capsys.readouterr().out


@pytest.mark.parametrize("path", sorted(set(re.findall(r"\]\(([^)h#][^)]*)\)|`((?:\w+/)+|\w+\.md|LICENSE)`", README))))
def test_every_file_it_names_is_there(path):
    assert (ROOT / next(filter(None, path))).exists()


def test_it_says_what_it_is_not_for():
    text = " ".join(README.split())
    for words in ("free to warp", "fatigue", "licensed engineer", "Sharp re-entrant corners", "not an approval"):
        assert words in text


def test_its_tables_are_those_of_the_benchmarks():
    for name, body in re.findall(r"<!-- (results/\w+\.md) -->\n(.*?)<!-- end -->", README, flags=re.DOTALL):
        assert body.strip() == (ROOT / "benchmarks" / name).read_text(encoding="utf-8").strip()
