"""The order of items as settings and command line ask for it."""

from dataclasses import replace

import numpy as np
import pytest

from reference.made_projects import csv_text, long_csv, make
from relook.errors import RelookError
from relook.project.figures import ordering as ordering_module
from relook.project.figures.ordering import groups_of, order_items, settings_of_queue
from relook.project.setup.loading import load
from relook.project.setup.settings import QueueSettings

TABLE = {
    f"i{u:02d}": [(c, "pqr"[(u + (c == "abc"[u % 3]) * (u % 2)) % 3]) for c in "abc"]
    for u in range(30)
}


def names(loaded, ordering):
    return [str(item) for item in loaded.labels.items[ordering.ranking.item_index]]


def test_the_order_does_not_follow_the_file(tmp_path):
    """Rows of the table in another order give the same ranking; another seed gives another."""
    first = load(make(tmp_path / "one", long_csv(TABLE)))
    second = load(make(tmp_path / "two", long_csv(dict(reversed(TABLE.items())))))
    orders = [
        names(loaded, order_items(loaded, QueueSettings(), seed=1)) for loaded in (first, second)
    ]
    assert orders[0] == orders[1]
    assert orders[0] != sorted(orders[0])
    other = names(first, order_items(first, QueueSettings(), seed=2))
    assert sorted(other) == sorted(orders[0])
    assert other != orders[0]


def test_ties_break_by_doubt(tmp_path):
    """Items of equal contribution stand by the doubt about them, where there is ground for it."""
    rng = np.random.default_rng(3)
    table = {
        f"i{u:03d}": [
            (c, "pq"[(u + int(rng.random() < wrong)) % 2])
            for c, wrong in zip("abc", (0.1, 0.2, 0.35), strict=True)
        ]
        for u in range(200)
    }
    loaded = load(make(tmp_path, long_csv(table)))
    ordering = order_items(loaded, QueueSettings(), seed=1)
    items = ordering.ranking.item_index
    assert np.unique(ordering.ranking.tied).size == 1
    doubt = ordering.doubts["label"].doubt[items]
    assert doubt.max() > doubt.min() + 0.01
    assert np.all(np.diff(doubt) <= 1e-12)


def test_priority_multiplies_and_zero_keeps_out(tmp_path):
    """Blank counts 1, 0 keeps an item out, 5 puts it first."""
    items = csv_text(("item", "due"), [("i01", "5"), ("i03", "0"), ("i05", "")])
    project = make(
        tmp_path,
        long_csv(TABLE),
        items=items,
        item_settings='key = "item"\npriority = "due"\n',
    )
    loaded = load(project)
    order = names(loaded, order_items(loaded, QueueSettings(), seed=1))
    assert order[0] == "i01"
    assert "i03" not in order
    assert "i05" in order


def test_no_order_by_doubt_without_ground(tmp_path):
    """The error names the reason of each variable."""
    table = {u: [("a", "pq"[u % 2]), ("b", "p")] for u in range(8)}
    loaded = load(make(tmp_path, long_csv(table)))
    with pytest.raises(RelookError) as caught:
        order_items(loaded, QueueSettings(rank_by="doubt"), seed=1)
    assert "fewer than three coders share items" in caught.value.message
    assert caught.value.mend == "rank by contribution or by intensity"


def test_an_unknown_order_names_the_nearest():
    """Words for orders are checked before anything is read."""
    with pytest.raises(RelookError) as caught:
        settings_of_queue(QueueSettings(), {"rank_by": "contributions"})
    assert caught.value.mend == 'did you mean "contribution"?'


def test_a_limit_given_now_replaces_those_written_down():
    """--share 0.5 does not stay within the top 40 of relook.toml; other settings do."""
    written = QueueSettings(top=40, hours=3.0, audit=7)
    assert settings_of_queue(written, {"share": 0.5, "top": None}) == replace(
        written, top=None, hours=None, share=0.5
    )
    assert settings_of_queue(written, {"rank_by": "intensity"}) == replace(
        written, rank_by="intensity"
    )


def test_groups_take_items_without_an_entry_together(tmp_path):
    """An item that the item table does not have belongs to the blank group."""
    items = csv_text(("item", "half"), [("i00", "odd"), ("i01", "even")])
    project = make(
        tmp_path, long_csv(TABLE), items=items, item_settings='key = "item"\ngroup_by = ["half"]\n'
    )
    group, found = groups_of(load(project), "half")
    assert found == ("", "even", "odd")
    assert np.bincount(group).tolist() == [28, 1, 1]


def test_doubt_that_takes_long_waits_until_it_is_asked_for(tmp_path, monkeypatch):
    """Beyond a size ties do without it; asking for the column leaves the order as it is."""
    monkeypatch.setattr(ordering_module, "QUICK_DOUBT", 0)
    loaded = load(make(tmp_path, long_csv(TABLE)))
    plain = order_items(loaded, QueueSettings(), seed=1)
    assert plain.doubts["label"].undefined_because == ordering_module.NOT_ASKED
    asked = order_items(loaded, QueueSettings(), seed=1, with_doubt=True)
    assert asked.doubts["label"].doubt is not None
    assert names(loaded, asked) == names(loaded, plain)
    ranked = order_items(loaded, QueueSettings(rank_by="doubt"), seed=1)
    assert ranked.ranking.score.max() > 0
