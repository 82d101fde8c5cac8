"""How to read the numbers: the sentences that go with them on the terminal and in the report."""

GUARANTEE = (
    "Guaranteed: for the inputs above, the exact solution of the flow equations lies between the two bounds."
    " They follow from a stress that is in exact balance and a velocity that meets the walls;"
    " neither the mesh nor an unfinished iteration can make them wrong, only wide."
    " What is printed is rounded outward.",
    "Not guaranteed: the best estimate, its estimated error, the velocities,"
    " the wall shear stress at a place, the fraction that looks unyielded, and whether the flow is laminar.",
    "Supposed: steady, laminar, fully developed and isothermal flow, fluid at rest on the walls,"
    " no elasticity, and the fluid and the section exactly as given."
    " The pressure gradient is what friction takes: the weight of the fluid is not in it.",
)
CAUTIONS = (
    "Such numbers feed decisions in which pressure, hot melt or well control can hurt someone:"
    " check them against local codes, licensed practice and, where there are any, measurements.",
)

MEAN_STRESS = "The mean is pressure gradient x hydraulic diameter / 4, whatever the fluid."
WALL_PIECES = (
    "Smallest and largest are means over one edge of the mesh; in a sharp outward corner"
    " the exact stress falls to zero."
)
REENTRANT = (
    "At a re-entrant corner the exact stress is unbounded, so that any largest value would only reflect"
    " the mesh; the one quoted is the largest more than {away} from such a corner."
)
STRESS_AT_REST = "While nothing flows, how the stress spreads along the wall is not determined."
PLUG = (
    "Looks unyielded: the computed stress is at or below the yield stress; not guaranteed."
    " Proved nearly rigid: certainly sheared more slowly than {rate} 1/s, which is 1 % of"
    " 8 x mean velocity / hydraulic diameter."
)
NONE_PROVED = "none at this accuracy; a smaller one may prove more"
HYDRAULIC_DIAMETER = "The hydraulic diameter is 4 x area / wetted perimeter."

LIMITS = {
    "common practice": "Newtonian fluid in a pipe, common practice",
    "Mishra and Tripathi": "Mishra and Tripathi 1971",
    "Ryan and Johnson": "Ryan and Johnson 1959",
}
REYNOLDS = (
    "Generalised: rho U^(2-n) Dh^n / [8^(n-1) K (b + a/n)^n], with density rho, mean velocity U,"
    " hydraulic diameter Dh, shape factors a and b, and the power law K, n.",
    "By friction: 8 rho U^2 / mean wall shear stress, that is 16 / f with the Fanning friction factor"
    " f = 2 x mean wall shear stress / (rho U^2) of this very solution.",
    "Limits for the generalised number: Mishra and Tripathi 2100 (4n + 2)(5n + 3) / [3 (3n + 1)^2];"
    " Ryan and Johnson 6464 n (n + 2)^((n + 2)/(n + 1)) / (3n + 1)^2. They were found for pipes;"
    " in other sections, and at a yield stress, they are a guide only.",
)
HISTORY = (
    "The gap is the relative distance between the two bounds on the potential of the flow, from which the"
    " bracket on the answer follows; the mesh is refined where it is largest."
)
