"""How quick the window is with a campaign of 10,000 spectra.

Run it with `python -m tests.benchmarks.window`. Times are processor time, so that other work on the
machine disturbs little; targets stand beside them. The fits of the 10,000 are made up from their
truth, and the judging of them is left out: its time is measured elsewhere.
"""

from __future__ import annotations

import hashlib
import os
import random
import resource
import shutil
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QPoint, QSettings
from PySide6.QtWidgets import QApplication, QGridLayout, QWidget

from coatgui.assessment.assess import conclude
from coatgui.campaign import CampaignFile
from coatgui.progress import Progress
from coatgui.records import Assessment, Found, FoundReading, Source
from coatgui.shipped import sample_panels
from coatgui.window import palette
from coatgui.window.main_window import MainWindow
from coatgui.window.places.map_place import MapPlace
from coatgui.window.places.reading_place import ReadingPlace
from tests.benchmarks.assessment_of_many import large_campaign
from tests.benchmarks.watchdog import Watchdog

_BARE = "import PySide6.QtWidgets, pyqtgraph, numpy"
_WINDOW = """
from PySide6.QtCore import QSettings
from PySide6.QtWidgets import QApplication
from coatgui.window import palette
from coatgui.window.main_window import MainWindow
app = QApplication([])
palette.apply(app, palette.colours(False))
window = MainWindow(QSettings('{ini}', QSettings.Format.IniFormat), False)
window.show()
app.processEvents()
"""


def say(what: str, value: float, unit: str, target: float, at_least: bool = False) -> None:
    met = value >= target if at_least else value <= target
    sign = "≥" if at_least else "≤"
    print(f"{'met   ' if met else 'MISSED'}  {what}: {value:.4g} {unit} ({sign} {target:g})")


def child_seconds(code: str) -> float:
    """Processor time of a Python that runs this code, the least of five."""
    taken = []
    for _ in range(5):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        subprocess.run([sys.executable, "-c", code], check=True, stderr=subprocess.DEVNULL)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        taken.append(after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime)
    return min(taken)


def memory_mb() -> float:
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * resource.getpagesize() / 1e6


def picks(window: MainWindow, application: QApplication, ids: list[str]) -> list[float]:
    """Seconds from the pick of a reading to all linked plots repainted."""
    taken = []
    for key in ids:
        start = time.process_time()
        window.desk.select(key)
        application.processEvents()
        taken.append(time.process_time() - start)
    return taken


def plain_picks(window: MainWindow, application: QApplication, ids: list[str]) -> list[float]:
    """The same spectra in four plain plots of the same size, their curves given other data."""
    place = next(p for p in window.places if isinstance(p, ReadingPlace))
    holder = QWidget()
    grid = QGridLayout(holder)
    plots = [pg.PlotWidget() for _ in range(4)]
    for number, (plot, ours) in enumerate(zip(plots, place.plots.plots, strict=True)):
        plot.setFixedSize(ours.size())
        grid.addWidget(plot, number // 2, number % 2)
    plots[0].setLogMode(True, True)
    plots[1].setLogMode(True, False)
    plots[3].setLogMode(True, False)
    points = [plot.plot([1.0], [1.0], pen=None, symbol="o", symbolSize=7) for plot in plots]
    lines = [plot.plot([1.0], [1.0]) for plot in plots[:3]]
    more = plots[3].plot([1.0], [1.0], pen=None, symbol="t", symbolSize=6)
    holder.show()
    application.processEvents()
    assert window.desk.campaign is not None
    readings = {r.reading_id: r for r in window.desk.campaign.readings}
    taken = []
    for key in ids:
        known = window.desk.assessment.reading(key) if window.desk.assessment else None
        assert known is not None
        assert known.fit is not None
        start = time.process_time()
        spectrum = readings[key].spectrum
        f, z, m = spectrum.frequency_hz, spectrum.impedance_ohm, known.fit.modelled_ohm
        off = 100 * (z - m) / np.abs(z)
        points[0].setData(f, np.abs(z))
        points[1].setData(f, np.degrees(np.angle(z)))
        points[2].setData(z.real, -z.imag)
        points[3].setData(f, off.real)
        more.setData(f, off.imag)
        lines[0].setData(f, np.abs(m))
        lines[1].setData(f, np.degrees(np.angle(m)))
        lines[2].setData(m.real, -m.imag)
        application.processEvents()
        taken.append(time.process_time() - start)
    holder.hide()
    holder.deleteLater()
    return taken


def map_frames(window: MainWindow, application: QApplication) -> tuple[float, float]:
    """Frames a second while the map is moved, and while it is made larger and smaller."""
    place = next(p for p in window.places if isinstance(p, MapPlace))
    window.go(0)
    application.processEvents()
    across, down = place.area.horizontalScrollBar(), place.area.verticalScrollBar()
    start, frames = time.process_time(), 100
    for number in range(frames):
        down.setValue(down.maximum() * number // frames)
        across.setValue(across.maximum() * number // frames)
        application.processEvents()
    moved = frames / (time.process_time() - start)
    start = time.process_time()
    for number in range(frames):
        place.zoom(1.05 if number < frames // 2 else 1 / 1.05, QPoint(300, 200))
        application.processEvents()
    return moved, frames / (time.process_time() - start)


def watched(window: MainWindow, application: QApplication, folder: Path) -> None:
    """The longest call on the window's thread during import, fitting and export."""
    desk, dog = window.desk, Watchdog()
    campaign = desk.campaign
    assert campaign is not None
    names = {p.panel_id: p.name for p in campaign.panels}
    raw = {}
    readings = []
    for number, r in enumerate(campaign.readings):
        data = str(number).encode()
        key = hashlib.sha256(data).hexdigest()
        raw[key] = data
        readings.append(
            FoundReading(
                r.spectrum, Source(f"{number}.csv", key), names[r.panel_id], r.exposure_h + 9000
            )
        )
    found = Found(readings=tuple(readings), raw=raw)
    before = len(campaign.readings)

    def there() -> bool:
        return desk.job is None and desk.campaign is not None

    def held(doing: str, begin: Callable[[], object], until: Callable[[], bool]) -> None:
        say(f"longest call while {doing}", 1e3 * dog.over(begin, until), "ms", 50)
        if dog.stacks:
            print(dog.report())

    held("writing the data", lambda: desk.export(folder / "out.json"), there)
    held(
        "bringing in 10,000 spectra",
        lambda: desk.import_found(found),
        lambda: there() and desk.campaign is not None and len(desk.campaign.readings) > before,
    )
    del desk.judge  # the real one again
    held(
        "opening and fitting the sample",
        lambda: desk.open(sample_panels()),
        lambda: there() and desk.assessment is not None,
    )
    held("writing the workbook", lambda: desk.export(folder / "out.xlsx"), there)
    held("writing the inspection summary", lambda: desk.export(folder / "out.pdf"), there)


def main() -> None:
    folder = Path(tempfile.mkdtemp(prefix="coatgui-benchmark-"))
    bare = child_seconds(_BARE)
    more = child_seconds(_WINDOW.format(ini=folder / "child.ini")) - bare
    say(f"start to a usable window, over {bare:.2f} s of bare imports", more, "s", 0.6)

    campaign, drawn = large_campaign()
    assessment: Assessment = conclude(campaign, drawn, Progress())
    path = folder / "large.coatgui"
    CampaignFile.create(path, campaign, {}).close()
    ids = [r.reading_id for r in campaign.readings]
    del campaign, drawn

    application = QApplication([])
    palette.apply(application, palette.colours(False))
    pg.setConfigOptions(antialias=True)
    window = MainWindow(QSettings(str(folder / "x.ini"), QSettings.Format.IniFormat), False)
    window.show()
    application.processEvents()
    desk = window.desk
    desk.judge = lambda: None  # type: ignore[method-assign]
    start = time.process_time()
    desk.open(path)
    while desk.file is None:
        application.processEvents()
        time.sleep(0.002)
    application.processEvents()
    say("opening 10,000 spectra", time.process_time() - start, "s", 1.5)
    desk.assessment = assessment
    desk._stale = False
    start = time.process_time()
    desk.assessed.emit()
    application.processEvents()
    print(f"        showing the assessment of all of them: {time.process_time() - start:.2f} s")
    window.go(1)
    application.processEvents()
    chosen = random.Random(1).sample(ids, 220)
    picks(window, application, chosen[:20])
    taken = sorted(picks(window, application, chosen[20:]))
    plain = statistics.median(plain_picks(window, application, chosen[20:]))
    middle = statistics.median(taken)
    say("pick to repainted, median", 1e3 * middle, "ms", 16)
    say("pick to repainted, 99 % below", 1e3 * taken[int(0.99 * len(taken))], "ms", 50)
    say(f"pick against four plain plots of {1e3 * plain:.1f} ms", middle / plain, "", 0.5)
    moved, zoomed = map_frames(window, application)
    say("map moved", moved, "frames/s", 50, at_least=True)
    say("map made larger and smaller", zoomed, "frames/s", 50, at_least=True)
    say("memory with 10,000 spectra open", memory_mb(), "MB", 600)
    watched(window, application, folder)
    desk.close()
    shutil.rmtree(folder)


if __name__ == "__main__":
    main()
