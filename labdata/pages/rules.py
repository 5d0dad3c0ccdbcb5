"""Rules: what each tests and why, its thresholds in this project, and how they came about."""

from django.http import HttpRequest, HttpResponse
from django.shortcuts import render

from labdata.pages.common import open_project


def rules(request: HttpRequest, slug: str) -> HttpResponse:
    open_project(request, slug)
    return render(request, "qc/rules.html", {})


def rules_compare(request: HttpRequest, slug: str) -> HttpResponse:
    open_project(request, slug)
    return render(request, "qc/rules.html", {})


def rule(request: HttpRequest, slug: str, rule_id: str) -> HttpResponse:
    open_project(request, slug)
    return render(request, "qc/rules.html", {})
