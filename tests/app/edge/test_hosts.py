"""Foreign hosts and changes from foreign pages are turned away; programs and our own pages are not."""

from __future__ import annotations

import pytest
from fastapi.testclient import TestClient


@pytest.mark.parametrize("host", ["localhost", "LOCALHOST:8321", "127.0.0.1", "[::1]:8321", "localhost."])
def test_loopback_names_are_answered(client: TestClient, host: str) -> None:
    assert client.get("/things/a", headers={"Host": host}).status_code == 200


@pytest.mark.parametrize(
    "host",
    ["evil.example", "localhost.evil.example", "127.0.0.1.evil.example", "localhost@evil.example", "", "[::1",
     "localhost:x", "localhost/x"],
)  # fmt: skip
def test_another_host_is_misdirected(client: TestClient, host: str) -> None:
    answer = client.get("/things/a", headers={"Host": host})
    assert (answer.status_code, answer.json()["code"]) == (421, "foreign_host")
    assert "evil" not in answer.text


@pytest.mark.parametrize(
    "headers",
    [
        {"Origin": "https://evil.example"},
        {"Origin": "null"},
        {"Origin": "http://localhost:3000"},  # another program's page on this very machine
        {"Origin": "http://localhost@evil.example"},
        {"Sec-Fetch-Site": "cross-site"},
        {"Sec-Fetch-Site": "same-site"},
        {"Sec-Fetch-Site": "cross-site", "Origin": "http://localhost"},
    ],
)
def test_a_page_of_another_site_changes_nothing_but_may_link_here(
    client: TestClient, headers: dict[str, str]
) -> None:
    answer = client.put("/things/a", headers=headers)
    assert (answer.status_code, answer.json()["code"]) == (403, "foreign_origin")
    assert client.get("/things/a", headers=headers).status_code == 200


@pytest.mark.parametrize(
    "headers",
    [
        {},
        {"Origin": "http://localhost", "Sec-Fetch-Site": "same-origin"},
        {"Origin": "http://localhost:80"},
        {"Origin": "https://localhost"},  # a proxy that ends TLS for us
        {"Origin": "https://localhost:443"},
        {"Origin": "http://localhost:8321", "Host": "localhost:8321"},
        {"Sec-Fetch-Site": "none"},
    ],
)
def test_programs_and_our_own_pages_reach_the_handler(client: TestClient, headers: dict[str, str]) -> None:
    assert client.put("/things/a", headers=headers).json()["code"] == "period_open"


@pytest.mark.parametrize("path", ["/things/a%00b", "/things/a?limit=%00"])
def test_nul_in_an_address_is_refused(client: TestClient, path: str) -> None:
    assert client.get(path).json()["code"] == "control_character"
