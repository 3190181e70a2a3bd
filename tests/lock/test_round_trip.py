"""Any lock goes to a file and comes back; no file that was changed does."""

from __future__ import annotations

import types
from collections.abc import Mapping
from functools import cache
from typing import Annotated, Any, Literal, Union, get_args, get_origin

import pytest
import yaml
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from beforehand.faults import LockError
from beforehand.lock import Lock, lock_from_bytes, lock_from_text, lock_text, sealed_lock
from beforehand.lock.pictures import PictureData
from beforehand.lock.prediction import Prediction
from beforehand.lock.record import PlainData, Record

TEXT = st.one_of(
    st.sampled_from(["load", "no", "a: b", "1e5", "two words", "", "- x", "environment:", '"', "{a", "null"]),
    st.text(st.characters(exclude_categories=["Cs"]), max_size=12),
)
NUMBER = st.floats(allow_nan=False, allow_infinity=False)
WHOLE = st.integers(0, 10**12)
PLAIN = st.recursive(
    st.one_of(st.none(), st.booleans(), st.integers(-(10**20), 10**20), NUMBER, TEXT),
    lambda inner: st.one_of(
        st.lists(inner, max_size=3), st.dictionaries(TEXT, inner, max_size=3), st.just("long text " * 15)
    ),
    max_leaves=12,
)
PATTERNS = {
    r"^sha256:[0-9a-f]{16,64}$": "sha256:" + "ab" * 32,
    r"^F[0-9]{3,}$": "F012",
    r"^R[0-9]{3,}$": "R1234",
    r"^C[0-9]{3,}$": "C001",
    r"^(sha256:[0-9a-f]{64})?$": "",
}
# Parts that are drawn by themselves: a lock with them is too much for one draw.
LARGE_PARTS: dict[str, type[Record]] = {"prediction": Prediction, "pictures": PictureData}
MANY = settings(deadline=None, max_examples=60, suppress_health_check=list(HealthCheck))


def content(annotation: Any, metadata: tuple[Any, ...] = ()) -> st.SearchStrategy[Any]:
    """Draw any value that a field of this type takes."""
    if annotation is PlainData:
        return st.dictionaries(TEXT, PLAIN, max_size=4)
    origin, inner = get_origin(annotation), get_args(annotation)
    if origin is Annotated:
        if annotation.__metadata__ and any(type(one).__name__ == "BeforeValidator" for one in metadata):
            return st.dictionaries(TEXT, PLAIN, max_size=4)
        return content(inner[0], (*metadata, *annotation.__metadata__))
    if origin in (Union, types.UnionType):
        return st.one_of([content(one) for one in inner])
    if origin is Literal:
        return st.sampled_from(inner)
    if origin is tuple:
        if inner[-1] is Ellipsis:
            return st.lists(content(inner[0]), max_size=2).map(tuple)
        return st.tuples(*[content(one) for one in inner])
    if origin in (Mapping, dict):
        return st.dictionaries(TEXT, content(inner[1]), max_size=2)
    if isinstance(annotation, type) and issubclass(annotation, Record):
        return records(annotation)
    patterns = [found for one in metadata if (found := _pattern(one)) is not None]
    if annotation is str:
        return st.just(PATTERNS[patterns[0]]) if patterns else TEXT
    return {float: NUMBER, int: WHOLE, bool: st.booleans(), types.NoneType: st.none()}[annotation]


def _pattern(metadata: Any) -> str | None:
    """Find the pattern in what annotates a text."""
    for one in (metadata, *getattr(metadata, "metadata", ())):
        if isinstance(found := getattr(one, "pattern", None), str):
            return found
    return None


@cache
def records(kind: type[Record]) -> st.SearchStrategy[Any]:
    """Draw a record with any content in its fields."""
    fields = {
        name: st.dictionaries(TEXT, PLAIN, max_size=4)
        if name in {"written", "changes"} and "Mapping" in str(field.annotation)
        else st.none()
        if name in LARGE_PARTS
        else content(field.annotation, tuple(field.metadata))
        for name, field in kind.model_fields.items()
    }
    return st.builds(lambda **drawn: kind(**drawn), **fields)


LOCKS = records(Lock)


@MANY
@given(LOCKS)
def test_any_lock_comes_back_and_is_written_the_same(lock: Lock) -> None:
    """Load then dump gives the same bytes, and the object that was read is the one that was sealed."""
    text = lock_text(lock)
    back = lock_from_text(text, "x.lock.yaml")
    assert lock_text(back) == text
    assert back == sealed_lock(lock)


@pytest.mark.parametrize("name", LARGE_PARTS)
@settings(MANY, max_examples=20)
@given(data=st.data())
def test_any_large_part_comes_back_and_is_written_the_same(
    name: str, lock: Lock, data: st.DataObject
) -> None:
    """As the whole lock does, and a reader of YAML finds the same in it."""
    whole = lock.model_copy(update={name: data.draw(records(LARGE_PARTS[name]))})
    text = lock_text(whole)
    back = lock_from_text(text, "x.lock.yaml")
    assert back == sealed_lock(whole)
    found, recorded = yaml.load(text, yaml.CSafeLoader), plain(back)
    assert found == recorded
    assert same_types(found, recorded)


def plain(value: Any) -> Any:
    """Turn a record into what a reader of YAML gives."""
    if isinstance(value, Record):
        fields = {
            field.alias or name: plain(getattr(value, name))
            for name, field in type(value).model_fields.items()
        }
        return {name: item for name, item in fields.items() if item is not None or name not in value.left_out}
    if isinstance(value, Mapping):
        return {key: plain(item) for key, item in value.items()}
    return [plain(item) for item in value] if isinstance(value, tuple) else value


def same_types(one: Any, other: Any) -> bool:
    """Tell whether two pieces of plain data are of the same types all through."""
    if type(one) is not type(other):
        return False
    if isinstance(one, dict):
        return list(one) == list(other) and all(same_types(one[key], other[key]) for key in one)
    if isinstance(one, list):
        return all(map(same_types, one, other))
    return True


@MANY
@given(LOCKS)
def test_readers_of_yaml_read_what_was_recorded(lock: Lock) -> None:
    """Both loaders of YAML 1.1 give the content of the lock, every number with its type."""
    text, recorded = lock_text(lock), plain(sealed_lock(lock))
    for loader in (yaml.SafeLoader, yaml.CSafeLoader):
        found = yaml.load(text, loader)
        assert found == recorded
        assert same_types(found, recorded)


@settings(MANY, max_examples=20)
@given(LOCKS)
def test_readers_of_yaml_1_2_read_what_was_recorded(lock: Lock) -> None:
    """A loader of YAML 1.2 gives the same."""
    ruamel = pytest.importorskip("ruamel.yaml")
    reader = ruamel.YAML(typ="safe", pure=True)
    reader.version = (1, 2)
    found, recorded = reader.load(lock_text(lock)), plain(sealed_lock(lock))
    assert found == recorded
    assert same_types(found, recorded)


@MANY
@given(LOCKS, st.data())
def test_a_changed_byte_above_the_environment_is_refused(lock: Lock, data: st.DataObject) -> None:
    """Whatever byte is put in the place of another, the file is no lock any more."""
    raw = lock_text(lock).encode()
    place = data.draw(st.integers(0, raw.index(b"\nenvironment:")))
    byte = data.draw(st.integers(0, 255).filter(lambda one: one != raw[place]))
    changed = raw[:place] + bytes([byte]) + raw[place + 1 :]
    with pytest.raises(LockError):
        lock_from_bytes(changed, "x.lock.yaml")


@MANY
@given(LOCKS, st.data())
def test_a_lock_that_is_cut_short_is_refused(lock: Lock, data: st.DataObject) -> None:
    """A file that ends anywhere before its end is told to be cut short, or to be no lock at all."""
    text = lock_text(lock)
    with pytest.raises(LockError, match=r"it is cut short|it is no lockfile"):
        lock_from_text(text[: data.draw(st.integers(0, len(text) - 1))], "x.lock.yaml")


@settings(MANY, max_examples=300)
@given(st.one_of(st.text(), st.text("lock: 1\n#{}[]-\"' ,digest").map(lambda tail: f"lock: 1\n{tail}")))
@example("")
@example("#")
@example("lock: 1")
@example("lock: 1\n")
def test_any_text_is_a_lock_or_a_fault(text: str) -> None:
    """No text makes the reader fail in any other way."""
    with pytest.raises(LockError):
        lock_from_text(text, "x.lock.yaml")


@settings(MANY, max_examples=150)
@given(st.data())
def test_any_content_with_a_true_digest_is_a_lock_or_a_fault(data: st.DataObject) -> None:
    """Even a forged digest lets nothing in but what is written back the same."""
    from beforehand.lock.writing import digest_of

    lines = lock_text(data.draw(LOCKS)).split("\nenvironment:")[0].split("\n")[2:]
    for _ in range(data.draw(st.integers(1, 3))):
        place = data.draw(st.integers(0, len(lines) - 1))
        kind = data.draw(st.sampled_from(["cut", "twice", "text", "indent", "swap"]))
        lines[place : place + 1] = {
            "cut": [],
            "twice": [lines[place]] * 2,
            "text": [data.draw(st.text("ab:{}[]-\"', 019.e\\", max_size=20))],
            "indent": [data.draw(st.sampled_from([" ", "  ", "- "])) + lines[place]],
            "swap": [lines[place - 1]],
        }[kind]
    covered = "\n".join(["# x", "lock: 1", *lines, ""])
    rest = 'environment:\n  beforehand: "1"\n  python: "3"\n  numpy: "2"\n  scipy: "1"\n'
    text = f'{covered}{rest}digest: "{digest_of(covered.encode())}"\n'
    try:
        lock = lock_from_text(text, "x.lock.yaml")
    except LockError:
        return
    assert lock_text(lock) == text


def test_names_that_no_reader_would_take_are_refused(lock: Lock) -> None:
    """A key of a mapping may not be longer than YAML allows one to be."""
    fate = next(iter(lock.predictors.values()))
    fields = {name: getattr(lock, name) for name in Lock.model_fields}
    with pytest.raises(ValidationError, match="a name may have at most 1000 characters as written"):
        Lock(**{**fields, "predictors": {"x" * 1001: fate}})
    longest = Lock(**{**fields, "predictors": {"x" * 1000: fate}})
    assert yaml.safe_load(lock_text(longest))["predictors"]["x" * 1000]["verdict"] == "adopted"


def test_plans_as_deep_as_can_be_read_go_through(lock: Lock) -> None:
    """A plan nested to the reader's limit of 50 levels comes back."""
    deep: object = 1
    for _ in range(49):
        deep = [{"a": deep}] if len(str(deep)) % 2 else {"b": deep, "c": "long " * 30}
    fields = {name: getattr(lock, name) for name in Lock.model_fields}
    plan = type(lock.plan)(**{**vars(lock.plan), "written": {"deep": deep}})
    text = lock_text(Lock(**{**fields, "plan": plan}))
    assert yaml.safe_load(text)["plan"]["written"] == {"deep": deep}
    assert lock_text(lock_from_text(text, "x")) == text


@settings(MANY, max_examples=200)
@given(st.binary())
def test_any_bytes_are_a_lock_or_a_fault(data: bytes) -> None:
    """No bytes make the reader fail in any other way, with or without the first line of a lock."""
    for start in (b"", b"lock: 1\n"):
        with pytest.raises(LockError):
            lock_from_bytes(start + data, "x.lock.yaml")
