"""The house: which room may import which, and the limits of size that keep rooms readable."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parents[1] / "auditor"

# Room: rooms of ours that it may import. A room not named here may import nothing of ours.
ALLOWED = {
    "records": set(),
    "physics": set(),
    "units": {"records"},
    "plant_file": {"records", "units"},
    "log_reading": {"records", "units"},
    "drafting": {"records", "units", "log_reading"},
    "cleaning": {"records"},
    "metering": {"records", "physics"},
    "balancing": {"records", "physics"},
    "influences": {"records"},
    "judging": {"records", "physics"},
    "history": {"records"},
    "resources": {"records"},
    "site_folder": {"records"},
    "progress": set(),
    "report": {"records", "units", "resources"},
    "restating": {"records", "report"},
    "publishing": {"records", "report", "restating", "history", "site_folder"},
    "audit_run": {
        *("records", "plant_file", "log_reading", "cleaning", "metering", "balancing", "influences"),
        *("judging", "site_folder"),
    },
    "nightly": {
        *("records", "audit_run", "publishing", "restating", "history", "log_reading", "site_folder"),
    },
    "commands": {
        *("records", "audit_run", "nightly", "publishing", "report", "resources", "site_folder"),
        *("progress", "plant_file", "log_reading", "drafting"),
    },
    "command_line": {"records", "commands"},
    "__main__": {"command_line"},
    "__init__": {"audit_run", "report"},
}
ONLY_IMPORTER = {"pint": "units", "argparse": "command_line", "jinja2": "report", "plotly": "report"}
MODULES = sorted(PACKAGE.rglob("*.py"))


def room_of(module: Path) -> str:
    """First part of the module's path below the package."""
    return module.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imported(module: Path) -> set[str]:
    """Full names of all modules that a file imports, lazily or not."""
    names: set[str] = set()
    for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{module}: relative imports hide which room is meant"
            names.add(str(node.module))
            if node.module == "auditor":
                names.update(f"auditor.{alias.name}" for alias in node.names)
    return names


@pytest.mark.parametrize("module", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_rooms_import_only_what_the_table_allows(module: Path) -> None:
    """Data flows one way: no room reaches into one that is not below it."""
    room = room_of(module)
    ours = {name.split(".")[1] for name in imported(module) if name.startswith("auditor.")}
    ours = {name for name in ours if not name.startswith("__")}
    assert ours - {room} <= ALLOWED[room]


@pytest.mark.parametrize("module", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_modules_and_functions_stay_small(module: Path) -> None:
    """A module has at most 400 lines, a function at most 60 lines of code."""
    text = module.read_text(encoding="utf-8")
    assert text.count("\n") <= 400
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.FunctionDef):
            body = node.body[1:] if ast.get_docstring(node) is not None else node.body
            length = body[-1].end_lineno - body[0].lineno + 1 if body else 0
            assert length <= 60, f"{node.name} has {length} lines"


def test_outside_libraries_have_one_importer() -> None:
    """Libraries with traps are met in one room only."""
    for module in MODULES:
        outside = {name.split(".")[0] for name in imported(module)}
        for library, room in ONLY_IMPORTER.items():
            if library in outside and room_of(module) not in {room, "commands"}:
                pytest.fail(f"{module.relative_to(PACKAGE)} imports {library}, which is for {room}")


def test_every_room_is_in_the_table() -> None:
    """A new room has to say what it may import."""
    assert {room_of(module) for module in MODULES} <= set(ALLOWED)


def test_help_imports_no_heavy_library() -> None:
    """``--help`` must answer at once, so nothing heavy is imported before a command is known."""
    code = (
        "import sys\nfrom auditor.command_line import main\n"
        "try:\n    main(['--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = {'numpy', 'pandas', 'pint', 'plotly', 'CoolProp', 'scipy', 'pyarrow', 'jinja2'}\n"
        "print('HEAVY', sorted(heavy & set(sys.modules)))\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-1] == "HEAVY []"
