"""A new site folder, to be filled in."""

from __future__ import annotations

from importlib import resources
from pathlib import Path

from meterlens.errors import SettingsError
from meterlens.settings.loading import SITE_FILE

__all__ = ["write_new_site"]


def write_new_site(folder: Path) -> Path:
    """Make a site folder with a commented site.toml and room for exports and reports.

    Parameters
    ----------
    folder : Path
        The folder; it is made where it does not exist.

    Returns
    -------
    Path
        The site.toml that was written.

    Raises
    ------
    SettingsError
        Where the folder has a site.toml already, or cannot be written.
    """
    file = folder / SITE_FILE
    text = resources.files("meterlens.settings").joinpath("new_site.toml").read_text("utf-8")
    try:
        for name in ("exports", "reports"):
            (folder / name).mkdir(parents=True, exist_ok=True)
        with file.open("x", encoding="utf-8", newline="\n") as out:
            out.write(text)
    except FileExistsError as error:
        if error.filename is not None and Path(error.filename) != file:
            raise SettingsError(
                "is in the way: a folder is wanted.", file=error.filename
            ) from error
        raise SettingsError(
            "exists already, and is left as it is.",
            file=file,
            hint="Name another folder, or edit the file.",
        ) from error
    except OSError as error:
        raise SettingsError(f"cannot be written: {error.strerror}.", file=file) from error
    return file
