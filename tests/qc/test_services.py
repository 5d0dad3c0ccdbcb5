"""From stored analyses to flags, and the same flags every time."""

import pytest

from labdata.jobs import run_here
from labdata.models import AuditEntry
from qc.models import Flag, QcRun
from qc.services import run_answer, start_run
from tests.qc.storing import store


@pytest.mark.django_db(transaction=True)
def test_a_run_keeps_flags_with_their_cells_and_an_audit_entry():
    project = store([
        {"well": "Quill 1", "label": "S-1", "top_m": 2000.0, "base_m": 2010.0, "S2": "0.14", "TMAX": "358", "TOC": "1.20"},
        {"well": "Quill 1", "label": "S-2", "top_m": 2010.0, "base_m": 2020.0, "S2": "5.10", "TMAX": "441", "TOC": "1.50"},
    ])  # fmt: skip
    job = run_here(start_run(project, None, None))
    assert job.state == "succeeded", job.error_detail
    run = QcRun.objects.get(pk=job.result["run"])
    flag = Flag.objects.get(rule="s2_floor_for_tmax")
    assert (flag.analyte, flag.severity, flag.value) == ("TMAX", "reject-candidate", 358.0)
    assert flag.analysis.sample.label == "S-1"
    assert [one["cell"] for one in flag.evidence["inputs"]] == ["B2", "A2"]
    answer = run_answer(run)
    assert answer["checked"] == {"analyses": 2, "results": 6}
    assert AuditEntry.objects.filter(action="qc.run", object_id=str(run.pk)).exists()
