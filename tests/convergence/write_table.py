"""Measure all orders and write docs/orders.md."""

from __future__ import annotations

from pathlib import Path

from tests.convergence.field_orders import measure, sort_pairs
from tests.convergence.order_table import page

PAGE = Path(__file__).parents[2] / "docs" / "orders.md"


def main() -> None:
    """Write the page."""
    allowed, refused = sort_pairs()
    PAGE.write_text(page([measure(*pair) for pair in allowed], refused), encoding="utf-8")


if __name__ == "__main__":
    main()
