"""Where a file comes from: configuration, versions, revision and command line, independent of the host."""

from __future__ import annotations

import hashlib
import importlib.metadata
import json
import platform
import subprocess
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path, PureWindowsPath
from typing import Any

from ..errors import VERSION

PACKAGES = ("numpy", "numba", "scipy", "h5py")

# what may differ when a run is resumed: it changes no number already stored
MAY_CHANGE = (("time", "until"), ("numerics", "threads"), ("output", "checkpoint_every"))


@dataclass(frozen=True)
class Provenance:
    """What made a run.

    Parameters
    ----------
    configuration : str
        The configuration's text, verbatim.
    settings : mapping
        Everything after overrides, with defaults filled, as it goes into settings.json.
    command : str
        The command line without anything of the host in it.
    versions : mapping of str to str
        Version of each package that takes part.
    revision : str
        Git revision of the program, empty where it does not run from a checkout.
    """

    configuration: str
    settings: Mapping[str, Any]
    command: str = ""
    versions: Mapping[str, str] = field(default_factory=dict)
    revision: str = ""

    @property
    def title(self) -> str:
        """Title of the experiment."""
        return str(self.settings.get("title") or "")

    @property
    def experiment(self) -> str:
        """Digest of the settings that a file of this run carries."""
        return digest(self.settings)


def gather_provenance(configuration: str, settings: Mapping[str, Any], arguments: Sequence[str]) -> Provenance:
    """Collect what made a run.

    Parameters
    ----------
    configuration : str
        The configuration's text.
    settings : mapping
        Everything after overrides, with defaults filled.
    arguments : sequence of str
        The command line, program first.
    """
    return Provenance(configuration, settings, without_host(arguments), package_versions(), git_revision())


def digest(settings: Mapping[str, Any]) -> str:
    """Return a digest of the settings, leaving out what may change when a run is resumed."""
    kept = {key: value for key, value in flatten(settings) if key not in MAY_CHANGE}
    text = json.dumps([[list(key), value] for key, value in sorted(kept.items(), key=repr)])
    return hashlib.sha256(text.encode()).hexdigest()[:16]


def flatten(settings: Any, key: tuple[str | int, ...] = ()) -> Iterator[tuple[tuple[str | int, ...], Any]]:
    """Yield (key path, value) of every entry of nested tables and lists."""
    if isinstance(settings, Mapping):
        for name, value in settings.items():
            yield from flatten(value, (*key, name))
    elif isinstance(settings, list | tuple) and settings:
        for number, value in enumerate(settings):
            yield from flatten(value, (*key, number))
    else:
        yield key, settings


def without_host(arguments: Sequence[str]) -> str:
    """Write a command line with every absolute path cut to its name."""
    return " ".join("=".join(_name_only(part) for part in argument.split("=")) for argument in arguments)


def _name_only(text: str) -> str:
    for path in (Path(text), PureWindowsPath(text)):
        if path.is_absolute():
            return path.name
    return text


def package_versions() -> dict[str, str]:
    """Return the versions of the interpreter and of the packages that take part."""
    versions = {"python": platform.python_version(), "swmodel": VERSION}
    for name in PACKAGES:
        try:
            versions[name] = importlib.metadata.version(name)
        except importlib.metadata.PackageNotFoundError:
            versions[name] = "not installed"
    return versions


def git_revision(folder: Path | None = None) -> str:
    """Return the git revision of the program, with ``-dirty`` where files differ from it; empty outside a checkout.

    Parameters
    ----------
    folder : Path, optional
        Where to ask; the package's own folder by default. A package that lies in someone's repository without being
        part of it (installed there, not tracked) has no revision.
    """
    folder = folder or Path(__file__).parent
    name = Path(__file__).name

    def git(*words: str) -> str:
        answer = subprocess.run(["git", *words], cwd=folder, capture_output=True, text=True, timeout=10, check=True)
        return answer.stdout.strip()

    try:
        git("ls-files", "--error-unmatch", name)
        return git("describe", "--always", "--dirty", "--abbrev=40", "--exclude=*")
    except (OSError, subprocess.SubprocessError):
        return ""
