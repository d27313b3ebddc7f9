"""The real window on a virtual screen: formulas typed by keyboard, the typing help, a picture of it."""

from __future__ import annotations

import os
import shutil
import subprocess
import time
from contextlib import contextmanager
from pathlib import Path

import pytest
from calc_session import Session, settings

#: Names a folder to keep the picture in.
PICTURES = "UFFUNCS_PICTURES"
NEEDED = ("Xvfb", "xdotool", "import")
WIDTH, HEIGHT = 1400, 480
ROWS = (
    ("Transmembrane pressure", "35 psi"),
    ("Viscosity, mPa·s", 1.002),
    ("Membrane resistance, 1/m", 5e12),
    ("Cake resistance, 1/m", 1e12),
    ("Flux, LMH", None),
    ("Pressure for 20 gfd, bar", None),
    ("Flux of a negative pressure", None),
    ("Why?", None),
    ("Flux of the clean membrane, LMH", None),
)


@pytest.fixture
def screen(office):
    missing = [name for name in NEEDED if shutil.which(name) is None]
    if missing:
        reason = f"no virtual screen: {', '.join(missing)} missing"
        if os.environ.get("UFFUNCS_NEED_CALC"):
            pytest.fail(reason)
        pytest.skip(reason)
    with virtual_screen() as name:
        yield name


@contextmanager
def virtual_screen():
    command = ["Xvfb", "-displayfd", "1", "-screen", "0", f"{WIDTH}x{HEIGHT}x24", "-nolisten", "tcp"]
    server = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True)
    try:
        yield ":" + server.stdout.readline().strip()
    finally:
        server.terminate()
        server.wait()
        server.stdout.close()


class Keyboard:
    """Types into whatever has the focus of a screen, and takes pictures of it."""

    def __init__(self, screen: str):
        self.environment = os.environ | {"DISPLAY": screen}

    def _run(self, *command):
        subprocess.run(command, env=self.environment, check=True, timeout=60)

    def click(self, x: int, y: int):
        self._run("xdotool", "mousemove", str(x), str(y), "click", "1")

    def type(self, text: str):
        self._run("xdotool", "type", "--delay", "40", text)

    def press(self, *keys: str):
        self._run("xdotool", "key", *keys)

    def picture(self, path: Path) -> Path:
        self._run("import", "-window", "root", str(path))
        return path


def waited_for(found, seconds: float = 15.0):
    deadline = time.monotonic() + seconds
    while not found() and time.monotonic() < deadline:
        time.sleep(0.1)
    return found()


def test_a_formula_typed_into_the_window(office, screen, tmp_path):
    keyboard = Keyboard(screen)
    with Session(
        office,
        tmp_path,
        settings(tmp_path),
        hidden=False,
        environment={"DISPLAY": screen, "LC_ALL": "C.UTF-8"},
    ) as session:
        document = session.open(Hidden=False)
        try:
            window = document.CurrentController.Frame.ContainerWindow
            window.setPosSize(0, 0, WIDTH, HEIGHT, 15)
            sheet = document.Sheets.getByIndex(0)
            fill(sheet)
            time.sleep(1.5)
            window.setFocus()
            document.CurrentController.ComponentWindow.setFocus()

            def enter(place: str, formula: str, picture: str = ""):
                """Type a formula, with a picture in the midst of it; the cell when it shows something."""
                cell = sheet.getCellRangeByName(place)
                document.CurrentController.select(cell)
                start = formula.rindex(",") + 1 if picture else 0
                if picture:
                    keyboard.type(formula[:start])
                    time.sleep(0.5)
                    keyboard.picture(tmp_path / picture)
                keyboard.type(formula[start:])
                keyboard.press("Return")
                assert waited_for(lambda: cell.String), place
                return cell

            assert enter("B5", "=UF_FLUX_DARCY(B1;B2;B3;;B4)").Value == pytest.approx(144.5, rel=1e-3)
            solved = enter(
                "B6", '=UF_SOLVE_FOR("UF_FLUX_DARCY";"transmembrane_pressure";"20 gfd";;B2;B3;;B4)'
            )
            assert solved.Value == pytest.approx(2.413 * 33.95 / 144.5, rel=1e-3)
            assert enter("B7", "=UF_FLUX_DARCY(-1;B2;B3)").String == "#NUM!"
            assert "must be 0 to 200 bar; got -1" in enter("B8", '=UF_WHY("UF_FLUX_DARCY";-1;B2;B3)').String
            clean = enter("B9", "=UF_FLUX_DARCY(B1,B2,B3)", picture="typing.png")
            assert clean.Value == pytest.approx(173.4, rel=1e-3)
            typing, done = tmp_path / "typing.png", keyboard.picture(tmp_path / "done.png")
            assert typing.stat().st_size > 5000 and done.read_bytes() != typing.read_bytes()
            if folder := os.environ.get(PICTURES):
                shutil.copy(typing, Path(folder) / "calc.png")
        finally:
            document.setModified(False)
            document.close(True)


def fill(sheet):
    for row, (label, value) in enumerate(ROWS):
        sheet.getCellByPosition(0, row).setString(label)
        if isinstance(value, str):
            sheet.getCellByPosition(1, row).setString(value)
        elif value is not None:
            sheet.getCellByPosition(1, row).setValue(value)
    sheet.Columns.getByIndex(0).Width = 6000
    sheet.Columns.getByIndex(1).Width = 3500
