"""Addresses of the pages."""

from django.contrib.auth.views import LogoutView
from django.urls import URLPattern, URLResolver, path

from labdata.pages import account, home, projects, tokens

urlpatterns: list[URLPattern | URLResolver] = [
    path("", home.home, name="home"),
    path("sign-in/", account.SignIn.as_view(), name="login"),
    path("sign-out/", LogoutView.as_view(), name="logout"),
    path("account/password/", account.ChangePassword.as_view(), name="password_change"),
    path("account/tokens/", tokens.tokens, name="tokens"),
    path("account/tokens/<int:pk>/revoke/", tokens.token_revoke, name="token_revoke"),
    path("projects/new/", projects.project_new, name="project_new"),
    path("p/<slug:slug>/", projects.project, name="project"),
]
