"""How fast the bench is: prints one JSON object.

    python tests/benchmarks/bench.py [DATA STRUCTURE]

Runs offscreen. Without arguments the sample spectrum and its structure are used.
Keys: window_ms and ready_ms from the start of the process (interpreter and
imports included), the second one until a click is answered within 50 ms; fps_1m for
panning and zooming 1 048 576 points with all lanes and 40 trees, longest_stall_ms of
the event loop over opening, reconciling and edits, memory_mib of the window's
process with the long spectrum. Keys with ``cpu`` are the same in processor time of
the window's process, which a busy machine changes less.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
HERE = Path(__file__).resolve()
sys.path.insert(0, str(HERE.parents[1] / "app"))

N_POINTS = 1_048_576
N_TREES = 40
FRAME_SECONDS = 4.0
STALL_MS = 50
PATIENCE_S = 900


def main() -> None:
    """Measure everything, each in a process of its own."""
    if len(sys.argv) > 1 and sys.argv[1] in PARTS:
        print(json.dumps(PARTS[sys.argv[1]](sys.argv[2:])))
        return
    result: dict[str, float] = {}
    for part in PARTS:
        result |= measured(part, sys.argv[1:])
    print(json.dumps(result, indent=1))


def measured(part: str, arguments: list[str]) -> dict[str, float]:
    """Run one part and read what it prints."""
    start = time.time()
    command = [sys.executable, str(HERE), part, *(arguments or [str(start)])]
    if part == "start":
        command = [sys.executable, str(HERE), part, str(start)]
    run = subprocess.run(command, capture_output=True, text=True, check=False)
    if run.returncode != 0:
        raise SystemExit(run.stderr)
    found: dict[str, float] = json.loads(run.stdout.strip().splitlines()[-1])
    return found


def start(arguments: list[str]) -> dict[str, float]:
    """From the start of the process to a painted window, and to an answered click.

    The window counts as ready when a click that was waiting in its queue has been
    taken, acted on and painted within 50 ms, with the working processes starting
    beside it as they do in the program.
    """
    begun = float(arguments[0])
    ready = begun
    from PySide6.QtCore import QSettings, Qt, QTimer
    from PySide6.QtTest import QTest
    from PySide6.QtWidgets import QApplication

    from spinledger_app import tasks
    from spinledger_app.application import build
    from spinledger_app.sketch.gestures import Tool

    app = QApplication([])
    with tempfile.TemporaryDirectory() as folder:
        parts = build(QSettings(f"{folder}/s.ini", QSettings.Format.IniFormat))
        parts.window.show()
        app.processEvents()
        painted, window_cpu_s = time.time(), time.process_time()
        QTimer.singleShot(0, lambda: parts.pool.start(tasks.WARM_UPS))
        app.processEvents()
        editor = parts.window.sketch.editor
        tools = [Tool.RING, Tool.BOND]
        n_asked, answer_s = 0, 1.0
        while answer_s * 1000 > STALL_MS:
            tool = tools[n_asked % 2]
            n_asked += 1
            asked = time.time()
            button = editor.toolbar.buttons[tool]
            QTimer.singleShot(
                0, lambda b=button: QTest.mouseClick(b, Qt.MouseButton.LeftButton)
            )
            while editor.canvas.kit.tool is not tool:
                app.processEvents()
            editor.repaint()
            ready = time.time()
            answer_s = ready - asked
        parts.pool.close()
    return {
        "window_ms": round((painted - begun) * 1000),
        "ready_ms": round((ready - begun) * 1000),
        "window_cpu_ms": round(window_cpu_s * 1000),
    }


def frames(_arguments: list[str]) -> dict[str, float]:
    """Frames a second of pan and zoom on the long spectrum."""
    import invented
    from PySide6.QtWidgets import QApplication
    from stage import put_on, settle, stage

    app = QApplication([])
    assert app is not None
    with tempfile.TemporaryDirectory() as folder:
        parts = stage(Path(folder))
        put_on(parts, invented.crowded(N_POINTS, N_TREES))
        lanes = parts.window.lanes
        lanes.set_folded(False)
        settle()
        memory = memory_mib()
        n_frames, begun, begun_cpu = 0, time.perf_counter(), time.process_time()
        while time.perf_counter() - begun < FRAME_SECONDS:
            assert lanes.camera is not None
            step = n_frames % 120
            factor = 1.03 if step < 60 else 1 / 1.03
            camera = lanes.camera.zoomed(factor, 300.0).panned(3.0 if step < 60 else -3)
            lanes.go_to(camera, is_eased=False)
            lanes.repaint()
            n_frames += 1
        seconds = time.perf_counter() - begun
        cpu_s = time.process_time() - begun_cpu
        parts.pool.close()
    return {
        "fps_1m": round(n_frames / seconds, 1),
        "fps_1m_cpu": round(n_frames / cpu_s, 1),
        "memory_mib": round(memory),
    }


def memory_mib() -> float:
    """Memory that this process holds now."""
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE") / 2**20


def stalls(arguments: list[str]) -> dict[str, float]:
    """Longest time the event loop stood still over open, reconcile and edits."""
    from PySide6.QtCore import QTimer
    from PySide6.QtWidgets import QApplication
    from stage import stage

    from spinledger_app import tasks
    from spinledger_app.places import example_place

    app = QApplication([])
    example = example_place()
    assert example is not None
    data, structure = (
        arguments[:2]
        if len(arguments) >= 2
        else (str(example.data), str(example.structure))
    )
    gaps: list[float] = []
    cpu_gaps: list[float] = []
    with tempfile.TemporaryDirectory() as folder:
        parts = stage(Path(folder))
        last, last_cpu = time.perf_counter(), time.thread_time()

        def tick() -> None:
            nonlocal last, last_cpu
            now, now_cpu = time.perf_counter(), time.thread_time()
            gaps.append(now - last)
            cpu_gaps.append(now_cpu - last_cpu)
            last, last_cpu = now, now_cpu

        timer = QTimer()
        timer.setInterval(1)
        timer.timeout.connect(tick)
        bench = parts.bench

        def until_quiet(limit_s: float) -> None:
            begun = quiet = time.perf_counter()
            while time.perf_counter() - quiet < 0.3:
                app.processEvents()
                time.sleep(0.0005)
                if bench.pool.is_busy or bench.project.needs_ledger:
                    quiet = time.perf_counter()
                if time.perf_counter() - begun > limit_s:
                    raise SystemExit("the bench did not come to rest")

        parts.pool.start(tasks.WARM_UPS)
        timer.start()
        parts.desk.files.open_places([data])
        bench.take_structure(structure)
        until_quiet(PATIENCE_S)
        ledger = bench.project.ledger
        if ledger is None:
            raise SystemExit("there is no ledger")
        for claim in [entry.claim for entry in ledger.entries][:2]:
            bench.selection.select(claim)
            parts.desk.do("unlink")
            until_quiet(PATIENCE_S)
            parts.desk.do("undo")
            until_quiet(PATIENCE_S)
        parts.pool.close()
    return {
        "longest_stall_ms": round(max(gaps) * 1000),
        "longest_stall_cpu_ms": round(max(cpu_gaps) * 1000),
        "second_longest_stall_ms": round(sorted(gaps)[-2] * 1000),
    }


PARTS = {"start": start, "frames": frames, "stalls": stalls}

if __name__ == "__main__":
    main()
