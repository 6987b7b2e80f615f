"""How long the whole stock takes to assess."""

from __future__ import annotations

from agewatch.plant.assess import assess
from tests.bench.rows import Row, best_s
from tests.bench.stocks import AT_S, Plant, plant


def _assess_s(stock: Plant, runs: int = 3) -> float:
    return best_s(
        lambda: assess(stock.inventory, stock.readings, stock.outlook, stock.settings, "", AT_S), runs
    )


def rows() -> list[Row]:
    """100,000 coils against the bar, and how the time grows with their number."""
    exact = _assess_s(plant(100_000, spreads=False))
    found = [Row("assess 100,000 coils, steels known exactly", exact, "s", bar=0.5)]
    for coils in (1_000, 10_000, 100_000):
        took = _assess_s(plant(coils))
        found.append(Row(f"assess {coils:,} coils with P10/P50/P90 and risk", took, "s"))
        found.append(
            Row(f"assess {coils:,} coils with P10/P50/P90 and risk, a coil", took / coils * 1e6, "µs")
        )
    return found
