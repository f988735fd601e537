#!/usr/bin/env python3
"""Solves models of the plan search by `solve-model`, HiGHS and CP-SAT, and prints them side by side.

Each gets the raw model, one thread, gap 0, no start, in this one run; reading is not timed.
HiGHS and CP-SAT are the Python packages `highspy` and `ortools`; a solver that is not installed is
left out. `near` is the time until a plan within 0.5 % of the best known is held.

Usage: search_models.py SOLVE_MODEL INSTANCE [INSTANCE ...] [--repeat N] [--seconds S] [--cp-sat]
"""

import argparse
import gzip
import json
import subprocess
import sys
import time

NEAR = 0.005


def load(path):
    opener = gzip.open if path.endswith(".gz") else open
    with opener(path, "rt", encoding="utf-8") as file:
        return json.load(file)


def inequalities(model):
    """(terms, right side) of every constraint, terms being (option, coefficient)."""
    live = {option for options in model["flights"] for option in options}
    for options in model["flights"]:
        if len(options) > 1:
            yield [(option, 1) for option in options], 1
    for a, b in model["edges"]:
        if a in live and b in live:
            yield [(a, 1), (b, 1)], 1
    for option, flight in model.get("edges_filed", []):
        mates = model["flights"][flight]
        if option in live and option not in mates:
            yield [(option, 1)] + [(mate, -1) for mate in mates], 0
    for row in model["rows"]:
        yield [(option, by) for option, by in row["coef"] if option in live], row["slack"]


class Run:
    """What a solver found: objective, bound, seconds, and (second, objective) of each better plan."""

    def __init__(self, objective, bound, seconds, plans):
        self.objective, self.bound, self.seconds, self.plans = objective, bound, seconds, plans

    def near(self, best):
        good = [at for at, objective in self.plans if objective >= best - NEAR * abs(best)]
        return min(good, default=None)


def ours(binary, path, seconds):
    command = [binary, path, "--threads", "1", "--seconds", str(seconds), "--plans"]
    out = json.loads(subprocess.run(command, check=True, capture_output=True, text=True).stdout)
    return Run(out["objective"], out["bound"], out["seconds"], out["plans"])


def highs(model, seconds):
    import highspy
    import numpy as np

    live = [option for options in model["flights"] for option in options]
    column = {option: position for position, option in enumerate(live)}
    starts, columns, values, upper = [0], [], [], []
    for terms, right in inequalities(model):
        columns += [column[option] for option, _ in terms]
        values += [float(by) for _, by in terms]
        starts.append(len(columns))
        upper.append(float(right))
    lp = highspy.HighsLp()
    lp.num_col_, lp.num_row_ = len(live), len(upper)
    lp.col_cost_ = np.array([model["weight"][option] for option in live], dtype=float)
    lp.col_lower_, lp.col_upper_ = np.zeros(len(live)), np.ones(len(live))
    lp.row_lower_ = np.full(len(upper), -highspy.kHighsInf)
    lp.row_upper_ = np.array(upper)
    lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
    lp.a_matrix_.start_ = np.array(starts)
    lp.a_matrix_.index_ = np.array(columns)
    lp.a_matrix_.value_ = np.array(values)
    lp.integrality_ = [highspy.HighsVarType.kInteger] * len(live)
    lp.sense_ = highspy.ObjSense.kMaximize
    solver = highspy.Highs()
    solver.setOptionValue("output_flag", False)
    solver.setOptionValue("threads", 1)
    solver.setOptionValue("parallel", "off")
    solver.setOptionValue("mip_rel_gap", 0.0)
    solver.setOptionValue("mip_abs_gap", 0.99)
    solver.setOptionValue("time_limit", float(seconds))
    solver.passModel(lp)
    plans = []
    start = time.perf_counter()

    def improved(event):
        plans.append((time.perf_counter() - start, event.data_out.objective_function_value))

    solver.cbMipImprovingSolution.subscribe(improved)
    solver.run()
    took = time.perf_counter() - start
    info = solver.getInfo()
    plans.append((took, info.objective_function_value))
    return Run(info.objective_function_value, info.mip_dual_bound, took, plans)


def cp_sat(model, seconds):
    from ortools.sat.python import cp_model

    problem = cp_model.CpModel()
    live = [option for options in model["flights"] for option in options]
    chosen = {option: problem.new_bool_var("") for option in live}
    for terms, right in inequalities(model):
        problem.add(sum(by * chosen[option] for option, by in terms) <= right)
    problem.maximize(sum(model["weight"][option] * chosen[option] for option in live))
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.max_time_in_seconds = seconds
    plans = []
    start = time.perf_counter()

    class Improved(cp_model.CpSolverSolutionCallback):
        def on_solution_callback(self):
            plans.append((time.perf_counter() - start, self.objective_value))

    solver.solve(problem, Improved())
    took = time.perf_counter() - start
    return Run(solver.objective_value, solver.best_objective_bound, took, plans)


def best_of(repeat, run):
    return min((run() for _ in range(repeat)), key=lambda it: it.seconds)


def amount(number):
    return "-" if number is None else f"{number:.4f}" if number < 1 else f"{number:.3f}"


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("binary", metavar="SOLVE_MODEL")
    parser.add_argument("instances", nargs="+", metavar="INSTANCE")
    parser.add_argument("--repeat", type=int, default=3, help="runs of each; the shortest counts")
    parser.add_argument("--seconds", type=float, default=60.0, help="most seconds for each run")
    parser.add_argument("--cp-sat", action="store_true", help="CP-SAT too; it may take its time")
    args = parser.parse_args()
    print("| instance | solver | objective | bound | seconds | near, s | seconds : ours | near : ours |")
    print("|---|---|---|---|---|---|---|---|")
    disagree = False
    for path in args.instances:
        model = load(path)
        runs = {"solve-model": best_of(args.repeat, lambda: ours(args.binary, path, args.seconds))}
        others = [("HiGHS", highs, args.repeat)] + [("CP-SAT", cp_sat, 1)] * args.cp_sat
        for name, solve, repeat in others:
            try:
                runs[name] = best_of(repeat, lambda: solve(model, args.seconds))
            except ImportError as error:
                print(f"{name} is left out: {error}", file=sys.stderr)
        best = max(run.objective for run in runs.values())
        disagree |= any(run.bound is None or run.bound < best - 0.5 for run in runs.values())
        base = runs["solve-model"]
        for name, run in runs.items():
            near, base_near = run.near(best), base.near(best)
            ratio = near / base_near if near and base_near else None
            print(
                f"| {model['name']} | {name} | {run.objective:.0f} | {run.bound:.0f} "
                f"| {amount(run.seconds)} | {amount(near)} "
                f"| {run.seconds / base.seconds:.1f} | {'-' if ratio is None else f'{ratio:.1f}'} |",
                flush=True,
            )
    if disagree:
        raise SystemExit("a bound lies below a plan that another solver found")


if __name__ == "__main__":
    main()
