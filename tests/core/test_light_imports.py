"""What an import costs: the core loads no window library and no file-format library, the command line no window."""

import json
import subprocess
import sys

HEAVY = ("PySide6", "shiboken6", "pyqtgraph", "astropy", "skyfield", "jplephem", "matplotlib", "scipy")

# Every module of the package is imported by name, so that one that a test never touches is seen too.
IMPORT_ALL = """
import importlib, json, pkgutil, sys
import colure
names = [m.name for m in pkgutil.walk_packages(colure.__path__, "colure.")]
for name in names:
    importlib.import_module(name)
print(json.dumps([names, sorted(sys.modules)]))
"""


def _run(code: str) -> str:
    """Run code in a fresh interpreter and return what it prints."""
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_no_core_module_loads_a_heavy_library() -> None:
    names, loaded = json.loads(_run(IMPORT_ALL))
    assert "colure.constellations" in names
    assert set(names) <= set(loaded)
    heavy = [name for name in loaded if name.partition(".")[0] in (*HEAVY, "colure_viewer")]
    assert heavy == []


def test_the_command_line_package_loads_no_window() -> None:
    # `colure where` must work where Qt is not installed: importing the package that holds it must not need Qt.
    loaded = json.loads(_run("import json, sys, colure_viewer.cli; print(json.dumps(sorted(sys.modules)))"))
    heavy = [name for name in loaded if name.partition(".")[0] in HEAVY]
    assert heavy == []


def test_importing_the_core_reads_no_data_file() -> None:
    # Nothing is parsed at start-up: an import may look for the data folder but must open no file in it.
    code = (
        "import sys, json\n"
        "opened = []\n"
        "sys.addaudithook(lambda event, args: opened.append(str(args[0])) if event == 'open' else None)\n"
        + IMPORT_ALL.replace("print(", "print(json.dumps([o for o in opened if 'colure_resources' in o])) #")
    )
    opened = [name for name in json.loads(_run(code)) if not name.endswith((".py", ".pyc"))]
    assert opened == []
