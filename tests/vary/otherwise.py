"""Studies as laboratories would vary them: the study file changed, and built from the start."""

from __future__ import annotations

import copy
import itertools
import json
import shutil
import tomllib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd

import etl

#: With more names of regions than this all are counted together, as in ``readiness.csv``.
MOST_REGIONS = 20
PROJECT = Path(__file__).resolve().parents[2]
#: Alternatives by the dotted key of the study file, the study's own first.
Alternatives = Mapping[str, Sequence[Any]]
Choice = dict[str, Any]


def as_toml(data: Mapping[str, Any]) -> str:
    """A study file with every table in braces: plain, and nobody's business but TOML's."""
    return "".join(f"{key} = {_value(value)}\n" for key, value in data.items())


def _value(value: Any) -> str:
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{json.dumps(k)} = {_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(map(_value, value)) + "]"
    return json.dumps(value, ensure_ascii=False)


def changed(data: Mapping[str, Any], choice: Choice) -> dict[str, Any]:
    """The contents of a study file with some keys set."""
    made = copy.deepcopy(dict(data))
    for key, value in choice.items():
        *tables, last = key.split(".")
        inner = made
        for table in tables:
            inner = inner.setdefault(table, {})
        inner[last] = value
    return made


def choices(alternatives: Alternatives) -> list[Choice]:
    """Every combination, the first key changing slowest."""
    return [
        dict(zip(alternatives, chosen, strict=True))
        for chosen in itertools.product(*alternatives.values())
    ]


def variants_file(path: Path, alternatives: Alternatives, more: str = "") -> Path:
    """Write a variants file for all combinations."""
    lines = [f"{key} = {_value(list(values))}\n" for key, values in alternatives.items()]
    path.write_text("".join(lines) + more, encoding="utf-8", newline="\n")
    return path


def named_variants_file(path: Path, named: Mapping[str, Choice]) -> Path:
    """Write a variants file that names variants one by one."""
    text = ""
    for name, choice in named.items():
        text += f"[[variants]]\nname = {json.dumps(name)}\n"
        text += "".join(f"{key} = {_value(value)}\n" for key, value in choice.items())
    path.write_text(text, encoding="utf-8", newline="\n")
    return path


def few_readers(name: str, folder: Path, logs: Sequence[str]) -> Path:
    """A sample study of some of its readers; gives its study file."""
    shutil.copytree(PROJECT / "region_definitions", folder / "region_definitions")
    lab = folder / "sample_logs" / name
    shutil.copytree(
        PROJECT / "sample_logs" / name, lab, ignore=shutil.ignore_patterns("out*", "variants*")
    )
    data = tomllib.loads((lab / "study.toml").read_text(encoding="utf-8"))
    data["logs"]["files"] = list(logs)
    study = lab / "study.toml"
    study.write_text(as_toml(data), encoding="utf-8", newline="\n")
    return study


@dataclass(frozen=True)
class Built:
    """One variant, built from the start."""

    outcomes: pd.DataFrame
    trials: pd.DataFrame
    accounts: pd.DataFrame
    factors: tuple[str, ...]

    @classmethod
    def of(cls, study_file: Path, choice: Choice, into: Path) -> Built:
        """Build a study with some keys set."""
        data = tomllib.loads(study_file.read_text(encoding="utf-8"))
        other = study_file.with_name("other.toml")
        other.write_text(as_toml(changed(data, choice)), encoding="utf-8", newline="\n")
        study = etl.load_study(other)
        result = etl.build(study, into=into, keep=False)
        return cls(
            result.outcomes,
            result.trials,
            pd.read_csv(into / "accounts.csv"),
            tuple(study.trials.factors),
        )

    def cells(self) -> dict[tuple[Any, ...], float | str]:
        """The value of each cell of ``outcomes``, or that it is missing."""
        found: dict[tuple[Any, ...], float | str] = {}
        ids = [name for name in ("participant", "session", "trial") if name in self.outcomes]
        columns = [self.outcomes[name] for name in (*ids, "region", "measure", "value")]
        for *key, value in zip(*columns, strict=True):
            found[tuple(key)] = "missing" if pd.isna(value) else float(value)
        return found

    def binary_rows(self) -> Iterator[tuple[str, str, dict[str, str], float]]:
        """Every row of a binary outcome: measure, region, levels, value (NaN for none)."""
        rows = self.outcomes[self.outcomes.kind == "binary"]
        for row in rows.to_dict("records"):
            levels = {name: row[name] for name in self.factors}
            yield row["measure"], row["region"], levels, row["value"]
        for row in self.trials.to_dict("records"):
            levels = {name: row[name] for name in self.factors}
            for name in ("any_regression", "any_first_pass_regression", "any_skip"):
                yield name, "", levels, row[name]

    def counts(self) -> dict[tuple[str, ...], list[int]]:
        """Rows, values and ones by measure, region and condition; "" for all levels of a factor."""
        found: dict[tuple[str, ...], list[int]] = {}
        together = self.outcomes.region.nunique() > MOST_REGIONS
        for measure, name, levels, value in self.binary_rows():
            region = "(all regions)" if name and together else name
            own = tuple(levels[name] for name in self.factors)
            conditions = {
                ("",) * len(own),
                own,
                *(
                    tuple(level if at == place else "" for at in range(len(own)))
                    for place, level in enumerate(own)
                ),
            }
            for condition in conditions:
                counted = found.setdefault((measure, region, *condition), [0, 0, 0])
                counted[0] += 1
                counted[1] += not pd.isna(value)
                counted[2] += value == 1
        return found
