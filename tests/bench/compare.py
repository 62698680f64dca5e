#!/usr/bin/env python3
"""Times pinchbar and the general-library pipeline of peer.py on one plate in one session, and prints a Markdown table.

They are compared where the loss is off by the same true amount as the middle of pinchbar's interval, as its lower end (which is
the loss of the potential, the same kind of number as the pipeline's), and with the same number of triangles. The truth is taken
from a tight run of pinchbar. Runs of the two take turns, so that a machine that drifts slows both.

    python compare.py target/release/pinchbar [--runs 5] [--brackets 0.1 0.01]
"""
import argparse
import datetime
import json
import math
import os
import platform
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

HERE = Path(__file__).parent
MOST_TRIANGLES = 6_000_000
LONG = 10.0  # s; what takes longer is run once
AREA = 240 * 80 - 2 * 60 * 4  # of the plate, mm2


def timed(command):
    """The JSON a command prints, its wall time in s, its peak memory in MB, its processor time in s."""
    start = time.perf_counter()
    child = subprocess.Popen(command, stdout=subprocess.PIPE)
    text = child.stdout.read()
    _, status, usage = os.wait4(child.pid, 0)
    wall = time.perf_counter() - start
    child.returncode = os.waitstatus_to_exitcode(status)
    if child.returncode != 0:
        sys.exit(f"failed: {command}")
    return json.loads(text), wall, usage.ru_maxrss / 1024, usage.ru_utime + usage.ru_stime


def pinchbar(tool, bracket, *more):
    return timed([tool, "map", str(HERE / "plate.toml"), "--json", "--quiet", "--bracket-percent", str(bracket), *more])


def peer(area, *more):
    return timed([sys.executable, str(HERE / "peer.py"), "--area", repr(area), *more])


def area_for(wanted, measure):
    """The triangle area at which a measure that falls with it has the wanted value; None where it takes too many triangles."""
    area, slope, last = AREA / 30_000 * 1.6, 1.0, None
    for _ in range(12):
        result = peer(area)[0]
        value = measure(result)
        if abs(value / wanted - 1) < 0.03:
            return area
        if last and value > 0 and abs(math.log(last[0] / area)) > 1e-6:
            slope = min(max(math.log(last[1] / value) / math.log(last[0] / area), 0.4), 2.0)
        last = (area, value) if value > 0 else last
        step = math.log(wanted / value) / slope if value > 0 else math.log(4)
        area *= math.exp(min(max(step, -math.log(6)), math.log(6)))
        if AREA * 1.6 / area > MOST_TRIANGLES:
            return None
    return area


def short_of(truth):
    return lambda result: 1 - result["loss_w"] / truth


def median(values):
    return statistics.median(values)


def stages(result):
    seconds = result["seconds"]
    drawing = [seconds.get(k, 0.0) for k in ("import_drawing", "draw")]
    return {"imports": seconds["import"] + drawing[0], "work": sum(seconds[k] for k in ("mesh", "assemble", "solve", "density")), "draw": drawing[1]}


def main():
    options = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    options.add_argument("tool", help="path of pinchbar, built with --release")
    options.add_argument("--runs", type=int, default=5)
    options.add_argument("--brackets", type=float, nargs="+", default=[0.1, 0.01], help="asked of pinchbar, per cent")
    options.add_argument("--reference", type=float, default=0.005, help="bracket of the run that is taken for the truth, per cent")
    asked = options.parse_args()

    loss = pinchbar(asked.tool, asked.reference)[0]["loss_w"]
    truth, half = loss["value"], (loss["high"] - loss["low"]) / 2 / loss["value"]
    print(f"Reference: {truth:.9g} W, enclosed within {half * 1e6:.0f} ppm either way.", file=sys.stderr)

    head = "| | triangles | loss off by | whole process, figures only | its processor time | with picture | imports | work | drawing | peak |"
    print(head)
    print("|---|" + "---:|" * (head.count("|") - 2))
    solvers = set()
    for bracket in asked.brackets:
        ours = pinchbar(asked.tool, bracket)[0]
        off, low_off = abs(ours["loss_w"]["value"] / truth - 1), 1 - ours["loss_w"]["low"] / truth
        areas = {
            "general libraries, off as the middle": area_for(off, short_of(truth)),
            "general libraries, off as the lower end": area_for(low_off, short_of(truth)),
            "general libraries, same triangles": area_for(1 / ours["run"]["triangles"], lambda r: 1 / r["triangles"]),
        }
        plain, drawn, laps, theirs = [], [], [], {name: ([], [], []) for name in areas}
        with tempfile.TemporaryDirectory() as folder:
            for _ in range(asked.runs):
                plain.append(pinchbar(asked.tool, bracket))
                drawn.append(pinchbar(asked.tool, bracket, "--timings", "--out", folder))
                laps.append(drawn[-1][0]["run"]["seconds"])
                for name, area in areas.items():
                    if area and (not theirs[name][0] or theirs[name][0][-1][1] < LONG):
                        theirs[name][0].append(peer(area))
                        theirs[name][1].append(peer(area, "--picture", str(Path(folder) / "peer.png")))
                        theirs[name][2].append(stages(theirs[name][1][-1][0]))
        wall, wall_drawn = median(r[1] for r in plain), median(r[1] for r in drawn)
        processor = median(r[3] for r in plain)
        work, draw = median(l["read"] + l["solve"] for l in laps), median(l["draw"] for l in laps)
        print(
            f"| pinchbar, {bracket:g} % asked | {ours['run']['triangles']:,} | {off * 1e6:.0f} ppm (lower end {low_off * 1e6:.0f}) | {wall:.2f} s | {processor:.2f} s | {wall_drawn:.2f} s "
            f"| - | {work:.2f} s | {draw:.2f} s | {max(r[2] for r in plain):.0f} MB |"
        )
        for name, (without, with_picture, parts) in theirs.items():
            if not without:
                print(f"| {name} | more than {MOST_TRIANGLES:,} | | | | | | | | |")
                continue
            result = without[-1][0]
            solvers.add(result["solver"])

            def cell(seconds, own):
                return f"{seconds:.2f} s ({seconds / own:.1f} x)"

            print(
                f"| {name} | {result['triangles']:,} | {(1 - result['loss_w'] / truth) * 1e6:.0f} ppm "
                f"| {cell(median(r[1] for r in without), wall)} | {cell(median(r[3] for r in without), processor)} "
                f"| {cell(median(r[1] for r in with_picture), wall_drawn)} "
                f"| {median(p['imports'] for p in parts):.2f} s | {cell(median(p['work'] for p in parts), work)} "
                f"| {cell(median(p['draw'] for p in parts), draw)} | {max(r[2] for r in without):.0f} MB |"
            )
    print(
        f"\nMeasured on {datetime.date.today()}, {os.cpu_count()} cores of {platform.machine()}, {platform.system()}, median of {asked.runs} runs "
        f"taking turns; solver of the general libraries: {', '.join(sorted(solvers)) or 'none'}. Both solve for given currents with resistive "
        f"joints; pinchbar also encloses the loss and every voltage and lists the hotspots. Truth: pinchbar at {asked.reference:g} %, "
        f"enclosed within {half * 1e6:.0f} ppm either way. x: times pinchbar's."
    )


if __name__ == "__main__":
    main()
