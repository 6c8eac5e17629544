"""The exception tree is the one that its module draws, and errors cross process borders whole."""

import pickle
import re

import pytest

from tracker import errors

MADE = [
    errors.UsageError("no"),
    errors.SettingsError("is odd", setting="gate.probability", source="s.toml"),
    errors.InputError("bad", path="a.csv", line=3, column="x", found="?", remedy="Mend it."),
    errors.RejectedRowsError(2, path="a.csv", first="line 3"),
    errors.OutputError("is full", path="out"),
    errors.LimitError("missed"),
    errors.InternalError("oops"),
    errors.CertificateError("x", frame=3, gap=1.0, violation=0.5, evidence={"a": 1}),
    errors.KernelError("status 3"),
]


def test_the_tree_in_the_docstring():
    drawn = re.findall(r"[├└]── (\w+)", errors.__doc__)
    classes = {
        name
        for name, value in vars(errors).items()
        if isinstance(value, type) and issubclass(value, errors.MargentError)
    }
    assert set(drawn) == classes - {"MargentError"}
    codes = dict(re.findall(r"(\w+Error) .*exit (\d)", errors.__doc__))
    for name, code in codes.items():
        assert getattr(errors, name).exit_code == int(code)


@pytest.mark.parametrize("error", MADE, ids=lambda error: type(error).__name__)
def test_pickled_errors_keep_sentence_and_data(error):
    again = pickle.loads(pickle.dumps(error))
    assert type(again) is type(error)
    assert str(again) == str(error)
    assert again.__dict__ == error.__dict__


def test_an_input_error_reads_from_place_to_remedy():
    assert str(MADE[2]) == "a.csv, line 3, column 'x': bad (found '?'). Mend it."
