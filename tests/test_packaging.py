"""The program and what ships with it are found from a checkout, an editable install and a wheel."""

from __future__ import annotations

import hashlib
import importlib.metadata
import os
import subprocess
import sys
import tarfile
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
OUTPUTS = (
    "report.html",
    "intervals.csv",
    "intervals.parquet",
    "statement.json",
    "findings.json",
    "dispositions.csv",
)


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A wheel and a source distribution, built without a network."""
    target = tmp_path_factory.mktemp("built")
    command = [sys.executable, "-m", "build", "--no-isolation", "--outdir", str(target), str(ROOT)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr
    return target


def audited(folder: Path, search: str | None, *, isolated: bool = False) -> dict[str, str]:
    """Digests of a demo month, audited in another process from a folder that holds nothing of ours."""
    folder.mkdir()
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONPATH"}
    if search is not None:
        environment["PYTHONPATH"] = search
    flags = ["-I"] if isolated else []
    command = [sys.executable, *flags, "-m", "auditor", "demo", "quillmere", "site", "--audit", "--quiet"]
    done = subprocess.run(command, cwd=folder, env=environment, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    report = folder / "site" / "audit" / "2025-10"
    return {name: hashlib.sha256((report / name).read_bytes()).hexdigest() for name in OUTPUTS}


def _origin() -> str:
    """How auditor was installed here; empty if it was not."""
    try:
        return importlib.metadata.distribution("auditor").read_text("direct_url.json") or ""
    except importlib.metadata.PackageNotFoundError:
        return ""


def test_checkout_editable_install_and_wheel_give_the_same_bytes(built: Path, tmp_path: Path) -> None:
    """All three find templates and sample logs from another folder, and write identical outputs."""
    unpacked = tmp_path / "wheel"
    with zipfile.ZipFile(next(built.glob("*.whl"))) as wheel:
        wheel.extractall(unpacked)
    from_wheel = audited(tmp_path / "one", str(unpacked))
    assert audited(tmp_path / "two", str(ROOT)) == from_wheel
    origin = _origin()
    if '"editable": true' not in origin:
        pytest.skip("the editable install was not tried: auditor is installed another way here")
    assert audited(tmp_path / "three", None, isolated=True) == from_wheel


def test_the_wheel_holds_what_is_needed_and_nothing_else(built: Path) -> None:
    """Templates and sample logs are inside the package; no caches, no tests."""
    with zipfile.ZipFile(next(built.glob("*.whl"))) as wheel:
        names = wheel.namelist()
    assert "auditor/report_templates/report.html" in names
    assert "auditor/sample_logs/emberlund/plant.toml" in names
    assert "auditor/py.typed" in names
    tops = {name.partition("/")[0] for name in names}
    assert {top for top in tops if not top.startswith("auditor-")} == {"auditor"}
    assert not [name for name in names if "__pycache__" in name or name.endswith(".pyc")]


def test_the_source_distribution_is_complete(built: Path) -> None:
    """It can be tested as it stands: package, templates, samples, tests and papers."""
    with tarfile.open(next(built.glob("*.tar.gz"))) as source:
        names = {name.partition("/")[2] for name in source.getnames()}
    for needed in ("README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml", "tests/test_house.py"):
        assert needed in names
    assert "report_templates/report.html" in names
    assert "sample_logs/quillmere/generate.py" in names
