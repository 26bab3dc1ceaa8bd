"""Calibration records as TOML files, bound to device, channel, rate and sample format."""

from pathlib import Path
from typing import Any, get_origin

import numpy as np

from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.loopback import Response
from wattproof.core.signal import Samples
from wattproof.store.record_file import Format, new_converter, read_document, save, structured, written

CALIBRATION = Format("calibration", 1, new_converter())
_PARTS = ("frequency_hz", "magnitude", "phase_deg")


def _samples(value: object, _: Any) -> Samples:  # noqa: ANN401 - cattrs hands the type over
    array = np.asarray(value, dtype=object)
    if array.ndim != 1 or not all(isinstance(each, int | float) and not isinstance(each, bool) for each in array):
        raise ValueError("a list of plain numbers is wanted")
    return array.astype(np.float64)


def _response(value: Any, _: Any) -> Response:  # noqa: ANN401 - whatever the file holds
    if not isinstance(value, dict) or set(value) != set(_PARTS):
        raise ValueError(f"a response has {', '.join(_PARTS)}, each a list of numbers")
    frequency_hz, magnitude, phase_deg = (_samples(value[name], None) for name in _PARTS)
    if not frequency_hz.shape == magnitude.shape == phase_deg.shape:
        raise ValueError(f"{', '.join(_PARTS)} differ in length; each frequency has one gain")
    gain = np.zeros(magnitude.size, dtype=np.complex128)
    gain[:] = magnitude * np.exp(1j * np.deg2rad(phase_deg))
    return Response(frequency_hz, gain)


def _response_table(response: Response) -> dict[str, list[float]]:
    gain = response.gain
    columns = (response.frequency_hz, np.abs(gain), np.rad2deg(np.angle(gain)))
    return {name: column.tolist() for name, column in zip(_PARTS, columns, strict=True)}


def _is_array(cls: Any) -> bool:  # noqa: ANN401 - any type of any field
    return get_origin(cls) is np.ndarray


CALIBRATION.converter.register_structure_hook_func(_is_array, _samples)
CALIBRATION.converter.register_structure_hook(Response, _response)
CALIBRATION.converter.register_unstructure_hook(Response, _response_table)
CALIBRATION.converter.register_unstructure_hook_func(_is_array, lambda array: array.tolist())


def read_calibration(file: Path) -> Calibration:
    """Read a calibration record.

    Raises:
        WrongUseError: the line names file, line and field, and says what to do.
    """
    return structured(read_document(file, CALIBRATION), Calibration, CALIBRATION)


def write_calibration(file: Path, calibration: Calibration) -> None:
    """Write a calibration record, whole or not at all.

    Raises:
        WrongUseError: the file cannot be written.
    """
    save(file, calibration_text(calibration))


def calibration_text(calibration: Calibration) -> str:
    """Return the TOML text of a calibration record."""
    return written(CALIBRATION.converter.unstructure(calibration), CALIBRATION)


def require_suits(
    calibration: Calibration, device: str, rate_hz: float, inputs: tuple[int, ...], sample_format: str = ""
) -> None:
    """Accept a calibration that was made of this device, at this rate, for these inputs, in this sample format.

    Raises:
        WrongUseError: it was made of another; the line names both, and what to do.
    """
    anew = "calibrate this one: wattproof measure calibrate"
    if calibration.device != device:
        raise WrongUseError(f"the calibration is of {calibration.device!a}, and this device is {device!a}; {anew}")
    if calibration.rate_hz is not None and calibration.rate_hz != rate_hz:
        raise WrongUseError(
            f"the calibration is for {calibration.rate_hz:g} Hz, and this run is at {rate_hz:g} Hz; {anew}"
        )
    known = {scale.socket for scale in calibration.inputs} | {loop.input for loop in calibration.loops}
    missing = [socket for socket in inputs if socket not in known]
    if missing:
        has = ", ".join(str(socket) for socket in sorted(known)) or "no input"
        raise WrongUseError(f"the calibration knows input {has}, and the rig uses input {missing[0]}; {anew}")
    if sample_format and calibration.sample_format and sample_format != calibration.sample_format:
        raise WrongUseError(
            f"the calibration was made in {calibration.sample_format}, the device now delivers {sample_format}; {anew}"
        )
