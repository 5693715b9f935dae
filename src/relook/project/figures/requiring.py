"""Whether alpha reaches the bar that a script asks for."""

from __future__ import annotations

import math

from relook.core.ties import TIE
from relook.errors import Place, RelookError
from relook.project.figures.scoring import Score
from relook.project.setup.settings import SETTINGS_FILE, Settings

#: What `--require` says for the bar of relook.toml.
BAR = "bar"


def required_alpha(text: str, settings: Settings) -> float:
    """Return the alpha that `--require` asks for.

    Parameters
    ----------
    text : str
        A number above -1 and at most 1, or "bar" for that of relook.toml.
    settings : Settings

    Raises
    ------
    RelookError
        Anything else, or no bar in relook.toml.
    """
    if text.strip() == BAR:
        if settings.bar is None:
            raise RelookError(
                "--require bar, but there is no bar",
                where=Place(SETTINGS_FILE),
                mend="write alpha = 0.8 under [bar], or give the number: --require 0.8",
            )
        return settings.bar
    try:
        asked = float(text)
    except ValueError:
        asked = math.nan
    if not -1 < asked <= 1:
        raise RelookError(
            f'--require takes an alpha of at most 1, or "{BAR}"; got "{text}"',
            mend="write --require 0.8, or --require bar for that of relook.toml",
        )
    return asked


def refuse_changed_labels(score: Score) -> None:
    """Refuse to judge labels that may not be independent any more.

    Raises
    ------
    RelookError
        Label files are not those of the first round.
    """
    if score.changed_files:
        raise RelookError(
            "--require speaks of independently made labels, and the label files are not those of "
            "the first round",
            where=Place(", ".join(score.changed_files)),
            mend="put the labels of the first round back, or look at `relook rescore`",
        )


def shortfalls(score: Score, bar: float) -> list[str]:
    """Return a sentence for each variable whose alpha is undefined or below the bar.

    An alpha equal to the bar to 12 significant digits reaches it.
    """
    said = []
    for held in score.variables:
        alpha = held.agreement.alpha
        if alpha is None:
            because = held.agreement.undefined_because
            said.append(
                f"{held.name}: alpha is undefined ({because}), which does not reach {bar:g}"
            )
        elif alpha < bar - TIE * abs(bar):
            said.append(f"{held.name}: alpha {_told_apart(alpha, bar)} is below {bar:g}")
    return said


def _told_apart(alpha: float, bar: float) -> str:
    """Alpha to three decimals, or to as many as it takes to look lower than the bar."""
    decimals = next(n for n in range(3, 18) if n == 17 or float(f"{alpha:.{n}f}") < bar)
    return f"{alpha:.{decimals}f}"
