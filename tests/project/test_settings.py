"""relook.toml is read and checked in one pass."""

from fractions import Fraction
from pathlib import Path

import pytest

from relook.errors import RelookError
from relook.project.setup.settings import load_settings

LEAST = '[labels]\nfiles = ["labels.csv"]\ncoder = "coder"\n'


def load(tmp_path: Path, text: str):
    file = tmp_path / "relook.toml"
    file.write_text(text, encoding="utf-8")
    return load_settings(file)


def problems_of(tmp_path: Path, text: str) -> list[str]:
    with pytest.raises(RelookError) as caught:
        load(tmp_path, text)
    return [str(problem) for problem in caught.value.problems] or [str(caught.value)]


def test_only_the_labels_table_is_required(tmp_path):
    """Everything but [labels] has a default."""
    settings = load(tmp_path, LEAST)
    assert settings.labels.layout == "long"
    assert [variable.name for variable in settings.variables] == ["label"]
    assert settings.items is None
    assert settings.queue.top is None
    assert settings.worksheet.reveal == "labels"


def test_every_documented_key_is_read(tmp_path):
    """Each key arrives where it belongs, with its type."""
    settings = load(
        tmp_path,
        """
format = 1
project = "abc"
[labels]
files = ["labels/*.csv"]
layout = "long"
item = "id"
coder = "who"
missing = ["", "-"]
duplicates = "last"
leave_out = ["c9"]
remark = "comment"
[variables.severity]
column = "severity"
difference = "ordinal"
labels = ["none", "minor", "major"]
weight = 2
[variables.size]
column = "size"
difference = "interval"
tolerance = 0.1
[items]
files = ["items.csv"]
key = "id"
show = ["text"]
group_by = ["source"]
priority = "urgent"
resample_by = "page"
[queue]
rank_by = "doubt"
top = 7
share = 0.5
hours = 2
seconds_per_item = 30
audit = 5
[worksheet]
adjudicators = {Ada = "c01", Ben = ""}
overlap = 0.2
reveal = "tallies"
reasons = ["slip"]
[bar]
alpha = 0.8
""",
    )
    assert settings.project == "abc"
    assert settings.labels.leave_out == ("c9",)
    assert settings.labels.duplicates == "last"
    severity, size = settings.variables
    assert (severity.labels, severity.weight) == (("none", "minor", "major"), 2.0)
    assert size.tolerance == Fraction(1, 10)
    assert settings.items is not None
    assert settings.items.resample_by == "page"
    assert (settings.queue.rank_by, settings.queue.top, settings.queue.hours) == ("doubt", 7, 2)
    assert settings.worksheet.adjudicators == {"Ada": "c01", "Ben": None}
    assert settings.bar == 0.8


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("formt = 1\n" + LEAST, 'unknown key formt, relook.toml\nmend: did you mean "format"?'),
        ("format = 2\n" + LEAST, "format is 2, relook.toml\nmend: write 1"),
        ("[label]\n" + LEAST, "unknown table [label], relook.toml\nmend: did you mean [labels]?"),
        (LEAST + "[queue]\ntopp = 3", 'unknown key [queue] topp, relook.toml\nmend: did you mean "top"?'),
        (LEAST + "[queue]\nshare = 3", "[queue] share is 3, relook.toml\nmend: write a number above 0 and up to 1"),
        (LEAST + "[queue]\ntop = true", "[queue] top is True, relook.toml\nmend: write 1 or more"),
        (LEAST + "[worksheet]\nadjudicators = []", "[worksheet] adjudicators is [], relook.toml\nmend: write a list of names"),
        (LEAST + '[variables.x]\ndifference = "nominl"', "[variables.x] difference is 'nominl', relook.toml\nmend: write one of \"nominal\""),
        (LEAST + '[variables.x]\nlabels = ["a", "a"]', "[variables.x] labels is ['a', 'a'], relook.toml\nmend: write a list of different labels"),
        (LEAST + '[variables.x]\nperiod = 12', "[variables.x] period has no meaning for nominal differences"),
        ("labels = 3", "[labels] must be a table; got 3"),
        ('[labels]\ncoder = "c"', '[labels] files is missing, relook.toml\nmend: write files = ["labels.csv"]'),
        ('[labels]\nfiles = ["a.csv"]', "[labels] coder is missing, which a long table needs"),
        (LEAST + "[items]\nkey = \"a\"", "[items] files is missing"),
        (LEAST + "[variables]\nx = 3", "[variables.x] must be a table; got 3"),
        ("format = ", "not valid TOML"),
        ("", "[labels] is missing"),
    ],
)  # fmt: skip
def test_a_fault_says_what_where_and_the_mend(tmp_path, text, said):
    """Each fault names its table and key, and how to mend it."""
    assert any(problem.startswith(said) for problem in problems_of(tmp_path, text)), problems_of(
        tmp_path, text
    )


def test_all_faults_are_told_in_one_pass(tmp_path):
    """Five faults make five problems."""
    text = 'formt = 1\n[labels]\n[queue]\ntopp = 1\nshare = 2\n[variables.x]\ndifference = "no"\n'
    assert len(problems_of(tmp_path, text)) == 5


def test_a_folder_without_settings_says_how_to_make_them(tmp_path):
    """The mend names the command that makes a project."""
    with pytest.raises(RelookError, match=r"no relook\.toml in this folder") as caught:
        load_settings(tmp_path / "relook.toml")
    assert "relook new TABLE" in str(caught.value.mend)


def test_settings_that_are_not_utf8_are_refused(tmp_path):
    """Bytes that are not UTF-8 are named as such."""
    file = tmp_path / "relook.toml"
    file.write_bytes(b'[labels]\nfiles = ["\xff.csv"]')
    with pytest.raises(RelookError, match="not UTF-8 text"):
        load_settings(file)


def test_an_unknown_variable_names_the_nearest(tmp_path):
    """A misspelt variable is answered with the one that was meant."""
    settings = load(tmp_path, LEAST + '[variables.severity]\ncolumn = "s"')
    with pytest.raises(RelookError) as caught:
        settings.variable("severty")
    assert caught.value.mend == 'did you mean "severity"?'
