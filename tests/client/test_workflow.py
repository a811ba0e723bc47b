"""The workflow for archives that outgrow one machine, run on this one: its reports say what one audit of the whole says."""
import json
import subprocess
import sys
from pathlib import Path

import nbformat
from jupyter_client.kernelspec import get_kernel_spec
from nbformat.v4 import new_code_cell, new_notebook

ROOT = Path(__file__).parents[2]
SHARDS = 3


def hessbook(*arguments, status=0):
    program = get_kernel_spec("hessbook").argv[0]
    done = subprocess.run([program, *map(str, arguments)], capture_output=True, text=True)
    assert done.returncode == status, done.stderr
    return done.stdout


def workflow(folder, archive, **settings):
    """Runs it from `folder`, as on a node of a cluster; the file knows nothing of where it is run."""
    settings = {"archive": archive, "shards": SHARDS, "program": get_kernel_spec("hessbook").argv[0], **settings}
    pairs = [f"{name}={value}" for name, value in settings.items()]
    command = [sys.executable, "-m", "snakemake", "--snakefile", ROOT / "workflows" / "audit.smk", "--cores", "2"]
    return subprocess.run([*map(str, command), "--config", *pairs], cwd=folder, capture_output=True, text=True)


def test_the_shards_of_an_archive_are_audited_apart_and_reported_together(tmp_path):
    archive = tmp_path / "archive of the plant"
    archive.mkdir()
    for n in range(8):
        cells = [new_code_cell(f'report("energy", q("{n}.5(1) kJ"))')]
        path = archive / f"{n}.ipynb"
        nbformat.write(new_notebook(cells=cells), path)
        hessbook("seal", path)
    # One is edited after it was sealed, and one cannot be read.
    edited = nbformat.read(archive / "3.ipynb", as_version=4)
    edited.cells[0].source = 'report("energy", q("9.5(1) kJ"))'
    nbformat.write(edited, archive / "3.ipynb")
    (archive / "5.ipynb").write_text("{")
    # Names with spaces cannot stand in a list that spaces part; a folder's own path can be given without them.
    link = tmp_path / "archive"
    link.symlink_to(archive)
    ran = workflow(tmp_path, link, options="--strict-data")
    assert ran.returncode == 0, ran.stderr
    together = json.loads((tmp_path / "audit" / "audit.json").read_text())
    whole = json.loads(hessbook("audit", link, "--strict-data", "--format", "json", status=2))
    assert together["tally"] == whole["tally"]
    assert together["notebooks"] == whole["notebooks"]
    assert (tmp_path / "audit" / "audit.status").read_text().strip() == "2"
    page = (tmp_path / "audit" / "audit.html").read_text()
    assert "3.ipynb" in page and "5.ipynb" in page
    assert (tmp_path / "audit" / "audit.xml").stat().st_size > 0
    states = sorted((tmp_path / "audit" / "shards").glob("*.json"))
    assert len(states) == SHARDS

    # A shard that was cut off goes on where it stopped: the others are not audited again.
    cut = next(state for state in states if '\n{"audit"' in state.read_text())
    lines = cut.read_text().splitlines(keepends=True)
    cut.write_text("".join(lines[:-1]))
    cut.with_suffix(".done").unlink()
    before = {state: state.read_bytes() for state in states if state != cut}
    again = workflow(tmp_path, link, options="--strict-data")
    assert again.returncode == 0, again.stderr
    assert all(state.read_bytes() == content for state, content in before.items())
    # Head and audits are what they were; that it was done stands behind them.
    assert cut.read_text().startswith("".join(lines[:-1]))
    assert cut.read_text().count('\n{"audit"') == len(lines) - 2


    # Other options make another audit, which the state of this one cannot go on with: no old report passes for it.
    other = workflow(tmp_path, link, options="--strict-data --from-sources")
    assert other.returncode != 0
    assert "made with other options" in other.stderr


def test_a_shard_that_cannot_be_audited_leaves_no_report(tmp_path):
    ran = workflow(tmp_path, tmp_path / "nowhere*")
    assert ran.returncode != 0
    assert not (tmp_path / "audit" / "audit.html").exists()
