"""What if labels were merged: figures, candidates, and what is refused."""

import pytest

from reference import by_definition as twin
from reference.made_projects import long_csv, make, scored
from relook.errors import RelookError
from relook.project.figures.label_mergers import MergeGroup, merge_labels, parse_merge_group
from relook.project.figures.score_object import score_object
from relook.project.setup.loading import load

TABLE = {
    u: [("a", labels[0]), ("b", labels[1]), ("c", labels[2])]
    for u, labels in enumerate(["ppq", "pqq", "rrr", "qqq", "ppp", "rsr", "sss", "pqr", "ssp"])
}
TWO = """[variables.colour]
column = "colour"
[variables.size]
column = "size"
difference = "ordinal"
labels = ["low", "mid", "high", "huge"]
[variables.marks]
column = "marks"
difference = "interval"
"""
LABELS = (
    "item,coder,colour,size,marks\n1,a,red,low,1\n1,b,blue,mid,2\n2,a,red,high,3\n2,b,red,huge,3\n"
    "3,a,green,mid,1\n3,b,blue,low,1\n"
)


def test_figures_with_labels_merged_are_those_of_the_definitions(tmp_path):
    """Alpha, D_o and D_e equal a fresh count of the merged table; so do two groups at once."""
    project = make(tmp_path, long_csv(TABLE))
    groups = [MergeGroup("x", ("p", "q")), MergeGroup("y", ("r", "s"))]
    for chosen in (groups[:1], groups):
        held = score_object(scored(project, merge=chosen))["merged"]
        into = {v: v for v in "pqrs"} | {v: g.name for g in chosen for v in g.labels}
        wanted = twin.alpha_by_definition(twin.merged(TABLE, into), twin.nominal)
        assert len(held) == 1
        assert held[0]["alpha"] == pytest.approx(float(wanted.alpha), rel=1e-12)
        assert held[0]["observed_disagreement"] == pytest.approx(float(wanted.observed), rel=1e-12)
        assert held[0]["expected_disagreement"] == pytest.approx(float(wanted.expected), rel=1e-12)


def test_the_best_merger_is_the_best_of_all_pairs(tmp_path):
    """Trying every pair by definition finds the same first place and gain."""
    held = score_object(scored(make(tmp_path, long_csv(TABLE))))
    alpha = twin.alpha_by_definition(TABLE, twin.nominal).alpha
    gains = {}
    for one in "pqrs":
        for other in "pqrs":
            if one < other:
                into = {v: one if v == other else v for v in "pqrs"}
                merged = twin.alpha_by_definition(twin.merged(TABLE, into), twin.nominal).alpha
                gains[one, other] = float(merged - alpha)
    best = max(gains, key=gains.get)
    first = held["best_mergers"][0]
    assert (first["first"], first["second"]) == best
    assert first["gain"] == pytest.approx(gains[best], rel=1e-12)
    assert "coarser" in held["mergers_caution"]


def test_labels_are_merged_in_the_variables_that_have_them(tmp_path):
    """Each group reaches its own variable; numbers say why they cannot be merged."""
    loaded = load(make(tmp_path, LABELS, variables=TWO))
    merged = merge_labels(
        loaded,
        [
            MergeGroup("cold", ("green", "blue")),
            MergeGroup("large", ("high", "huge")),
            MergeGroup("few", ("1", "2")),
        ],
    )
    assert [each.variable for each in merged] == ["colour", "size", "marks"]
    assert [each.agreement is None for each in merged] == [False, False, True]
    assert merged[2].not_merged_because == (
        "labels can be merged under nominal and ordinal differences only, not interval"
    )


@pytest.mark.parametrize(
    ("groups", "says", "mend"),
    [
        ([("x", "red", "blu")], 'colour has no label "blu"', 'did you mean "blue"?'),
        ([("green", "red", "blue")], '"green" is another label of colour', "add it to"),
        ([("x", "red", "blue"), ("y", "blue", "green")], 'merged into "x" and into "y"', "one"),
        ([("x", "red", "blue"), ("x", "low", "mid")], 'two mergers are called "x"', "its own"),
        (
            [("x", "low", "high")],
            "size: ordinal labels can be merged with their neighbours",
            "in b",
        ),
        ([("x", "1", "2")], "marks: labels can be merged under nominal and ordinal", "leave"),
    ],
)
def test_what_cannot_be_merged_is_said(tmp_path, groups, says, mend):
    """Each fault is named with what would do."""
    loaded = load(make(tmp_path, LABELS, variables=TWO))
    with pytest.raises(RelookError) as caught:
        merge_labels(loaded, [MergeGroup(name, tuple(labels)) for name, *labels in groups])
    assert says in caught.value.message
    assert mend.split()[0] in caught.value.mend


def test_mergers_are_read_from_one_word():
    """Spaces do no harm, and a label with a comma stands in quotes."""
    assert parse_merge_group('late = delayed , "gone, for good"') == MergeGroup(
        "late", ("delayed", "gone, for good")
    )
    assert parse_merge_group("red=red,blue").labels == ("red", "blue")


@pytest.mark.parametrize("text", ["late", "=a,b", "late=", "late=a", "late=a,a", 'late="a,b'])
def test_words_that_are_no_merger_are_refused(text):
    """Each is quoted back."""
    with pytest.raises(RelookError) as caught:
        parse_merge_group(text)
    assert f'--merge "{text}"' in caught.value.message
