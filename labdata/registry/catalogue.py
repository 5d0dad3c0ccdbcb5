"""The methods and analytes every project has, seeded from labdata/analytes.toml after migrations. Idempotent."""

from typing import Any

from django.apps import AppConfig
from django.apps import apps as installed
from django.apps.registry import Apps

from labdata.intake.fields import catalogue


def seed(sender: AppConfig | None = None, apps: Apps = installed, using: str = "default", **_: Any) -> None:
    """Create what is missing and bring the rest up to the file. Connected to post_migrate."""
    if sender is not None and not _has_tables(apps):
        return
    method_model, analyte_model = apps.get_model("labdata", "Method"), apps.get_model("labdata", "Analyte")
    listed = catalogue()
    methods = {}
    for code, entry in listed["methods"].items():
        methods[code], _made = method_model.objects.using(using).update_or_create(code=code, defaults=entry)
    held = {analyte.code: analyte for analyte in analyte_model.objects.using(using).filter(project=None)}
    fields = ("name", "unit", "method_id", "low", "high", "decimals", "order", "inputs")
    new, changed = [], []
    for code, entry in listed["analytes"].items():
        values = {
            "name": entry["name"], "unit": entry["unit"], "method_id": methods[entry["method"]].pk, "low": entry.get("low"),
            "high": entry.get("high"), "decimals": entry["decimals"], "order": entry["order"], "inputs": entry.get("inputs", []),
        }  # fmt: skip
        analyte = held.get(code)
        if analyte is None:
            new.append(analyte_model(code=code, project=None, **values))
        elif any(getattr(analyte, name) != value for name, value in values.items()):
            for name, value in values.items():
                setattr(analyte, name, value)
            changed.append(analyte)
    analyte_model.objects.using(using).bulk_create(new)
    analyte_model.objects.using(using).bulk_update(changed, fields)


def _has_tables(apps: Apps) -> bool:
    """False while migrating to a state before the catalogue exists."""
    try:
        apps.get_model("labdata", "Analyte")
    except LookupError:
        return False
    return True
