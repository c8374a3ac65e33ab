"""Where the files beside the program are: templates, static files, migrations, seed data."""

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent


def find_folder(name: str) -> Path:
    """Return the folder of a name: inside an installed package, else beside it in the source tree.

    Raises:
        FileNotFoundError: it is in neither place.
    """
    for folder in (_PACKAGE / "_files" / name, _PACKAGE.parent / name):
        if folder.is_dir():
            return folder
    says = f"The folder {name} that belongs to the program is missing."
    raise FileNotFoundError(says)
