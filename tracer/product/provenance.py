"""Where a product comes from: the global attributes that this layer can know."""

import subprocess
from collections.abc import Sequence
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

from tracer.product.layout import PRODUCT_VERSION

CONVENTIONS = "CF-1.11"
DISTRIBUTION = "exosphere-tracer"
CHECKOUT = Path(__file__).resolve().parents[2]
"""Folder that holds the package: the top of a checkout, or a place of installed packages."""
GIT_SECONDS = 5.0
REFERENCES = ("Chamberlain, J. W. (1963), Planet. Space Sci. 11, 901",)


def global_attributes(
    title: str, action: str, references: Sequence[str] = (), created: datetime | None = None
) -> dict[str, str | int]:
    """Return the global attributes that do not depend on the scene.

    Parameters
    ----------
    title : str
        The run file's title.
    action : str
        What made the product, for the line of `history`, for example "tracer run harrow.toml".
    references : sequence of str
        Publications behind the laws of this run, beside those behind every run.
    created : datetime, optional
        Time of making, with a time zone; now if absent.

    Returns
    -------
    dict
        `Conventions`, `title`, `history`, `source`, `product_version`, `created`, `references`, and
        `git_commit` where the package lies in a git checkout.
    """
    moment = (created or datetime.now(UTC)).astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    attributes: dict[str, str | int] = {
        "Conventions": CONVENTIONS,
        "title": title,
        "history": f"{moment} {action}",
        "source": f"{DISTRIBUTION} {package_version()}",
        "product_version": PRODUCT_VERSION,
        "created": moment,
        "references": "; ".join([*REFERENCES, *(text for text in references if text not in REFERENCES)]),
    }
    commit = git_commit()
    return attributes if commit is None else {**attributes, "git_commit": commit}


def package_version() -> str:
    """Return the version of the installed package; "unknown" for a bare folder of sources."""
    try:
        return version(DISTRIBUTION)
    except PackageNotFoundError:
        return "unknown"


def git_commit(checkout: Path = CHECKOUT) -> str | None:
    """Return the commit of the package's own checkout, with `-dirty` behind it where the package was changed.

    None where the package does not lie at the top of a checkout, or git cannot tell.
    """
    # An installed package may lie inside some other project's checkout, whose commit would mislead.
    if not (checkout / ".git").exists():
        return None
    commit = _git(checkout, "rev-parse", "HEAD")
    changes = _git(checkout, "status", "--porcelain", "--untracked-files=no", "--", "tracer")
    if not commit or changes is None:
        return None
    return f"{commit}-dirty" if changes else commit


def _git(checkout: Path, *arguments: str) -> str | None:
    try:
        done = subprocess.run(
            ["git", "-C", str(checkout), *arguments],
            capture_output=True,
            text=True,
            timeout=GIT_SECONDS,
            check=True,
        )
    except (OSError, subprocess.SubprocessError, UnicodeDecodeError):
        return None
    return done.stdout.strip()
