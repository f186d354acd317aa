"""From a set of constants and a list of wanted fields to the steps that compute them on a tile.

A step fills one row of a scratch table from other rows. The steps are found by asking for the wanted columns and
following the names of each function's arguments; nothing that is not needed is computed.
"""

from __future__ import annotations

import functools
from dataclasses import asdict, dataclass, replace
from typing import Any, Literal

import numpy as np

from gridcarb.chemistry import solver
from gridcarb.chemistry.compiled import TILE, arguments, tile_function, tile_loop
from gridcarb.chemistry.constants_set import CONSTANTS, ConstantsSet
from gridcarb.chemistry.declare import COLUMNS, DERIVED, Formula
from gridcarb.chemistry.formulas.pressure import ln_pressure_factor
from gridcarb.chemistry.passage import solve_cells_with
from gridcarb.chemistry.reuse import assign_rows
from gridcarb.chemistry.status import seal
from gridcarb.compiling import COMPILE_LOCK, plain
from gridcarb.elementary import exp, log
from gridcarb.fields import FIELDS

Precision = Literal["float32", "float64"]

INPUTS = ("t", "s", "p_bar", "dic", "alk", "pt", "sit")
"""The rows a caller fills: degC, practical salinity, bar, and four amounts in mol/kg."""

_ACIDS = ("k1", "k2", "kb", "kw", "kp1", "kp2", "kp3", "ksi")
_SOLIDS = ("k_calcite", "k_aragonite")


exp_row = tile_loop("exp_row", ("x",), "exp(x)", {"exp": exp})
log_row = tile_loop("log_row", ("x",), "log(x)", {"log": log})


@dataclass(frozen=True)
class Step:
    """Fill row `out` from rows `reads` by a tile loop."""

    run: Any
    out: int
    reads: tuple[int, ...]

    def moved(self, rows: dict[int, int]) -> Step:
        """The same step with every row renumbered."""
        return replace(self, out=rows[self.out], reads=tuple(rows[row] for row in self.reads))


@dataclass(frozen=True)
class Program:
    """The steps for one set and one selection of fields.

    rows : how many rows of scratch a tile needs; the inputs come first.
    before, after : steps up to the equation's columns, and from its root to the fields.
    unknowns : rows of the solver, in its order; hydrogen and step : the rows it fills.
    outputs : rows of the fields, in the order asked for.
    """

    rows: int
    before: tuple[Step, ...]
    unknowns: tuple[int, ...]
    hydrogen: int
    step: int
    after: tuple[Step, ...]
    outputs: tuple[int, ...]

    def compiled(self, constants: str) -> Any:
        """One function that solves any number of cells without the interpreter; see `passage.solve_cells`."""
        found = ", ".join(f"scratch[{row}]" for row in (self.hydrogen, self.step, *self.unknowns))
        lines = [
            *_calls(self.before),
            f"if sweep({found}):",
            f"    settle({found})",
            *_calls(self.after),
            f"return seal(flags, scratch[{self.hydrogen}], scratch[{self.step}], {solver.SWEPT!r})",
        ]
        uses = {step.run.__name__: step.run for step in (*self.before, *self.after)}
        tile = tile_function(
            f"tile_of_{constants}", ("scratch", "flags"), lines,
            {**uses, "sweep": solver.sweep, "settle": solver.settle, "seal": seal},
        )  # fmt: skip
        self._load_parts()
        return solve_cells_with(tile)

    def _load_parts(self) -> None:
        """Run every part by itself once, so that its own machine code is there before that of the tile.

        The tile brings copies of its parts along, compiled in its context, which may differ in the last bit. Whichever
        is loaded first is used: without this, code that was compiled just now and code from disk gave different bits.
        """
        scratch, flags = np.ones((self.rows, TILE)), np.zeros(TILE, dtype=np.int8)
        for step in (*self.before, *self.after):
            step.run(scratch, step.out, *step.reads)
        rows = [scratch[row] for row in (self.hydrogen, self.step, *self.unknowns)]
        solver.sweep(*rows)
        solver.settle(*rows)
        seal(flags, scratch[self.hydrogen], scratch[self.step], solver.SWEPT)


def _calls(steps: tuple[Step, ...]) -> list[str]:
    return [f"{step.run.__name__}(scratch, {step.out}, {', '.join(map(str, step.reads))})" for step in steps]


class _Builder:
    """Collects steps while columns are asked for by name."""

    def __init__(self, constants: ConstantsSet) -> None:
        self.constants = constants
        self.formulas = constants.formulas()
        self.rows: dict[str, int] = {}
        self.steps: list[Step] = []
        for name in INPUTS:
            self.fresh(name)

    def fresh(self, name: str) -> int:
        """A new row under a name."""
        self.rows[name] = len(self.rows)
        return self.rows[name]

    def row(self, name: str) -> int:
        """The row of a column, with the steps that fill it appended if it is new."""
        if name not in self.rows:
            self._make(name)
        return self.rows[name]

    def _make(self, name: str) -> None:
        if name in _ACIDS or name in _SOLIDS or name == "ks":
            self._constant(name, self.formulas[name], pressure=name)
        elif name in ("ks_surface", "kf_surface_given", "k0"):
            key = {"ks_surface": "ks", "kf_surface_given": "kf"}.get(name, name)
            self._constant(name, self.formulas[key], pressure=None)
        elif name == "kf_pressure_factor":
            self._loop(f"ln_{name}", self._pressure_columns(), self._pressure("kf"), {"factor": ln_pressure_factor})
            self._elementary(name, exp_row, f"ln_{name}")
        elif name in ("kf_surface", "kf_surface_free"):
            self._fluoride(name)
        elif name in COLUMNS or name in DERIVED:
            self._call(name, COLUMNS[name] if name in COLUMNS else DERIVED[name])
        elif name in self.formulas:
            self._call(name, self.formulas[name].cell)
        elif name.startswith("ln_"):
            self._elementary(name, log_row, name.removeprefix("ln_"))
        else:
            self._elementary(name, exp_row, f"ln_{name}")

    def _loop(self, name: str, columns: tuple[str, ...], expression: str, uses: dict[str, Any]) -> None:
        reads = tuple(self.row(column) for column in columns)
        run = tile_loop(f"{name}_of_{self.constants.key}", columns, expression, uses)
        self.steps.append(Step(run, self.fresh(name), reads))

    def _call(self, name: str, cell: Any) -> None:
        columns = arguments(cell)
        reads = tuple(self.row(column) for column in columns)
        self.steps.append(Step(_plain_loop(cell), self.fresh(name), reads))

    def _elementary(self, name: str, loop: Any, argument: str) -> None:
        reads = (self.row(argument),)
        self.steps.append(Step(loop, self.fresh(name), reads))

    def _pressure_columns(self) -> tuple[str, ...]:
        return ("t", "p_bar", "tk")

    def _pressure(self, constant: str) -> str:
        numbers = ", ".join(repr(value) for value in asdict(self.constants.volumes[constant]).values())
        return f"factor(t, p_bar, tk, {numbers})"

    def _constant(self, name: str, formula: Formula, pressure: str | None) -> None:
        """A constant on the scale the equation wants, at pressure: logarithms are summed before the one exp."""
        columns = list(formula.columns)
        expression = f"cell({', '.join(columns)})"
        if pressure is not None:
            expression += f" + {self._pressure(pressure)}"
            columns += self._pressure_columns()
        if name in _ACIDS:
            shift = {"total": "ln_shift_total", "seawater": "ln_shift_seawater"}[formula.scale]
            expression += f" + {shift}"
            columns.append(shift)
        unique = tuple(dict.fromkeys(columns))
        self._loop(f"ln_{name}", unique, expression, {"cell": formula.cell, "factor": ln_pressure_factor})
        self._elementary(name, exp_row, f"ln_{name}")

    def _fluoride(self, name: str) -> None:
        """KF at the surface on the total scale (kf_surface) or the free scale, whichever the set's equation gives."""
        given = {"kf_surface": "total", "kf_surface_free": "free"}[name]
        if self.formulas["kf"].scale == given:
            self.rows[name] = self.row("kf_surface_given")
            return
        sign = "*" if given == "total" else "/"
        self._loop(name, ("kf_surface_given", "st", "ks_surface"), f"kf_surface_given {sign} (1.0 + st / ks_surface)", {})


@functools.cache
def _plain_loop(cell: Any) -> Any:
    columns = arguments(cell)
    return tile_loop(f"column_{plain(cell).__name__}", columns, f"cell({', '.join(columns)})", {"cell": cell})


@functools.cache
def program(constants: str, fields: tuple[str, ...], precision: Precision = "float64") -> tuple[Program, Any]:
    """The program for a set and a selection of derived fields (both by key), and its compiled function for results of a
    precision; the chemistry itself is in double precision always.

    Raises
    ------
    UnknownWordError : an unknown set or field.
    """
    chosen = CONSTANTS[constants]
    for key in fields:
        FIELDS[key], DERIVED[key]
    with COMPILE_LOCK:
        made = _build(chosen, fields)
        solve_cells = made.compiled(constants)
        _solve_one(made, solve_cells, precision)
    return made, solve_cells


def _solve_one(made: Program, solve_cells: Any, precision: Precision) -> None:
    """Solve one ordinary cell, so that all compiling is over before threads enter."""
    water = (15.0, 35.0, 0.0, 2100.0, 2300.0, 0.0, 0.0)
    solve_cells(
        tuple(np.array([value]) for value in water), np.empty((len(made.outputs), 1), dtype=precision),
        np.empty(1, dtype=np.int8), np.empty(0, dtype=np.intp), True, np.empty((made.rows, TILE)),
        np.empty(TILE, dtype=np.int8), np.array(made.outputs, dtype=np.intp), (2.0, 35.0, 19.0, 43.0),
    )  # fmt: skip


def _build(chosen: ConstantsSet, fields: tuple[str, ...]) -> Program:
    builder = _Builder(chosen)
    unknowns = tuple(builder.row(name) for name in solver.UNKNOWNS)
    before = tuple(builder.steps)
    builder.steps = []
    hydrogen, step = builder.fresh("h"), builder.fresh("newton_step")
    outputs = tuple(builder.row(key) for key in fields)
    return _compact(Program(len(builder.rows), before, unknowns, hydrogen, step, tuple(builder.steps), outputs))


def _compact(made: Program) -> Program:
    """The same program on as few rows as its steps allow."""
    root = (made.hydrogen, made.step)
    work = [
        *(((step.out,), step.reads) for step in made.before),
        (root, made.unknowns),
        *(((step.out,), step.reads) for step in made.after),
    ]
    rows, count = assign_rows(work, len(INPUTS), (*root, *made.outputs))
    return Program(
        count,
        tuple(step.moved(rows) for step in made.before),
        tuple(rows[row] for row in made.unknowns),
        rows[made.hydrogen],
        rows[made.step],
        tuple(step.moved(rows) for step in made.after),
        tuple(rows[row] for row in made.outputs),
    )
