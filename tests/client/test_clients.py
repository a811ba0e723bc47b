"""The kernel under the clients that people use: what a person would see in each of them.

Waiting polls for up to a minute and no duration is asserted, so that a slow machine fails no test.
"""
import json
import os
import subprocess
import sys
from pathlib import Path

import nbformat
import pytest
from jupyter_client.manager import KernelManager
from nbclient import NotebookClient
from nbclient.exceptions import CellExecutionError
from nbformat.v4 import new_code_cell, new_markdown_cell, new_notebook

KERNEL = "hessbook"
PATIENCE = 60
SPEC = {"name": KERNEL, "display_name": "hessbook (thermochemistry)", "language": "rhai"}


@pytest.fixture
def manager():
    manager = KernelManager(kernel_name=KERNEL)
    manager.start_kernel()
    yield manager
    if manager.has_kernel:
        manager.shutdown_kernel(now=True)


@pytest.fixture
def client(manager):
    client = manager.client()
    client.start_channels()
    client.wait_for_ready(timeout=PATIENCE)
    yield client
    client.stop_channels()


def run(client, code):
    """Runs a cell; gives its reply and what was published for it."""
    published = []
    reply = client.execute_interactive(code, timeout=PATIENCE, allow_stdin=False, output_hook=published.append)
    return reply["content"], published


def shown(published):
    return [m["content"]["data"]["text/plain"] for m in published if m["msg_type"] == "execute_result"]


def notebook(*sources):
    cells = [new_markdown_cell("A notebook of the tests")] + [new_code_cell(source) for source in sources]
    return new_notebook(cells=cells, metadata={"kernelspec": SPEC})


def jupyter(*arguments, **options):
    command = [sys.executable, "-m", *arguments]
    return subprocess.run(command, capture_output=True, text=True, timeout=5 * PATIENCE, **options)


def test_a_cell_prints_and_shows_its_value(client):
    reply, published = run(client, 'print("hello"); 6 * 7')
    assert reply["status"] == "ok"
    assert [m["content"]["text"] for m in published if m["msg_type"] == "stream"] == ["hello\n"]
    assert shown(published) == ["42"]


def test_a_failed_cell_says_where_it_failed_and_the_way_out(client):
    run(client, "let a = 1;")
    reply, _ = run(client, 'let b = 2;\nthrow "on purpose";')
    assert reply["status"] == "error"
    text = "\n".join(reply["traceback"])
    assert "cell-2, line 2" in text, text
    assert "try: " in text, text


def test_an_interrupt_ends_the_cell_and_keeps_the_variables(manager, client):
    run(client, "let kept = 41;")
    request = client.execute("loop { }")
    while True:
        message = client.get_iopub_msg(timeout=PATIENCE)
        if message["msg_type"] == "execute_input" and message["parent_header"]["msg_id"] == request:
            break
    manager.interrupt_kernel()
    reply = client.get_shell_msg(timeout=PATIENCE)
    assert reply["parent_header"]["msg_id"] == request
    assert reply["content"]["status"] == "error"
    assert shown(run(client, "kept + 1")[1]) == ["42"]


@pytest.mark.parametrize(
    "code",
    [
        "fn deeper(x) { deeper(x) } deeper(1)",
        "blob(100000000000000)",
        'let text = "x"; loop { text += text; }',
        '"x".pad(100000000000000, "y")',
    ],
)
def test_a_cell_that_wants_too_much_fails_alone(client, code):
    run(client, "let kept = 41;")
    reply, _ = run(client, code)
    assert reply["status"] == "error"
    assert shown(run(client, "kept + 1")[1]) == ["42"]


def test_a_restart_forgets_and_serves_the_same_client(manager, client):
    run(client, "let kept = 41;")
    manager.restart_kernel()
    client.wait_for_ready(timeout=PATIENCE)
    reply, _ = run(client, "kept + 1")
    assert (reply["status"], reply["execution_count"]) == ("error", 1)


def test_a_shutdown_needs_no_force(manager, client):
    process = manager.provisioner.process
    manager.shutdown_kernel()
    assert process.wait(PATIENCE) == 0


def test_a_notebook_runs_from_top_to_bottom_and_is_valid():
    ran = notebook("let x = 20;", "print(\"printed\"); x + 1", "x * 2 + 2")
    NotebookClient(ran, timeout=PATIENCE, kernel_name=KERNEL, raise_on_iopub_timeout=True).execute()
    nbformat.validate(ran)
    outputs = [cell.outputs for cell in ran.cells if cell.cell_type == "code"]
    assert outputs[0] == []
    assert outputs[1][0]["text"] == "printed\n"
    assert [outputs[1][1]["data"]["text/plain"], outputs[2][0]["data"]["text/plain"]] == ["21", "42"]
    assert ran.metadata.language_info.name == "rhai"


def test_a_notebook_stops_at_its_first_error_unless_errors_are_allowed():
    stopped = notebook('throw "on purpose"', "6 * 7")
    with pytest.raises(CellExecutionError):
        NotebookClient(stopped, timeout=PATIENCE, kernel_name=KERNEL).execute()
    assert stopped.cells[2].outputs == []
    allowed = notebook('throw "on purpose"', "6 * 7")
    NotebookClient(allowed, timeout=PATIENCE, kernel_name=KERNEL, allow_errors=True).execute()
    assert allowed.cells[1].outputs[0]["output_type"] == "error"
    assert allowed.cells[2].outputs[0]["data"]["text/plain"] == "42"


def test_a_notebook_becomes_a_page_on_the_command_line(tmp_path):
    source = tmp_path / "first.ipynb"
    nbformat.write(notebook("6 * 7"), source)
    made = jupyter("nbconvert", "--to", "html", "--execute", str(source), cwd=tmp_path)
    assert made.returncode == 0, made.stderr
    page = (tmp_path / "first.html").read_text(encoding="utf8")
    assert "<pre>42</pre>" in page


RECORD = "application/vnd.hessbook.report.v1+json"


@pytest.mark.parametrize("source", sorted(Path("notebooks").glob("*.ipynb")), ids=lambda path: path.stem)
def test_a_shipped_notebook_gives_the_records_of_the_command_line(source, tmp_path):
    """Kernel and runner are two ways to one session: the same records, to the last digit."""
    made = jupyter("nbconvert", "--to", "notebook", "--execute", str(source), "--output-dir", str(tmp_path))
    assert made.returncode == 0, made.stderr
    executed = nbformat.read(tmp_path / source.name, as_version=4)
    outputs = [output for cell in executed.cells for output in cell.get("outputs", [])]
    by_kernel = [output["data"][RECORD] for output in outputs if RECORD in output.get("data", {})]
    [program] = KernelManager(kernel_name=KERNEL).kernel_spec.argv[:1]
    ran = subprocess.run([program, "run", "--format", "json", str(source)], capture_output=True, text=True, check=True)
    assert by_kernel and json.loads(ran.stdout)["reports"] == by_kernel


def test_the_kernel_is_listed_with_its_logo():
    listed = jupyter("jupyter_client.kernelspecapp", "list", "--json")
    assert listed.returncode == 0, listed.stderr
    manager = KernelManager(kernel_name=KERNEL)
    assert manager.kernel_spec.interrupt_mode == "message"
    assert os.path.exists(os.path.join(manager.kernel_spec.resource_dir, "logo-svg.svg"))
    assert f'"{KERNEL}"' in listed.stdout
