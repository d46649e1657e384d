"""Losses in result files."""

from __future__ import annotations

from femag.export.document import Entry
from femag.materials import Steinmetz
from femag.quantities import CoreLoss, LayerLoss, LossBudget, LossShare, PartLoss, WindingLoss


class PartLossEntry(Entry):
    """Core loss (W) of a part of the core (m3)."""

    name: str
    volume: float
    loss: float


class LossShareEntry(Entry):
    """Half the swing of B (T) and loss density (W/m3) that a share of the core stays below."""

    share: float
    flux_density: float
    loss_density: float


class SteinmetzEntry(Entry):
    """Loss parameters: k in W/m3 over Hz^alpha T^beta, Hz, peak T, degrees Celsius."""

    k: float
    alpha: float
    beta: float
    frequencies: tuple[float, float]
    flux_densities: tuple[float, float]
    temperature: float | None
    source: str


class CoreLossEntry(Entry):
    """Core loss: W, W/m3."""

    total: float
    total_of_sides: tuple[float, float]
    mean_density: float
    parts: list[PartLossEntry]
    volume_shares: list[LossShareEntry]
    waveform_factor: float
    minor_loops: int
    frequency_in_range: bool
    share_in_range: float
    bend: float
    material: SteinmetzEntry


class LossBudgetEntry(Entry):
    """Losses, W; null where one is not known and not in the total."""

    core: float | None
    copper_dc: float | None
    copper_ripple: float | None
    total: float


class LayerLossEntry(Entry):
    """Loss of a layer: W; radius in m; null where out of range."""

    section: int
    layer: int
    turns: int
    radius: float
    dc: float
    ripple: float | None
    crossing: float | None


class CopperLossEntry(Entry):
    """Loss of a winding: W; squared field in T2 m3; null where out of range."""

    name: str
    dc: float | None
    ripple: float | None
    crossing: float | None
    squared_field: float
    layers: tuple[LayerLossEntry, ...]
    crossing_of_turns: tuple[float, ...]
    note: str


def copper_loss_entry(loss: WindingLoss) -> CopperLossEntry:
    """Return the entry of a winding's loss."""
    layers = tuple(LayerLossEntry(**vars(layer)) for layer in loss.layers)
    return CopperLossEntry(**(vars(loss) | {"layers": layers}))


def copper_loss_of(entry: CopperLossEntry) -> WindingLoss:
    """Return the loss of a winding from its entry."""
    layers = tuple(LayerLoss(**layer.model_dump()) for layer in entry.layers)
    return WindingLoss(**(entry.model_dump() | {"layers": layers}))


def core_loss_entry(loss: CoreLoss) -> CoreLossEntry:
    """Return the entry of a core loss."""
    names = CoreLossEntry.model_fields.keys() - {"parts", "volume_shares", "material"}
    return CoreLossEntry(
        parts=[PartLossEntry(**vars(part)) for part in loss.parts],
        volume_shares=[LossShareEntry(**vars(share)) for share in loss.volume_shares],
        material=SteinmetzEntry(**vars(loss.material)),
        **{name: getattr(loss, name) for name in names},
    )


def core_loss_of(entry: CoreLossEntry) -> CoreLoss:
    """Return the core loss of an entry, without its fields."""
    nested = {"parts", "volume_shares", "material", "mean_density"}
    return CoreLoss(
        parts=tuple(PartLoss(**part.model_dump()) for part in entry.parts),
        volume_shares=tuple(LossShare(**share.model_dump()) for share in entry.volume_shares),
        material=Steinmetz(**entry.material.model_dump()),
        **entry.model_dump(exclude=nested),
    )


def loss_budget_entry(budget: LossBudget) -> LossBudgetEntry:
    """Return the entry of a loss budget."""
    return LossBudgetEntry(**vars(budget), total=budget.total)
