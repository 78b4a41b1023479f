"""Where the folders that lie beside the package are: report templates and sample logs."""

from __future__ import annotations

from pathlib import Path

from auditor.records.errors import AuditorError, Fault


def folder(name: str) -> Path:
    """Find a folder that ships with the program.

    An installed package carries it inside itself; a checkout or an editable install has it at the top
    of the source tree, beside ``pyproject.toml``.

    Parameters
    ----------
    name : str
        ``report_templates`` or ``sample_logs``.

    Returns
    -------
    Path
        The folder, absolute.

    Raises
    ------
    AuditorError
        If neither place holds the folder: the installation is incomplete.
    """
    here = Path(__file__).resolve()
    inside = here.parent / name
    if inside.is_dir():
        return inside
    for parent in here.parents[1:3]:
        if (parent / "pyproject.toml").is_file() and (parent / name).is_dir():
            return parent / name
    raise AuditorError(
        [
            Fault(
                where=str(here.parent),
                found=f"the folder {name!r}, which ships with the program, is missing",
                fix="install the program again from a complete wheel or source tree",
            )
        ]
    )
