"""Where the data that comes with the program lies: themes and sample projects.

In a checkout these folders stand at the top, where people look for them; a wheel carries them beside the
code. Nothing else in the house may guess at either place.
"""

from pathlib import Path
from typing import Literal

DataFolder = Literal["themes", "sample_projects"]


def data_folder(name: DataFolder) -> Path:
    """Folder of data that comes with the program, in a checkout or in an installed wheel.

    Args:
        name: Which of the folders.

    Returns: Path of an existing folder; its files are to be copied, never written.

    Raises:
        FileNotFoundError: The installation is incomplete; the message names both places looked at.
    """
    from importlib.resources import files

    package = Path(str(files("worksheet")))
    places = (package / "_data" / name, package.parent / name)
    for place in places:
        if place.is_dir():
            return place
    raise FileNotFoundError(
        f"this installation has no folder {name!r}: looked for {places[0]} and {places[1]}; install biasbook again"
    )
