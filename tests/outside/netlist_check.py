"""Lets ngspice measure the subcircuit of a solved case and holds the result against its record.

    python netlist_check.py FOLDER      FOLDER holds record.json and netlist.cir

For each electrode in turn: 1 V at 1 kHz on its pin, all other pins at 0 V, and the current into every
pin.  Im(I)/omega is a row of the capacitance matrix as the simulator sees it.  Every capacitance kept
must come back within 1e-6; one that is absent must be smaller than its bar.
"""

import json
import math
import pathlib
import re
import subprocess
import sys
import tempfile

REL_TOL = 1e-6
HERTZ = 1000.0


def subcircuit(text):
    """Name and pins of the only subcircuit."""
    joined = re.sub(r"\n\+", " ", text)
    found = re.findall(r"^\.subckt\s+(\S+)\s+(.*)$", joined, re.IGNORECASE | re.MULTILINE)
    if len(found) != 1:
        sys.exit(f"netlist_check: {len(found)} subcircuits, 1 expected")
    return found[0][0], found[0][1].split()


def currents(text, name, pins, driven):
    """Imaginary part of the current into each pin, in ampere, with 1 V on pin `driven`."""
    deck = ["capacitances of a subcircuit", text, "x1 " + " ".join(f"p{k}" for k in range(len(pins))) + f" {name}"]
    deck += [f"vp{k} p{k} 0 dc 0 ac {1 if k == driven else 0}" for k in range(len(pins))]
    deck += [".control", "set numdgt=15", f"ac lin 1 {HERTZ} {HERTZ}"]
    deck += [f"print i(vp{k})" for k in range(len(pins))]
    deck += ["quit 0", ".endc", ".end"]
    with tempfile.TemporaryDirectory() as folder:
        path = pathlib.Path(folder) / "deck.cir"
        path.write_text("\n".join(deck) + "\n")
        run = subprocess.run(["ngspice", "-b", str(path)], capture_output=True, text=True, timeout=60, cwd=folder)
    said = run.stdout + run.stderr
    if run.returncode or "error" in said.lower():
        sys.exit(f"netlist_check: ngspice ended with {run.returncode} and said\n{said}")
    found = dict(re.findall(r"i\(vp(\d+)\)\s*=\s*\S+?,\s*(\S+)", said))
    if len(found) != len(pins):
        sys.exit(f"netlist_check: {len(found)} currents for {len(pins)} pins\n{said}")
    # The current of a source flows into its positive end.
    return [-float(found[str(k)]) for k in range(len(pins))]


def main(folder):
    folder = pathlib.Path(folder)
    record = json.loads((folder / "record.json").read_text())
    text = (folder / "netlist.cir").read_text()
    name, pins = subcircuit(text)
    n = len(record["electrodes"])
    if len(pins) != n + 1 or pins[-1] != "earth":
        sys.exit(f"netlist_check: pins {pins} for electrodes {record['electrodes']}")
    omega = 2 * math.pi * HERTZ
    matrix = [[i / omega for i in currents(text, name, pins, driven)] for driven in range(n)]
    kept = dropped = 0
    worst = 0.0
    for i in range(n):
        total = 0.0
        for j in list(range(i)) + list(range(i + 1, n + 1)):
            seen = -matrix[i][j]
            key = "earth" if j == n else "mutual"
            value, bar = (record[f"{key}_farad"][i], record[f"{key}_bar_farad"][i])
            if j < n:
                value, bar = value[j], bar[j]
            if abs(seen) > REL_TOL * REL_TOL * matrix[i][i]:
                worst = max(worst, abs(seen / value - 1))
                kept += 1
                total += value
            elif value <= bar:
                dropped += 1
            else:
                sys.exit(f"netlist_check: {pins[i]} to {pins[j]}: {value} F, bar {bar} F, is not in the netlist")
        worst = max(worst, abs(matrix[i][i] / total - 1))
    if not kept or not worst <= REL_TOL:
        sys.exit(f"netlist_check: {kept} capacitances, worst deviation {worst:.1e}, allowed {REL_TOL:.0e}")
    print(f"ngspice: {kept} readings of kept capacitances within {worst:.1e}, {dropped} under their bars left out")


if __name__ == "__main__":
    main(*sys.argv[1:])
