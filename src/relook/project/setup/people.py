"""Adjudicators: recorded under ids, their names kept in relook.toml alone."""

from __future__ import annotations

from relook.core.decisions import LEAD
from relook.project.setup.folder import Project
from relook.worksheet.keys import adjudicator_id
from relook.worksheet.plan import Adjudicator


def adjudicators_of(project: Project, secret: bytes) -> tuple[Adjudicator, ...]:
    """Return the adjudicators of relook.toml with the ids they are recorded under."""
    return tuple(
        Adjudicator(id=adjudicator_id(secret, name), name=name, coder=coder)
        for name, coder in project.settings.worksheet.adjudicators.items()
    )


def names_by_id(project: Project) -> dict[str, str]:
    """Return the name of each adjudicator by id, as far as relook.toml still has it."""
    if not project.has_secret:
        return {}
    secret = project.secret()
    names = {held.id: held.name for held in adjudicators_of(project, secret)}
    return {**names, LEAD: "panel"}
