// Bodies of revolution about z with smooth meridians, and a block with round edges; lengths in mm, all invented.
// One part a run: openscad -D 'part="torus"' -D turn=36 -D step=15 ...
//
// `turn` is the number of facets around the axis, `step` the largest angle between neighbours on an arc of the meridian.
// Every corner lies on the true body, within the grid of 1e-5 mm that OpenSCAD rounds polygons to.  A meridian is a list of [r, z], from axis to axis or closed.

part = "torus";
turn = 36;
step = 15;

// Points on the arc about `c` with radius `r` from angle `a` to `b` (degrees), both ends included.
function arc(c, r, a, b) =
    let (n = ceil(abs(b - a) / step - 1e-9))
    [for (i = [0:n]) [c[0] + r * cos(a + (b - a) * i / n), c[1] + r * sin(a + (b - a) * i / n)]];

// The same without its first point, for an arc that goes on where the last one ended.
function onward(c, r, a, b) = let (p = arc(c, r, a, b)) [for (i = [1:len(p) - 1]) p[i]];

// Points at an end of the axis are put on it exactly.
function snapped(points) = [for (p = points) [abs(p[0]) < 1e-9 ? 0 : p[0], p[1]]];

module turned(points) { rotate_extrude($fn = turn) polygon(snapped(points)); }

// Round disc of radius `r` from height `low` to `high`, rims rounded by `f`.
function plate(r, low, high, f) = concat(
    [[0, low]],
    arc([r - f, low + f], f, -90, 0),
    2 * f < high - low ? arc([r - f, high - f], f, 0, 90) : onward([r - f, high - f], f, 0, 90),
    [[0, high]]);

// Bowl: a spherical shell between the radii 26 and 30 below z = 0; its rim is rolled outwards to a bead of radius 4
// about (30, 0), which goes on from the inner sphere without a kink and meets the outer one in a hollow fillet of radius 2.
function bowl() =
    let (hollow_z = -(32 * 32 + 30 * 30 - 6 * 6) / (2 * 30))        // along the line from the origin: |c| = 32, |c - (30, 0)| = 6
    let (cx = -hollow_z, cz = -sqrt(32 * 32 - cx * cx))
    let (to_origin = atan2(-cz, -cx), to_bead = atan2(-cz, 30 - cx))
    concat(
        arc([0, 0], 30, -90, atan2(cz, cx)),
        onward([cx, cz], 2, to_origin, to_bead),
        onward([30, 0], 4, atan2(cz, cx - 30), 180),
        onward([0, 0], 26, 0, -90));

// Ball of radius 20 with a hollow of radius 14 about (0, 26); the rim between them is rounded by 4.
function dimpled() =
    let (cz = (16 * 16 + 26 * 26 - 18 * 18) / (2 * 26), cx = sqrt(16 * 16 - cz * cz))
    concat(
        arc([0, 0], 20, -90, atan2(cz, cx)),
        onward([cx, cz], 4, atan2(cz, cx), atan2(26 - cz, -cx)),
        onward([0, 26], 14, atan2(cz - 26, cx), -90));

// Ball of radius 20 drawn in by 7 at the pole: distance from the origin 20 - 7 exp(-(angle from the axis / 0.5 rad)^2).
function dented() =
    let (n = ceil(180 / step))
    [for (i = [0:n]) let (a = 180 * (1 - i / n), t = a * PI / 180 / 0.5, r = 20 - 7 * exp(-t * t)) [r * sin(a), r * cos(a)]];

// Block of 40 x 30 x 20 with all edges and corners rounded by 3: hull of eight balls with corners on their poles.
module block() {
    hull()
        for (x = [-17, 17], y = [-12, 12], z = [-7, 7])
            translate([x, y, z]) turned(arc([0, 0], 3, -90, 90));
}

if (part == "torus") turned([for (i = [0:round(360 / step) - 1]) [30 + 10 * cos(i * step), 10 * sin(i * step)]]);
if (part == "capsule") turned(concat(arc([0, -10], 10, -90, 0), arc([0, 10], 10, 0, 90)));
if (part == "cylinder") turned(plate(10, -10, 10, 2));
if (part == "plate_low") turned(plate(30, -10, -4, 3));
if (part == "plate_high") turned(plate(20, 4, 10, 2));
if (part == "bowl") turned(bowl());
if (part == "spheroid") turned([for (p = arc([0, 0], 1, -90, 90)) [10 * p[0], 30 * p[1]]]);
if (part == "dimpled") turned(dimpled());
if (part == "dented") turned(dented());
if (part == "block") block();
