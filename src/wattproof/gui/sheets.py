"""Gives every task besides the watch and the power statement its page and its sheet."""

from collections.abc import Callable

from wattproof.core.audio_device import Device
from wattproof.gui import task_text
from wattproof.gui.calibration_desk import CalibrationDesk
from wattproof.gui.device_page import DevicePage
from wattproof.gui.panel import Page
from wattproof.gui.planner_page import PlannerPage
from wattproof.gui.rig_page import RigPage
from wattproof.gui.task_board import Sheet, TaskBoard
from wattproof.gui.tasks import Task
from wattproof.gui.theme import Theme
from wattproof.procedures.guard import FIRST_POWER_UP


def add_sheets(
    board: TaskBoard, theme: Theme, look: Callable[[], tuple[Device, ...]], open_bench: Callable[[str], None]
) -> None:
    """Add what each task needs."""
    runner = board.runner
    board.add(Task.FIRST_POWER_UP, _power_up_page(theme), Sheet())
    scale = runner.calibration.input_vrms(runner.rig.wirings[0].input)
    planner = PlannerPage(theme, runner.rig, None if scale is None else scale.value)
    board.add(Task.PLANNER, planner, Sheet("", planner.sheet, task_text.PLAN, planner.start, opened=planner.show_plan))
    rig = RigPage(theme, runner.rig)
    board.add(Task.RIG, rig, Sheet("", rig.sheet, task_text.STORE_RIG, rig.start, opened=rig.opened))
    calibration = CalibrationDesk(theme, runner, board.face.panel.card)
    board.add(
        Task.CALIBRATE,
        calibration,
        Sheet("", calibration.sheet, task_text.CALIBRATE, calibration.start, opened=calibration.opened),
    )
    board.runs.append(calibration)
    devices = DevicePage(theme, look, open_bench)
    board.add(
        Task.DEVICES, devices, Sheet("", devices.sheet, task_text.OPEN_DEVICE, devices.start, opened=devices.look)
    )


def _power_up_page(theme: Theme) -> Page:
    page = Page(theme)
    for line in FIRST_POWER_UP:
        page.add_words(f"{line[:1].upper()}{line[1:]}.", "sheet")
    page.rows.addStretch(1)
    return page
