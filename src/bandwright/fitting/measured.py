"""Measured data of one wafer: lines, X-ray period, X-ray mismatch, each with its error."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

from ..errors import QuantityError, ResultsError
from ..lines import CONTINUUM
from ..metrics import Pair, read_pair
from ..quantities import as_length, as_temperature, show, temperature_text

#: what names the line of the largest oscillator strength
STRONGEST = "strongest"


@dataclass(frozen=True, init=False)
class MeasuredLine:
    """A line that was measured.

    Parameters
    ----------
    wavelength : length
        In vacuum, ``"10.3 um"``.
    error : length
        One standard deviation of it, ``"0.02 um"``.
    pair : (upper, lower) or "strongest"
        Level numbers; the upper may be ``"continuum"``. ``"strongest"`` is the line of the
        largest oscillator strength that the design has.
    temperature : temperature, optional
        At which it was measured; the stack's if absent.

    Raises
    ------
    QuantityError, StackError
        If one of them can't be read; the text begins with its name.

    Examples
    --------
    >>> MeasuredLine("10.3 um", "20 nm", (2, 1), "77 K").name
    '2 to 1, 77 K'
    """

    wavelength_nm: float
    error_nm: float
    pair: Pair | None
    temperature_K: float | None

    def __init__(
        self, wavelength: object, error: object, pair: object = STRONGEST,
        temperature: object = None,
    ) -> None:  # fmt: skip
        length = as_length(wavelength, "wavelength")
        if length <= 0.0:
            raise QuantityError(f"wavelength: got {show(wavelength)}; it must be above zero")
        fill = {
            "wavelength_nm": length,
            "error_nm": _error(as_length(error, "error"), "error", error),
            "pair": None if pair == STRONGEST else read_pair(pair),
            "temperature_K": None if temperature is None
            else as_temperature(temperature, "temperature"),
        }  # fmt: skip
        for key, value in fill.items():
            object.__setattr__(self, key, value)

    @property
    def name(self) -> str:
        """Its levels and its temperature in words."""
        ends = "strongest line" if self.pair is None else f"{self.pair[0]} to {self.pair[1]}"
        at = "" if self.temperature_K is None else f", {temperature_text(self.temperature_K)}"
        return ends + at


@dataclass(frozen=True, init=False)
class Measured:
    """What one wafer was measured to be.

    Parameters
    ----------
    lines : iterable of MeasuredLine
    period, period_error : length, optional
        X-ray period, as `bandwright.xray_pattern` has it, with one standard deviation.
    mismatch_ppm : float, optional
        Mean mismatch if it were relaxed [1e-6], ``mean_mismatch_ppm`` of the X-ray positions.
    perpendicular_mismatch_ppm : float, optional
        In its place: the mismatch along growth [1e-6], as the zero order shows it.
    mismatch_error : float, optional
        One standard deviation of the mismatch given [1e-6].
    name, note : str, optional
        Where the data come from.

    Raises
    ------
    ResultsError
        If there is nothing, a value without its error, or both mismatches.
    QuantityError
        If a value can't be read, or an error is not above zero.

    Examples
    --------
    Invented:

    >>> len(Measured([MeasuredLine("10.3 um", "20 nm")], period="20.1 nm", period_error="0.1 Å"))
    2
    """

    lines: tuple[MeasuredLine, ...]
    period_nm: float | None
    period_error_nm: float | None
    mismatch_ppm: float | None
    mismatch_error_ppm: float | None
    along_growth: bool
    name: str | None
    note: str | None

    def __init__(
        self, lines: Iterable[MeasuredLine] = (), *, period: object = None,
        period_error: object = None, mismatch_ppm: object = None,
        perpendicular_mismatch_ppm: object = None, mismatch_error: object = None,
        name: str | None = None, note: str | None = None,
    ) -> None:  # fmt: skip
        if mismatch_ppm is not None and perpendicular_mismatch_ppm is not None:
            raise ResultsError("mismatch_ppm and perpendicular_mismatch_ppm are both given; they"
                               " say the same in two ways, leave one out")  # fmt: skip
        along = perpendicular_mismatch_ppm is not None
        given = perpendicular_mismatch_ppm if along else mismatch_ppm
        key = "perpendicular_mismatch_ppm" if along else "mismatch_ppm"
        _together(period, period_error, "period", "period_error", '"0.02 nm"')
        _together(given, mismatch_error, key, "mismatch_error", "40")
        fill: dict[str, object] = {
            "lines": tuple(lines), "along_growth": along, "name": name, "note": note,
            "period_nm": None, "period_error_nm": None, "mismatch_ppm": None,
            "mismatch_error_ppm": None,
        }  # fmt: skip
        if period is not None:
            length = as_length(period, "period")
            if length <= 0.0:
                raise QuantityError(f"period: got {show(period)}; it must be above zero")
            error = _error(as_length(period_error, "period_error"), "period_error", period_error)
            fill |= {"period_nm": length, "period_error_nm": error}
        if given is not None:
            error = _error(_ppm(mismatch_error, "mismatch_error"), "mismatch_error", mismatch_error)
            fill |= {"mismatch_ppm": _ppm(given, key), "mismatch_error_ppm": error}
        for name_, value in fill.items():
            object.__setattr__(self, name_, value)
        if not len(self):
            raise ResultsError("no data: give a line, an X-ray period or a mismatch")

    def __len__(self) -> int:
        """Return the number of data."""
        return len(self.lines) + sum(v is not None for v in (self.period_nm, self.mismatch_ppm))

    @property
    def xray_names(self) -> tuple[str, ...]:
        """What of X-rays was measured, in words."""
        mismatch = "mismatch along growth" if self.along_growth else "mean mismatch, relaxed"
        period = () if self.period_nm is None else ("X-ray period",)
        return period if self.mismatch_ppm is None else (*period, mismatch)


def _together(value: object, error: object, name: str, error_name: str, example: str) -> None:
    if (value is None) != (error is None):
        missing, there = (name, error_name) if value is None else (error_name, name)
        hint = f"; write for example {error_name} = {example}" if missing == error_name else ""
        raise ResultsError(f"{missing}: missing beside {there}{hint}")


def _error(value: float, name: str, given: object) -> float:
    if value <= 0.0:
        raise QuantityError(f"{name}: got {show(given)}; a standard deviation is above zero")
    return value


def _ppm(given: object, name: str) -> float:
    number = not isinstance(given, bool) and isinstance(given, int | float)
    if not number or not math.isfinite(given):  # type: ignore[arg-type]  # it is a number
        raise QuantityError(f"{name}: got {show(given)}; a number is due, in parts per million")
    return float(given)  # type: ignore[arg-type]  # as above


def end_of(given: object) -> object:
    """Return one end of a line as written in a file: a number, or ``"continuum"``.

    Examples
    --------
    >>> end_of("Continuum"), end_of(2)
    ('continuum', 2)
    """
    word = isinstance(given, str) and given.strip().lower() == CONTINUUM
    return CONTINUUM if word else given
