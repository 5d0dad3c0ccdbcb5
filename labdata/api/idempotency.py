"""``Idempotency-Key``: a POST sent twice is done once, and answered alike."""

import hashlib
import json
from collections.abc import Callable
from functools import partial, wraps
from typing import Any

from django.contrib.auth.models import User
from django.core.files.uploadedfile import UploadedFile
from django.db import IntegrityError, transaction
from django.utils.crypto import salted_hmac
from rest_framework.exceptions import APIException, ValidationError
from rest_framework.renderers import JSONRenderer
from rest_framework.request import Request
from rest_framework.response import Response

from labdata.api.callers import caller_of
from labdata.audit import canonical
from labdata.errors import Conflict, KerogateError
from labdata.models import IdempotencyRecord

KEY_LENGTH = 200
Handler = Callable[..., Response]


class KeyReused(Conflict):
    """The key came with another request before."""

    code = "idempotency_key_reused"
    status = 422


def once(handler: Handler) -> Handler:
    """A POST handler that, under one key, changes something once; later calls get the first answer.

    Record and change are one transaction. A refusal is not kept (the same key may be tried again), but what a
    service wrote on purpose while refusing stays, such as a wrong password on record.
    """

    @wraps(handler)
    def answer(view: Any, request: Request, *args: Any, **kwargs: Any) -> Response:
        key = request.headers.get("Idempotency-Key")
        if key is None:
            return handler(view, request, *args, **kwargs)
        if not (0 < len(key) <= KEY_LENGTH and key.isprintable()):
            raise ValidationError({"Idempotency-Key": [f"A key has 1 to {KEY_LENGTH} printable characters."]})
        user, digest = caller_of(request).user, _digest(request)
        return _earlier(user, key, digest) or _first(
            partial(handler, view, request, *args, **kwargs), user, key, digest
        )

    return answer


def _first(handler: Callable[[], Response], user: User, key: str, digest: str) -> Response:
    refusal: Exception | None = None
    with transaction.atomic():
        try:
            with transaction.atomic():
                held = IdempotencyRecord.objects.create(user=user, key=key, request_sha256=digest, status=0, body={})
        except IntegrityError:  # the same request, sent twice at the same moment: the other one was first
            replayed = _earlier(user, key, digest)
            if replayed is None:
                raise
            return replayed
        try:
            response = handler()
        except (KerogateError, APIException) as error:
            refusal = error
            held.delete()
        else:
            held.status = response.status_code
            data = json.loads(JSONRenderer().render(response.data))
            held.body = {"data": data, "location": response.headers.get("Location", "")}
            held.save(update_fields=["status", "body"])
    if refusal is not None:
        raise refusal
    return response


def _earlier(user: User, key: str, digest: str) -> Response | None:
    """The answer given before. Raises KeyReused when the key came with something else."""
    record = IdempotencyRecord.objects.filter(user=user, key=key).first()
    if record is None:
        return None
    if record.request_sha256 != digest:
        raise KeyReused(
            f"The Idempotency-Key «{key}» came with another request before.", remedy="Use a new key for a new request."
        )
    headers = {"Idempotent-Replayed": "true", "Location": record.body["location"]}
    return Response(record.body["data"], record.status, headers={name: text for name, text in headers.items() if text})


def _digest(request: Request) -> str:
    """Keyed hash over address and content (keyed, since a signature's content holds a password)."""
    fields = {
        name: hashlib.sha256(value.read()).hexdigest() if isinstance(value, UploadedFile) else value
        for name, value in _fields(request).items()
    }
    for value in _fields(request).values():
        if isinstance(value, UploadedFile):
            value.seek(0)
    token = getattr(request.auth, "project_id", None)
    text = canonical([request.method, request.path, token, fields])
    return salted_hmac("kerogate.idempotency", text, algorithm="sha256").hexdigest()


def _fields(request: Request) -> dict[str, Any]:
    data = request.data
    return dict(data.items()) if hasattr(data, "items") else {"": data}
