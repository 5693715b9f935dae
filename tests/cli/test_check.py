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
