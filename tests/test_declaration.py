"""A declaration is read once and completely; a wrong one is a named error at import."""

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from uffuncs import declaration
from uffuncs.declaration import Column, DeclarationError, Fitted, Function, Number, Rule, worksheet_function
from uffuncs.quantities import VOCABULARY
from uffuncs.registry import TOPICS, functions
from uffuncs.units import WORKSHEET_UNITS

GOOD = dict(result="flux", equation="J = Q/A", source="a source")


@pytest.fixture
def registry(monkeypatch):
    """An empty registry: what a test declares does not stay."""
    monkeypatch.setattr(declaration, "DECLARED", {})
    return declaration.DECLARED


def test_the_decorated_function_is_the_same_object(registry):
    def flux_test(permeate_flow: Number, area: Number = 2.0) -> Number:
        """Flux of a test."""
        return permeate_flow / area

    assert worksheet_function(**GOOD)(flux_test) is flux_test
    record = registry["UF_FLUX_TEST"]
    assert record.python is flux_test and record.argument_names == ("permeate_flow", "area")
    assert record.minimum_cells == 1 and record.arguments[1].default_text == "2"
    for words in ("m³/s; worksheet: 0 to 1e+07 m³/h", "[m/s; worksheet: L/(m²·h)]", "a source", "J = Q/A", "Raises", "broadcast"):
        assert words in flux_test.__doc__


def refused(match, function, **given):
    with pytest.raises(DeclarationError, match=match):
        worksheet_function(**{**GOOD, **given})(function)


def test_wrong_declarations_are_named(registry):
    def no_docstring(area: Number):
        return area

    def unknown_name(areas: Number):
        """Summary."""

    def no_annotation(area):
        """Summary."""

    def order(area: Number = 1.0, flux: Number = 1e-6):
        """Summary."""

    def out_of_bounds(flux: Number, area: Number = -1.0):
        """Summary."""

    def text(rule: str):
        """Summary."""

    def fine(area: Number):
        """Summary."""

    def missing_default_text(area: Number = None):
        """Summary."""

    refused("UF_NO_DOCSTRING: the docstring", no_docstring)
    refused("UF_UNKNOWN_NAME: 'areas' is not in the vocabulary", unknown_name)
    refused("UF_NO_ANNOTATION: annotate area", no_annotation)
    refused("UF_OUT_OF_BOUNDS: the default -1 of area is outside", out_of_bounds)
    refused("UF_TEXT: the text argument rule needs", text)
    refused("exactly one of result", fine, results=["flux"])
    refused("'fluxx' is not in the vocabulary", fine, result="fluxx")
    refused("equation and source", fine, source="")
    refused("uses \\['flux'\\], which are not arguments", fine, refuses=[Rule(lambda flux: True, "text")])
    refused("fitted range of 'Reynolds'", fine, fitted=[Fitted("Reynolds", 0, 1)])
    refused("are not arguments", fine, arguments={"flux": "meaning"})
    refused("None of area needs a text", missing_default_text)
    refused("not among its choices", lambda_with_default(), choices={"rule": ("a", "b")})
    worksheet_function(**GOOD)(fine)
    refused("declared twice", fine)
    worksheet_function(**GOOD)(order)
    with pytest.raises(DeclarationError, match="required but follows"):
        worksheet_function(**GOOD)(required_after_optional())


def lambda_with_default():
    def choose(rule: str = "c"):
        """Summary."""

    return choose


def required_after_optional():
    import inspect

    def late(area: Number, flux: Number):
        """Summary."""

    parameters = list(inspect.signature(late).parameters.values())
    late.__signature__ = inspect.Signature([parameters[0].replace(default=1.0, kind=inspect.Parameter.KEYWORD_ONLY),
                                            parameters[1].replace(kind=inspect.Parameter.KEYWORD_ONLY)])
    return late


def test_every_topic_has_functions_and_every_function_a_topic():
    assert {r.topic for r in functions().values()} == set(TOPICS)


@pytest.mark.parametrize("record", [r for r in functions().values() if isinstance(r, Function)], ids=lambda r: r.worksheet_name)
def test_record_is_complete(record):
    assert len(record.summary) <= 200, "the wizard cuts longer summaries off"
    assert record.equation and record.source
    doc = record.python.__doc__
    for argument in record.arguments:
        assert f"{argument.name} : " in doc
        assert len(argument.description) <= 255
    assert "Returns" in doc and "Raises" in doc and record.source in doc


def test_vocabulary_is_sound():
    for name, q in VOCABULARY.items():
        assert name == q.name and name == name.lower()
        assert q.low < q.high and q.unit in WORKSHEET_UNITS and q.meaning[0].isupper()
        assert q.to_si(q.from_si(1.0)) == pytest.approx(1.0)


def test_functions_are_attributes_of_the_package():
    import uffuncs

    assert uffuncs.flux_darcy(1e5, 1e-3, 1e13) == pytest.approx(1e-5)
    assert "flux_darcy" in dir(uffuncs)
    with pytest.raises(AttributeError):
        uffuncs.no_such_function
    assert isinstance(uffuncs.flux_darcy(np.array([1e5, 2e5]), 1e-3, 1e13), np.ndarray)
    assert Column is not Number


def test_the_registry_is_whole_at_the_first_look_and_the_second():
    code = "from uffuncs.registry import functions; a = set(functions()); from uffuncs import cell; assert a == set(functions()); print(len(a))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=Path(__file__).parents[1])
    assert int(done.stdout) == len(functions())
