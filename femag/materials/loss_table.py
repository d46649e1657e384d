"""The table loss of material and design files, in and out."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.materials.known_keys import require_known
from femag.materials.steinmetz import Steinmetz, steinmetz_through
from femag.units import ACCEPTED, TEMPERATURE, celsius, exact_text, si_value

Array = NDArray[np.float64]

TABLE = (
    "a table such as { k = 1.5, alpha = 1.45, beta = 2.6, frequencies = ['25 kHz', '300 kHz'], "
    "flux_densities = ['30 mT', '300 mT'] }, or { readings = [['100 kHz', '0.2 T', '400 kW/m3'], "
    "...] }"
)
PARAMETERS = ("k", "alpha", "beta", "frequencies", "flux_densities")
READING = ("Hz", "T", "W/m3")


def loss_of_table(table: object, key: str = "loss") -> Steinmetz:
    """Return the loss parameters of a table: given, or fitted to readings.

    Parameters
    ----------
    table : mapping
        `k`, `alpha`, `beta`, `frequencies` and `flux_densities`, or `readings`; `temperature` and
        `source` beside either.
    key : str
        Where the table stands, for messages.

    Raises
    ------
    InputError
        If a key or value cannot be used.
    """
    if isinstance(table, Steinmetz):
        return table
    if not isinstance(table, Mapping):
        raise InputError("not a table", key=key, value=table, accepted=TABLE)
    try:
        require_known(table, (*PARAMETERS, "readings", "temperature", "source"))
        return _loss(table)
    except InputError as error:
        raise error.changed(key=f"{key}.{error.key}") from error


def loss_document(loss: Steinmetz) -> dict[str, Any]:
    """Return the table that `loss_of_table` turns into equal parameters."""
    document: dict[str, Any] = {
        "k": float(loss.k),
        "alpha": float(loss.alpha),
        "beta": float(loss.beta),
        "frequencies": [exact_text(value, "Hz") for value in loss.frequencies],
        "flux_densities": [exact_text(value, "T") for value in loss.flux_densities],
    }
    if loss.temperature is not None:
        document["temperature"] = f"{float(loss.temperature)!r} C"
    return document | ({"source": loss.source} if loss.source else {})


def _loss(table: Mapping[str, Any]) -> Steinmetz:
    stated: dict[str, Any] = {"source": table.get("source", "")}
    if "temperature" in table:
        stated["temperature"] = _keyed("temperature", celsius, table["temperature"])
    if "readings" in table:
        for key in PARAMETERS:
            if key in table:
                raise InputError("stands beside readings", key=key, accepted="one of the two")
        return steinmetz_through(*_readings(table["readings"]), **stated)
    for key in PARAMETERS:
        if key not in table:
            raise InputError("missing", key=key, accepted=f"{', '.join(PARAMETERS)}; or readings")
    return Steinmetz(
        table["k"],
        table["alpha"],
        table["beta"],
        _limits("frequencies", table["frequencies"], "Hz"),
        _limits("flux_densities", table["flux_densities"], "T"),
        **stated,
    )


def _keyed(key: str, read: Any, value: object) -> float:
    try:
        return float(read(value))
    except InputError as error:
        accepted = error.accepted or TEMPERATURE
        raise InputError(error.problem, key=key, value=value, accepted=accepted) from error


def _limits(key: str, given: object, unit: str) -> tuple[float, float]:
    if not isinstance(given, list | tuple) or len(given) != 2:
        raise InputError(
            "not a pair", key=key, value=given, accepted=f"lowest and highest: {ACCEPTED[unit]}"
        )
    low, high = (_keyed(key, lambda text: si_value(text, unit), value) for value in given)
    return low, high


def _readings(given: object) -> tuple[Array, Array, Array]:
    accepted = "a list of triples such as ['100 kHz', '0.2 T', '400 kW/m3']"
    if not isinstance(given, list) or not given:
        raise InputError("not a list", key="readings", value=given, accepted=accepted)
    rows = []
    for entry in given:
        if not isinstance(entry, list | tuple) or len(entry) != len(READING):
            raise InputError("not a triple", key="readings", value=entry, accepted=accepted)
        try:
            rows.append([si_value(text, unit) for text, unit in zip(entry, READING, strict=True)])
        except InputError as error:
            raise error.changed(key="readings") from error
    frequency, flux_density, loss_density = np.array(rows).T
    return frequency, flux_density, loss_density
