"""Where the user's Python is: a small file that `uffuncs install calc` writes and the add-in reads."""

import json
import os
import sys
import tempfile
import time

#: Names the file directly; for tests and for several installations.
OVERRIDE = "UFFUNCS_CALC_CONFIG"
#: Seconds after which a call is given up.
TIME_LIMIT = 30.0
AUTOMATIC, IN_PROCESS, WORKER = "automatic", "in process", "worker"


class Problem(Exception):
    """Why the functions cannot be reached, in plain words."""


def configuration_path():
    """The file's path: in the user's folder for settings."""
    given = os.environ.get(OVERRIDE)
    if given:
        return given
    home = os.path.expanduser("~")
    if os.name == "nt":
        base = os.environ.get("APPDATA") or os.path.join(home, "AppData", "Roaming")
    elif sys.platform == "darwin":
        base = os.path.join(home, "Library", "Application Support")
    else:
        base = os.environ.get("XDG_CONFIG_HOME") or os.path.join(home, ".config")
    return os.path.join(base, "uffuncs", "calc.json")


def problem_path():
    """Where the add-in notes its last problem for `uffuncs doctor`."""
    return os.path.splitext(configuration_path())[0] + "_problem.txt"


def read_configuration():
    """The settings: python, version, paths, mode, seconds.

    Raises
    ------
    Problem
        No file, or not one that `uffuncs install calc` wrote.
    """
    path = configuration_path()
    try:
        with open(path, encoding="utf-8") as file:
            found = json.load(file)
    except FileNotFoundError:
        raise Problem("%s is missing; run: uffuncs install calc" % path) from None
    except (OSError, ValueError) as error:
        raise Problem("%s cannot be read (%s); run: uffuncs install calc" % (path, error)) from None
    if not isinstance(found, dict) or not isinstance(found.get("python"), str):
        raise Problem("%s does not name a Python; run: uffuncs install calc" % path)
    found["paths"] = [p for p in found.get("paths") or () if isinstance(p, str)]
    seconds = found.get("seconds")
    found["seconds"] = float(seconds) if isinstance(seconds, (int, float)) and seconds > 0 else TIME_LIMIT
    return found


def write_configuration(settings):
    """Write the settings in one step."""
    path = configuration_path()
    write_text(path, json.dumps(settings, indent=2, sort_keys=True) + "\n")
    return path


def note_problem(text):
    """Keep a problem for `uffuncs doctor`; a folder that cannot be written is no further problem."""
    try:
        write_text(problem_path(), "%s  %s\n" % (time.strftime("%Y-%m-%d %H:%M"), text))
    except OSError:
        pass


def write_text(path, text):
    """Write a text file under a temporary name and move it into place."""
    folder = os.path.dirname(path)
    os.makedirs(folder, exist_ok=True)
    handle, temporary = tempfile.mkstemp(prefix=".uffuncs-", dir=folder)
    try:
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            file.write(text)
        os.replace(temporary, path)
    except BaseException:
        os.unlink(temporary)
        raise
