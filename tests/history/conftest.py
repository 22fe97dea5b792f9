"""A user of git with an identity and no other settings."""

from pathlib import Path

import pytest


@pytest.fixture(autouse=True)
def home(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    folder = tmp_path / "home"
    folder.mkdir()
    (folder / ".gitconfig").write_text("[user]\nname = Ada Beispiel\nemail = ada@example.org\n", "utf-8")
    monkeypatch.setenv("HOME", str(folder))
    monkeypatch.setenv("GIT_CONFIG_NOSYSTEM", "1")
    monkeypatch.setenv("GIT_CEILING_DIRECTORIES", str(tmp_path))
    for name in ("XDG_CONFIG_HOME", "GIT_CONFIG_GLOBAL", "GIT_AUTHOR_NAME", "GIT_COMMITTER_NAME", "EMAIL"):
        monkeypatch.delenv(name, raising=False)
    return folder
