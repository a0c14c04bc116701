"""Loops in C and Fortran, compiled on the spot, and their wrappers in Python."""

from __future__ import annotations

import ctypes
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

RATE = ctypes.CFUNCTYPE(
    None, ctypes.c_int, ctypes.c_double, ctypes.POINTER(ctypes.c_double), ctypes.POINTER(ctypes.c_double)
)

IN_C = """
typedef void (*rate_t)(int n, double t, const double *y, double *out);
#define MOST 1024

/* the rule of three eighths, for any length; the weight is a macro so that a wrong one can be planted */
#ifndef LAST
#define LAST 1.0
#endif
void three_eighths(rate_t f, int n, double t, double *y, double h) {
    double k1[MOST], k2[MOST], k3[MOST], k4[MOST], u[MOST];
    f(n, t, y, k1);
    for (int i = 0; i < n; i++) u[i] = y[i] + h * k1[i] / 3;
    f(n, t + h / 3, u, k2);
    for (int i = 0; i < n; i++) u[i] = y[i] + h * (k2[i] - k1[i] / 3);
    f(n, t + 2 * h / 3, u, k3);
    for (int i = 0; i < n; i++) u[i] = y[i] + h * (k1[i] - k2[i] + k3[i]);
    f(n, t + h, u, k4);
    for (int i = 0; i < n; i++) y[i] += h / 8 * (k1[i] + 3 * k2[i] + 3 * k3[i] + LAST * k4[i]);
}

/* a loop for a pendulum: two numbers, whatever else there may be */
void pendulum(rate_t f, int n, double t, double *y, double h) {
    double k1[2], k2[2], k3[2], u[2];
    f(2, t, y, k1);
    for (int i = 0; i < 2; i++) u[i] = y[i] + h / 2 * k1[i];
    f(2, t + h / 2, u, k2);
    for (int i = 0; i < 2; i++) u[i] = y[i] + h * (2 * k2[i] - k1[i]);
    f(2, t + h, u, k3);
    for (int i = 0; i < 2; i++) y[i] += h / 6 * (k1[i] + 4 * k2[i] + k3[i]);
}

/* four Euler-like stages from the start of the step, in place, one register more */
void falling_fractions(rate_t f, int n, double t, double *y, double h) {
    double start[MOST], k[MOST];
    for (int i = 0; i < n; i++) start[i] = y[i];
    for (int m = 4; m >= 1; m--) {
        f(n, m == 4 ? t : t + h / (m + 1), y, k);
        for (int i = 0; i < n; i++) y[i] = start[i] + h / m * k[i];
    }
}
"""

IN_FORTRAN = """
module loops
  use iso_c_binding
  implicit none
  abstract interface
    subroutine rate_t(n, t, y, out) bind(c)
      import
      integer(c_int), value :: n
      real(c_double), value :: t
      real(c_double), intent(in) :: y(n)
      real(c_double), intent(out) :: out(n)
    end subroutine
  end interface
contains
  subroutine heun_third(f, n, t, y, h) bind(c)
    procedure(rate_t) :: f
    integer(c_int), value :: n
    real(c_double), value :: t, h
    real(c_double), intent(inout) :: y(n)
    real(c_double) :: k1(n), k2(n), k3(n)
    call f(n, t, y, k1)
    call f(n, t + h/3d0, y + h/3d0*k1, k2)
    call f(n, t + 2d0*h/3d0, y + 2d0*h/3d0*k2, k3)
    y = y + h/4d0*(k1 + 3d0*k3)
  end subroutine

  subroutine single_precision_constant(f, n, t, y, h) bind(c)
    procedure(rate_t) :: f
    integer(c_int), value :: n
    real(c_double), value :: t, h
    real(c_double), intent(inout) :: y(n)
    real(c_double) :: k1(n), k2(n), k3(n)
    call f(n, t, y, k1)
    call f(n, t + h/3d0, y + h/3d0*k1, k2)
    call f(n, t + 2d0*h/3d0, y + 2d0/3.0*0.9d0*h*k2, k3)
    y = y + h/4d0*(k1 + 3d0*k3)
  end subroutine
end module
"""


def compilers() -> dict[str, str | None]:
    """The commands that there are on this machine."""
    return {"C": shutil.which("gcc") or shutil.which("cc"), "Fortran": shutil.which("gfortran")}


def compiled(language: str, folder: Path, *options: str) -> ctypes.CDLL:
    """Compile the loops of a language into a library and load it."""
    source = folder / ("loops.c" if language == "C" else "loops.f90")
    source.write_text(IN_C if language == "C" else IN_FORTRAN, encoding="utf-8")
    library = folder / f"{source.stem}_{language}{len(options)}.so"
    command = compilers()[language]
    assert command is not None
    subprocess.run(
        [command, "-O1", "-shared", "-fPIC", *options, str(source), "-o", str(library)],
        check=True,
        capture_output=True,
        cwd=folder,
    )
    return ctypes.CDLL(str(library))


def wrapped(function: Any) -> Callable[..., None]:
    """A step function around a compiled one, as a user writes it: y is changed in place."""
    function.argtypes = [
        RATE,
        ctypes.c_int,
        ctypes.c_double,
        ctypes.POINTER(ctypes.c_double),
        ctypes.c_double,
    ]
    function.restype = None

    def step(rate: Any, t: float, y: Any, h: float) -> None:
        failed: list[Exception] = []

        @RATE
        def callback(n: int, time: float, state: Any, out: Any) -> None:
            try:
                values = rate(time, np.ctypeslib.as_array(state, (n,)).copy())
                np.ctypeslib.as_array(out, (n,))[:] = values[:n]
            except Exception as error:
                failed.append(error)

        function(callback, len(y), t, y.ctypes.data_as(ctypes.POINTER(ctypes.c_double)), h)
        if failed:
            raise failed[0]

    return step
