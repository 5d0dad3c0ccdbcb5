"""Addresses of the pages. Those of review are in qc/review/urls.py."""

from django.contrib.auth.views import LogoutView
from django.urls import URLPattern, URLResolver, include, path

from labdata.pages import (
    account,
    audit,
    home,
    jobs,
    members,
    projects,
    qc,
    releases,
    results,
    rules,
    samples,
    tokens,
    uploads,
    wells,
)

in_project: list[URLPattern | URLResolver] = [
    path("", projects.project, name="project"),
    path("wells/", wells.wells, name="wells"),
    path("wells/<int:pk>/", wells.well, name="well"),
    path("wells/<int:pk>/edit/", wells.well_edit, name="well_edit"),
    path("wells/<int:pk>/<slug:kind>/add/", wells.well_add, name="well_add"),
    path("wells/<int:pk>/<slug:kind>/<int:thing>/remove/", wells.well_remove, name="well_remove"),
    path("samples/<int:pk>/", samples.sample, name="sample"),
    path("results/<int:pk>/", results.result, name="result"),
    path("files/<int:pk>/", uploads.file_download, name="file_download"),
    path("uploads/", uploads.uploads, name="uploads"),
    path("uploads/<int:pk>/", uploads.upload, name="upload"),
    path("uploads/<int:pk>/progress/", uploads.upload_progress, name="upload_progress"),
    path("uploads/<int:pk>/answer/", uploads.upload_answer, name="upload_answer"),
    path("jobs/", jobs.jobs, name="jobs"),
    path("jobs/<uuid:pk>/", jobs.job, name="job"),
    path("jobs/<uuid:pk>/progress/", jobs.job_progress, name="job_progress"),
    path("jobs/<uuid:pk>/cancel/", jobs.job_cancel, name="job_cancel"),
    path("qc/", qc.qc_runs, name="qc_runs"),
    path("qc/start/", qc.qc_start, name="qc_start"),
    path("qc/<int:pk>/", qc.qc_run, name="qc_run"),
    path("rules/", rules.rules, name="rules"),
    path("rules/compare/", rules.rules_compare, name="rules_compare"),
    path("rules/<slug:rule_id>/", rules.rule, name="rule"),
    path("releases/", releases.releases, name="releases"),
    path("releases/new/", releases.release_new, name="release_new"),
    path("releases/<int:number>/", releases.release, name="release"),
    path("releases/<int:number>/data/", releases.release_data, name="release_data"),
    path("releases/<int:number>/manifest/", releases.release_manifest, name="release_manifest"),
    path("releases/<int:number>/withdraw/", releases.release_withdraw, name="release_withdraw"),
    path("audit/", audit.audit, name="audit"),
    path("members/", members.members, name="members"),
    path("members/account/", members.member_create, name="member_create"),
    path("members/remove/", members.member_remove, name="member_remove"),
]

urlpatterns: list[URLPattern | URLResolver] = [
    path("", home.home, name="home"),
    path("sign-in/", account.SignIn.as_view(), name="login"),
    path("sign-out/", LogoutView.as_view(), name="logout"),
    path("account/password/", account.ChangePassword.as_view(), name="password_change"),
    path("account/tokens/", tokens.tokens, name="tokens"),
    path("account/tokens/<int:pk>/revoke/", tokens.token_revoke, name="token_revoke"),
    path("projects/new/", projects.project_new, name="project_new"),
    path("p/<slug:slug>/", include(in_project)),
]
