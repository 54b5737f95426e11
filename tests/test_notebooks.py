"""The notebooks run from top to bottom, and what they show is there."""

import runpy
import shutil
import sys
from pathlib import Path

import nbformat
import pytest
from jupyter_client.kernelspec import KernelSpec
from jupyter_client.manager import AsyncKernelManager
from nbclient import NotebookClient

from explorer.scenario import first_question

NOTEBOOKS = Path(__file__).resolve().parent.parent / "notebooks"


class ThisPython(AsyncKernelManager):
    """A kernel of the Python that runs the tests, whatever kernels the machine knows."""

    @property
    def kernel_spec(self) -> KernelSpec:
        launch = ["-m", "ipykernel_launcher", "-f", "{connection_file}"]
        return KernelSpec(argv=[sys.executable, *launch], display_name="this", language="python")


@pytest.mark.parametrize("path", sorted(NOTEBOOKS.glob("*.ipynb")), ids=lambda path: path.stem)
def test_notebook_runs(path: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """In a folder of its own, beside the measured files: what a notebook writes goes there."""
    shutil.copytree(NOTEBOOKS / "measured", tmp_path / "measured")
    monkeypatch.setenv("PYTHONPATH", str(NOTEBOOKS.parent))
    notebook = nbformat.read(path, as_version=4)
    client = NotebookClient(
        notebook,
        timeout=300,
        km=ThisPython(),
        resources={"metadata": {"path": str(tmp_path)}},
        store_widget_state=True,
    )
    client.execute()
    outputs = [output for cell in notebook.cells for output in cell.get("outputs", ())]
    assert outputs
    assert not [output for output in outputs if output.output_type == "error"]
    assert not [output for output in outputs if output.get("name") == "stderr"]
    if path.stem == "explorer":
        views = [output.data for output in outputs if output.output_type == "execute_result"]
        assert ["application/vnd.jupyter.widget-view+json" in data for data in views] == [True]
        models = notebook.metadata.widgets["application/vnd.jupyter.widget-state+json"]["state"]
        classes = {
            name for model in models.values() for name in model["state"].get("_dom_classes", ())
        }
        assert {"explorer", "panel-map", "panel-headline", "panel-budget"} <= classes


def test_the_notebook_does_the_job_of_the_page(tmp_path: Path) -> None:
    """The same published values, the same invented device, the same requirements."""
    cells = nbformat.read(NOTEBOOKS / "from_code.ipynb", as_version=4).cells
    sources = [cell.source for cell in cells if cell.cell_type == "code"]
    upto = next(index for index, source in enumerate(sources) if "requirements = " in source)
    script = tmp_path / "main_job.py"
    script.write_text("\n".join(sources[: upto + 1]), encoding="utf-8")
    names = runpy.run_path(str(script))
    design = first_question().design
    assert names["point"] == dict(design.point)
    assert names["requirements"] == design.requirements


def test_notebooks_are_kept_without_outputs() -> None:
    for path in NOTEBOOKS.glob("*.ipynb"):
        for cell in nbformat.read(path, as_version=4).cells:
            assert not cell.get("outputs"), path.name
            assert cell.get("execution_count") is None, path.name
