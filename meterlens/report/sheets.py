"""What a table of a page is: columns, groups of rows, and how small screens show it."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Column", "Group", "Row", "Table"]

Row = tuple[str, ...]


@dataclass(frozen=True)
class Column:
    """A column's heading and the kind of its cells: ``num``, ``time``, ``long`` or plain."""

    heading: str
    kind: str = ""


@dataclass(frozen=True)
class Group:
    """Rows that belong together; without a heading where the table has one group only."""

    heading: str
    rows: tuple[Row, ...]


@dataclass(frozen=True)
class Table:
    """A table ready to lay out.

    Attributes
    ----------
    name : str
        What the rows are, for those who hear the page.
    caption : str
        How the rows are chosen and what their cells mean.
    columns : tuple of Column
        Headings; the first one heads its row.
    groups : tuple of Group
        Rows of cells as text.
    stacked : bool
        Whether a small screen shows each row as a card instead of scrolling sideways.
    """

    name: str
    caption: str
    columns: tuple[Column, ...]
    groups: tuple[Group, ...]
    stacked: bool = False

    @property
    def rows(self) -> tuple[Row, ...]:
        """All rows, whatever their group."""
        return tuple(row for group in self.groups for row in group.rows)
