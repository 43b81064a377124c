"""Make the front-end files of others anew, in the versions vendor.json names. Needs npm.

    python .ci/vendor_assets.py

Writes static/vendor and static/fonts: the files as they are published, one Plotly bundle with only
the kinds of trace that are drawn, Plotly's own style sheet as a file (it may not add styles under
our content policy), THIRD_PARTY.md with the licence of every package in the bundle, and
MANIFEST.json with the digests that tests/house/test_vendored.py checks without a network.
"""

import hashlib
import json
import re
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
SPEC = json.loads((ROOT / ".ci/vendor.json").read_text(encoding="utf-8"))
STATIC = ROOT / "static"
BUNDLE, STYLES, NOTICES = "plotly-custom.min.js", "plotly.css", "THIRD_PARTY.md"
LICENCES = ("LICENSE*", "LICENCE*", "license*", "COPYING*")


def main() -> None:
    with tempfile.TemporaryDirectory() as box:
        modules = install(Path(box))
        for name, source in SPEC["files"].items():
            (STATIC / name).parent.mkdir(parents=True, exist_ok=True)
            shutil.copyfile(modules / source, STATIC / name)
        packages = bundle(Path(box), STATIC / "vendor" / BUNDLE)
        rules = (modules / "plotly.js/build/plotcss.js").read_text(encoding="utf-8")
        (STATIC / "vendor" / STYLES).write_text(styles(rules), encoding="utf-8")
        notices = "".join(notice(modules / package) for package in packages)
        (STATIC / "vendor" / NOTICES).write_text(
            "# Packages inside plotly-custom.min.js\n" + notices, encoding="utf-8"
        )
    names = [*SPEC["files"], *(f"vendor/{name}" for name in (BUNDLE, STYLES, NOTICES))]
    manifest = {"packages": SPEC["packages"], "sha256": {}}
    for name in sorted(names):
        manifest["sha256"][name] = hashlib.sha256((STATIC / name).read_bytes()).hexdigest()
    (STATIC / "vendor/MANIFEST.json").write_text(
        json.dumps(manifest, indent=1) + "\n", encoding="utf-8"
    )


def install(box: Path) -> Path:
    wanted = {"private": True, "dependencies": SPEC["packages"]}
    (box / "package.json").write_text(json.dumps(wanted), encoding="utf-8")
    quiet = ["--ignore-scripts", "--no-audit", "--no-fund", "--no-package-lock", "--silent"]
    subprocess.run(["npm", "install", *quiet], cwd=box, check=True, timeout=600)
    return box / "node_modules"


def bundle(box: Path, target: Path) -> list[str]:
    """Build the Plotly bundle; answers the packages that went into it."""
    traces = "".join(f'P.register([require("plotly.js/lib/{name}")]);' for name in SPEC["traces"])
    entry = f'const P=require("plotly.js/lib/core");{traces}module.exports=P;'
    (box / "entry.js").write_text(entry, encoding="utf-8")
    options = ["--bundle", "--minify", "--format=iife", "--global-name=Plotly"]
    options += ["--define:global=window", "--target=es2019", "--legal-comments=eof"]
    options += ["--log-level=warning", "--outfile=bundle.js", "--metafile=inside.json"]
    program = box / "node_modules/.bin/esbuild"
    subprocess.run([program, "entry.js", *options], cwd=box, check=True, timeout=300)
    shutil.copyfile(box / "bundle.js", target)
    inputs = json.loads((box / "inside.json").read_text(encoding="utf-8"))["inputs"]
    inside = re.compile(r".*node_modules/((?:@[^/]+/)?[^/]+)/")
    found = {match[1] for match in map(inside.match, inputs) if match}
    return sorted(found)


def styles(script: str) -> str:
    """The rules Plotly would add to the page by itself."""
    rules = re.findall(r'^    ("(?:[^"\\]|\\.)*"): ("(?:[^"\\]|\\.)*"),?$', script, re.MULTILINE)
    return "".join(f"{rule}\n" for rule in map(_rule, rules))


def _rule(pair: tuple[str, str]) -> str:
    selector, declarations = (json.loads(text) for text in pair)
    selector = re.sub("^,", " ,", selector).replace("X", ".js-plotly-plot .plotly")
    return f"{selector.replace('Y', '.plotly-notifier')} {{ {declarations} }}"


def notice(package: Path) -> str:
    about = json.loads((package / "package.json").read_text(encoding="utf-8"))
    texts = "\n".join(_licences(package)) or "(The package carries no licence text.)"
    return f"\n## {about['name']} {about['version']}, {about['license']}\n\n```\n{texts}\n```\n"


def _licences(package: Path) -> Iterator[str]:
    for path in sorted({path for shape in LICENCES for path in package.glob(shape)}):
        yield path.read_text(encoding="utf-8").strip().replace("\r\n", "\n")


if __name__ == "__main__":
    main()
