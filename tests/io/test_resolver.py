import shutil
import subprocess
import sys
import venv
import zipfile
from pathlib import Path

import pytest

import unitclass
from unitclass.errors import FileError
from unitclass.io import resolver

SHOW = ("from unitclass.io.resolver import *; import unitclass; "
        "print(templates_folder()); print(samples_folder()); print(unitclass.__file__)")
ROOT = Path(unitclass.__file__).resolve().parent.parent


def test_a_checkout_is_used_where_it_stands():
    assert resolver.checkout_folder() == ROOT
    assert resolver.templates_folder() == ROOT / "templates"
    assert resolver.samples_folder() == ROOT / "sample_nwb"


def installed(tmp_path, monkeypatch, pyproject=""):
    package = tmp_path / "unitclass"
    (package / "_data" / "templates").mkdir(parents=True)
    if pyproject:
        (tmp_path / "pyproject.toml").write_text(pyproject)
    monkeypatch.setattr(unitclass, "__file__", str(package / "__init__.py"))
    monkeypatch.setattr(resolver.resources, "files", lambda name: package)
    return package


@pytest.mark.parametrize("pyproject", ["", "[project]\nname = 'another'\n", "[project\n", "\xff"])
def test_an_installed_copy_uses_its_own_data_whatever_lies_beside_it(tmp_path, monkeypatch, pyproject):
    package = installed(tmp_path, monkeypatch, pyproject)
    assert resolver.templates_folder() == package / "_data" / "templates"


def test_missing_data_is_named(tmp_path, monkeypatch):
    installed(tmp_path, monkeypatch)
    with pytest.raises(FileError, match=r"no folder sample_nwb; install the program again"):
        resolver.samples_folder()


# ------------------------------------------------------------------- real installations

@pytest.fixture(scope="module")
def project(tmp_path_factory):
    """Return a clean copy of what a wheel is built from."""
    copy = tmp_path_factory.mktemp("project")
    for name in ("unitclass", "templates", "sample_nwb", "docs"):
        shutil.copytree(ROOT / name, copy / name, ignore=shutil.ignore_patterns("__pycache__", "*.part"))
    for name in ("pyproject.toml", "README.md"):
        shutil.copy(ROOT / name, copy / name)
    return copy


def built(project, into, hook):
    for name in ("hatchling", "editables"):
        pytest.importorskip(name, reason=f"{name} is needed to build the project: it is in the extra 'test'")
    code = f"from hatchling import build; print(build.{hook}({str(into)!r}))"
    done = subprocess.run([sys.executable, "-c", code], cwd=project, check=True, capture_output=True, text=True)
    return into / done.stdout.split()[-1]


def shown_by(python, folder, **environment):
    done = subprocess.run([python, "-c", SHOW], cwd=folder, check=True, capture_output=True, text=True,
                          env={"PATH": "", **environment})
    return [Path(line) for line in done.stdout.splitlines()]


def installed_in_venv(wheel, folder):
    """Unpack a wheel into a fresh environment, as an installer does (PEP 427), without any network."""
    venv.create(folder, with_pip=False)
    python = next(p for p in (folder / "bin" / "python", folder / "Scripts" / "python.exe") if p.exists())
    where = subprocess.run([python, "-c", "import sysconfig; print(sysconfig.get_path('purelib'))"], check=True,
                           capture_output=True, text=True).stdout.strip()
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(where)
    return python, Path(where).resolve()


@pytest.mark.slow
def test_a_wheel_carries_templates_and_samples(project, tmp_path):
    python, site = installed_in_venv(built(project, tmp_path, "build_wheel"), tmp_path / "venv")
    templates, samples, module = shown_by(python, tmp_path)
    assert module.resolve().is_relative_to(site)
    assert templates.resolve() == site / "unitclass" / "_data" / "templates"
    assert samples.resolve() == site / "unitclass" / "_data" / "sample_nwb"
    for found, original in ((templates, project / "templates"), (samples, project / "sample_nwb")):
        names = {p.relative_to(found) for p in found.rglob("*") if p.is_file()}
        assert names == {p.relative_to(original) for p in original.rglob("*") if p.is_file()}


@pytest.mark.slow
def test_an_editable_install_uses_the_checkout_and_not_a_stale_copy(project, tmp_path):
    python, _ = installed_in_venv(built(project, tmp_path, "build_editable"), tmp_path / "venv")
    templates, samples, module = shown_by(python, tmp_path)
    assert module.resolve() == (project / "unitclass" / "__init__.py").resolve()
    assert templates.resolve() == (project / "templates").resolve()
    assert samples.resolve() == (project / "sample_nwb").resolve()


@pytest.mark.slow
def test_a_checkout_on_the_path_uses_its_own_folders(project, tmp_path):
    templates, samples, _ = shown_by(sys.executable, tmp_path, PYTHONPATH=str(project))
    assert (templates.resolve(), samples.resolve()) == (
        (project / "templates").resolve(), (project / "sample_nwb").resolve())
