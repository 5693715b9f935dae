"""Random tables, and every difference function of numbers beside its definition."""

from __future__ import annotations

import numpy as np

from reference import by_definition as twin
from relook.core.agreement import Agreement, measure_agreement
from relook.core.differences import difference_function

CASES = {
    "nominal": (twin.nominal, {}),
    "ordinal": (twin.ordinal, {}),
    "interval": (twin.interval, {}),
    "ratio": (twin.ratio, {}),
    "circular": (twin.circular(7), {"period": 7}),
    "polar": (twin.polar(0, 9), {"ends": [0, 9]}),
}


def random_table(rng, n_items=8, n_coders=5, n_values=5):
    return {
        item: [
            (coder, int(rng.integers(1, n_values + 1)))
            for coder in range(n_coders)
            if rng.random() > 0.3
        ]
        for item in range(n_items)
    }


def measured(table, name="nominal") -> tuple[Agreement, twin.Coded]:
    data = twin.coded(table)
    function = difference_function(name, CASES[name][1])
    numbers = data.numbers() if function.needs == "number" else None
    return measure_agreement(data.labels, function, numbers), data


def tables(name, how_many=60):
    """Random tables, with their agreement, where something is pairable."""
    rng = np.random.default_rng([ord(letter) for letter in name])
    for _ in range(how_many):
        table = random_table(rng, int(rng.integers(1, 9)), int(rng.integers(2, 6)))
        if twin.pairable(table):
            yield table, *measured(table, name)
