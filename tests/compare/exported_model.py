#!/usr/bin/env python3
"""Solves the exported model of a day with HiGHS and compares its optimum with the plan's.

Usage: exported_model.py RIMESHIFT [DAY]; RIMESHIFT is the built program, DAY a day folder (the
demo's where none is given). Needs highspy (PyPI; HiGHS, MIT licence). Exits with 1 where the two
optima differ.
"""

import json
import pathlib
import re
import subprocess
import sys
import tempfile

import highspy


def main() -> int:
    program = sys.argv[1]
    with tempfile.TemporaryDirectory() as folder:
        within = pathlib.Path(folder)
        if len(sys.argv) > 2:
            day = sys.argv[2]
        else:
            day = str(within / "day")
            subprocess.run([program, "demo", "--write", day], check=True, stdout=subprocess.DEVNULL)
        model = str(within / "model.mps")
        subprocess.run([program, "export", day, "--out", model], check=True)
        plan = within / "plan"
        subprocess.run(
            [program, "plan", day, "--out", str(plan)], check=True, stdout=subprocess.DEVNULL
        )
        found = json.loads((plan / "plan.json").read_text())
        with open(model, encoding="ascii") as text:
            unit = float(re.search(r"units of (\S+)", text.readline()).group(1))
        solver = highspy.Highs()
        solver.setOptionValue("output_flag", False)
        solver.setOptionValue("mip_rel_gap", 0.0)
        solver.setOptionValue("mip_abs_gap", 0.5)
        solver.readModel(model)
        solver.run()
        optimum = round(solver.getInfo().objective_function_value) * unit
    print(f"plan {found['objective']:.9e} ({found['stopped']}), HiGHS {optimum:.9e}")
    same = abs(found["objective"] - optimum) <= 1e-9 * max(1.0, abs(optimum))
    return 0 if same or found["stopped"] != "optimal" else 1


if __name__ == "__main__":
    sys.exit(main())
