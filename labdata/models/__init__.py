"""Every noun of the laboratory, one file per kind of thing."""

from labdata.models.analyses import Analysis, AnalysisRole, Result
from labdata.models.audit import AuditEntry
from labdata.models.base import Qualifier
from labdata.models.jobs import Job, JobEvent, JobState, SweeperBeat
from labdata.models.logins import LoginFailure
from labdata.models.methods import AnalysisRequest, Analyte, Method, ReferenceMaterial
from labdata.models.projects import ApiToken, IdempotencyRecord, Membership, Project, Role, TokenScope
from labdata.models.releases import Release
from labdata.models.reports import RememberedLayout, Report, SourceColumn, SourceFile, SourceTable, Upload
from labdata.models.samples import Consignment, CustodyEvent, DepthKind, Laboratory, Sample, SampleKind
from labdata.models.wells import (
    CasingShoe,
    CoreRun,
    CurveQuantity,
    DatumKind,
    FormationTop,
    LogCurve,
    MudInterval,
    MudKind,
    SurveyStation,
    Well,
    WellAlias,
    WellIdentifier,
)

__all__ = [
    "Analysis", "AnalysisRequest", "AnalysisRole", "Analyte", "ApiToken", "AuditEntry", "CasingShoe", "Consignment",
    "CoreRun", "CurveQuantity", "CustodyEvent", "DatumKind", "DepthKind", "FormationTop", "IdempotencyRecord", "Job", "JobEvent",
    "JobState", "Laboratory", "LogCurve", "LoginFailure", "Membership", "Method", "MudInterval", "MudKind", "Project", "Qualifier",
    "ReferenceMaterial", "Release", "RememberedLayout", "Report", "Result", "Role", "Sample", "SampleKind", "SourceColumn", "SourceFile",
    "SourceTable", "SurveyStation", "SweeperBeat", "TokenScope", "Upload", "Well", "WellAlias", "WellIdentifier",
]  # fmt: skip
