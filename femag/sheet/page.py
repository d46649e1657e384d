"""The sheet as one HTML file: nothing is loaded, everything that is printed is escaped."""

from __future__ import annotations

from base64 import b64encode
from collections import Counter
from functools import cache
from hashlib import sha256
from importlib.resources import files

from jinja2 import Environment, StrictUndefined, Template
from markupsafe import Markup

from femag.answer import cautions, described, hand_caveat, what_is_bounded, where_it_saturates
from femag.design_file import design_toml
from femag.review import Review
from femag.sheet import losses, tables
from femag.sheet.field_data import as_script, field_data
from femag.sheet.figures import review_figures
from femag.sheet.texts import shown_together
from femag.tolerance_answer import CUSTOMARY_NOTE

FULL_BAR = 0.25
"""Error of a hand formula that fills its bar."""


def review_sheet(review: Review, file: str = "") -> str:
    """Return the sheet of a review as the text of an HTML file.

    Equal reviews give equal texts, whenever they were made.

    Parameters
    ----------
    review : Review
        What it shows.
    file : str
        Where the design was read from, for print.
    """
    style, script = _resource("page.css"), _resource("field_viewer.js")
    return _template().render(
        policy=_policy(style, script),
        style=Markup(style),  # both are our own
        script=Markup(script),
        data=Markup(as_script(_fields(review))),
        figures=review_figures(review),
        title=review.design.title or "Design without a title",
        file=file,
        review=review,
        verdict=verdict(review),
        counts=Counter(check.verdict for check in review.checks),
        tables=tables,
        losses=losses,
        texts=_texts(review),
        full_bar=FULL_BAR,
    )


def verdict(review: Review) -> str:
    """Return in words whether the requirements are kept."""
    counts = Counter(check.verdict for check in review.checks)
    total = sum(counts.values())
    if not total:
        return "No requirements were given"
    if counts["kept"] == total:
        return "The requirement is kept" if total == 1 else f"All {total} requirements are kept"
    missed, unshown = counts["missed"], counts["not shown"]
    parts = [f"{missed} {'is' if missed == 1 else 'are'} missed"] if missed else []
    if unshown:
        parts.append(f"{unshown} {'is' if unshown == 1 else 'are'} not shown to be kept")
    return f"Of {total} requirement{'' if total == 1 else 's'}, {' and '.join(parts)}"


def _texts(review: Review) -> dict[str, str]:
    """Return the paragraphs that depend on the design."""
    result = review.result
    bounds = result.inductance
    value, lower, upper = shown_together((bounds.value, bounds.lower, bounds.upper), "H", 5)
    return {
        "described": described(review.design).plain.replace("\n", "; "),
        "answer": (
            f"Inductance {value} at {result.current:g} A, between {lower.split()[0]} and {upper}."
        ),
        "saturates": where_it_saturates(result),
        "bounded": what_is_bounded(result),
        "model": review.design.core.model_note,
        "caveat": " ".join(line.plain for line in hand_caveat(result)),
        "clearance": tables.clearance_text(result),
        "cautions": cautions(result.stored_energy, result.current),
        "customary": CUSTOMARY_NOTE,
        "design": design_toml(review.design),
    }


def _fields(review: Review) -> dict[str, object]:
    measured = set() if review.measured is None else set(review.measured.current)
    peak = review.design.current
    grid = [
        solution.current
        for solution in review.curve.solutions
        if solution.current not in measured or solution.current == peak
    ]
    return field_data(review.curve, peak, grid)


def _policy(style: str, script: str) -> str:
    """Return the content security policy: pictures in the file, this style, this script."""
    hashes = (b64encode(sha256(text.encode()).digest()).decode("ascii") for text in (style, script))
    style_hash, script_hash = hashes
    return (
        f"default-src 'none'; img-src data:; style-src 'sha256-{style_hash}'; "
        f"script-src 'sha256-{script_hash}'; base-uri 'none'; form-action 'none'"
    )


@cache
def _resource(name: str) -> str:
    return files("femag.sheet").joinpath(name).read_text(encoding="utf-8")


@cache
def _template() -> Template:
    environment = Environment(
        autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True
    )
    return environment.from_string(_resource("page.html.jinja"))
