"""Folders that ship beside the package are found from a checkout and from an installed package."""

from __future__ import annotations

import importlib.util
import shutil
from pathlib import Path

import pytest

from auditor import resources
from auditor.records.errors import AuditorError


def _module_at(path: Path) -> object:
    """The module as it would be in another place."""
    path.parent.mkdir(parents=True)
    shutil.copy(resources.__file__, path)
    spec = importlib.util.spec_from_file_location("moved_resources", path)
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_checkout_holds_the_folders() -> None:
    """In a checkout they lie at the top, beside pyproject.toml (or inside, once installed)."""
    assert (resources.folder("report_templates") / "report.html").is_file()


def test_an_installed_package_uses_its_own_folder(tmp_path: Path) -> None:
    """A wheel carries the folder inside the package."""
    module = _module_at(tmp_path / "site-packages" / "auditor" / "resources.py")
    (tmp_path / "site-packages" / "auditor" / "report_templates").mkdir()
    found = module.folder("report_templates")  # type: ignore[attr-defined]
    assert found == tmp_path / "site-packages" / "auditor" / "report_templates"


def test_a_stray_folder_without_a_project_is_not_taken(tmp_path: Path) -> None:
    """A folder of the same name beside site-packages is somebody else's."""
    module = _module_at(tmp_path / "site-packages" / "auditor" / "resources.py")
    (tmp_path / "site-packages" / "report_templates").mkdir()
    with pytest.raises(AuditorError, match="install the program again"):
        module.folder("report_templates")  # type: ignore[attr-defined]
