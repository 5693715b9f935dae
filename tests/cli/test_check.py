"""The screen of `relook check`: what one mend is for stands together."""

from __future__ import annotations

from relook.cli.app import run


def test_findings_with_one_mend_stand_together(tmp_path, capsys):
    """Three spellings of one label: two findings, one mend below both; the next group is apart."""
    labels = [("red", "green")] * 12 + [("Red", "green"), ("red ", "green"), ("red", "Green")]
    rows = [
        f"i{at:02d},{coder},{label}"
        for at, pair in enumerate(labels)
        for coder, label in zip("ab", pair, strict=True)
    ]
    table = tmp_path / "labels.csv"
    table.write_text("item,coder,label\n" + "\n".join(rows) + "\n", encoding="utf-8")
    assert run(["check", str(table)]) == 0
    out = capsys.readouterr().out
    blocks = [" ".join(block.split()) for block in out.split("\n\n")]
    (reds,) = [block for block in blocks if 'mend: write "red" throughout' in block]
    assert reds.index('"Red" (1)') < reds.index('"red " (1)') < reds.index("mend:")
    assert reds.count("mend:") == 1
    assert '"Green"' not in reds
    (greens,) = [block for block in blocks if 'mend: write "green" throughout' in block]
    assert '"Green" (1)' in greens


def test_a_check_says_that_a_round_is_out(tmp_path, capsys):
    """Labels mended now are not those of the round; with nothing back, the way out is starting over."""
    table = tmp_path / "labels.csv"
    rows = [
        f"i{at:02d},{coder},{'Red' if (at, coder) == (1, 'a') else 'red'}"
        for at in range(14)
        for coder in "ab"
    ]
    rows += [f"i{at:02d},c,{'green' if at % 3 else 'red'}" for at in range(14)]
    table.write_text("item,coder,label\n" + "\n".join(rows) + "\n", encoding="utf-8")
    assert run(["queue", str(table)]) == 0
    assert "differ by next to nothing" in " ".join(capsys.readouterr().out.split())
    project = tmp_path / "labels-relook"
    assert run(["check", str(project)]) == 0
    assert "A round of this project is out" in capsys.readouterr().err
    table.write_text(table.read_text(encoding="utf-8").replace("Red", "red"), encoding="utf-8")
    assert run(["score", str(project), "--require", ".1"]) != 0
    capsys.readouterr()
    assert run(["release", str(project)]) == 2
    said = capsys.readouterr().err
    assert "no decision is in yet, so nothing is lost by starting over" in said
    assert "take the folder rounds away and queue anew" in said
