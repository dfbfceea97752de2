"""Limits against hostile files; every one can be set by the caller."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Limits:
    """How large a workbook may be before it is refused.

    The defaults leave room for the largest sheets that people keep by hand, and end decompression
    bombs and endless nesting long before they hurt the machine.

    Parameters
    ----------
    file_size : int
        Size of the file. [bytes]
    entries : int
        Members of the archive; at most 65 534.
    total_size : int
        All members unpacked. [bytes]
    ratio : float
        Unpacked size over packed size of any member above `ratio_from`. [-]
    ratio_from : int
        Smaller members may be packed as tightly as they like. [bytes]
    xml_depth : int
        Elements inside one another.
    cells : int
        Cells that the file lists, over all sheets.
    formula_length : int
        Characters of one formula; Excel itself allows 8192.

    Examples
    --------
    >>> Limits(cells=1000).cells
    1000
    """

    file_size: int = 512 * 2**20
    entries: int = 20_000
    total_size: int = 2 * 2**30
    ratio: float = 200.0
    ratio_from: int = 16 * 2**20
    xml_depth: int = 100
    cells: int = 10_000_000
    formula_length: int = 32_768
