"""Rows of the catalogue: families of one state variable."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

_GROWTH = {"label": "intrinsic growth rate"}
_DENSITY = {"start": "0.3", "label": "scaled population density"}

ONE_VARIABLE: Mapping[str, Mapping[str, Any]] = {
    "logistic": {
        "title": "Logistic map",
        "state": {"x": {"start": "0.3", "label": "scaled population", "domain": ["0", "1"]}},
        "parameters": {"r": {"default": "3.8", "label": "growth rate"}},
        "step": {"x": "r * x * (1 - x)"},
        "across": ["r", "2.8", "4"],
        "up": ["x", "0", "1"],
        "source": "R. M. May 1976, Nature 261, 459-467; M. J. Feigenbaum 1978, J. Stat. Phys. 19, 25-52",
        "note": "At r = 4 rounding drops some orbits onto 0; near r = 1 and r = 3 transients die out like a "
        "power of time. The start 1/2 reaches 0 in two steps at r = 4.",
    },
    "ricker": {
        "title": "Ricker map",
        "state": {"x": _DENSITY},
        "parameters": {"r": {"default": "2.8", **_GROWTH}},
        "step": {"x": "x * exp(r * (1 - x))"},
        "across": ["r", "1.6", "3.6"],
        "up": ["x", "0", "3.8"],
        "source": "W. E. Ricker 1954, J. Fish. Res. Board Can. 11, 559-623 (citation from memory); "
        "R. M. May and G. F. Oster 1976, Am. Nat. 110, 573-599",
        "note": "x is the stock divided by its equilibrium. For large r it falls so low after each peak "
        "that many steps of growth follow.",
    },
    "hassell": {
        "title": "Hassell map",
        "state": {"x": _DENSITY},
        "parameters": {
            "growth": {"default": "60", "label": "finite rate of increase"},
            "beta": {"default": "6", "label": "strength of competition"},
        },
        "step": {"x": "growth * x / (1 + x)**beta"},
        "across": ["growth", "5", "100"],
        "up": ["x", "0", "7"],
        "source": "M. P. Hassell 1975, J. Anim. Ecol. 44, 283-295; M. P. Hassell, J. H. Lawton and R. M. May "
        "1976, J. Anim. Ecol. 45, 471-486 (citations from memory)",
        "note": "Where x falls below -1, after a negative start, the power is no real number.",
    },
    "maynard_smith_slatkin": {
        "title": "Maynard Smith-Slatkin map",
        "state": {"x": _DENSITY},
        "parameters": {
            "growth": {"default": "3", "label": "finite rate of increase"},
            "b": {"default": "6", "label": "abruptness of density dependence"},
        },
        "step": {"x": "growth * x / (1 + x**b)"},
        "across": ["b", "2", "10"],
        "up": ["x", "0", "2.4"],
        "source": "J. Maynard Smith and M. Slatkin 1973, Ecology 54, 384-391 (citation from memory)",
        "note": "For a negative x and broken b the power is no real number.",
    },
    "theta_ricker": {
        "title": "Theta-Ricker map",
        "state": {"x": _DENSITY},
        "parameters": {
            "r": {"default": "1.4", **_GROWTH},
            "theta": {"default": "2", "label": "shape of density dependence"},
        },
        "step": {"x": "x * exp(r * (1 - x**theta))"},
        "across": ["r", "0.8", "1.8"],
        "up": ["x", "0", "2"],
        "source": "M. E. Gilpin and F. J. Ayala 1973, Proc. Natl. Acad. Sci. USA 70, 3590-3593, for the "
        "shape parameter in continuous time (citation from memory)",
        "note": "With y = x**theta this is the Ricker map of growth rate r * theta.",
    },
    "cubic": {
        "title": "Odd cubic map",
        "state": {"x": {"start": "0.3", "label": "state"}},
        "parameters": {"r": {"default": "2.5", "label": "gain"}},
        "step": {"x": "r * x * (1 - x**2)"},
        "across": ["r", "1.6", "3"],
        "up": ["x", "-1.2", "1.2"],
        "source": "T. D. Rogers and D. C. Whitley 1983, Math. Modelling 4, 9-25 (citation from memory)",
        "note": "Up to r = 3 sqrt(3) / 2 there are two mirror attractors, and one start shows one of them. "
        "At r = 3 rounding carries orbits out of their interval, and they escape.",
    },
    "sine": {
        "title": "Sine map",
        "state": {"x": {"start": "0.3", "label": "state", "domain": ["0", "1"]}},
        "parameters": {"r": {"default": "0.9", "label": "height"}},
        "step": {"x": "r * sin(pi * x)"},
        "across": ["r", "0.65", "1"],
        "up": ["x", "0", "1"],
        "source": "M. J. Feigenbaum 1978, J. Stat. Phys. 19, 25-52",
        "note": "At r = 1 the Lyapunov exponent is 0.689, not the ln 2 of the logistic map.",
    },
    "tent": {
        "title": "Tent map",
        "state": {"x": {"start": "0.3", "label": "state", "domain": ["0", "1"]}},
        "parameters": {"mu": {"default": "1.7", "label": "slope"}},
        "step": {"x": "mu * min(x, 1 - x)"},
        "across": ["mu", "1", "2"],
        "up": ["x", "0", "1"],
        "source": "S. Ito, S. Tanaka and H. Nakada 1979, Proc. Japan Acad. 55A, 221-224 (citation from "
        "memory)",
        "note": "At slope 2 rounding drops every float64 orbit onto 0 within 55 steps.",
    },
    "skew_tent": {
        "title": "Skew tent map with offset",
        "state": {"x": {"start": "0.3", "label": "distance from the border"}},
        "parameters": {
            "a": {"default": "0.5", "label": "slope below the border"},
            "b": {"default": "-2.5", "label": "slope above the border"},
            "mu": {"default": "1", "label": "offset"},
        },
        "step": {"x": "where(x <= 0, a*x + mu, b*x + mu)"},
        "across": ["b", "-6", "-1"],
        "up": ["x", "-5", "1"],
        "source": "H. E. Nusse and J. A. Yorke 1992, Physica D 57, 39-57; S. Banerjee et al. 2000, IEEE "
        "Trans. Circuits Syst. I 47, 389-394 (citations from memory)",
        "note": "The normal form of a border collision, which happens at mu = 0; on either side of it "
        "attractors keep their shape and grow in proportion to mu.",
    },
    "gauss": {
        "title": "Gauss map",
        "state": {"x": {"start": "0", "label": "state"}},
        "parameters": {
            "alpha": {"default": "6.2", "label": "narrowness of the bell"},
            "beta": {"default": "-0.5", "label": "offset"},
        },
        "step": {"x": "exp(-alpha * x**2) + beta"},
        "across": ["beta", "-1", "1"],
        "up": ["x", "-0.5", "1.2"],
        "source": "R. C. Hilborn 2000, Chaos and Nonlinear Dynamics, 2nd ed., Oxford (citation from memory)",
        "note": "Attractors coexist, near beta = -0.8 at alpha = 6.2 for example: the picture depends on the "
        "start.",
    },
    "quadratic": {
        "title": "Real quadratic map",
        "state": {"x": {"start": "0.3", "label": "state", "domain": ["-2", "2"]}},
        "parameters": {"c": {"default": "-1.8", "label": "constant term"}},
        "step": {"x": "x**2 + c"},
        "across": ["c", "-2", "0.25"],
        "up": ["x", "-2", "2"],
        "source": "P. J. Myrberg 1963, Ann. Acad. Sci. Fenn. A I 336/3 (citation from memory)",
        "note": "Conjugate to the logistic map by c = r (2 - r) / 4. The start 0 is mapped onto the "
        "repelling fixed point 2 at c = -2.",
    },
    "circle": {
        "title": "Sine circle map",
        "state": {"theta": {"start": "0.2", "label": "phase in turns", "wrap": ["0", "1"]}},
        "parameters": {
            "Omega": {"default": "0.3", "label": "bare rotation"},
            "K": {"default": "0.9", "label": "coupling"},
        },
        "step": {"theta": "theta + Omega - K/(2*pi) * sin(2*pi*theta)"},
        "across": ["Omega", "0", "1"],
        "up": ["K", "0", "2"],
        "source": "V. I. Arnold 1965, Am. Math. Soc. Transl. Ser. 2 46, 213-284 (citation from memory); "
        "M. H. Jensen, P. Bak and T. Bohr 1984, Phys. Rev. A 30, 1960-1969",
        "note": "The rotation number is counted on the lifted map, before theta is brought back. Above K "
        "= 1 tongues overlap, and it can depend on the start. At K = 0 every orbit is a rotation: for a "
        "rational Omega all cycles are neutral.",
    },
    "forced_logistic": {
        "title": "Forced logistic map",
        "state": {"x": {"start": "0.3", "label": "scaled population", "domain": ["0", "1"]}},
        "parameters": {
            "a": {"default": "3.4", "label": "growth rate in the steps of a"},
            "b": {"default": "3.9", "label": "growth rate in the steps of b"},
            "r": {"pattern": ["a", "b"], "label": "growth rate"},
        },
        "step": {"x": "r * x * (1 - x)"},
        "across": ["a", "2", "4"],
        "up": ["b", "2", "4"],
        "source": "M. Markus and B. Hess 1989, Comput. Graph. 13, 553-558 (citation from memory)",
        "note": "The first letter of the pattern holds in the first step. Where two attractors coexist, near "
        "a = 3.4 and b = 3.25 for example, the one that a start reaches depends on that phase, so that the "
        "plane of one start is not symmetric. The start 1/2 is lost at a = 4.",
    },
}
