"""A growth sheet, or what was kept of it, back to a stack."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Any

from .. import quantities as q
from ..errors import GrowthError
from ..frames import is_table
from ..frames import rows as rows_of_table
from ..stack import Stack
from .rows import read_rows, said_of, stack_of_rows
from .sheet import GrowthSheet

if TYPE_CHECKING:
    import pandas as pd


def stack_from_sheet(
    sheet: GrowthSheet | pd.DataFrame | str | os.PathLike[str],
    *,
    whole: bool | None = None,
    **stack_arguments: Any,
) -> Stack:
    """Return the stack that a growth sheet grows.

    Parameters
    ----------
    sheet : GrowthSheet, DataFrame or path
        A sheet, its ``table``, or the CSV file that ``bandwright grow`` writes.
    whole : bool, optional
        Whether layers have the whole monolayers of the sheet, or the thickness written. As the
        sheet has it, and whole in tables and files, unless given.
    **stack_arguments
        As for `Stack`. A sheet knows what its stack says beyond its layers; for a table or a
        file it is given here, ``order`` too.

    Returns
    -------
    Stack
        Its sheet is the same but for thicknesses, which are those of whole monolayers now.
        With ``whole=False`` it is the designed stack.

    Raises
    ------
    GrowthError
        If a row is no step of a sheet.
    StackError, QuantityError
        If its layers can't be grown.

    Examples
    --------
    >>> import bandwright as bw
    >>> sheet = bw.growth_sheet(bw.parse_line("6.2 nm GaAs", substrate="GaAs"))
    >>> bw.stack_from_sheet(sheet)
    Stack([Layer('22 ML', 'GaAs')], substrate='GaAs')
    >>> bw.stack_from_sheet(sheet, whole=False) == sheet.stack
    True
    """
    if isinstance(sheet, GrowthSheet):
        said = {**said_of(sheet.stack, sheet.order), **stack_arguments}
        return stack_of_rows(sheet.rows, whole=sheet.whole if whole is None else whole, **said)
    if is_table(sheet):
        rows = rows_of_table(sheet)
    elif isinstance(sheet, str | os.PathLike):
        rows = read_rows(sheet)
    else:
        raise GrowthError(f"got {q.show(sheet)}; give a GrowthSheet, its table, or a CSV file")
    return stack_of_rows(rows, whole=whole is not False, **stack_arguments)
