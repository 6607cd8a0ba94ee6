"""The ways a log may be sent, and what goes wrong on them."""

from __future__ import annotations

import asyncio
import gzip
import zlib
from collections.abc import AsyncIterator

import expect
import pytest
from conftest import apart
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from starlette.testclient import TestClient

from service.api.gzip import gunzip
from service.app import create_app
from service.errors import ProblemError

GZIP = {"Content-Encoding": "gzip"}


def test_plain_gzip_and_form_give_the_same_report(client: TestClient, step_test: bytes) -> None:
    plain = client.post("/v1/reports", content=step_test, headers={"Content-Type": "text/csv"})
    assert plain.status_code == 200, plain.text
    assert plain.headers["content-type"] == "application/json"
    packed = client.post("/v1/reports", content=gzip.compress(step_test), headers=GZIP)
    form = client.post("/v1/reports", files={"file": ("log.csv", step_test, "text/csv")})
    # curl --data-binary names this type when none is given.
    curl = client.post("/v1/reports", content=step_test, headers={"Content-Type": "application/x-www-form-urlencoded"})
    assert packed.content == plain.content
    assert form.content == plain.content
    assert curl.content == plain.content


def test_options_change_the_report(client: TestClient, step_test: bytes) -> None:
    told = client.post("/v1/reports?Ms=1.4", content=step_test).json()
    assert told["options"]["Ms"] == 1.4


@pytest.mark.parametrize(
    ("query", "named"),
    [
        ("ms=1.4", "ms"),
        ("Ms=one", "Ms"),
        ("Ms=0.9", "Ms"),
        ("Ms=nan", "Ms"),
        ("model=best", "model"),
        ("period=1e300", "period"),
    ],
)
def test_an_option_that_is_wrong_is_named(client: TestClient, query: str, named: str) -> None:
    told = expect.answer(client.post(f"/v1/reports?{query}", content=b"a"), expected=422, code="invalid-option")
    assert list(told["evidence"]) == [named]
    assert f"{named}: " in told["detail"]


def test_a_cut_gzip_is_told_from_a_damaged_one(client: TestClient, step_test: bytes) -> None:
    packed = gzip.compress(step_test)
    cut = client.post("/v1/reports", content=packed[:-5], headers=GZIP)
    assert "ends before" in expect.answer(cut, expected=400, code="broken-gzip")["detail"]
    plain = client.post("/v1/reports", content=step_test, headers=GZIP)
    assert "not gzip" in expect.answer(plain, expected=400, code="broken-gzip")["detail"]
    trailing = client.post("/v1/reports", content=packed + b"rubbish", headers=GZIP)
    expect.answer(trailing, expected=400, code="broken-gzip")


def test_other_encodings_are_refused_with_what_is_taken(client: TestClient) -> None:
    response = client.post("/v1/reports", content=b"a", headers={"Content-Encoding": "br"})
    expect.answer(response, expected=415, code="unsupported-encoding")
    assert response.headers["accept-encoding"] == "gzip, zstd"


def test_a_form_must_hold_one_file(client: TestClient) -> None:
    wrong_field = client.post("/v1/reports", files={"log": ("log.csv", b"a")})
    expect.answer(wrong_field, expected=422, code="unexpected-field")
    option = client.post("/v1/reports", files={"file": ("log.csv", b"a")}, data={"Ms": "1.4"})
    expect.answer(option, expected=422, code="unexpected-field")
    text = client.post(
        "/v1/reports",
        content=b'--x\r\nContent-Disposition: form-data; name="file"\r\n\r\na\r\n--x--\r\n',
        headers={"Content-Type": "multipart/form-data; boundary=x"},
    )
    expect.answer(text, expected=422, code="no-file-field")
    no_boundary = client.post("/v1/reports", content=b"a", headers={"Content-Type": "multipart/form-data"})
    expect.answer(no_boundary, expected=400, code="broken-multipart")


def test_the_limit_holds_as_sent_unpacked_and_in_a_form() -> None:
    with TestClient(create_app(apart(max_upload_bytes=10_000))) as small:
        within = small.post("/v1/reports", content=b"\0" * 10_000)
        assert within.status_code == 422
        bodies = {
            "announced": small.post("/v1/reports", content=b"0" * 10_001),
            "streamed": small.post("/v1/reports", content=(b"0" * 1000 for _ in range(11))),
            "bomb": small.post("/v1/reports", content=gzip.compress(b"0" * 100_000_000), headers=GZIP),
            "form": small.post("/v1/reports", files={"file": ("log.csv", b"0" * 10_001)}),
        }
        for response in bodies.values():
            told = expect.answer(response, expected=413, code="too-large")
            assert told["evidence"] == {"limit_bytes": 10_000}


@given(members=st.lists(st.binary(max_size=3000), min_size=1, max_size=3), step=st.integers(1, 500))
@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_gunzip_undoes_gzip_however_it_is_cut(members: list[bytes], step: int) -> None:
    # RFC 1952, 2.2: a file of several members stands for their contents one after the other.
    packed = b"".join(gzip.compress(member) for member in members)
    assert unpack(packed, step) == b"".join(members) == gzip.decompress(packed)
    with pytest.raises(ProblemError, match="broken-gzip"):
        unpack(packed[:-1], step)


def test_gunzip_gives_small_pieces() -> None:
    dense = zlib.compressobj(9, zlib.DEFLATED, 31)
    packed = dense.compress(b"\0" * 50_000_000) + dense.flush()
    sizes: list[int] = []
    unpack(packed, len(packed), sizes)
    assert max(sizes) <= 2**20
    assert sum(sizes) == 50_000_000


def unpack(packed: bytes, step: int, sizes: list[int] | None = None) -> bytes:
    async def pieces() -> AsyncIterator[bytes]:
        for begin in range(0, len(packed), step):
            yield packed[begin : begin + step]

    async def whole() -> bytes:
        found = [piece async for piece in gunzip(pieces())]
        if sizes is not None:
            sizes.extend(map(len, found))
        return b"".join(found)

    return asyncio.run(whole())
