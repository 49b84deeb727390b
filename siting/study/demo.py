"""Where the demo study is: inside the installed package, or beside it in a checkout."""

from __future__ import annotations

from pathlib import Path

from siting.errors import Fault, StudyError

DEMO = "demo"
"""What a user writes instead of a path to mean the demo study."""


def demo_folder() -> Path:
    """
    Return the folder of the demo study that comes with the program.

    Returns
    -------
    folder
        `siting/demo` of an installed wheel, or `demo_data/study` of a checkout.

    Raises
    ------
    FileNotFoundError
        If neither is there: the installation is damaged.
    """
    package = Path(__file__).resolve().parent.parent
    for folder in (package / "demo", package.parent / "demo_data" / "study"):
        if (folder / "study.toml").is_file():
            return folder
    msg = f"the demo study is in neither {package / 'demo'} nor {package.parent / 'demo_data'}. Install siting again."
    raise FileNotFoundError(msg)


def study_path(given: str) -> Path:
    """
    Return the path a user means: the demo study for `demo` where no file or folder has that name, else the path itself.

    Parameters
    ----------
    given
        What the user wrote.

    Raises
    ------
    StudyError
        If it is the folder of a plan, whose tables of results are easily taken for a study's.
    """
    path = Path(given)
    if (path / "plan.json").is_file() and (path / "study" / "study.toml").is_file():
        wrong, repair = "the folder of a plan, not of a study", f"Give the study in it, {path / 'study'}"
        raise StudyError([Fault(table="study", value=given, wrong=wrong, repair=repair)])
    return demo_folder() if given == DEMO and not path.exists() else path
