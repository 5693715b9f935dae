"""Row codes, ids, orders and fingerprints."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reference.made_sheets import SECRET
from relook.cells.writing import storable
from relook.worksheet import keys
from relook.worksheet.keys import (
    adjudicator_id,
    evidence_digest,
    evidence_digests,
    keyed_bytes,
    keyed_number,
    keyed_order,
    plain_key,
    row_key,
    row_keys,
    worksheet_id,
)

OTHER = bytes(32)


def test_codes_have_the_stated_forms() -> None:
    """Twelve, eight and six characters of Crockford's alphabet."""
    letters = "[0-9A-HJKMNP-TV-Z]"
    assert re.fullmatch(f"{letters}{{4}}(-{letters}{{4}}){{2}}", row_key(SECRET, "w", "a", "v"))
    assert re.fullmatch(f"{letters}{{4}}-{letters}{{4}}", worksheet_id(SECRET, 1, "a"))
    assert re.fullmatch(f"a-{letters}{{6}}", adjudicator_id(SECRET, "Ada"))


def test_codes_are_the_ones_recorded() -> None:
    """Codes stand in sheets that are out: these, worked out by hand with hmac, must never change."""
    import hashlib
    import hmac

    def prefixed(text: str) -> bytes:
        return len(text.encode()).to_bytes(8, "big") + text.encode()

    message = b"".join(map(prefixed, ("row", "w", "a", "v")))
    digest = hmac.new(SECRET, message, hashlib.sha256).digest()
    bits = "".join(f"{byte:08b}" for byte in digest)
    by_hand = "".join(keys.ALPHABET[int(bits[at : at + 5], 2)] for at in range(0, 60, 5))
    assert row_key(SECRET, "w", "a", "v").replace("-", "") == by_hand


def test_everything_that_goes_into_a_code_matters() -> None:
    """Secret, worksheet, item and variable; and where one part ends and the next begins."""
    made = {
        row_key(SECRET, "w", "ab", "c"),
        row_key(SECRET, "w", "a", "bc"),
        row_key(SECRET, "w2", "ab", "c"),
        row_key(OTHER, "w", "ab", "c"),
        row_key(SECRET, "wa", "b", "c"),
    }
    assert len(made) == 5
    assert keyed_bytes(SECRET, "p", "x") != keyed_bytes(SECRET, "px")


def test_colliding_codes_are_keyed_again(monkeypatch: pytest.MonkeyPatch) -> None:
    """No two rows of a worksheet share a code, even with an alphabet made to collide."""
    monkeypatch.setattr(keys, "KEY_LENGTH", 1)
    codes = row_keys(SECRET, "w", [(f"i{at}", "v") for at in range(25)])
    assert len(set(codes)) == 25


@pytest.mark.parametrize("typed", ["k7qf2m9x4trb", " K7QF 2M9X 4TRB ", "K7QF–2M9X-4TRB"])
def test_a_code_is_recognised_as_people_write_it(typed: str) -> None:
    """Case, spaces and dashes do not matter."""
    assert plain_key(typed) == "K7QF-2M9X-4TRB"


def test_letters_left_out_of_the_alphabet_are_read_as_digits() -> None:
    """O for 0, I and L for 1, as Crockford has it."""
    assert plain_key("OIL0-1111-2222") == "0110-1111-2222"


@given(st.lists(st.text(max_size=5), unique=True, max_size=30), st.randoms())
def test_an_order_does_not_depend_on_the_order_given(ids: list[str], chance: object) -> None:
    """The permutation puts the same ids in the same places, however they come."""
    order = keyed_order(SECRET, "p", ids)
    assert sorted(order) == list(range(len(ids)))
    turned = ids[::-1]
    again = keyed_order(SECRET, "p", turned)
    assert [ids[at] for at in order] == [turned[at] for at in again]


def test_orders_for_different_purposes_are_unrelated() -> None:
    """Two adjudicators' orders, and the file's, agree in about as many places as chance has it."""
    ids = [f"item {at:03}" for at in range(300)]
    first, second = keyed_order(SECRET, "a", ids), keyed_order(SECRET, "b", ids)
    # Matches of two random permutations are Poisson with mean 1: over 8 has a chance of 1e-6.
    assert sum(a == b for a, b in zip(first, second, strict=True)) <= 8
    assert sum(a == b for a, b in enumerate(first)) <= 8


def test_keyed_numbers_are_spread_evenly() -> None:
    """Mean of 2,000 numbers on [0, 1): within five standard errors, 5 × sqrt(1/12/2000), of ½."""
    numbers = [keyed_number(SECRET, "n", str(at)) for at in range(2_000)]
    assert 0 <= min(numbers) <= max(numbers) < 1
    assert abs(sum(numbers) / 2_000 - 0.5) < 0.033


def test_an_adjudicator_is_the_same_however_the_name_is_spaced() -> None:
    """Spaces and the form of accents do not make another person."""
    assert adjudicator_id(SECRET, " Ada  Lo\u0301pez ") == adjudicator_id(SECRET, "Ada L\u00f3pez")


@pytest.mark.parametrize(
    ("sent", "returned"),
    [
        ("a\r\nb", "a\nb"),
        ("a\tb", "a b"),
        ("e\u0301", "\u00e9"),
        ("a_x000D_b", "a\rb"),
        ("a_x0041_b", storable("a_x0041_b")),
        ("\x01x", "\ufffdx"),
        ("two  spaces ", "two spaces"),
        ("🚢" * 20_000, storable("🚢" * 20_000)),
    ],
)
def test_a_digest_survives_what_programs_change_on_their_own(sent: str, returned: str) -> None:
    """Line ends, tabs, escapes and cuts are no edits."""
    assert evidence_digests({"text": sent}) == {"text": evidence_digest(returned)}


def test_a_digest_tells_an_edit() -> None:
    """A changed letter, case or number gives another digest."""
    assert len({evidence_digest(text) for text in ("delay", "Delay", "delays", "")}) == 4
