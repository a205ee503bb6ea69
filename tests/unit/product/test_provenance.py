import subprocess
from datetime import UTC, datetime, timedelta, timezone

import pytest

from tracer.product import provenance
from tracer.product.provenance import git_commit, global_attributes


def git(folder, *arguments):
    names = ["-c", "user.name=Harrow", "-c", "user.email=harrow@example.invalid"]
    done = subprocess.run(["git", *names, *arguments], cwd=folder, check=True, capture_output=True, text=True)
    return done.stdout.strip()


@pytest.fixture
def checkout(tmp_path):
    (tmp_path / "tracer").mkdir()
    (tmp_path / "tracer" / "fate.py").write_text("one")
    git(tmp_path, "init")
    git(tmp_path, "add", ".")
    git(tmp_path, "commit", "-m", "first")
    return tmp_path


def test_attributes_tell_when_and_by_what_the_product_was_made():
    moment = datetime(2031, 6, 1, 14, 0, tzinfo=timezone(timedelta(hours=2)))
    attributes = global_attributes(
        "Sodium over Harrow", "tracer run harrow.toml", ["Haser, L. (1957)"], moment
    )
    assert attributes["Conventions"] == "CF-1.11"
    assert attributes["title"] == "Sodium over Harrow"
    assert attributes["created"] == "2031-06-01T12:00:00Z"
    assert attributes["history"] == "2031-06-01T12:00:00Z tracer run harrow.toml"
    assert attributes["source"].startswith("exosphere-tracer ")
    assert attributes["product_version"] == 1
    assert attributes["references"].endswith("; Haser, L. (1957)")


def test_a_product_is_dated_now_by_default():
    created = datetime.strptime(str(global_attributes("", "")["created"]), "%Y-%m-%dT%H:%M:%SZ")
    assert abs(datetime.now(UTC) - created.replace(tzinfo=UTC)) < timedelta(minutes=1)


def test_the_commit_is_known_in_a_checkout_and_marked_where_the_package_changed(checkout):
    commit = git(checkout, "rev-parse", "HEAD")
    (checkout / "harrow.nc").write_text("output that is not in git")
    assert git_commit(checkout) == commit
    (checkout / "tracer" / "fate.py").write_text("two")
    assert git_commit(checkout) == f"{commit}-dirty"


def test_a_package_inside_a_foreign_checkout_has_no_commit(checkout):
    (checkout / "site-packages" / "tracer").mkdir(parents=True)
    assert git_commit(checkout / "site-packages") is None


def test_a_checkout_without_commits_or_without_git_has_none(tmp_path, checkout, monkeypatch):
    empty = tmp_path / "empty"
    empty.mkdir()
    git(empty, "init")
    assert git_commit(empty) is None
    monkeypatch.setenv("PATH", str(empty))
    assert git_commit(checkout) is None
    monkeypatch.setattr(provenance, "git_commit", lambda: None)
    assert "git_commit" not in global_attributes("", "")
