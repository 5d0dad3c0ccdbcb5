"""A form field for several files at once."""

from typing import Any

from django import forms
from django.core.files.uploadedfile import UploadedFile


class FilesInput(forms.ClearableFileInput):
    """A file field that takes several."""

    allow_multiple_selected = True


class FilesField(forms.FileField):
    """Cleans to a list of files, each of which must hold something."""

    widget = FilesInput

    def clean(self, data: Any, initial: Any = None) -> list[UploadedFile]:  # type: ignore[override]
        many = data if isinstance(data, list | tuple) else [data]
        single = super().clean
        return [single(one, initial) for one in many] if many else [single(None, initial)]
