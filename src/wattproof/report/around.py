"""Which document and which page belong to the result of a procedure around the power statement."""

from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

from wattproof.procedures.crosstalk import CrosstalkResult
from wattproof.procedures.efficiency import EfficiencyResult
from wattproof.procedures.frequency import FrequencyResult
from wattproof.procedures.gain import GainResult
from wattproof.procedures.idle import IdleResult
from wattproof.procedures.output_resistance import ImpedanceResult
from wattproof.procedures.response_result import ResponseResult
from wattproof.report.crosstalk_document import crosstalk_document, crosstalk_sheet
from wattproof.report.efficiency_document import efficiency_document, efficiency_sheet
from wattproof.report.frequency_document import frequency_document, frequency_sheet
from wattproof.report.gain_document import gain_document, gain_sheet
from wattproof.report.idle_document import idle_document, idle_sheet
from wattproof.report.output_resistance_document import output_resistance_document, output_resistance_sheet
from wattproof.report.quantities import Document, Frame
from wattproof.report.response_document import response_document, response_sheet
from wattproof.report.sheet import Sheet

_PAGES: Mapping[type, tuple[Callable[[Any, Frame], Document], Callable[[Any], Sheet]]] = MappingProxyType({
    CrosstalkResult: (crosstalk_document, crosstalk_sheet),
    EfficiencyResult: (efficiency_document, efficiency_sheet),
    FrequencyResult: (frequency_document, frequency_sheet),
    GainResult: (gain_document, gain_sheet),
    ImpedanceResult: (output_resistance_document, output_resistance_sheet),
    IdleResult: (idle_document, idle_sheet),
    ResponseResult: (response_document, response_sheet),
})  # fmt: skip


def document_of(result: object, frame: Frame) -> Document:
    """Return the JSON document of a result."""
    return _PAGES[type(result)][0](result, frame)


def sheet_of(result: object) -> Sheet:
    """Return the page of a result."""
    return _PAGES[type(result)][1](result)
