"""Labels that coders corrected themselves: compared, kept as a version, never called independent."""

import pytest

from reference import by_definition
from reference.concluded_project import make_project, send_round, write_labels
from relook.errors import ExitCode, RelookError
from relook.project.corrections.correcting import compare_with, correction_object, record_correction
from relook.project.corrections.label_versions import read_versions, with_version
from relook.project.setup.loading import load

LABELS = {
    "i1": [("c1", "a"), ("c2", "b"), ("c3", "b")],
    "i2": [("c1", "a"), ("c2", "a"), ("c3", "a")],
    "i3": [("c1", "b"), ("c2", "c"), ("c3", "a")],
    "i4": [("c1", "c")],
    "i5": [("c1", "a"), ("c2", "b")],
}
CORRECTED = {
    "i1": [("c1", "b"), ("c2", "b"), ("c3", "b")],  # toward
    "i2": [("c1", "c"), ("c2", "a"), ("c3", "a")],  # away
    "i3": [("c1", "d"), ("c2", "c"), ("c3", "a")],  # neither, and a label nobody gave
    "i4": [("c1", "a"), ("c2", "a")],  # alone, and one added
    "i5": [("c1", "a")],  # one removed
}
STAMP = "2031-03-01T09:00:00+00:00"


@pytest.fixture
def project(tmp_path):
    made = make_project(tmp_path / "p", LABELS)
    send_round(made, LABELS, {"i1": "disputed"})
    write_labels(tmp_path / "corrected.csv", CORRECTED)
    return made


def compared(project, name="corrected.csv", **options):
    return compare_with(load(project), [project.root.parent / name], **options)


def test_each_change_is_told_with_who_and_which_way(project):
    """Toward, away, neither, alone; added and removed labels are counted by coder."""
    (held,) = compared(project).variables
    assert [(c.item, c.coder, c.old, c.new, c.direction) for c in held.changes] == [
        ("i1", "c1", "a", "b", "toward"),
        ("i2", "c1", "a", "c", "away"),
        ("i3", "c1", "b", "d", "neither"),
        ("i4", "c1", "c", "a", "alone"),
    ]
    assert held.directions == {"toward": 1, "away": 1, "neither": 1, "alone": 1}
    by_coder = {each.coder: (each.n_changed, each.n_added, each.n_removed) for each in held.coders}
    assert by_coder == {"c1": (4, 0, 0), "c2": (0, 1, 1), "c3": (0, 0, 0)}


def test_directions_follow_the_distance_of_numbers(tmp_path):
    """On numbers a label moves toward the others by getting nearer, without being equal."""
    labels = {"i1": [("c1", "9"), ("c2", "1")], "i2": [("c1", "2"), ("c2", "3")]}
    project = make_project(tmp_path / "p", labels, difference="interval")
    write_labels(
        tmp_path / "corrected.csv",
        {"i1": [("c1", "5"), ("c2", "1")], "i2": [("c1", "1.5"), ("c2", "3")]},
    )
    (held,) = compared(project).variables
    assert [change.direction for change in held.changes] == ["toward", "away"]


def test_both_figures_are_those_of_the_slow_twin_and_the_second_is_no_alpha(project):
    """`before` has an alpha, `after` only an agreement."""
    (row,) = correction_object(compared(project), None)["variables"]
    for key, name, table in (("before", "alpha", LABELS), ("after", "agreement", CORRECTED)):
        want = by_definition.alpha_by_definition(table, by_definition.nominal)
        assert row[key][name] == pytest.approx(float(want.alpha), rel=1e-12)
        assert row[key]["observed_disagreement"] == pytest.approx(float(want.observed), rel=1e-12)
    assert "alpha" not in row["after"]


def test_a_version_is_kept_once_and_the_users_files_stay(project):
    """The table lies under label_versions to the byte; again it is the same version."""
    table = project.root.parent / "corrected.csv"
    own, given = (project.root / "labels.csv").read_bytes(), table.read_bytes()
    version, is_new = record_correction(compared(project), STAMP)
    assert (version.number, is_new) == (1, True)
    assert (project.root / "label_versions/01/corrected.csv").read_bytes() == given
    assert version.summary["topic"]["toward"] == 1
    again, is_new = record_correction(compared(project), STAMP)
    assert (again, is_new) == (version, False)
    assert read_versions(project) == [version]
    assert (project.root / "labels.csv").read_bytes() == own
    assert table.read_bytes() == given
    labels = load(with_version(project, 1)).labels
    assert labels.variables["topic"].labels.n_labels == sum(map(len, CORRECTED.values()))


def test_a_version_that_was_touched_is_not_read(project):
    """A changed copy would no longer be what the coders corrected."""
    record_correction(compared(project), STAMP)
    with (project.root / "label_versions/01/corrected.csv").open("a") as file:
        file.write("i9,c1,a\n")
    with pytest.raises(RelookError, match="was changed or is gone"):
        with_version(project, 1)


def test_no_such_version_names_those_there_are(project):
    """The mend lists the versions, or says how to record one."""
    with pytest.raises(RelookError, match="no label version 2") as caught:
        with_version(project, 2)
    assert "--against" in caught.value.mend


def test_a_table_with_the_same_labels_corrects_nothing(project):
    """Exit 1, and nothing is recorded."""
    write_labels(project.root.parent / "same.csv", LABELS)
    with pytest.raises(RelookError, match="the same labels") as caught:
        compared(project, "same.csv")
    assert caught.value.exit_code == ExitCode.FALLS_SHORT
    assert read_versions(project) == []


def test_counts_do_not_say_who_changed_a_label(tmp_path):
    """A table of counts is refused."""
    root = tmp_path / "p"
    root.mkdir()
    (root / "labels.csv").write_text("item,a,b\ni1,1,1\n")
    (root / "relook.toml").write_text(
        'format = 1\nproject = "x"\n[labels]\nfiles = ["labels.csv"]\nlayout = "counts"\n'
        'item = "item"\n[variables.topic]\nlabels = ["a", "b"]\n'
    )
    from relook.project.setup.folder import Project

    with pytest.raises(RelookError, match="does not say who"):
        compared(Project.open(root))


def test_coders_named_by_files_keep_the_files_that_were_not_corrected(tmp_path):
    """With one file per coder, a corrected file takes the place of its own coder's alone."""
    from relook.project.setup.folder import Project

    root = tmp_path / "p"
    (root / "labels").mkdir(parents=True)
    for coder, text in (("ada", "i1,a\ni2,b\n"), ("ben", "i1,b\ni2,b\n")):
        (root / f"labels/{coder}.csv").write_text(f"item,topic\n{text}")
    (root / "relook.toml").write_text(
        'format = 1\nproject = "x"\n[labels]\nfiles = ["labels/*.csv"]\ncoder_from = "file"\n'
        'item = "item"\n[variables.topic]\ncolumn = "topic"\n'
    )
    (tmp_path / "ben.csv").write_text("item,topic\ni1,a\ni2,b\n")
    project = Project.open(root)
    held = compared(project, "ben.csv")
    (change,) = held.variables[0].changes
    assert (change.item, change.coder, change.direction) == ("i1", "ben", "toward")
    assert held.variables[0].n_removed == 0
    version, _ = record_correction(held, STAMP)
    assert sorted(version.files) == ["label_versions/01/ada.csv", "label_versions/01/ben.csv"]
