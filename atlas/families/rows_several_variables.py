"""Rows of the catalogue: families of two and three state variables."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

_TURN = ["0", "2*pi"]
_HOST = {"start": "1.2", "label": "hosts"}
_PARASITOID = {"start": "0.6", "label": "parasitoids"}

SEVERAL_VARIABLES: Mapping[str, Mapping[str, Any]] = {
    "henon": {
        "title": "Henon map",
        "state": {"x": {"start": "0.1", "label": "state"}, "y": {"start": "0.1", "label": "second state"}},
        "parameters": {
            "a": {"default": "1.4", "label": "strength of the bend"},
            "b": {"default": "0.3", "label": "contraction of area"},
        },
        "step": {"x": "1 - a * x**2 + y", "y": "b * x"},
        "across": ["a", "0.2", "1.4"],
        "up": ["x", "-1.5", "1.5"],
        "source": "M. Henon 1976, Commun. Math. Phys. 50, 69-77",
        "note": "Near a = 1.427 at b = 0.3 the attractor is destroyed, and nearly all orbits escape, as "
        "they do below a = -(1 - b)**2 / 4. The basin is bounded: far starts escape at every a. In places "
        "attractors coexist.",
    },
    "lozi": {
        "title": "Lozi map",
        "state": {"x": {"start": "0.1", "label": "state"}, "y": {"start": "0.1", "label": "second state"}},
        "parameters": {
            "a": {"default": "1.7", "label": "strength of the fold"},
            "b": {"default": "0.5", "label": "contraction of area"},
        },
        "step": {"x": "1 - a * abs(x) + y", "y": "b * x"},
        "across": ["a", "0.3", "1.7"],
        "up": ["x", "-1.5", "2.2"],
        "source": "R. Lozi 1978, J. Phys. Colloq. 39 C5, 9-10 (citation from memory)",
        "note": "The cycle of period 2 is stable for 1 - b < a < 1 + b exactly; at a = 1 - b a whole "
        "segment of states has period 2, so that what is drawn there depends on the start.",
    },
    "ikeda": {
        "title": "Ikeda map",
        "state": {
            "x": {"start": "0.1", "label": "real part of the field"},
            "y": {"start": "0.1", "label": "imaginary part of the field"},
        },
        "parameters": {"u": {"default": "0.9", "label": "reflectivity of the cavity"}},
        "helpers": {"turn": "0.4 - 6 / (1 + x**2 + y**2)"},
        "step": {
            "x": "1 + u * (x * cos(turn) - y * sin(turn))",
            "y": "u * (x * sin(turn) + y * cos(turn))",
        },
        "across": ["u", "0.4", "0.9"],
        "up": ["x", "-0.6", "1.9"],
        "source": "K. Ikeda 1979, Opt. Commun. 30, 257-261; S. M. Hammel, C. K. R. T. Jones and J. V. "
        "Moloney 1985, J. Opt. Soc. Am. B 2, 552-564 (citations from memory)",
        "note": "At u = 0.9 a stable fixed point near x = 2.97, y = 4.15 coexists with the chaotic "
        "attractor, which is destroyed at a slightly larger u. A step multiplies areas by u**2 exactly.",
    },
    "standard": {
        "title": "Standard map",
        "state": {
            "theta": {"start": "0.1", "label": "angle", "wrap": _TURN},
            "p": {"start": "0.1", "label": "momentum", "wrap": _TURN},
        },
        "parameters": {"K": {"default": "1.2", "label": "strength of the kick"}},
        "helpers": {"kicked": "p + K * sin(theta)"},
        "step": {"theta": "theta + kicked", "p": "kicked"},
        "across": ["theta", *_TURN],
        "up": ["p", *_TURN],
        "source": "B. V. Chirikov 1979, Phys. Rep. 52, 263-379 (citation from memory); J. M. Greene 1979, "
        "J. Math. Phys. 20, 1183-1201",
        "note": "Area is preserved: there is no attractor, and one start fills one curve or one chaotic "
        "zone. Give a grid of starts to see islands and rotational curves; of the latter none is left "
        "above K = 0.971635. Exponents converge slowly, because orbits stick to the islands' edges.",
    },
    "delayed_logistic": {
        "title": "Delayed logistic map",
        "state": {
            "x": {"start": "0.5", "label": "scaled population"},
            "y": {"start": "0.4", "label": "scaled population a step ago"},
        },
        "parameters": {"r": {"default": "2.1", "label": "growth rate"}},
        "step": {"x": "r * x * (1 - y)", "y": "x"},
        "across": ["r", "1.9", "2.27"],
        "up": ["x", "0", "1"],
        "source": "J. Maynard Smith 1968, Mathematical Ideas in Biology, Cambridge; D. G. Aronson, M. A. "
        "Chory, G. R. Hall and R. P. McGehee 1982, Commun. Math. Phys. 83, 303-354 (citations from memory)",
        "note": "Neimark-Sacker at r = 2, where orbits spiral in like a power of time only. From about r "
        "= 2.271 on they escape; starts far from the invariant circle do so earlier.",
    },
    "coupled_logistic": {
        "title": "Two coupled logistic maps",
        "state": {
            "x": {"start": "0.3", "label": "first population", "domain": ["0", "1"]},
            "y": {"start": "0.4", "label": "second population", "domain": ["0", "1"]},
        },
        "parameters": {
            "r": {"default": "3.8", "label": "growth rate"},
            "eps": {"default": "0.05", "label": "strength of the coupling"},
        },
        "helpers": {"grown_x": "r * x * (1 - x)", "grown_y": "r * y * (1 - y)"},
        "step": {
            "x": "(1 - eps) * grown_x + eps * grown_y",
            "y": "(1 - eps) * grown_y + eps * grown_x",
        },
        "observables": {
            "difference": {"formula": "x - y", "label": "difference of the populations"},
            "mean": {"formula": "(x + y) / 2", "label": "mean population"},
        },
        "across": ["r", "2.8", "4"],
        "up": ["x", "0", "1"],
        "source": "H. Fujisaka and T. Yamada 1983, Prog. Theor. Phys. 69, 32-47; K. Kaneko 1984, Prog. "
        "Theor. Phys. 72, 480-486 (citations from memory)",
        "note": "A start with x = y stays synchronised for ever, whether that is stable or not, and "
        "rounding synchronises chaotic orbits for good once x = y to the last bit. Attractors coexist, "
        "often in mirror pairs.",
    },
    "nicholson_bailey": {
        "title": "Nicholson-Bailey map",
        "state": {"N": _HOST, "P": _PARASITOID},
        "parameters": {"R": {"default": "2", "label": "growth rate of hosts"}},
        "step": {"N": "R * N * exp(-P)", "P": "N * (1 - exp(-P))"},
        "extinct": {"N": "1e-6", "P": "1e-6"},
        "across": ["R", "1.05", "3"],
        "up": ["N", "0", "10"],
        "source": "A. J. Nicholson and V. A. Bailey 1935, Proc. Zool. Soc. Lond. 105, 551-598 (citation "
        "from memory)",
        "note": "There is no attractor: the equilibrium is unstable for every R > 1, and orbits spiral out "
        "until the parasitoids underflow to 0 and the hosts escape, or both underflow. Only short runs "
        "without a transient show anything; planes and basins say extinct.",
    },
    "beddington": {
        "title": "Beddington-Free-Lawton map",
        "state": {"N": _HOST, "P": _PARASITOID},
        "parameters": {
            "r": {"default": "1.5", "label": "intrinsic growth rate of hosts"},
            "K": {"default": "4", "label": "carrying capacity of hosts"},
        },
        "step": {"N": "N * exp(r * (1 - N/K) - P)", "P": "N * (1 - exp(-P))"},
        "extinct": {"N": "1e-9", "P": "1e-9"},
        "across": ["r", "0.2", "2.9"],
        "up": ["N", "0", "6"],
        "source": "J. R. Beddington, C. A. Free and J. H. Lawton 1975, Nature 255, 58-60 (citation from "
        "memory)",
        "note": "For K not above 1 the parasitoids die out and the hosts follow a Ricker map. At K = 4 "
        "this attractor coexists with others for r above 3; near the Neimark-Sacker curve transients are "
        "long.",
    },
    "burgers": {
        "title": "Burgers map",
        "state": {
            "x": {"start": "-0.1", "label": "amplitude of the mean flow"},
            "y": {"start": "0.1", "label": "amplitude of the disturbance"},
        },
        "parameters": {
            "a": {"default": "0.75", "label": "damping of the mean flow"},
            "b": {"default": "1.8", "label": "growth of the disturbance"},
        },
        "step": {"x": "a * x - y**2", "y": "b * y + x * y"},
        "across": ["b", "0.9", "1.84"],
        "up": ["y", "-1.5", "1.5"],
        "source": "R. R. Whitehead and N. MacDonald 1984, Physica D 13, 401-407 (citation from memory)",
        "note": "The mirror y -> -y maps attractors onto each other: up to their merging one start shows "
        "one of two. Starts with y = 0 stay there. Above about b = 1.84 at a = 0.75 orbits escape.",
    },
    "border_collision_plane": {
        "title": "Border-collision map of the plane",
        "state": {
            "x": {"start": "0.1", "label": "distance from the border"},
            "y": {"start": "0.1", "label": "second state"},
        },
        "parameters": {
            "tau_left": {"default": "1.4", "label": "trace left of the border"},
            "delta_left": {"default": "0.3", "label": "determinant left of the border"},
            "tau_right": {"default": "-2", "label": "trace right of the border"},
            "delta_right": {"default": "0.3", "label": "determinant right of the border"},
            "mu": {"default": "1", "label": "offset"},
        },
        "step": {
            "x": "where(x <= 0, tau_left, tau_right) * x + y + mu",
            "y": "-where(x <= 0, delta_left, delta_right) * x",
        },
        "across": ["tau_right", "-3", "0.5"],
        "up": ["x", "-4", "2"],
        "source": "H. E. Nusse and J. A. Yorke 1992, Physica D 57, 39-57; S. Banerjee and C. Grebogi "
        "1999, Phys. Rev. E 59, 4052-4061 (citations from memory)",
        "note": "The normal form of a border collision, which happens at mu = 0; on either side of it "
        "attractors keep their shape and grow in proportion to mu, so only its sign matters. Attractors "
        "may coexist, and where one is lost orbits escape.",
    },
    "complex_quadratic": {
        "title": "Complex quadratic map",
        "state": {
            "re": {"start": "0", "label": "real part"},
            "im": {"start": "0", "label": "imaginary part"},
        },
        "parameters": {
            "c_re": {"default": "-0.1", "label": "real part of the constant term"},
            "c_im": {"default": "0.7", "label": "imaginary part of the constant term"},
        },
        "step": {"re": "re**2 - im**2 + c_re", "im": "2 * re * im + c_im"},
        "observables": {"modulus": {"formula": "sqrt(re**2 + im**2)", "label": "modulus"}},
        "across": ["c_re", "-2", "0.5"],
        "up": ["c_im", "-1.25", "1.25"],
        "source": "A. Douady and J. H. Hubbard 1982, C. R. Acad. Sci. Paris Ser. I 294, 123-126 (citation "
        "from memory)",
        "note": "The start 0 is the critical point, which finds the attracting cycle wherever there is "
        "one. Near the edges of components transients are long. At c = -2 the start is mapped onto the "
        "repelling fixed point 2.",
    },
    "insect_stages": {
        "title": "Three-stage insect map",
        "state": {
            "larvae": {"start": "250", "label": "feeding larvae", "unit": "insects"},
            "pupae": {"start": "5", "label": "pupae and resting larvae", "unit": "insects"},
            "adults": {"start": "100", "label": "adults", "unit": "insects"},
        },
        "parameters": {
            "b": {"default": "6.598", "label": "larvae an adult, without cannibalism"},
            "cea": {"default": "0.01155", "label": "cannibalism of eggs by adults"},
            "cel": {"default": "0.01209", "label": "cannibalism of eggs by larvae"},
            "cpa": {"default": "0.35", "label": "cannibalism of pupae by adults"},
            "mua": {"default": "0.96", "label": "mortality of adults"},
            "mul": {"default": "0.2055", "label": "mortality of larvae"},
        },
        "step": {
            "larvae": "b * adults * exp(-cel * larvae - cea * adults)",
            "pupae": "(1 - mul) * larvae",
            "adults": "pupae * exp(-cpa * adults) + (1 - mua) * adults",
        },
        "observables": {
            "total": {"formula": "larvae + pupae + adults", "label": "all stages", "unit": "insects"}
        },
        "extinct": {"larvae": "1e-6", "pupae": "1e-6", "adults": "1e-6"},
        "across": ["cpa", "0", "1"],
        "up": ["larvae", "0", "200"],
        "source": "B. Dennis, R. A. Desharnais, J. M. Cushing and R. F. Costantino 1995, Ecol. Monogr. "
        "65, 261-281; R. F. Costantino et al. 1997, Science 275, 389-391 (citations and parameters from "
        "memory)",
        "note": "The insects die out where b * (1 - mul) < mua. Attractors coexist, a cycle of period 3 "
        "with chaos at cpa = 0.5 for example, so that the picture depends on the start. A step is two "
        "weeks.",
    },
    "predator_prey": {
        "title": "Predator-prey map",
        "state": {
            "x": {"start": "0.5", "label": "scaled prey"},
            "y": {"start": "0.3", "label": "scaled predators"},
        },
        "parameters": {
            "a": {"default": "3.6", "label": "growth rate of prey"},
            "d": {"default": "3.2", "label": "growth of predators on prey"},
        },
        "step": {"x": "a * x * (1 - x) - x * y", "y": "d * x * y"},
        "across": ["d", "1.2", "3.5"],
        "up": ["x", "0", "1"],
        "source": "M. Danca, S. Codreanu and B. Bako 1997, J. Biol. Phys. 23, 11-20 (citation from memory)",
        "note": "Where the predators die out, below d = a / (a - 1) for a up to 3, the prey follow the "
        "logistic map of growth rate a. Starts with y > a * (1 - x) make the prey negative, and orbits "
        "escape.",
    },
}
