"""Exports: the numbers that leave are the numbers that were proved, and the steps are the engine's steps."""

import math
import re
import subprocess
import sys
from fractions import Fraction
from pathlib import Path
from shutil import which

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import newel
from newel.errors import BadRequest
from newel.methods.exact import Exact
from newel.methods.exports.languages import LANGUAGES, export_tableau
from newel.methods.exports.latex_text import latex_text
from newel.methods.exports.numbers import rounded_decimal
from newel.methods.order_conditions import prove
from newel.methods.tableau import Tableau
from tests.methods.exported import read_back

pytestmark = pytest.mark.core

WITH_NUMBERS = [name for name, each in LANGUAGES.items() if each.takes_digits]


@pytest.fixture(scope="module")
def registry():
    return newel.Registry(cache=None)


@pytest.fixture(scope="module")
def methods(registry):
    return [registry.load(slug) for slug in registry.names()]


def test_there_are_the_six_languages():
    assert list(LANGUAGES) == ["latex", "toml", "c", "fortran", "python", "bibtex"]


@pytest.mark.parametrize("language", WITH_NUMBERS)
def test_exact_exports_of_every_method_read_back_as_the_same_numbers(methods, language):
    for method in methods:
        again = read_back(export_tableau(method, language), language, method)
        assert again.digest == method.digest, method.slug


PROVED_AGAIN = ["bogacki-shampine-3-2", "gill-4", "ssp-4-stages-5", "dormand-prince-5-4", "fehlberg-8-7"]


@pytest.mark.parametrize("slug", PROVED_AGAIN)
@pytest.mark.parametrize("language", WITH_NUMBERS)
def test_exported_numbers_are_proved_again(registry, language, slug):
    """Exact ones to the same outcome, 20 digits as rounded ones of the same orders."""
    method = registry.find(slug)
    before = prove(method)
    exact = prove(read_back(export_tableau(method, language), language, method))
    assert (exact.outcome, exact.order, exact.embedded_order) == (
        before.outcome,
        before.order,
        before.embedded_order,
    )
    rounded = prove(read_back(export_tableau(method, language, digits=20), language, method, digits=20))
    assert rounded.outcome == "rounded"
    assert (rounded.order, rounded.embedded_order) == (before.order, before.embedded_order)


def test_a_digit_changed_in_an_export_is_found_by_the_proof(registry):
    method = registry.find("kutta-4")
    text = export_tableau(method, "c").replace("1.0/3.0", "1.0/6.0", 1)
    assert not prove(read_back(text, "c", method))


@pytest.mark.parametrize("language", WITH_NUMBERS)
def test_rounding_is_to_the_digits_that_were_asked_for(registry, language):
    method = registry.find("gill-4")
    text = export_tableau(method, language, digits=6)
    assert "0.292893" in text  # 1 − 1/√2 = 0.29289321881345…
    assert "0.2928932" not in text
    assert "sqrt" not in text.lower().split("digest")[-1]


def test_toml_never_claims_more_digits_than_were_trusted_before():
    method = Tableau("t-1", order=1, matrix=[[]], weights=["1.00000"], digits={"weights": 6})
    assert "digits = { nodes = 12, matrix = 12, weights = 6" in export_tableau(method, "toml", digits=12)


@settings(deadline=None, derandomize=True)
@given(st.fractions(max_denominator=10**8), st.integers(1, 40))
def test_a_rounded_decimal_is_the_nearest_of_its_length(value, digits):
    text = rounded_decimal(Exact(value), digits)
    figures = re.sub(r"e.*|[-.]", "", text).strip("0")
    assert len(figures) <= digits
    if value:
        unit = Fraction(10) ** (math.floor(math.log10(abs(value)) + 1e-12) - digits + 1)
        assert abs(Fraction(text) - value) <= unit * 10 / 2
        shorter = Fraction(f"{value.numerator / value.denominator:.{min(digits, 15) - 1}e}")
        assert digits > 15 or abs(Fraction(text) - value) <= abs(shorter - value)
    else:
        assert text == "0.0"


@pytest.mark.parametrize("digits", [1, 2, 17, 40])
def test_rounded_roots_agree_with_square_roots_of_integers(digits):
    for d in (2, 3, 5, 10**11 + 1):
        text = rounded_decimal(Exact(0, 1, d), digits)
        scaled = math.isqrt(d * 10**120)
        exponent = len(str(math.isqrt(d))) - 1
        nearest = round(Fraction(scaled, 10**60) / Fraction(10) ** (exponent - digits + 1))
        assert Fraction(text) == nearest * Fraction(10) ** (exponent - digits + 1)


def test_names_are_valid_whatever_the_slug(registry):
    for slug in ("3-stages-2", "x" + "-long" * 15, "nodes", "double", "step"):
        t = Tableau(slug, order=2, matrix=[[], ["1/2"]], weights=[0, 1])
        c_names = re.findall(r"static const double (\w+)\[", export_tableau(t, "c"))
        module = re.search(r"^module (\w+)$", export_tableau(t, "fortran"), re.MULTILINE)[1]
        for name in (*c_names, module):
            assert re.fullmatch(r"[a-z][a-z0-9_]{0,62}", name)
        assert module not in ("nodes", "matrix", "weights", "step")
    long = [Tableau("x" + "-long" * 15, order=1, matrix=[[]], weights=[w]) for w in ("1", "1/1")]
    apart = Tableau("x" + "-long" * 15, order=1, matrix=[[]], weights=["2"])
    assert export_tableau(long[0], "c") == export_tableau(long[1], "c")
    assert re.search(r"#ifndef \w+", export_tableau(apart, "c"))[0] not in export_tableau(long[0], "c")


def test_a_comment_cannot_be_ended_by_a_name():
    nasty = Tableau("t-1", name="*/ int x; /*", source="a\nb\u2028c */", order=1, matrix=[[]], weights=[1])
    for language, mark in (("c", " *"), ("fortran", "!"), ("python", "#"), ("latex", "%")):
        head = export_tableau(nasty, language).split("digest")[0].splitlines()
        assert all(line.startswith(mark) or line == "/*" for line in head)
        assert language != "c" or not any("*/" in line for line in head)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("fortan",), "'fortan': no language of an export; the nearest is fortran"),
        (("c", 0), "digits=0: no number of significant digits from 1 to 100"),
        (("c", 101), "digits=101"),
        (("c", True), "digits=True"),
        (("c", "20"), "digits='20'"),
        (("bibtex", 20), "bibtex holds no coefficients"),
        (("latex", None, True), "latex has no routines\n  A step can be written in c, fortran, python"),
    ],
)
def test_a_request_that_does_not_fit_is_refused(registry, arguments, says):
    with pytest.raises(BadRequest, match=re.escape(says)):
        newel.export("kutta-4", *arguments, registry=registry)


def test_an_integer_that_no_double_holds_asks_for_digits():
    huge = 10**400
    t = Tableau("t-1", order=1, matrix=[[]], weights=[Fraction(huge + 1, huge)])
    with pytest.raises(BadRequest, match=r"weights\[1\] of t-1 holds an integer of 401 digits"):
        export_tableau(t, "c")
    assert "1.0" in export_tableau(t, "c", digits=17)


def test_what_is_not_proved_does_not_leave(registry):
    wrong = Tableau("wrong-2", order=2, matrix=[[], ["1/3"]], weights=[0, 1])
    with pytest.raises(newel.errors.NotProved):
        newel.export(wrong, "c", registry=registry)


def test_bibtex_of_every_method_is_plain_ascii_with_balanced_braces(methods):
    for method in methods:
        text = export_tableau(method, "bibtex")
        assert text.isascii(), method.slug
        assert "[U+" not in text, method.slug
        plain = re.sub(r"\\[{}]", "", text)
        assert plain.count("{") == plain.count("}")
        assert text.startswith(f"@misc{{{method.slug},\n")


def test_text_becomes_latex():
    assert latex_text("50 % of A_1 & {B} ~ Gröbner’s “ŁÉ” ☃") == (
        r"50 \% of A\_1 \& \{B\} \textasciitilde{} Gr{\"o}bner's ``{\L}{\'E}'' [U+2603]"
    )


# ---------------------------------------------------------------- steps

LARGEST_GAP = 4e-15
"""Sums in another order: some tens of roundings of numbers about 1."""


def forced(t, y):
    return [y[1] * math.cos(t), -y[0] + 0.25 * y[2], 0.5 * y[0] * y[1] - t]


def expected(methods):
    for method in methods:
        state, error = newel.one_step(
            lambda t, y: np.array(forced(t, y)), 0.3, [1.0, 0.5, -0.25], 0.1, method.with_proof(None)
        )
        yield method, state, error


def assert_close(method, got, state, error):
    scale = 1 + abs(np.array(method.A)).max() + abs(method.b).max()
    assert np.abs(np.array(got[:3]) - state).max() <= LARGEST_GAP * scale, method.slug
    if error is not None:
        assert np.abs(np.array(got[3:]) - error).max() <= LARGEST_GAP * scale, method.slug
    assert len(got) == (3 if error is None else 6)


def test_the_python_step_is_the_engines_step(methods):
    for method, state, error in expected(methods):
        for digits in (None, 17):
            names = {}
            exec(compile(export_tableau(method, "python", digits, True), "exported", "exec"), names)
            new, off = names["step"](forced, 0.3, (1.0, 0.5, -0.25), 0.1)
            assert_close(method, [*new, *(off or [])], state, error)


C_MAIN = """
#include <math.h>
#include <stdio.h>
static void rate(int64_t n, double t, const double *y, double *out, void *user)
{
    const double *p = user;
    (void) n;
    out[0] = y[1]*cos(t);
    out[1] = -y[0] + p[0]*y[2];
    out[2] = p[1]*y[0]*y[1] - t;
}
static void show(const char *slug, const double *new, const double *error)
{
    printf("%s", slug);
    for (int i = 0; i < 3; i++) printf(" %.17g", new[i]);
    for (int i = 0; error && i < 3; i++) printf(" %.17g", error[i]);
    printf("\\n");
}
"""


def compiled(command, cwd):
    done = subprocess.run(command, cwd=cwd, capture_output=True, text=True, timeout=120, check=False)
    assert (done.returncode, done.stderr) == (0, ""), done.stderr[-3000:]
    ran = subprocess.run([cwd / "steps"], capture_output=True, text=True, timeout=60, check=True)
    return {line.split()[0]: list(map(float, line.split()[1:])) for line in ran.stdout.splitlines()}


@pytest.mark.skipif(which("gcc") is None, reason="no C compiler gcc here: exported C is not compiled")
@pytest.mark.parametrize("digits", [None, 17])
def test_c_compiles_without_a_warning_and_steps_as_the_engine(methods, tmp_path, digits):
    """In C99 with every usual warning on, the state overwritten in place; with digits every fourth method."""
    calls = []
    methods = methods if digits is None else methods[::4]
    for method in methods:
        (tmp_path / f"{method.slug}.h").write_text(
            export_tableau(method, "c", digits, with_step=True), encoding="utf-8"
        )
        name = re.search(r"#ifndef (\w+)_H", (tmp_path / f"{method.slug}.h").read_text("utf-8"))[1].lower()
        pair = method.embedded_weights is not None
        error = "error, " if pair else ""
        calls.append(
            f"{{ double y[3] = {{1.0, 0.5, -0.25}}, error[3] = {{0}};\n  (void) error;\n"
            f"  {name}_step(rate, p, 3, 0.3, 0.1, y, y, {error}work);\n"
            f'  show("{method.slug}", y, {"error" if pair else "NULL"}); }}'
        )
    most = max(method.stages for method in methods)
    heads = "".join(f'#include "{method.slug}.h"\n' for method in methods)
    body = f"int main(void)\n{{\n double p[2] = {{0.25, 0.5}}, work[{3 * (most + 1)}];\n"
    (tmp_path / "main.c").write_text(heads + C_MAIN + body + "\n".join(calls) + "\nreturn 0;\n}\n")
    flags = "-std=c99 -pedantic-errors -Wall -Wextra -Werror -Wno-unused-const-variable -Wno-unused-variable"
    got = compiled(["gcc", *flags.split(), "-O0", "main.c", "-o", "steps", "-lm"], tmp_path)
    for method, state, error in expected(methods):
        assert_close(method, got[method.slug], state, error)


F_HELPERS = """
module problem
  use, intrinsic :: iso_fortran_env, only: real64
  implicit none
  type :: settings
    real(real64) :: p(2) = [0.25_real64, 0.5_real64]
  end type settings
contains
  subroutine rate(t, y, dydt, user)
    real(real64), intent(in) :: t, y(:)
    real(real64), intent(out) :: dydt(:)
    class(*), intent(inout) :: user
    select type (user)
    type is (settings)
      dydt(1) = y(2)*cos(t)
      dydt(2) = -y(1) + user%p(1)*y(3)
      dydt(3) = user%p(2)*y(1)*y(2) - t
    end select
  end subroutine rate
end module problem
"""


@pytest.mark.skipif(which("gfortran") is None, reason="no gfortran here: exported Fortran is not compiled")
@pytest.mark.parametrize("digits", [None, 17])
def test_fortran_compiles_as_2008_and_steps_as_the_engine(methods, tmp_path, digits):
    """With warnings as errors; a sample of small, wide, irrational and 17-stage methods."""
    chosen = [m for i, m in enumerate(methods) if i % 5 == 0 or m.slug in (*PROVED_AGAIN, "ssp-4-stages-10")]
    modules, calls = [F_HELPERS], []
    for method in chosen:
        text = export_tableau(method, "fortran", digits, with_step=True)
        assert max(len(line.encode()) for line in text.splitlines()) <= 132
        modules.append(text)
        module = re.search(r"^module (\w+)$", text, re.MULTILINE)[1]
        error = ", error" if method.embedded_weights is not None else ""
        shown = "new, error" if error else "new"
        calls.append(
            f"block\n  use {module}, only: step\n  type(settings) :: user\n  real(real64) :: new(3)\n"
            + ("  real(real64) :: error(3)\n" if error else "")
            + f"  call step(rate, user, 0.3_real64, 0.1_real64, y, new{error})\n"
            f"  print '(a, 6(1x, es25.17))', '{method.slug}', {shown}\nend block\n"
        )
    head = (
        "program steps\n  use, intrinsic :: iso_fortran_env, only: real64\n  use problem\n  implicit none\n"
    )
    head += "  real(real64) :: y(3) = [1.0_real64, 0.5_real64, -0.25_real64]\n"
    main = head + "".join(calls) + "end program steps\n"
    (tmp_path / "main.f90").write_text("\n".join([*modules, main]), encoding="utf-8")
    flags = [
        "-std=f2008",
        "-Wall",
        "-Wextra",
        "-Werror",
        "-Wno-unused-parameter",
        "-Wno-unused-dummy-argument",
    ]
    got = compiled(["gfortran", *flags, "-O0", "main.f90", "-o", "steps"], tmp_path)
    for method, state, error in expected(chosen):
        assert_close(method, got[method.slug], state, error)


@pytest.mark.skipif(which("pdflatex") is None, reason="no pdflatex here: exported LaTeX is not compiled")
def test_latex_of_every_method_compiles(methods, tmp_path):
    """In one plain document without a package; only lines that are too wide are remarked on."""
    body = "".join(export_tableau(method, "latex", digits) for method in methods for digits in (None, 8))
    (tmp_path / "all.tex").write_text(
        "\\documentclass{article}\n\\begin{document}\n" + body + "\\end{document}\n", encoding="ascii"
    )
    done = subprocess.run(
        ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "all.tex"],
        cwd=tmp_path,
        capture_output=True,
        timeout=120,
        check=False,
    )
    assert done.returncode == 0, done.stdout.decode(errors="replace")[-2000:]
    assert (tmp_path / "all.pdf").stat().st_size > 10_000


def test_the_exported_python_needs_newel_nowhere(registry, tmp_path):
    (tmp_path / "mine.py").write_text(newel.export("gill-4", "python", with_step=True, registry=registry))
    code = "import mine; print(mine.step(lambda t, y: [-y[0]], 0.0, [1.0], 0.1)[0][0])"
    done = subprocess.run(
        [sys.executable, "-I", "-c", f"import sys; sys.path.insert(0, '.'); {code}"],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=True,
    )
    # 1 − h + h²/2 − h³/6 + h⁴/24 with h = 0.1, for any method of order 4 with 4 stages
    assert abs(float(done.stdout) - 0.9048375) < 1e-15
    assert "newel" not in re.sub(
        r"^#.*", "", Path(tmp_path / "mine.py").read_text("utf-8"), flags=re.MULTILINE
    )
